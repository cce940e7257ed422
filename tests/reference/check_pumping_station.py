"""Outside figures for the design check of the pumping station's cascade at 48 kHz.

A Butterworth high-pass of order 4 at 40 Hz and eight elliptic stops of order 3,
3.2 Hz wide, at 50 to 400 Hz (ripple 0.1 dB, stop 40 dB), designed by SciPy and
evaluated from its poles and zeros, not from its sections; times from the simulated
impulse response and its FFT.

Made with numpy 2.4.6, scipy 1.17.1:  python3 check_pumping_station.py > check_pumping_station.json
"""

import json

import numpy as np
from scipy import optimize, signal

RATE = 48000
zpk = [signal.butter(4, 40, "highpass", fs=RATE, output="zpk")]
zpk += [signal.ellip(3, 0.1, 40, [50 * k - 1.6, 50 * k + 1.6], "bandstop", fs=RATE, output="zpk") for k in range(1, 9)]
sos = np.vstack([signal.zpk2sos(*part) for part in zpk])
z = np.concatenate([part[0] for part in zpk])
p = np.concatenate([part[1] for part in zpk])
gain = np.prod([part[2] for part in zpk])


def db(f):
    w = np.exp(2j * np.pi * np.atleast_1d(f) / RATE)[:, None]
    with np.errstate(divide="ignore"):
        d = np.log10(gain) + np.sum(np.log10(np.abs(w - z)), 1) - np.sum(np.log10(np.abs(w - p)), 1)
    return 20 * d


def crossing(a, b, level):
    return optimize.brentq(lambda f: db(f)[0] - level, a, b, xtol=1e-12)


impulse = np.zeros(8 * RATE)
impulse[0] = 1
h = signal.sosfilt(sos, impulse)
n = np.arange(len(h))

# Height of the tail: the largest magnitude of its spectrum, finely padded.
def height(frame):
    return np.abs(np.fft.rfft(h[frame + 1 :], 1 << 20)).max()


# It falls with small rises in between, so look for the last frame above the limit.
limit = 10 ** (-50 / 20)
coarse = max(frame for frame in range(2 * RATE, 5 * RATE // 2, 50) if height(frame) > limit)
settling = 1 + max(frame for frame in range(coarse, coarse + 50) if height(frame) > limit)

bands = []
for k in range(1, 9):
    f = np.linspace(50 * k - 0.5, 50 * k + 0.5, 200001)
    g = db(f)
    tone = np.exp(2j * np.pi * 50 * k / RATE * n)
    y = tone * np.cumsum(h / tone) + (0 - np.cumsum(h))
    bands.append({
        "attenuation_min_db": -g.max(),
        "reaches_hz": [crossing(50 * k - 1.2, 50 * k - 0.2, -30), crossing(50 * k + 0.2, 50 * k + 1.2, -30)],
        # The first stop lies below the keep band.
        "excepted_hz": None if k == 1 else [
            crossing(50 * k - 2.5, 50 * k - 1, -0.5),
            crossing(50 * k + 1, 50 * k + 2.5, -0.5),
        ],
        "startup_frames": int(np.nonzero(np.abs(y) > 10 ** (-30 / 20))[0][-1] + 1),
    })

f = np.linspace(90, 6000, 2000001)
for band in bands[1:]:
    f = f[(f < band["excepted_hz"][0]) | (f > band["excepted_hz"][1])]
at = np.exp(2j * np.pi * 3045 / RATE)
print(json.dumps({
    "sections": [{"b": list(row[:3]), "a": list(row[3:])} for row in sos],
    "settling_frames_50_db": settling,
    "bands": bands,
    "keep_attenuation_min_db": float(-db(f).max()),
    "group_delay_3045_hz_s": float((np.sum((at / (at - p)).real) - np.sum((at / (at - z)).real)) / RATE),
}, indent=1))
