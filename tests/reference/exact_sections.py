"""Exact coefficients of bilinear filters from zeros and poles, to 60 digits and more.

Prototypes from their closed forms (elliptic: the complex cd of mpmath's own Jacobi
functions; Bessel: roots of the reverse Bessel polynomial), then the band transform on
prewarped edges and the bilinear transform. Edges as in exact_filters.py. mpmath 1.3.0.
"""

from functools import lru_cache
from math import factorial

import mpmath as mp

mp.mp.dps = 60


def power_ratio(db):
    return mp.expm1(mp.mpf(db) * mp.log(10) / 10)


@lru_cache(maxsize=None)
def bessel(n):
    c = [mp.mpf(factorial(2 * n - k)) / (2 ** (n - k) * factorial(k) * factorial(n - k)) for k in range(n, -1, -1)]
    with mp.workdps(130):
        excess = lambda w: abs(mp.polyval(c, 1j * w)) ** 2 / (2 * c[-1] ** 2) - 1
        high = mp.mpf(1)
        while excess(high) < 0:
            high *= 2
        tol = mp.mpf(10) ** -110
        edge = mp.findroot(excess, (high / 2, high), solver="anderson", tol=tol) if n > 1 else mp.mpf(1)
        roots = [root / edge for root in mp.polyroots(c, maxsteps=2000, extraprec=1000)]
    upper = [root for root in roots if mp.im(root) > mp.mpf(10) ** -50]
    real = [mp.re(root) for root in roots if abs(mp.im(root)) <= mp.mpf(10) ** -50]
    assert len(upper) == n // 2 and len(real) == n % 2
    return upper, real


@lru_cache(maxsize=None)
def elliptic(n, ripple_db, stop_db):
    with mp.workdps(160):
        ripple, stop = power_ratio(ripple_db), power_ratio(stop_db)
        m1 = ripple / stop
        m1_rest = (1 + ripple) * power_ratio(mp.mpf(stop_db) - mp.mpf(ripple_db)) / stop
        ratio = mp.ellipk(m1_rest) / mp.ellipk(m1) / n
        k = mp.kfrom(q=mp.exp(-mp.pi * ratio)) if ratio >= 1 else mp.sqrt(1 - mp.kfrom(q=mp.exp(-mp.pi / ratio)) ** 2)
        period = mp.ellipk(k * k)
        v = mp.ellipf(mp.atan(1 / mp.sqrt(ripple)), m1_rest) / (n * mp.ellipk(m1))
        cd = lambda x: mp.ellipfun("cd", x * period, m=k * k)
        u = [mp.mpf(2 * i - 1) / n for i in range(1, n // 2 + 1)]
        zeros = [1 / (k * mp.re(cd(x))) for x in u]
        poles = [1j * cd(x - 1j * v) for x in u]
        real = [mp.re(1j * cd(1 - 1j * v))] if n % 2 else []
        assert all(mp.re(p) < 0 < mp.im(p) for p in poles) and all(p < 0 for p in real)
        return zeros, poles, real


@lru_cache(maxsize=None)
def prototype(family, n, ripple_db, stop_db):
    """Zeros (W of +-jW), poles in the upper half-plane, real pole if any, gain at DC."""
    angles = [(2 * k - 1) * mp.pi / (2 * n) for k in range(1, n // 2 + 1)]
    dc = mp.mpf(10) ** (-mp.mpf(ripple_db) / 20) if ripple_db is not None and n % 2 == 0 else mp.mpf(1)
    on_ellipse = lambda a, b: [mp.mpc(-a * mp.sin(t), b * mp.cos(t)) for t in angles]
    if family == "butterworth":
        return [], on_ellipse(1, 1), [mp.mpf(-1)] * (n % 2), dc
    if family == "bessel":
        return [], *bessel(n), dc
    if family == "elliptic":
        return *elliptic(n, ripple_db, stop_db), dc
    if family == "chebyshev1":
        v = mp.asinh(1 / mp.sqrt(power_ratio(ripple_db))) / n
        return [], on_ellipse(mp.sinh(v), mp.cosh(v)), [-mp.sinh(v)] * (n % 2), dc
    v = mp.asinh(mp.sqrt(power_ratio(stop_db))) / n
    poles = [mp.conj(1 / p) for p in on_ellipse(mp.sinh(v), mp.cosh(v))]
    return [1 / mp.cos(t) for t in angles], poles, [-1 / mp.sinh(v)] * (n % 2), mp.mpf(1)


def analog(family, kind, n, ripple_db, stop_db, rate_hz, edges_hz):
    """Pole pairs (half sum, product), single poles, W^2 of zero pairs, gain at DC of the
    prototype, prewarped edges. All numbers as floats, taken at their exact binary value."""
    zeros, poles, real, dc = prototype(family, n, ripple_db, stop_db)
    edges = [mp.tan(mp.pi * mp.mpf(edge) / mp.mpf(rate_hz)) for edge in edges_hz]
    if kind in ("lowpass", "highpass"):
        moved = (lambda p: p * edges[0]) if kind == "lowpass" else (lambda p: edges[0] / p)
        pairs = [(mp.re(moved(p)), abs(moved(p)) ** 2) for p in poles]
        return pairs, [moved(p) for p in real], [moved(z) ** 2 for z in zeros], dc, edges
    center_square, width = edges[0] * edges[1], edges[1] - edges[0]
    moved = (lambda p: p * width) if kind == "bandpass" else (lambda p: width / p)
    pairs, squares = [], []
    for p in map(moved, poles):
        root = mp.sqrt(p * p - 4 * center_square)
        pairs += [(mp.re(q), abs(q) ** 2) for q in ((p + root) / 2, (p - root) / 2)]
    pairs += [(moved(p) / 2, center_square) for p in real]
    for z in map(moved, zeros):
        far = (z + mp.sqrt(z * z + 4 * center_square)) / 2
        squares += [far * far, (center_square / far) ** 2]
    if kind == "bandstop":
        squares += [center_square] * (len(pairs) - len(squares))
    return pairs, [], squares, dc, edges


def coefficients(family, kind, n, ripple_db, stop_db, rate_hz, edges_hz):
    """(a1, a2) of pole pairs, a1 of single poles, b1 of zero pairs (b0 = b2 = 1), and the
    gain that makes the product of all of them the filter. Zeros that are not listed are at
    z = -1 (low-pass), at z = 1 (high-pass), or one at each for a pole pair (band-pass)."""
    pairs, single, squares, dc, edges = analog(family, kind, n, ripple_db, stop_db, rate_hz, edges_hz)
    double = [(2 * (m - 1) / (1 - 2 * h + m), (1 + 2 * h + m) / (1 - 2 * h + m)) for h, m in pairs]
    first = [(p + 1) / (p - 1) for p in single]
    zeros = [2 * (m - 1) / (m + 1) for m in squares]
    # z^-1 where the prototype's gain at DC stands.
    back = {"lowpass": mp.mpf(1), "highpass": mp.mpf(-1), "bandstop": mp.mpf(1)}.get(kind)
    if back is None:
        w = mp.sqrt(edges[0] * edges[1])
        back = (1 - 1j * w) / (1 + 1j * w)
    gain = dc
    for a1, a2 in double:
        gain *= abs(1 + back * (a1 + back * a2))
    for a1 in first:
        gain *= abs(1 + back * a1)
    for b1 in zeros:
        gain /= abs(1 + back * (b1 + back))
    fixed = len(double) - len(zeros)
    gain /= {"bandpass": abs(1 - back * back) ** fixed, "bandstop": 1}.get(kind, mp.mpf(2) ** (2 * fixed + len(first)))
    return double, first, zeros, gain
