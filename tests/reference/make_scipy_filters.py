"""Writes scipy_filters.json: complex responses of SciPy's designs, and iirnotch.

Every filter carries `scipy_error`: the largest relative deviation of SciPy's own
magnitude from the exact one (exact_filters.py) at its frequencies. A test allows that
and a little for itself. scipy 1.17.1, numpy 2.4.6, mpmath 1.4.1.
"""

import json
import os

import mpmath as mp
import numpy as np
import scipy
from scipy import signal

from exact_filters import gain_db

assert scipy.__version__ == "1.17.1"

FAMILIES = {
    "butterworth": [(2, None, None), (5, None, None)],
    "chebyshev1": [(4, 0.5, None), (7, 0.1, None)],
    "chebyshev2": [(3, None, 30.0), (6, None, 60.0)],
    "elliptic": [(4, 1.0, 40.0), (5, 0.1, 60.0)],
    "bessel": [(3, None, None), (8, None, None)],
}
EDGES = {
    "lowpass": [(48000.0, [3000.0]), (8000.0, [3500.0])],
    "highpass": [(48000.0, [1500.0]), (8000.0, [3200.0])],
    "bandpass": [(48000.0, [2000.0, 5000.0]), (8000.0, [900.0, 1100.0])],
    "bandstop": [(48000.0, [4000.0, 9000.0]), (8000.0, [1500.0, 1800.0])],
}


def design(family, order, ripple, stop, kind, rate, edges):
    args = dict(Wn=edges[0] if len(edges) == 1 else edges, btype=kind, fs=rate, output="sos")
    if family == "butterworth":
        return signal.butter(order, **args)
    if family == "chebyshev1":
        return signal.cheby1(order, ripple, **args)
    if family == "chebyshev2":
        return signal.cheby2(order, stop, **args)
    if family == "elliptic":
        return signal.ellip(order, ripple, stop, **args)
    return signal.bessel(order, norm="mag", **args)


filters = []
for family, figures in FAMILIES.items():
    for order, ripple, stop in figures:
        for kind, places in EDGES.items():
            for rate, edges in places:
                sos = design(family, order, ripple, stop, kind, rate, edges)
                center = sum(edges) / len(edges)
                frequencies = [f for f in [0.5 * edges[0], 0.95 * edges[0], edges[0], center, edges[-1], 1.06 * edges[-1], 0.47 * rate] if f < rate / 2]
                frequencies = sorted(set(float(f"{f:.9g}") for f in frequencies))
                _, h = signal.sosfreqz(sos, worN=frequencies, fs=rate)
                error = 0.0
                for f, value in zip(frequencies, h):
                    exact = mp.mpf(10) ** (gain_db(family, kind, order, ripple, stop, rate, edges, f) / 20)
                    error = max(error, float(abs(abs(mp.mpc(value)) / exact - 1)))
                filters.append({
                    "family": family, "kind": kind, "order": order, "ripple_db": ripple, "stop_db": stop,
                    "rate_hz": rate, "edges_hz": edges, "scipy_error": float(f"{error:.2g}"),
                    "response": [[f, float(v.real), float(v.imag)] for f, v in zip(frequencies, h)],
                })

notches = []
for rate, center, q in [(48000.0, 1000.0, 10.0), (48000.0, 50.0, 30.0), (48000.0, 15800.0, 60.0), (44100.0, 19000.0, 2.0), (8000.0, 60.0, 35.0)]:
    b, a = signal.iirnotch(center, q, fs=rate)
    notches.append({"rate_hz": rate, "center_hz": center, "width_hz": center / q, "b": b.tolist(), "a": a.tolist()})

lines = ",\n".join(json.dumps(entry, separators=(",", ":")) for entry in filters)
rows = ",\n".join(json.dumps(entry, separators=(",", ":")) for entry in notches)
with open(os.path.join(os.path.dirname(__file__), "scipy_filters.json"), "w") as file:
    file.write('{"source":"make_scipy_filters.py, scipy 1.17.1",\n"filters":[\n%s\n],\n"notches":[\n%s\n]}\n' % (lines, rows))
