"""Figures of bands from spectra by SciPy and floors by direct double sums, for
tests/evidence/reference.rs (numpy 2.4.6, scipy 1.17.1). Writes evidence_figures.csv.

Nothing is shared with the tool but the definitions: one-sided power spectra of a
periodic 4-term Blackman-Harris window, 0 dBFS a mean square of 0.5; leakage from every
bin outside the band by the window's kernel averaged over one bin, side lobes (from 5
bins on) twice, mirror images included, to 64 bins; beyond, 2 * (6e-5/(2 d))^2 over the
mean of w^2.
"""

import csv
from pathlib import Path

import numpy as np
from scipy import optimize, signal

RATE, LENGTH, FRAMES = 8000, 8000, 28000
ROUNDING_BEFORE, ROUNDING_AFTER = 1e-11, 3e-11
A = [0.35875, 0.48829, 0.14128, 0.01168]  # Harris 1978


def recording():
    state, noise = 12345, np.empty(FRAMES)
    for n in range(FRAMES):
        state = (1664525 * state + 1013904223) % 2**32  # Numerical Recipes' quick LCG
        noise[n] = state / 2**31 - 1.0
    t = np.arange(FRAMES) / RATE
    x = 0.1 * np.sin(2 * np.pi * 443.3 * t) + 0.25 * np.sin(2 * np.pi * 1200.5 * t) + 0.001 * noise + 0.05
    c, q = -2 * np.cos(2 * np.pi * 443.0 / RATE), np.tan(np.pi * 6.0 / RATE)
    g = 1 / (1 + q)
    return x, signal.lfilter([g, g * c, g], [1.0, g * c, 2 * g - 1], x)


def transform(d):
    d = np.asarray(d, float)
    return A[0] * np.sinc(d) + sum(0.5 * A[m] * (np.sinc(d - m) + np.sinc(d + m)) for m in (1, 2, 3))


FINE = (np.arange(4000) + 0.5) / 4000 - 0.5
MEAN_SQUARE = A[0] ** 2 + (A[1] ** 2 + A[2] ** 2 + A[3] ** 2) / 2
KERNEL = np.array([np.mean(transform(k + FINE) ** 2) / MEAN_SQUARE for k in range(65)])
KERNEL[5:] *= 2


def share(distance):
    distance = np.abs(distance)
    far = 2 * (6e-5 / (2 * np.maximum(distance, 1))) ** 2 / MEAN_SQUARE
    return np.where(distance <= 64, KERNEL[np.minimum(distance, 64)], far)


def floor(spectrum, band, rounding, both):
    half = len(spectrum) - 1
    own = np.zeros(half + 1, bool)
    own[band] = True
    source = np.where(own, 0.0, spectrum)
    targets = np.arange(half + 1)[band]
    leakage = 0.0
    for j, power in enumerate(source):
        once = 2.0 if j in (0, half) else 1.0
        leakage += once * power * share(targets - j).sum()
        for image in (-j, 2 * half - j):
            if j not in (0, half):
                near = np.abs(targets - image) <= 64  # beyond, the factor 2 is for them
                leakage += power * share(targets - image)[near].sum()
    return rounding * len(targets) / half + leakage + 1e-28 * both


def main():
    x, y = recording()
    n = np.arange(LENGTH)
    w = sum((-1) ** m * A[m] * np.cos(2 * np.pi * m * n / LENGTH) for m in range(4))
    options = dict(fs=RATE, window=w, nperseg=LENGTH, noverlap=LENGTH // 2, detrend=False, scaling="density")
    step = RATE / LENGTH
    sxx, syy = (signal.welch(v, **options)[1] * step for v in (x, y))
    sxy = signal.csd(x, y, **options)[1] * step
    segments = (FRAMES - LENGTH) // (LENGTH // 2) + 1
    db = lambda power: 10 * np.log10(power)
    rows = []
    for low, high in ((430, 456), (440, 446), (1150, 1190), (1150, 1165), (300, 319), (600, 617), (3980, 3999), (9, 25)):
        band = slice(low, high)
        both = sxx.sum() + syy.sum()
        b, a = sxx[band].sum(), syy[band].sum()
        fb = min(floor(sxx, band, ROUNDING_BEFORE, both), b)
        fa = min(floor(syy, band, ROUNDING_AFTER, both), a)
        k = np.arange(low, high)
        turned = lambda t: -np.abs((sxy[band] * np.exp(1j * t * (k - k.mean()))).sum())
        grid = np.linspace(-np.pi, np.pi, 4001)
        start = grid[np.argmin([turned(t) for t in grid])]
        best = -optimize.minimize_scalar(turned, bounds=(start - 2e-3, start + 2e-3), method="bounded", options={"xatol": 1e-12}).fun
        coherence = min(best**2 / (b * a), 1.0)
        count = segments * (high - low) / (np.mean(w**4) / np.mean(w**2) ** 2)
        error = 20 / np.log(10) * np.sqrt((1 - coherence) / (2 * coherence * count))
        levels = [db(2 * v) for v in (b, fb, a, fa)]
        rows.append([low, high, *levels, 2 * db(best / b), error])
    with open(Path(__file__).with_suffix(".csv"), "w", newline="") as file:
        out = csv.writer(file, lineterminator="\n")
        out.writerow("from_hz to_hz before before_floor after after_floor gain error".split())
        out.writerows([row[:2] + [f"{v:.6f}" for v in row[2:]] for row in rows])


if __name__ == "__main__":
    main()
