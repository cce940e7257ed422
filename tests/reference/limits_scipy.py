"""Writes limits_scipy.csv: the orders that SciPy's buttord, cheb1ord, cheb2ord and ellipord
find for limits of digital filters.

The last rows are limits that an order just meets: the stop edge is where the prototype of
that order, by its closed form in mpmath, has the stop attenuation. There SciPy's own
rounding decides between two orders, and `met` says which one meets them; it is empty in
the other rows. scipy 1.17.1, numpy 2.4.6, mpmath 1.4.1.
"""

import csv
import os

import mpmath as mp
import scipy
from scipy import signal

assert scipy.__version__ == "1.17.1"
mp.mp.dps = 40

ORDER = {
    "butterworth": signal.buttord,
    "chebyshev1": signal.cheb1ord,
    "chebyshev2": signal.cheb2ord,
    "elliptic": signal.ellipord,
}
RIPPLES = [0.01, 0.2, 1.0, 3.0]
STOPS = [20.0, 45.0, 70.0, 100.0]
# (rate, edges, stop edges)
EDGES = {
    "lowpass": [
        (8000.0, [1000.0], [1500.0]),
        (48000.0, [3000.0], [3300.0]),
        (384000.0, [500.0], [2200.0]),
        (44100.0, [15000.0], [21000.0]),
    ],
    "highpass": [
        (8000.0, [3000.0], [2000.0]),
        (48000.0, [40.0], [17.0]),
        (384000.0, [20000.0], [18000.0]),
        (96000.0, [300.0], [60.0]),
    ],
    "bandpass": [
        (8000.0, [900.0, 1100.0], [800.0, 1300.0]),
        (48000.0, [140.0, 180.0], [50.0, 200.0]),
        (384000.0, [20000.0, 120000.0], [15000.0, 130000.0]),
        (48000.0, [2000.0, 6000.0], [100.0, 9000.0]),
    ],
    "bandstop": [
        (48000.0, [45.0, 55.0], [49.0, 51.0]),
        (48000.0, [40.0, 300.0], [90.0, 110.0]),
        (8000.0, [500.0, 3500.0], [600.0, 1000.0]),
        (384000.0, [10000.0, 30000.0], [24000.0, 28000.0]),
        (96000.0, [15000.0, 17000.0], [15500.0, 16100.0]),
    ],
}


def order(family, edges, stops, ripple, stop, rate):
    found, _ = ORDER[family](
        edges[0] if len(edges) == 1 else edges, stops[0] if len(stops) == 1 else stops, ripple, stop, fs=rate
    )
    return int(found)


def just_met(family, n, ripple, stop):
    """The stop edge of the prototype over its pass edge."""
    pass_ratio, stop_ratio = mp.mpf(10) ** (mp.mpf(ripple) / 10) - 1, mp.mpf(10) ** (mp.mpf(stop) / 10) - 1
    if family == "butterworth":
        return (stop_ratio / pass_ratio) ** (mp.mpf(1) / (2 * n))
    if family in ("chebyshev1", "chebyshev2"):
        return mp.cosh(mp.acosh(mp.sqrt(stop_ratio / pass_ratio)) / n)
    m1 = pass_ratio / stop_ratio
    ratio = mp.ellipk(1 - m1) / mp.ellipk(m1) / n
    return 1 / mp.sqrt(mp.mfrom(q=mp.exp(-mp.pi * ratio)))


def rows():
    for family in ORDER:
        for kind, places in EDGES.items():
            for rate, edges, stops in places:
                for ripple in RIPPLES:
                    for stop in STOPS:
                        yield family, kind, rate, edges, stops, ripple, stop, ""
    for family in ORDER:
        for n in range(1, 11):
            for ripple, stop, rate, edge in [(0.5, 40.0, 48000.0, 1000.0), (3.0, 60.0, 8000.0, 700.0)]:
                w = mp.tan(mp.pi * edge / rate) * just_met(family, n, ripple, stop)
                yield family, "lowpass", rate, [edge], [float(mp.atan(w) / mp.pi * rate)], ripple, stop, n


def listed(values):
    return " ".join(repr(value) for value in values)


here = os.path.dirname(os.path.abspath(__file__))
with open(os.path.join(here, "limits_scipy.csv"), "w", newline="") as file:
    writer = csv.writer(file, lineterminator="\n")
    writer.writerow("family kind rate_hz edges_hz stop_edges_hz ripple_db stop_db scipy_order met".split())
    for family, kind, rate, edges, stops, ripple, stop, met in rows():
        found = order(family, edges, stops, ripple, stop, rate)
        writer.writerow([family, kind, rate, listed(edges), listed(stops), ripple, stop, found, met])
