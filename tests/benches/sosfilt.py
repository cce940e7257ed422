#!/usr/bin/env python3
"""Times the cascade against scipy.signal.sosfilt, in turn, in one run.

usage: sosfilt.py [ROUNDS]

Both filter white-like float64 samples in memory through the same notches, for each
of the cases below. Each figure is the best of ROUNDS (default 12) alternating
repeats, as other work on the machine can only make a repeat slower.
Needs numpy and scipy (last run with numpy 2.4.6, scipy 1.17.1).
"""
import json
import os
import subprocess
import sys
import time
from pathlib import Path

# Settings for a linear-algebra library that sosfilt does not use, kept out of its run.
for name in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"):
    os.environ.pop(name, None)

import numpy as np
import scipy
from scipy.signal import sosfilt

PROJECT = Path(__file__).resolve().parents[2]
FRAMES = 16384 * 30
# (sections, channels, ratio to reach)
CASES = [(8, 1, 1.6), (16, 1, 2.2), (16, 2, 3.0), (1, 1, None), (4, 1, None), (10, 1, None), (10, 2, None), (32, 2, None)]


def build():
    """Builds the timing program and returns its path."""
    command = ["cargo", "bench", "--bench", "kernel_speed", "--no-run", "--message-format=json"]
    lines = subprocess.run(command, cwd=PROJECT, check=True, stdout=subprocess.PIPE, text=True).stdout.splitlines()
    for message in map(json.loads, lines):
        if message.get("target", {}).get("name") == "kernel_speed" and message.get("executable"):
            return message["executable"]
    sys.exit("cargo named no executable for the bench kernel_speed")


def notches(count):
    """2 Hz wide notches at 50, 100, ... Hz at 48 kHz."""
    angle = 2 * np.pi * 50 * np.arange(1, count + 1) / 48000
    half_width = np.pi * 2 / 48000
    gain = 1 / (1 + half_width)
    middle = -2 * gain * np.cos(angle)
    flat = np.ones(count)
    return np.column_stack([gain * flat, middle, gain * flat, flat, middle, (1 - half_width) * gain * flat])


def scipy_ns(sections, samples):
    started = time.perf_counter()
    sosfilt(sections, samples, axis=-1)
    return (time.perf_counter() - started) * 1e9 / samples.size


def main():
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 12
    program = build()
    print(f"numpy {np.__version__}, scipy {scipy.__version__}, best of {rounds} alternating repeats, ns a sample")
    print("sections channels  sosfilt  cascade  ratio  wanted")
    for count, channels, wanted in CASES:
        sections = notches(count)
        samples = np.random.default_rng(1).uniform(-1, 1, (channels, FRAMES))
        theirs, ours = [], []
        for _ in range(rounds):
            theirs.append(scipy_ns(sections, samples))
            command = [program, str(count), str(channels), str(FRAMES)]
            ours.append(float(subprocess.run(command, check=True, stdout=subprocess.PIPE, text=True).stdout))
        a, b = min(theirs), min(ours)
        verdict = "" if wanted is None else f"{wanted:6.1f}  {'reached' if a / b >= wanted else 'NOT REACHED'}"
        print(f"{count:8} {channels:8} {a:8.2f} {b:8.2f} {a / b:6.2f} {verdict}")


if __name__ == "__main__":
    main()
