"""How much a sweep disturbs the attenuation measured in narrow bands.

The excitation runs through the sections of filter-specs/reed-bed.toml at 48 kHz; the
attenuation of the eight hum bands (3 Hz wide, edges where the stops are steep and pass sound
on up to a second later) is taken as a measurement takes it, for six seeds of the noise and three
places of the first segment. By design it is 6.6 to 7.3 dB in each. The segments' own noise
is Gaussian here: this is about the sweep. numpy 2.4.6, scipy 1.17.1.

    cargo build && python3 tests/reference/excite_sweep_share.py

Printed on 2026-12-01:
    a quarter at the start, peak -6 dBFS: 2.98 to 10.16 dB, largest deviation of a band 2.78 dB
    a twentieth in the middle, as loud as the noise: 5.33 to 8.40 dB, largest deviation of a band 0.43 dB
    no sweep: 4.93 to 8.15 dB, largest deviation of a band 0.51 dB
"""

import json
import subprocess

import numpy as np
from scipy.signal import sosfilt
from scipy.signal.windows import blackmanharris

RATE, SECONDS, SEGMENT = 48000, 60, 165888
FRAMES = SECONDS * RATE
NOISE_DBFS = -14.76
BANDS = [(50 * line - 1.5, 50 * line + 1.5) for line in range(1, 9)]


def sections():
    command = ["target/debug/bandproof", "design", "filter-specs/reed-bed.toml", "--rate", str(RATE), "--json"]
    design = json.loads(subprocess.check_output(command))["designs"][0]
    return np.array([s["b"] + s["a"] for s in design["sections"]]), int(design["settling_s"] * RATE) + 1


def sweep(seconds, peak, f1=5.0, f2=23520.0):
    t = np.arange(int(seconds * RATE)) / RATE
    log_ratio = np.log(f2 / f1)
    return peak * np.sin(2 * np.pi * (f1 * seconds / log_ratio * np.expm1(t / seconds * log_ratio) % 1))


def pink(frames, seed):
    shaped = np.fft.rfft(np.random.default_rng(seed).standard_normal(frames))
    x = np.fft.irfft(shaped / np.sqrt(np.maximum(np.fft.rfftfreq(frames, 1 / RATE), 5)), frames)
    return x / np.sqrt(np.mean(x**2)) * np.sqrt(0.5 * 10 ** (NOISE_DBFS / 10))


def attenuations(x, y, first):
    window = blackmanharris(SEGMENT, sym=False)
    slack = FRAMES - SEGMENT - first
    starts = np.linspace(first, FRAMES - SEGMENT, int(np.ceil(slack / (SEGMENT / 2))) + 1).astype(int)
    power = lambda z: sum(abs(np.fft.rfft(window * z[s : s + SEGMENT])[:2000]) ** 2 for s in starts)
    before, after = power(x), power(y)
    bins = [slice(*(int(np.ceil(hz * SEGMENT / RATE)) for hz in band)) for band in BANDS]
    return [10 * np.log10(before[k].sum() / after[k].sum()) for k in bins]


sos, settling = sections()
for name, seconds, peak, begins in [
    ("a quarter at the start, peak -6 dBFS", 15.0, 0.5, 0),
    ("a twentieth in the middle, as loud as the noise", 3.0, 10 ** (-15.81 / 20), 20 * RATE),
    ("no sweep", 0.0, 0.0, 0),
]:
    seen = []
    for seed in range(6):
        start = sweep(seconds, peak) if seconds else np.zeros(0)
        x = np.roll(np.concatenate([start, pink(FRAMES - len(start), seed)]), begins)
        y = sosfilt(sos, x)
        seen += [attenuations(x, y, settling + int(later * RATE)) for later in (0.0, 0.8, 1.6)]
    seen = np.array(seen)
    print(f"{name}: {seen.min():.2f} to {seen.max():.2f} dB, largest deviation of a band {seen.std(0).max():.2f} dB")
