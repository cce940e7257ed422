"""Writes equalizer_exact.json: gains of peaks and shelves in 50 digits.

Formulas of the W3C Working Group Note "Audio EQ Cookbook" (8 June 2021; from memory). floor_db is
what it costs to round each exact coefficient to the nearest 64-bit float, the largest of the
case's frequencies: what no design in such coefficients can be expected to do better than by
luck.

Last run with Python 3.11.7 and mpmath 1.3.0.
"""
import json
import pathlib

from mpmath import mp, mpf

mp.dps = 50


def coefficients(kind, rate, hz, gain_db, q, slope):
    amplitude = mpf(10) ** (mpf(gain_db) / 40)
    w = 2 * mp.pi * mpf(hz) / rate
    cos = mp.cos(w)
    if slope is None:
        alpha = mp.sin(w) / (2 * mpf(q))
    else:
        alpha = mp.sin(w) / 2 * mp.sqrt((amplitude + 1 / amplitude) * (1 / mpf(slope) - 1) + 2)
    if kind == "peak":
        b = [1 + alpha * amplitude, -2 * cos, 1 - alpha * amplitude]
        a = [1 + alpha / amplitude, -2 * cos, 1 - alpha / amplitude]
    else:
        sign = 1 if kind == "lowshelf" else -1
        plus, minus, root = amplitude + 1, amplitude - 1, 2 * mp.sqrt(amplitude) * alpha
        b = [amplitude * (plus - sign * minus * cos + root),
             sign * 2 * amplitude * (minus - sign * plus * cos),
             amplitude * (plus - sign * minus * cos - root)]
        a = [plus + sign * minus * cos + root,
             sign * -2 * (minus + sign * plus * cos),
             plus + sign * minus * cos - root]
    return [x / a[0] for x in b], [x / a[0] for x in a]


def gain(b, a, hz, rate):
    z = mp.expj(-2 * mp.pi * mpf(hz) / rate)
    value = lambda p: p[0] + z * (p[1] + z * p[2])
    return 20 * mp.log10(abs(value(b) / value(a)))


cases = []
for rate, centers in ((384000, (20.0, 997.0)), (48000, (20.0, 1000.0, 11000.0, 23900.0)), (44100, (12000.5,))):
    for hz in centers:
        for gain_db in (-24.0, -3.0, 0.5, 12.0):
            shapes = [("peak", q, None) for q in (0.5, 4.0, 60.0)]
            shapes += [(kind, 0.7, None) for kind in ("lowshelf", "highshelf")]
            shapes += [(kind, None, 0.4) for kind in ("lowshelf", "highshelf")]
            for kind, q, slope in shapes:
                b, a = coefficients(kind, rate, hz, gain_db, q, slope)
                width = hz / (q or 0.7)
                places = sorted(f for f in {hz / 4, hz - width / 2, hz - width / 6, hz, hz + width / 6, hz + width / 2,
                                            hz * 3} if 0 < f < rate / 2)
                exact = [gain(b, a, f, rate) for f in places]
                rounded = [[mpf(float(x)) for x in p] for p in (b, a)]
                floor = max(abs(gain(*rounded, f, rate) - g) for f, g in zip(places, exact))
                cases.append({"kind": kind, "rate_hz": rate, "hz": hz, "gain_db": gain_db, "q": q, "slope": slope,
                              "places_hz": places, "gains_db": [float(g) for g in exact], "floor_db": float(floor)})
path = pathlib.Path(__file__).with_suffix(".json")
text = ",\n".join(json.dumps(case) for case in cases)
path.write_text("[\n" + text + "\n]\n", encoding="utf-8")
