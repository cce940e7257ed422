"""Exact magnitude responses of bilinear filters, from characteristic functions.

No poles, no sections: the power |H|^2 = 1 / (1 + e^2 F(x)^2) of the prototype at the
frequency x to which band transform and bilinear transform lead. Edges: Butterworth
and Bessel at half power, Chebyshev I and elliptic where the ripple ends, Chebyshev II
where the stop band begins. mpmath 1.4.1, 50 digits.
"""

from functools import lru_cache
from math import factorial

import mpmath as mp

mp.mp.dps = 50


def prototype_power(family, order, ripple_db, stop_db, x):
    """|H(jx)|^2 of the low-pass prototype."""
    if family == "butterworth":
        return 1 / (1 + x ** (2 * order))
    if family == "chebyshev1":
        return 1 / (1 + power_ratio(ripple_db) * chebyshev(order, x) ** 2)
    if family == "chebyshev2":
        if x == 0:
            return mp.mpf(1)
        t2 = chebyshev(order, 1 / x) ** 2
        return t2 / (t2 + power_ratio(stop_db))
    if family == "elliptic":
        return 1 / (1 + power_ratio(ripple_db) * elliptic_rational(order, mp.mpf(ripple_db), mp.mpf(stop_db), x) ** 2)
    c, edge = bessel(order)
    return c[-1] ** 2 / abs(mp.polyval(c, 1j * x * edge)) ** 2


def power_ratio(db):
    return mp.mpf(10) ** (mp.mpf(db) / 10) - 1


def chebyshev(n, x):
    x = abs(x)
    return mp.cos(n * mp.acos(x)) if x <= 1 else mp.cosh(n * mp.acosh(x))


@lru_cache(maxsize=None)
def elliptic_modulus(order, ripple_db, stop_db):
    k1 = mp.sqrt(power_ratio(ripple_db) / power_ratio(stop_db))
    ratio = mp.ellipk(1 - k1**2) / mp.ellipk(k1**2)
    # Beyond 50 digits, for moduli near 1.
    with mp.workdps(80):
        k = mp.kfrom(q=mp.exp(-mp.pi * ratio / order))
        zeros = [mp.re(mp.ellipfun("cd", (2 * i - 1) * mp.ellipk(k**2) / order, k=k)) for i in range(1, order // 2 + 1)]
    return k, zeros


def elliptic_rational(order, ripple_db, stop_db, x):
    k, zeros = elliptic_modulus(order, ripple_db, stop_db)

    def unscaled(w):
        value = w if order % 2 else mp.mpf(1)
        for z in zeros:
            value *= (w * w - z * z) / (1 - (k * z * w) ** 2)
        return value

    return unscaled(x) / unscaled(mp.mpf(1))


@lru_cache(maxsize=None)
def bessel(n):
    """Reverse Bessel polynomial, highest power first, and its half-power frequency."""
    c = [mp.mpf(factorial(2 * n - k)) / (2 ** (n - k) * factorial(k) * factorial(n - k)) for k in range(n, -1, -1)]
    excess = lambda w: abs(mp.polyval(c, 1j * w)) ** 2 / (2 * c[-1] ** 2) - 1
    high = mp.mpf(1)
    while excess(high) < 0:
        high *= 2
    return c, mp.findroot(excess, (high / 2, high), solver="anderson", tol=mp.mpf(10) ** -45)


def prewarp(frequency_hz, rate_hz):
    return mp.tan(mp.pi * mp.mpf(frequency_hz) / mp.mpf(rate_hz))


def prototype_frequency(kind, edges_hz, rate_hz, frequency_hz):
    w = prewarp(frequency_hz, rate_hz)
    edges = [prewarp(edge, rate_hz) for edge in edges_hz]
    if kind == "lowpass":
        return w / edges[0]
    if kind == "highpass":
        return edges[0] / w
    center_square, width = edges[0] * edges[1], edges[1] - edges[0]
    if kind == "bandpass":
        return (w * w - center_square) / (width * w)
    return width * w / (center_square - w * w) if w * w != center_square else mp.inf


def gain_db(family, kind, order, ripple_db, stop_db, rate_hz, edges_hz, frequency_hz):
    """All numbers as floats, taken at their exact binary value."""
    x = prototype_frequency(kind, edges_hz, rate_hz, frequency_hz)
    return 10 * mp.log10(prototype_power(family, order, ripple_db, stop_db, abs(x)))
