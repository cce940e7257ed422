#!/usr/bin/env python3
"""Times recheck against sha256sum over the same files with as many processes as threads.

usage: recheck_speed.py [--files N] [--seconds S] [--rounds R] [--tool PATH]

N recordings of S seconds (default 24 of 120, 276 MB in all) are filtered once; their
outputs are then hashed by `find | xargs -P J sha256sum` and checked by
`recheck --jobs J`, in turn, R rounds (default 7), for 1 job and for one a core. The
ratio is that of the best times, theirs over ours: other work on the machine can only
make a round slower. Files come from the page cache on both sides. Both times are those
of the whole process, recheck's with reading the report and looking for new files.
Build first: cargo build --release
"""
import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import timing


def timed(command):
    started = time.perf_counter()
    run = subprocess.run(command, stdout=subprocess.PIPE, text=True)
    seconds = time.perf_counter() - started
    if run.returncode != 0:
        sys.exit(f"{command} ended with status {run.returncode}:\n{run.stdout}")
    return seconds, run.stdout


def hash_with_sha256sum(folder, jobs):
    # A few files a process, so that no process is left with all the large ones.
    command = f"find '{folder}' -name '*.wav' -print0 | xargs -0 -n 4 -P {jobs} sha256sum"
    return timed(["sh", "-c", command])


def main():
    options = timing.options(__doc__, files=24, seconds=120, rounds=7)
    with tempfile.TemporaryDirectory() as folder:
        folder = Path(folder)
        timing.make_recordings(folder / "in", options.files, options.seconds)
        timing.run_tool(folder / "in", folder / "out", os.cpu_count(), options.tool)
        report = folder / "out" / "bandproof-report.json"
        total = sum(path.stat().st_size for path in (folder / "out").rglob("*.wav"))
        print(f"{options.files} files, {total / 1e6:.0f} MB, best of {options.rounds} alternating rounds")
        print("jobs  sha256sum s  recheck s  ratio  recheck GB/s")
        for jobs in sorted({1, os.cpu_count()}):
            theirs, ours = [], []
            for _ in range(options.rounds):
                seconds, printed = hash_with_sha256sum(folder / "out", jobs)
                if printed.count("\n") != options.files:
                    sys.exit(f"sha256sum printed {printed.count(chr(10))} hashes for {options.files} files")
                theirs.append(seconds)
                ours.append(timed([options.tool, "recheck", report, "--jobs", str(jobs)])[0])
            a, b = min(theirs), min(ours)
            print(f"{jobs:4} {a:12.3f} {b:10.3f} {a / b:6.2f} {total / b / 1e9:13.2f}", flush=True)


if __name__ == "__main__":
    main()
