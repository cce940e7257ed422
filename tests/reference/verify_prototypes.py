"""Derives every entry of prototypes.json again and compares; prints the largest
relative deviation of a real or imaginary part.

Method: the poles are the left-half-plane roots of 1 + e^2 F(x)^2 with s = jx, found by
Newton steps from the file's values on the characteristic functions of exact_filters.py
(which know no poles); zeros and gain from the same functions. mpmath 1.4.1, 50 digits.
"""

import json
import os

import mpmath as mp

from exact_filters import bessel, elliptic_modulus, power_ratio

HERE = os.path.dirname(__file__)


def characteristic(entry):
    """A function of s whose left-half-plane roots are the poles, and the zeros' frequencies."""
    family, n = entry["family"], entry["n"]
    if family == "butterworth":
        return lambda s: 1 + (s / 1j) ** (2 * n), []
    if family == "chebyshev1":
        e2 = power_ratio(entry["rp_db"])
        return lambda s: 1 + e2 * mp.chebyt(n, s / 1j) ** 2, []
    if family == "chebyshev2":
        e2 = power_ratio(entry["rs_db"])
        zeros = [1 / mp.cos((2 * i - 1) * mp.pi / (2 * n)) for i in range(1, n // 2 + 1)]
        return lambda s: 1 + mp.chebyt(n, 1j / s) ** 2 / e2, zeros
    if family == "elliptic":
        k, small = elliptic_modulus(n, mp.mpf(entry["rp_db"]), mp.mpf(entry["rs_db"]))
        e2 = power_ratio(entry["rp_db"])

        def rational(x):
            value = x if n % 2 else mp.mpf(1)
            for z in small:
                value *= (x * x - z * z) / (1 - (k * z * x) ** 2)
            return value

        at_one = rational(mp.mpf(1))
        return lambda s: 1 + e2 * (rational(s / 1j) / at_one) ** 2, [1 / (k * z) for z in small]
    c, edge = bessel(n)
    scale = {"delay": mp.mpf(1), "mag": 1 / edge, "phase": 1 / mp.root(c[-1], n)}[entry["norm"]]
    return lambda s: mp.polyval(c, s / scale), []


def newton(f, s):
    for _ in range(4):
        h = abs(s) * mp.mpf(10) ** -25
        s -= f(s) * 2 * h / (f(s + h) - f(s - h))
    return s


worst = mp.mpf(0)
for entry in json.load(open(os.path.join(HERE, "prototypes.json")))["entries"]:
    f, zeros = characteristic(entry)
    poles = [mp.mpc(*p) for p in entry["poles"]]
    assert all(mp.re(p) < 0 for p in poles) and len(poles) == entry["n"]
    assert len({mp.nstr(p, 15) for p in poles}) == entry["n"]
    for p in poles:
        root = newton(f, p)
        worst = max(worst, abs(mp.re(root) / mp.re(p) - 1))
        if mp.im(p) != 0:
            worst = max(worst, abs(mp.im(root) / mp.im(p) - 1))
    for z in zeros:
        worst = max(worst, min(abs(mp.mpf(im) / z - 1) for _, im in entry["zeros"]))
    assert len(entry["zeros"]) == 2 * len(zeros)
    dc = mp.mpf(10) ** (-mp.mpf(entry["rp_db"]) / 20) if entry["family"] in ("chebyshev1", "elliptic") and entry["n"] % 2 == 0 else 1
    gain = dc * mp.fprod(-p for p in poles) / mp.fprod(z * z for z in zeros)
    worst = max(worst, abs(mp.re(gain) / mp.mpf(entry["gain"]) - 1))
print("largest relative deviation", mp.nstr(worst, 3))
