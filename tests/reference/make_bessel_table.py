"""Writes the pole table of src/design/prototype/bessel.rs to standard output.

Poles of the Bessel low-pass of order 1 to 20, scaled so that the gain at 1 rad/s is
10 log10(1/2) dB. They are the roots of the reverse Bessel polynomial
theta_n(s) = sum_k (2n-k)! / (2^(n-k) k! (n-k)!) s^k, found with 120 digits by mpmath's
polyroots and divided by the frequency at which |theta_n(jw)|^2 = 2 theta_n(0)^2.
Upper half-plane and real poles only, largest imaginary part first, each part as the
nearest f64 and what that leaves out.

mpmath 1.4.1.
"""

from math import factorial

import mpmath as mp

mp.mp.dps = 120


def coefficients(n):
    """Highest power first."""
    return [mp.mpf(factorial(2 * n - k)) / (2 ** (n - k) * factorial(k) * factorial(n - k)) for k in range(n, -1, -1)]


def half_power_frequency(c):
    theta = lambda w: abs(mp.polyval(c, 1j * w)) ** 2 / (2 * c[-1] ** 2) - 1
    # The edge of the delay-normalized filter lies near sqrt((2n-1) ln 2), and above 1.
    high = mp.mpf(1)
    while theta(high) < 0:
        high *= 2
    return mp.findroot(theta, (high / 2, high), solver="anderson", tol=mp.mpf(10) ** -80) if high > 1 else high


for n in range(1, 21):
    c = coefficients(n)
    edge = half_power_frequency(c)
    assert abs(abs(mp.polyval(c, 1j * edge)) ** 2 / c[-1] ** 2 - 2) < mp.mpf(10) ** -60
    roots = mp.polyroots(c, maxsteps=2000, extraprec=800)
    upper = sorted((r / edge for r in roots if mp.im(r) > mp.mpf(10) ** -60), key=lambda r: -mp.im(r))
    real = [r / edge for r in roots if abs(mp.im(r)) <= mp.mpf(10) ** -60]
    assert len(upper) == n // 2 and len(real) == n % 2
    print(f"    // order {n}")
    parts = lambda x: f"{float(x)!r}, {float(x - mp.mpf(float(x)))!r}"
    rows = [f"[{parts(mp.re(r))}, {parts(mp.im(r))}]" for r in upper]
    rows += [f"[{parts(mp.re(r))}, 0.0, 0.0]" for r in real]
    print("    &[" + ", ".join(rows) + "],")
