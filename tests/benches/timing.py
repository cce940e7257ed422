"""What the scripts that time the whole program share. Standard library only: a child's
peak memory counts from its parent's at the fork, so the parent has to be small."""
import argparse
import os
import shutil
import subprocess
import sys
import time
from pathlib import Path

HERE = Path(__file__).resolve().parent
SPEC = HERE / "speed.toml"
TOOL = HERE.parents[1] / "target" / "release" / "bandproof"


def options(doc, files, seconds, rounds):
    """What every script takes: how many recordings, how long, how often, which program."""
    parser = argparse.ArgumentParser(description=doc.splitlines()[0])
    parser.add_argument("--files", type=int, default=files)
    parser.add_argument("--seconds", type=float, default=seconds)
    parser.add_argument("--rounds", type=int, default=rounds)
    parser.add_argument("--tool", type=Path, default=TOOL)
    return parser.parse_args()


def make_recordings(folder, count, seconds):
    subprocess.run([sys.executable, HERE / "recordings.py", folder, str(count), str(seconds)], check=True)


def run_tool(source, target, jobs, tool=TOOL, spec=SPEC):
    """Filters `source` into an empty `target`; returns seconds and peak memory in MiB."""
    shutil.rmtree(target, ignore_errors=True)
    command = [os.fspath(a) for a in (tool, "filter", spec, source, target, "--jobs", str(jobs), "--quiet")]
    started = time.perf_counter()
    child = os.posix_spawn(command[0], command, os.environ)
    _, status, usage = os.wait4(child, 0)
    seconds = time.perf_counter() - started
    # 1 says that some band was missed: the work is done all the same.
    if os.waitstatus_to_exitcode(status) not in (0, 1):
        sys.exit(f"{' '.join(command)}\nended with status {os.waitstatus_to_exitcode(status)}")
    made = sum(1 for _ in target.rglob("*.wav"))
    wanted = sum(1 for _ in source.rglob("*.wav"))
    if made != wanted:
        sys.exit(f"{made} recordings came out of {wanted}")
    return seconds, usage.ru_maxrss / 1024
