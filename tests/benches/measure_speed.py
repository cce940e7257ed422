#!/usr/bin/env python3
"""Times measure against filter on the same folder, in turn.

usage: measure_speed.py [--files N] [--seconds S] [--rounds R] [--tool PATH]

N recordings of S seconds (default 16 of 60). The folder is filtered, and then the pairs
of it and its outputs are measured, R alternating rounds (default 5) for 1 and 2 jobs;
the ratio is that of the best times, measure over filter: other work on the machine can
only make a round slower. measure reads both sides twice and writes only its report.
Build first: cargo build --release
"""
import subprocess
import tempfile
import time
from pathlib import Path

import timing

JOBS = (1, 2)


def run_measure(source, target, jobs, tool):
    command = [tool, "measure", timing.SPEC, source, target, "--jobs", str(jobs), "--quiet", "--replace"]
    started = time.perf_counter()
    # Status 1: a band of the spec may be missed, which takes no less time.
    status = subprocess.run(command, cwd=target.parent).returncode
    if status not in (0, 1):
        raise SystemExit(f"measure ended with status {status}")
    return time.perf_counter() - started


def main():
    options = timing.options(__doc__, files=16, seconds=60, rounds=5)
    with tempfile.TemporaryDirectory() as folder:
        folder = Path(folder)
        timing.make_recordings(folder / "in", options.files, options.seconds)
        samples = options.files * options.seconds * 48000
        print(f"{options.files} recordings of {options.seconds:g} s, best of {options.rounds} alternating rounds")
        print("jobs  filter s  measure s  ratio  measure ns a sample")
        for jobs in JOBS:
            filtering, measuring = [], []
            for _ in range(options.rounds):
                filtering.append(timing.run_tool(folder / "in", folder / "out", jobs, options.tool)[0])
                measuring.append(run_measure(folder / "in", folder / "out", jobs, options.tool))
            a, b = min(filtering), min(measuring)
            print(f"{jobs:4} {a:9.2f} {b:10.2f} {b / a:6.2f} {b * 1e9 / samples:8.1f}", flush=True)


if __name__ == "__main__":
    main()
