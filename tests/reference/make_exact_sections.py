"""Writes exact_sections.txt: exact coefficients for the statement that finished sections
are as near the exact response as rounding allows.

One line a filter: family kind order ripple_db stop_db rate_hz edges_hz | a1,a2 of pole
pairs | a1 of single poles | b1 of zero pairs | gain and what f64 drops of it. `-` for
what does not apply; coefficients times 2^80, in hexadecimal. exact_sections.py says what
they are. The filters are those of exact_filters.txt, and bands 1 % and 0.1 % wide.
"""

import os
import sys

import mpmath as mp

from exact_sections import coefficients

HERE = os.path.dirname(os.path.abspath(__file__))

FIGURES = {
    "butterworth": [(None, None)],
    "bessel": [(None, None)],
    "chebyshev1": [(0.1, None), (1.0, None), (0.01, None)],
    "chebyshev2": [(None, 40.0), (None, 80.0), (None, 20.0)],
    "elliptic": [(0.1, 60.0), (1.0, 40.0), (0.01, 100.0), (3.0, 20.0)],
}


def heads():
    with open(os.path.join(HERE, "exact_filters.txt")) as file:
        yield from (line.split("|")[0].strip() for line in file if not line.startswith("#"))
    show = lambda v: "-" if v is None else f"{v:g}"
    for family, figures in FIGURES.items():
        for kind in ("bandpass", "bandstop"):
            count = 0
            for order in (1, 2, 5, 8, 14, 20):
                if family == "elliptic" and order > 14:
                    continue
                for rate in (8000.0, 48000.0, 384000.0):
                    middle, high = round((20.0 * 0.45 * rate) ** 0.5, 1), 0.45 * rate
                    for ratio in (1.001, 1.01):
                        for e in ((20.0, 20.0 * ratio), (middle, middle * ratio), (high / ratio, high)):
                            ripple, stop = figures[count % len(figures)]
                            count += 1
                            yield f"{family} {kind} {order} {show(ripple)} {show(stop)} {rate:g} {e[0]:.9g},{e[1]:.9g}"
    yield "elliptic lowpass 14 3 20 48000 20"


def line(head):
    family, kind, order, ripple, stop, rate, edges = head.split()
    figure = lambda text: None if text == "-" else float(text)
    edges_hz = [float(edge) for edge in edges.split(",")]
    double, first, zeros, gain = coefficients(family, kind, int(order), figure(ripple), figure(stop), float(rate), edges_hz)
    scaled = lambda x: f"{int(mp.nint(x * mp.mpf(2) ** 80)):x}"
    if zeros and max(zeros) - min(zeros) < mp.mpf(10) ** -50:
        zeros = zeros[:1]  # all the same
    parts = [
        " ".join(f"{scaled(a1)},{scaled(a2)}" for a1, a2 in double) or "-",
        " ".join(map(scaled, first)) or "-",
        " ".join(map(scaled, zeros)) or "-",
        f"{float(gain)!r} {float(gain - mp.mpf(float(gain))):.5g}",
    ]
    return " | ".join([head, *parts])


if __name__ == "__main__":
    with open(os.path.join(HERE, "exact_sections.txt"), "w") as file:
        file.write("# Written by make_exact_sections.py (mpmath 1.3.0), which states what the columns are.\n")
        for head in heads():
            file.write(line(head) + "\n")
