#!/usr/bin/env python3
"""Writes a folder of recordings to time with: hum and its harmonics over colored noise.

usage: recordings.py FOLDER COUNT SECONDS

COUNT mono files at 48 kHz, 16 bit, SECONDS long, from fixed seeds: the same bytes
every time. Written minute by minute, so that hours need no memory.
Needs numpy and scipy (last run with numpy 2.4.6, scipy 1.17.1).
"""
import sys
import wave
from pathlib import Path

import numpy as np
from scipy.signal import lfilter

RATE_HZ = 48000
HUM_HZ = 50.01
MINUTE = 60 * RATE_HZ
NOISE_POLE = 0.95


def minutes(seed, frames):
    """Yields the samples of one recording, a minute at a time."""
    generator = np.random.default_rng([20310502, seed])
    memory = np.zeros(1)
    for start in range(0, frames, MINUTE):
        frame = np.arange(start, min(frames, start + MINUTE))
        white = generator.normal(0, 0.01, frame.size)
        samples, memory = lfilter([1.0], [1.0, -NOISE_POLE], white, zi=memory)
        for line in range(1, 9):
            phase = HUM_HZ * line / RATE_HZ * frame % 1.0
            samples += 0.03 / line * np.sin(2 * np.pi * phase + 0.7 * seed + line)
        yield samples


def write(path, seed, seconds):
    with wave.open(str(path), "wb") as file:
        file.setnchannels(1)
        file.setsampwidth(2)
        file.setframerate(RATE_HZ)
        for samples in minutes(seed, round(seconds * RATE_HZ)):
            integers = np.round(samples * 2**15).clip(-(2**15), 2**15 - 1)
            file.writeframesraw(integers.astype("<i2").tobytes())


def main():
    folder, count, seconds = Path(sys.argv[1]), int(sys.argv[2]), float(sys.argv[3])
    folder.mkdir(parents=True, exist_ok=True)
    for seed in range(count):
        write(folder / f"recording-{seed:02}.wav", seed, seconds)


if __name__ == "__main__":
    main()
