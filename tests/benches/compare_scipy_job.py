#!/usr/bin/env python3
"""Times the program against scipy_job.py on the same folder, in turn.

usage: compare_scipy_job.py [--files N] [--seconds S] [--rounds R] [--tool PATH]

N recordings of S seconds (default 16 of 60). For 1 and 2 jobs, R alternating rounds
(default 5); the ratio is that of the best times, as other work on the machine can
only make a round slower. The program's time is the whole process; SciPy's leaves out
the start of the interpreter and its imports.
Build first: cargo build --release
"""
import os
import subprocess
import sys
import tempfile
from pathlib import Path

import timing

JOBS = (1, 2)


def run_scipy(source, target, jobs):
    # One thread a process, or numerical libraries would take cores beyond `jobs`.
    environment = {k: v for k, v in os.environ.items() if k not in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE")}
    environment |= {"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    command = [sys.executable, timing.HERE / "scipy_job.py", source, target, str(jobs)]
    run = subprocess.run(command, check=True, stdout=subprocess.PIPE, text=True, env=environment)
    return float(run.stdout)


def main():
    options = timing.options(__doc__, files=16, seconds=60, rounds=5)
    with tempfile.TemporaryDirectory() as folder:
        folder = Path(folder)
        timing.make_recordings(folder / "in", options.files, options.seconds)
        samples = options.files * options.seconds * 48000
        print(f"{options.files} recordings of {options.seconds:g} s, best of {options.rounds} alternating rounds")
        print("jobs   SciPy s  program s  ratio  program ns a sample")
        for jobs in JOBS:
            theirs, ours = [], []
            for _ in range(options.rounds):
                (folder / "scipy").mkdir(exist_ok=True)
                theirs.append(run_scipy(folder / "in", folder / "scipy", jobs))
                ours.append(timing.run_tool(folder / "in", folder / "out", jobs, options.tool)[0])
            a, b = min(theirs), min(ours)
            print(f"{jobs:4} {a:9.2f} {b:10.2f} {a / b:6.2f} {b * 1e9 / samples:8.1f}", flush=True)


if __name__ == "__main__":
    main()
