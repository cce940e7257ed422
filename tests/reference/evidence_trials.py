"""Figures that comments of src/evidence quote, from trials (numpy 2.4.6, about a minute).

1. leakage: how far a line's leakage into a band exceeds the floor from the window's
   kernel averaged over a bin, side lobes taken once or twice.
2. scatter: how often white noise of known power exceeds its expectation in ten bins, and
   what the rule "B/(A - Fa) < R is missed" would then say of a perfect filter.
3. peaks: how often a peak of white noise stands out like a line.
"""

import numpy as np

A = [0.35875, 0.48829, 0.14128, 0.01168]  # Harris 1978, -92 dB


def transform(d):
    d = np.asarray(d, float)
    return A[0] * np.sinc(d) + sum(0.5 * A[m] * (np.sinc(d - m) + np.sinc(d + m)) for m in (1, 2, 3))


def window(length):
    t = 2 * np.pi * np.arange(length) / length
    return A[0] - A[1] * np.cos(t) + A[2] * np.cos(2 * t) - A[3] * np.cos(3 * t)


def leakage():
    fine = (np.arange(2000) + 0.5) / 2000 - 0.5
    kernel = np.array([np.mean(transform(k + fine) ** 2) for k in range(1001)])
    total = kernel[0] + 2 * kernel[1:].sum()
    ks = np.arange(-400, 401)
    for factor in (1, 2):
        taken = kernel / total
        taken[5:] *= factor
        worst = -np.inf
        for bins in (1, 4, 10, 30):
            for gap in range(1, 60):
                for place in np.linspace(-0.5, 0.5, 21):
                    seen = transform(ks - place) ** 2 / total
                    band = np.arange(gap + 1, gap + 1 + bins)
                    outside = (ks < band[0]) | (ks > band[-1])
                    weights = taken[np.minimum(np.abs(band[:, None] - ks[outside][None, :]), 1000)]
                    floor = (weights * seen[outside][None, :]).sum()
                    worst = max(worst, (transform(band - place) ** 2).sum() / total / floor)
        print(f"leakage: side lobes x{factor}: at most {10 * np.log10(worst):+.2f} dB over the floor")


def averaged(rng, length, segments):
    w = window(length)
    spectra = np.fft.rfft(w * rng.standard_normal((segments, length)), axis=1)
    return np.mean(np.abs(spectra) ** 2, axis=0) / (w**2).sum()


def scatter():
    rng = np.random.default_rng(1)
    for segments in (1, 11):
        sums = [averaged(rng, 2000, segments)[100:800].reshape(-1, 10).sum(1) / 10 for _ in range(1500)]
        ratio = np.concatenate(sums)
        for over_db in (1, 3, 5, 10):
            share = np.mean(ratio - 1 > 10 ** (-over_db / 10))
            print(f"scatter: {segments} segments, {over_db} dB over what can be shown: {share:.4f} missed")
        n = segments * 10 / 2.76
        e = (1 - 1 / (9 * n) + 3.5 / (3 * np.sqrt(n))) ** 3 - 1
        print(f"scatter: {segments} segments: {np.mean(ratio - 1 > e):.5f} above 1 + e = {1 + e:.3f}")


def peaks():
    rng = np.random.default_rng(1)
    for segments in (1, 2, 5):
        hits = tried = 0
        for _ in range(3000 if segments < 5 else 600):
            s = averaged(rng, 1000, segments)
            for low in range(40, 460, 40):
                b = low + np.argmax(s[low : low + 10])
                if s[b] < s[b - 1] or s[b] < s[b + 1]:
                    continue
                around = np.r_[s[b - 12 : b - 4], s[b + 5 : b + 13]].mean()
                tried += 1
                hits += s[b - 1 : b + 2].mean() > around * (1 + 9 / np.sqrt(segments))
        print(f"peaks: {segments} segments: {hits} of {tried} stand out")


if __name__ == "__main__":
    leakage()
    scatter()
    peaks()
