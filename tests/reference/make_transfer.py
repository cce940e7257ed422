"""Writes transfer.json: transfer functions with their exact responses at a rate of 48 kHz.

Random stable filters of degree 2 to 20 in z (polynomials, roots, sections) and of degree 2 to
12 in s (polynomials in rad/s, roots in rad/s and Hz, with and without a matched frequency).
What is given are f64; the responses are those of the given numbers, by mpmath 1.4.1 at 50
digits, through the bilinear transform where they are in s. Polynomials that rounding to f64 has
made unstable are left out, and so are those with a pole within 1e-4 of the unit circle.
"""

import json
import os
import random

import mpmath as mp

mp.mp.dps = 50
RATE = 48000
HZ = [0.0, 21.5, 113.7, 997.0, 4001.0, 12000.0, 17777.0, 23990.0]
random.seed(20260512)


def expand(roots):
    """Coefficients, highest power first, of a polynomial with these roots and their conjugates."""
    c = [mp.mpf(1)]
    for root in roots:
        factor = [1, -mp.mpf(root.real)] if root.imag == 0 else [1, -2 * mp.mpf(root.real), mp.mpf(root.real) ** 2 + mp.mpf(root.imag) ** 2]
        product = [mp.mpf(0)] * (len(c) + len(factor) - 1)
        for i, x in enumerate(c):
            for j, y in enumerate(factor):
                product[i + j] += x * y
        c = product
    return c


def both(roots):
    """All roots as pairs, conjugates beside one another."""
    out = []
    for root in roots:
        out.append([root.real, root.imag])
        if root.imag != 0:
            out.append([root.real, -root.imag])
    return out


def in_z(count, reach):
    """Upper halves of roots in z, `count` of them in all."""
    roots = []
    while count > 0:
        radius = random.uniform(0.3, reach)
        if count == 1 or random.random() < 0.2:
            roots.append(complex(random.choice([-1, 1]) * radius, 0))
            count -= 1
        else:
            angle = random.uniform(0.02, 3.1)
            roots.append(complex(float(radius * mp.cos(angle)), float(radius * mp.sin(angle))))
            count -= 2
    return roots


def in_s(count, scale):
    roots = []
    while count > 0:
        size = scale * 10 ** random.uniform(-1, 0.5)
        if count == 1 or random.random() < 0.2:
            roots.append(complex(-size, 0))
            count -= 1
        else:
            angle = random.uniform(1.65, 3.0)
            roots.append(complex(float(size * mp.cos(angle)), float(size * mp.sin(angle))))
            count -= 2
    return roots


def value(c, x):
    """Highest power first."""
    sum = mp.mpf(0)
    for coefficient in c:
        sum = sum * x + mp.mpf(coefficient)
    return sum


def over(roots, x):
    product = mp.mpf(1)
    for re, im in roots:
        product *= x - mp.mpc(re, im)
    return product


def stable(c):
    roots = mp.polyroots([mp.mpf(x) for x in c], maxsteps=500, extraprec=400)
    return max(abs(root) for root in roots) < 1 - 1e-4


def response(h):
    points = []
    for hz in HZ:
        z = mp.expjpi(2 * mp.mpf(hz) / RATE)
        got = mp.mpc(h(z))
        points.append([hz, float(got.real), float(got.imag)])
    return points


def digital():
    entries = []
    for degree in range(2, 21):
        for _ in range(3):
            zeros, poles = in_z(random.randint(max(0, degree - 3), degree), 1.3), in_z(degree, 0.97)
            n, d = [float(x) for x in expand(zeros)], [float(x) for x in expand(poles)]
            # In powers of z^-1 the numerator may be shorter: a delay is left out.
            if stable(d):
                h = lambda z: value(n[::-1], 1 / z) / value(d[::-1], 1 / z)
                entries.append({"form": "polynomials", "degree": degree, "numerator": n, "denominator": d, "response": response(h)})
            gain = random.uniform(0.01, 2)
            zs, ps = both(zeros), both(poles)
            h = lambda z: mp.mpf(gain) * over(zs, z) / over(ps, z)
            entries.append({"form": "roots", "degree": degree, "zeros": zs, "poles": ps, "gain": gain, "response": response(h)})
            rows = []
            for k in range((degree + 1) // 2):
                single = degree % 2 == 1 and k == 0
                b = [random.uniform(-2, 2) for _ in range(2 if single else 3)]
                a0 = random.choice([1.0, random.uniform(0.5, 3)])
                a = [float(a0 * x) for x in expand(in_z(1 if single else 2, 0.97))]
                rows.append({"b": b + [0.0] * (3 - len(b)), "a": a + [0.0] * (3 - len(a))})
            h = lambda z: mp.fprod(value(row["b"][::-1], 1 / z) / value(row["a"][::-1], 1 / z) for row in rows)
            entries.append({"form": "sections", "degree": degree, "sections": rows, "response": response(h)})
    # Longer above than below, a delay, multiple zeros at both ends, multiple poles.
    extra = [
        ([0.0, 0.0, 0.25, 0.5, 0.25, 0.125], [1.0, -0.5]),
        ([1.0, 6.0, 15.0, 20.0, 15.0, 6.0, 1.0], [1.0, 0.0, 0.5, 0.0, 0.0625]),
        ([1.0, 0.0, -3.0, 0.0, 3.0, 0.0, -1.0], [64.0, -32.0, 16.0]),
        ([1.0, -2.0, 0.0, 2.0, -1.0], [1.0, -2.0, 1.5, -0.5, 0.0625]),
        ([0.5], [1.0]),
        ([0.5] * 64, [1.0]),
        ([0.7, -0.2], [1.0] + [0.0] * 62 + [0.5]),
    ]
    for n, d in extra:
        h = lambda z: value(n[::-1], 1 / z) / value(d[::-1], 1 / z)
        entries.append({"form": "polynomials", "degree": len(d) - 1, "numerator": n, "denominator": d, "response": response(h)})
    return entries


def bilinear(h, match_hz, hertz):
    """`h` of s in z; s in Hz where `hertz`."""
    k = 2 * mp.mpf(RATE) if match_hz is None else 2 * mp.pi * mp.mpf(match_hz) / mp.tan(mp.pi * mp.mpf(match_hz) / RATE)
    if hertz:
        k /= 2 * mp.pi
    return lambda z: h(k * (z - 1) / (z + 1))


def analog():
    entries = []
    for degree in range(2, 13):
        for _ in range(2):
            for match_hz in (None, 1000.0, 15000.0):
                zeros = in_s(random.randint(0, degree), 30000.0)
                poles = in_s(degree, 30000.0)
                n, d = [float(x) for x in expand(zeros)], [float(x) for x in expand(poles)]
                n = [x * (d[-1] / n[-1]) for x in n]
                h = lambda s: value(n, s) / value(d, s)
                entries.append({"form": "polynomials", "degree": degree, "numerator": n, "denominator": d, "match_hz": match_hz,
                                "response": response(bilinear(h, match_hz, False))})
                for hertz in (False, True):
                    scale = 5000.0 if hertz else 30000.0
                    zs, ps = both(in_s(random.randint(0, degree), scale)), both(in_s(degree, scale))
                    gain = float(over(ps, mp.mpf(0)).real / over(zs, mp.mpf(0)).real)
                    h = lambda s: mp.mpf(gain) * over(zs, s) / over(ps, s)
                    entries.append({"form": "roots", "degree": degree, "hertz": hertz, "zeros": zs, "poles": ps, "gain": gain,
                                    "match_hz": match_hz, "response": response(bilinear(h, match_hz, hertz))})
    return entries


with open(os.path.join(os.path.dirname(__file__), "transfer.json"), "w") as file:
    json.dump({"source": "make_transfer.py, mpmath 1.4.1, 50 digits", "rate_hz": RATE, "digital": digital(), "analog": analog()}, file,
              separators=(",", ":"))
    file.write("\n")
