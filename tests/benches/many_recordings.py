#!/usr/bin/env python3
"""Times folders of many short recordings: against scipy_job.py, by their number, again.

usage: many_recordings.py [--files N] [--rounds R] [--tiny N] [--folder DIR] [--tool PATH] [PART]...

PART is any of these, all of them unless given:
  scipy    N recordings of 1 s (default 10000; 200 distinct contents, hard-linked) through
           the program and through scipy_job.py in alternating rounds (default 1), for 1 and
           2 jobs. The ratio is that of the best wall times, that of the processors' times
           stands beside it: it hardly changes with what else the machine does.
  lengths  the same with every recording of a length of its own, from 0.95 to 1.05 s.
  number   recordings of 16 frames, which cost next to nothing to filter and are not
           measured: an eighth, a quarter, half and all of --tiny (default 100000). The time
           a recording must not grow; peak memory and what of it each further one takes.
  again    the same command over the finished folder, and sha256sum over the same inputs and
           outputs with as many processes, in turn. No output may be written again.

DIR is where recordings and outputs go (default: the system's temporary folder). On a disk,
making and deleting so many files is what is measured for the most part; in a folder in
memory (/dev/shm on Linux) it is the program. Needs 2 GB there by default.
Build first: cargo build --release
"""
import argparse
import os
import resource
import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import timing

JOBS = (1, 2)
RATE_HZ = 48000
DISTINCT = 200
SHORT = timing.HERE / "short.toml"
HEADER_BYTES = 44


def place(folder, index):
    """Where recording `index` goes: a thousand a folder."""
    below = folder / f"{index // 1000:03}"
    below.mkdir(parents=True, exist_ok=True)
    return below / f"recording-{index:06}.wav"


def link_recordings(distinct, folder, count):
    sources = sorted(distinct.glob("*.wav"))
    for index in range(count):
        os.link(sources[index % len(sources)], place(folder, index))


def cut(whole, frames):
    """The first frames of a plain recording with 16 bits and one channel."""
    size = 2 * frames
    samples = whole[HEADER_BYTES : HEADER_BYTES + size]
    assert len(samples) == size, f"{len(whole)} bytes hold no {frames} frames"
    head = bytearray(whole[:HEADER_BYTES])
    head[4:8] = (HEADER_BYTES - 8 + size).to_bytes(4, "little")
    head[40:44] = size.to_bytes(4, "little")
    return bytes(head) + samples


def write_different_lengths(distinct, folder, count):
    sources = [path.read_bytes() for path in sorted(distinct.glob("*.wav"))]
    for index in range(count):
        frames = round(RATE_HZ * (0.95 + 0.1 * index / count))
        place(folder, index).write_bytes(cut(sources[index % len(sources)], frames))


def write_tiny(distinct, folder, count):
    sources = [cut(path.read_bytes(), 16) for path in sorted(distinct.glob("*.wav"))]
    for index in range(count):
        place(folder, index).write_bytes(sources[index % len(sources)])


def processors_s():
    """User and system time of all children so far."""
    usage = resource.getrusage(resource.RUSAGE_CHILDREN)
    return usage.ru_utime + usage.ru_stime


def timed(work):
    cpu, started = processors_s(), time.perf_counter()
    work()
    return time.perf_counter() - started, processors_s() - cpu


def run_scipy(source, target, jobs):
    shutil.rmtree(target, ignore_errors=True)
    target.mkdir()
    # Some of its bands of 1 Hz hold no bin in recordings shorter than 1 s: it warns and goes on.
    environment = os.environ | {"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "PYTHONWARNINGS": "ignore"}
    command = [sys.executable, timing.HERE / "scipy_job.py", source, target, str(jobs)]
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, env=environment)
    shutil.rmtree(target)


def compare(name, source, folder, options):
    print(f"{name}, best of {options.rounds} alternating rounds")
    print("jobs   SciPy s  program s  ratio  ratio of processor time  program ms a recording", flush=True)
    for jobs in JOBS:
        theirs, ours = [], []
        for _ in range(options.rounds):
            theirs.append(timed(lambda: run_scipy(source, folder / "scipy", jobs)))
            ours.append(timed(lambda: timing.run_tool(source, folder / "out", jobs, options.tool, SHORT)))
        (a, a_cpu), (b, b_cpu) = (tuple(map(min, zip(*times))) for times in (theirs, ours))
        print(f"{jobs:4} {a:9.2f} {b:10.2f} {a / b:6.2f} {a_cpu / b_cpu:24.2f} {b * 1e3 / options.files:23.3f}", flush=True)


def by_number(distinct, folder, options):
    print("recordings of 16 frames, 2 jobs, best of 2")
    print("recordings  seconds  us a recording  processor us a recording  peak MiB  bytes a recording more", flush=True)
    before = None
    for part in (8, 4, 2, 1):
        count = options.tiny // part
        source = folder / f"tiny-{part}"
        write_tiny(distinct, source, count)
        memory = []

        def run():
            memory.append(timing.run_tool(source, folder / "out", 2, options.tool, SHORT)[1])

        seconds, cpu = map(min, zip(*(timed(run) for _ in range(2))))
        peak = max(memory)
        more = f"{(peak - before[1]) * 2**20 / (count - before[0]):22.0f}" if before else f"{'-':>22}"
        print(f"{count:10} {seconds:8.2f} {seconds * 1e6 / count:15.1f} {cpu * 1e6 / count:25.1f} {peak:9.1f} {more}", flush=True)
        before = count, peak
        shutil.rmtree(source)
    shutil.rmtree(folder / "out")


def run_again(command):
    status = subprocess.run(command).returncode
    # 1 says that some band was missed.
    if status not in (0, 1):
        sys.exit(f"the second run ended with status {status}")


def again(source, folder, options):
    target = folder / "out"
    timing.run_tool(source, target, max(JOBS), options.tool, SHORT)
    identities = {path: path.stat().st_ino for path in target.rglob("*.wav")}
    print(f"{options.files} recordings of 1 s once more, best of 3 alternating rounds")
    print("jobs  sha256sum s  program s  program processor s  sha256sum processor s", flush=True)
    for jobs in JOBS:
        hashing = f"find '{source}' '{target}' -name '*.wav' -print0 | xargs -0 -n 500 -P {jobs} sha256sum"
        command = [options.tool, "filter", SHORT, source, target, "--jobs", str(jobs), "--quiet"]
        theirs, ours = [], []
        for _ in range(3):
            theirs.append(timed(lambda: subprocess.run(hashing, shell=True, check=True, stdout=subprocess.DEVNULL)))
            ours.append(timed(lambda: run_again(command)))
        (a, a_cpu), (b, b_cpu) = (tuple(map(min, zip(*times))) for times in (theirs, ours))
        print(f"{jobs:4} {a:12.2f} {b:10.2f} {b_cpu:20.2f} {a_cpu:22.2f}", flush=True)
        if identities != {path: path.stat().st_ino for path in target.rglob("*.wav")}:
            sys.exit("outputs were written again")
    shutil.rmtree(target)


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--files", type=int, default=10_000)
    parser.add_argument("--rounds", type=int, default=1)
    parser.add_argument("--tiny", type=int, default=100_000)
    parser.add_argument("--folder", type=Path)
    parser.add_argument("--tool", type=Path, default=timing.TOOL)
    parser.add_argument("parts", nargs="*", metavar="PART", default=[])
    options = parser.parse_args()
    parts = options.parts or ["scipy", "lengths", "number", "again"]
    with tempfile.TemporaryDirectory(dir=options.folder) as folder:
        folder = Path(folder)
        distinct = folder / "distinct"
        timing.make_recordings(distinct, min(DISTINCT, options.files), 1.05)
        whole = folder / "whole"
        whole.mkdir()
        for path in distinct.glob("*.wav"):
            (whole / path.name).write_bytes(cut(path.read_bytes(), RATE_HZ))
        source = folder / "in"
        if {"scipy", "again"} & set(parts):
            link_recordings(whole, source, options.files)
        if "scipy" in parts:
            compare(f"{options.files} recordings of 1 s", source, folder, options)
        if "again" in parts:
            again(source, folder, options)
        shutil.rmtree(source, ignore_errors=True)
        if "lengths" in parts:
            write_different_lengths(distinct, source, options.files)
            compare(f"{options.files} recordings, each of a length of its own", source, folder, options)
            shutil.rmtree(source)
        if "number" in parts:
            by_number(distinct, folder, options)


if __name__ == "__main__":
    main()
