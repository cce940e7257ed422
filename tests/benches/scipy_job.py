#!/usr/bin/env python3
"""The job of speed.toml, as it is scripted on SciPy: what the program is timed against.

usage: scipy_job.py IN OUT JOBS [SEGMENT_FRAMES]

Filters every WAV file below IN with the stages of speed.toml, writes it below OUT,
estimates the spectra before and after and the cross-spectrum by Welch's method
(4-term Blackman-Harris window, half overlap, segments of 524288 frames unless given),
and writes attenuation and gain of the bands to OUT/bands.json. It does less than the
program: no dither, no metadata, no hashes, no floors, no verdicts.
Prints the seconds the work took, without the start of the interpreter.
Needs numpy and scipy (last run with numpy 2.4.6, scipy 1.17.1).
"""
import functools
import json
import multiprocessing
import os
import sys
import time
from pathlib import Path

import numpy as np
from scipy import signal
from scipy.io import wavfile

HUM_BANDS = {f"hum x{line}": (50 * line - 0.5, 50 * line + 0.5) for line in range(1, 9)}
ALL_BANDS = HUM_BANDS | {"calls": (2000, 6000)}


def sections(rate_hz):
    """High-pass of order 4 at 90 Hz and 2 Hz wide notches at 50, 100, ... 400 Hz."""
    parts = [signal.butter(4, 90, btype="highpass", output="sos", fs=rate_hz)]
    for line_hz in range(50, 401, 50):
        numerator, denominator = signal.iirnotch(line_hz, line_hz / 2, fs=rate_hz)
        parts.append(np.concatenate([numerator, denominator])[np.newaxis])
    return np.concatenate(parts)


def band_figures(before, after, rate_hz, segment_frames):
    """Attenuation and gain of each band of one channel."""
    settings = dict(
        fs=rate_hz, window="blackmanharris", nperseg=min(segment_frames, before.size), detrend=False
    )
    frequencies, sxx = signal.welch(before, **settings)
    _, syy = signal.welch(after, **settings)
    _, sxy = signal.csd(before, after, **settings)
    figures = {}
    for name, (from_hz, to_hz) in ALL_BANDS.items():
        bins = slice(*np.searchsorted(frequencies, [from_hz, to_hz]))
        power = sxx[bins].sum()
        figures[name] = {
            "attenuation_db": float(10 * np.log10(power / syy[bins].sum())),
            "gain": float(np.abs(sxy[bins].sum()) / power),
        }
    return figures


def filter_one(path, source, target, segment_frames):
    rate_hz, integers = wavfile.read(source / path)
    before = integers.reshape(integers.shape[0], -1) / 2**15
    after = signal.sosfilt(sections(rate_hz), before, axis=0)
    written = np.clip(np.rint(after * 2**15), -(2**15), 2**15 - 1).astype(np.int16)
    (target / path).parent.mkdir(parents=True, exist_ok=True)
    wavfile.write(target / path, rate_hz, written)
    as_written = written / 2**15
    channels = range(before.shape[1])
    return [band_figures(before[:, c], as_written[:, c], rate_hz, segment_frames) for c in channels]


def main():
    source, target, jobs = Path(sys.argv[1]), Path(sys.argv[2]), int(sys.argv[3])
    segment_frames = int(sys.argv[4]) if len(sys.argv) > 4 else 524288
    started = time.perf_counter()
    paths = sorted(p.relative_to(source) for p in source.rglob("*.wav"))
    work = functools.partial(filter_one, source=source, target=target, segment_frames=segment_frames)
    if jobs > 1:
        with multiprocessing.Pool(jobs) as pool:
            results = pool.map(work, paths, chunksize=1)
    else:
        results = list(map(work, paths))
    report = {os.fspath(path): result for path, result in zip(paths, results)}
    (target / "bands.json").write_text(json.dumps(report, indent=1))
    print(f"{time.perf_counter() - started:.3f}")


if __name__ == "__main__":
    main()
