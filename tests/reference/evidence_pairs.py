"""A pair made by SciPy and its figures, for tests/evidence/pair_reference.rs (numpy 2.4.6,
scipy 1.17.1). Writes evidence_pairs.bin (16-bit samples, little-endian, before and after
in turn) and evidence_pairs.csv.

The excitation is noise; the device a low-pass of second order with a stop of 40 dB
between 1450 and 1750 Hz, a delay of
7.3 frames (7 of them taken out, as an alignment would) and white noise of its own at
-62 dBFS. What is not coherent comes from scipy.signal.coherence, gains from
scipy.signal.csd turned by their best delay; rounding and leakage from the direct double
sums of evidence_figures.py. The last columns are the truth: the response at the band's
center and the noise of the device in the band.
"""

import csv
from pathlib import Path

import numpy as np
from evidence_figures import A, floor
from scipy import optimize, signal

RATE, LENGTH, FRAMES, DELAY = 4000, 2000, 24000, 7.3
NOISE_DBFS = -62.0
BANDS = ((200, 238), (300, 320), (640, 678), (900, 922), (1540, 1660), (1560, 1600), (300, 1300))


def pair():
    rng = np.random.default_rng(20)
    padded = FRAMES + 1000
    x = np.round(32768 * 0.1 * rng.standard_normal(padded)) / 32768
    low = signal.butter(2, 1200, fs=RATE, output="sos")
    stop = signal.cheby2(4, 40, (1450, 1750), "bandstop", fs=RATE, output="sos")
    sos = np.vstack([low, stop])
    y = signal.sosfilt(sos, x)
    turn = np.exp(-2j * np.pi * np.fft.rfftfreq(padded) * DELAY)
    y = np.fft.irfft(np.fft.rfft(y) * turn, padded)
    y += np.sqrt(0.5 * 10 ** (NOISE_DBFS / 10)) * rng.standard_normal(padded)
    y = np.round(32768 * y) / 32768
    start = 500
    return x[start : start + FRAMES], y[start + 7 : start + 7 + FRAMES], sos


def main():
    x, y, sos = pair()
    here = Path(__file__)
    (32768 * np.stack([x, y], axis=1)).astype("<i2").tofile(here.with_suffix(".bin"))
    n = np.arange(LENGTH)
    w = sum((-1) ** m * A[m] * np.cos(2 * np.pi * m * n / LENGTH) for m in range(4))
    options = dict(fs=RATE, window=w, nperseg=LENGTH, noverlap=LENGTH // 2, detrend=False)
    step = RATE / LENGTH
    sxx, syy = (signal.welch(v, **options)[1] * step for v in (x, y))
    sxy = signal.csd(x, y, **options)[1] * step
    g2 = signal.coherence(x, y, **options)[1]
    segments = (FRAMES - LENGTH) // (LENGTH // 2) + 1
    rounding = 2.0**-30 / 12
    db = lambda power: 10 * np.log10(power)
    rows = []
    for low_hz, high_hz in BANDS:
        low, high = int(low_hz / step), int(high_hz / step)
        band = slice(low, high)
        both = sxx.sum() + syy.sum()
        level = syy[band].sum()
        incoherent = (syy * (1 - g2))[band].sum() * segments / (segments - 1)
        bare = floor(syy, band, rounding, both)
        own = rounding * (high - low) / (LENGTH // 2) + 1e-28 * both
        after_floor = min(bare + max(incoherent - own, 0), level)
        k = np.arange(low, high)
        turned = lambda t: -np.abs((sxy[band] * np.exp(1j * t * (k - k.mean()))).sum())
        grid = np.linspace(-np.pi, np.pi, 40001)
        start = grid[np.argmin([turned(t) for t in grid])]
        best = -optimize.minimize_scalar(turned, bounds=(start - 2e-4, start + 2e-4), method="bounded", options={"xatol": 1e-12}).fun
        together = min(best**2 / (sxx[band].sum() * level), 1.0)
        count = segments * (high - low) / (np.mean(w**4) / np.mean(w**2) ** 2)
        error = 20 / np.log(10) * np.sqrt((1 - together) / (2 * together * count))
        gain = 2 * db(best / sxx[band].sum())
        _, h = signal.sosfreqz(sos, [(low_hz + high_hz) / 2], fs=RATE)
        noise = NOISE_DBFS + db((high - low) / (LENGTH // 2))
        rows.append([low_hz, high_hz, db(2 * level), db(2 * after_floor), gain, error, 2 * db(abs(h[0])), noise])
    with open(here.with_suffix(".csv"), "w", newline="") as file:
        out = csv.writer(file, lineterminator="\n")
        out.writerow("from_hz to_hz after after_floor gain error true_gain true_noise".split())
        out.writerows([row[:2] + [f"{v:.6f}" for v in row[2:]] for row in rows])


if __name__ == "__main__":
    main()
