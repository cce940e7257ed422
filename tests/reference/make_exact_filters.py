"""Writes exact_filters.txt: exact gains for the statement that finished sections are
within 5e-6 dB of the exact response wherever that is above -120 dB.

One line a filter: family kind order ripple_db stop_db rate_hz edges_hz | frequency:dB ...
(`-` for what does not apply). mpmath 1.4.1, see exact_filters.py.
"""

import os

import mpmath as mp

from exact_filters import gain_db

FIGURES = {
    "butterworth": [(None, None)],
    "bessel": [(None, None)],
    "chebyshev1": [(0.1, None), (1.0, None), (0.01, None)],
    "chebyshev2": [(None, 40.0), (None, 80.0), (None, 20.0)],
    "elliptic": [(0.1, 60.0), (1.0, 40.0), (0.01, 100.0), (3.0, 20.0)],
}
RATES = [8000.0, 48000.0, 384000.0]


def edges(kind, rate):
    """The lowest and the highest edges of the statement, and one between."""
    low, middle, high = 20.0, round((20.0 * 0.45 * rate) ** 0.5, 1), 0.45 * rate
    if kind in ("lowpass", "highpass"):
        return [[low], [middle], [high]]
    # Ten per cent wide, and one octave-spanning band.
    return [[low, 22.1], [middle, round(1.105 * middle, 1)], [round(high / 1.105, 1), high], [round(high / 40, 1), round(high / 3, 1)]]


def frequencies(kind, e, rate):
    """Pass band, edges, skirts."""
    factors = [0.3, 0.82, 0.99, 1.0, 1.01, 1.2, 2.5]
    if len(e) == 1:
        found = [e[0] * f for f in factors]
    else:
        span = e[1] - e[0]
        found = [e[0] - span * f for f in (0.6, 0.02)] + [e[0], e[0] + span / 3, e[0] + span / 2, e[1], e[1] + 0.02 * span, e[1] + 0.7 * span]
    if kind == "bandstop":
        # Close to the zeros in the middle.
        middle = float(mp.atan(mp.sqrt(mp.tan(mp.pi * e[0] / rate) * mp.tan(mp.pi * e[1] / rate))) / mp.pi * rate)
        found += [middle + 1e-5 * span, middle + 1e-3 * span]
    return [float(f"{f:.9g}") for f in found if 0 < f < rate / 2]


def line(family, kind, order, ripple, stop, rate, e):
    points = []
    for f in frequencies(kind, e, rate):
        db = gain_db(family, kind, order, ripple, stop, rate, e, f)
        if db > -120:
            points.append(f"{f:.9g}:{mp.nstr(db, 11)}")
    show = lambda v: "-" if v is None else f"{v:g}"
    place = ",".join(f"{x:.9g}" for x in e)
    return f"{family} {kind} {order} {show(ripple)} {show(stop)} {rate:g} {place} | {' '.join(points)}"


lines = []
for family, figures in FIGURES.items():
    for kind in ("lowpass", "highpass", "bandpass", "bandstop"):
        count = 0
        for order in (1, 2, 5, 8, 14, 20):
            if family == "elliptic" and order > 14:
                continue
            for rate in RATES:
                for e in edges(kind, rate):
                    ripple, stop = figures[count % len(figures)]
                    count += 1
                    lines.append(line(family, kind, order, ripple, stop, rate, e))

# Ripples and moduli near their limits.
EXTREMES = {
    "elliptic": [(1e-6, 200.0), (1e-6, 1e-3), (1e-4, 300.0), (20.0, 200.0), (1e-3, 20.0), (0.01, 3.0)],
    "chebyshev1": [(1e-9, None), (40.0, None)],
    "chebyshev2": [(None, 1e-3), (None, 200.0)],
}
for family, figures in EXTREMES.items():
    for order in (1, 2, 3, 6, 9, 14):
        for ripple, stop in figures:
            if family == "chebyshev2" and stop == 200.0 and order < 3:
                continue  # poles at 5e-8 of the rate: an error
            lines.append(line(family, "lowpass", order, ripple, stop, 48000.0, [5000.0]))

# The two poles a real one splits into meet where the width is 2 W0, a ratio of edges
# of 3 + sqrt(8) at low frequency.
for family in ("butterworth", "bessel"):
    for order in (1, 2, 3, 20):
        for kind in ("bandpass", "bandstop"):
            for high in (580.0, 582.842712, 582.9, 590.0):
                lines.append(line(family, kind, order, None, None, 48000.0, [100.0, high]))

with open(os.path.join(os.path.dirname(__file__), "exact_filters.txt"), "w") as file:
    file.write("# Written by make_exact_filters.py (mpmath 1.4.1, 50 digits), which states what the columns are.\n")
    file.write("\n".join(lines) + "\n")
