"""Writes double_functions.txt: arithmetic and elementary functions of numbers of twice the
digits of f64. mpmath 1.3.0, 60 digits.

One line a value: function, its arguments, the value; each number as the nearest f64 and
what that leaves out.
"""

import os
import random

import mpmath as mp

mp.mp.dps = 60
random.seed(20)

FUNCTIONS = {
    "add": (2, lambda a, b: a + b), "mul": (2, lambda a, b: a * b), "div": (2, lambda a, b: a / b),
    "sqrt": (1, mp.sqrt), "exp": (1, mp.exp), "exp_m1": (1, mp.expm1),
    "sinh": (1, mp.sinh), "cosh": (1, mp.cosh), "asinh": (1, mp.asinh), "sin": (1, mp.sin), "cos": (1, mp.cos),
}


def parts(x):
    high = float(x)
    return high, float(x - mp.mpf(high))


def argument(name):
    sign = random.choice([-1, 1])
    size = 10 ** random.uniform(-12, 12)
    if name == "sqrt":
        sign = 1
    if name in ("exp", "exp_m1", "sinh", "cosh"):
        size = 10 ** random.uniform(-10, 2.3)
    if name in ("sin", "cos"):
        size = random.choice([10 ** random.uniform(-10, 0), random.uniform(0.7, 12)])
    high = sign * size
    return high, high * 2.0**-54 * random.uniform(-1, 1)


with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "double_functions.txt"), "w") as file:
    file.write("# Written by make_double_functions.py (mpmath 1.3.0), which states what the columns are.\n")
    for name, (count, function) in FUNCTIONS.items():
        for _ in range(40):
            arguments = [argument(name) for _ in range(count)]
            if name == "add" and random.random() < 0.5:
                # Of nearly equal size: most digits cancel.
                high, low = arguments[0]
                arguments[1] = (-high * (1 + 2.0 ** -random.randint(1, 50)), low / 3)
            value = function(*[mp.mpf(high) + mp.mpf(low) for high, low in arguments])
            numbers = [number for pair in [*arguments, parts(value)] for number in pair]
            file.write(" ".join([name, *map(repr, numbers)]) + "\n")
