"""Values of the dither `triangular-1`, from its documentation alone.

Python 3 integers, no libraries. Writes triangular_1.csv beside this file:
channel, frame, value * 2^32 (an integer).

SplitMix64: G. L. Steele, D. Lea, C. H. Flood, "Fast splittable pseudorandom number
generators", OOPSLA 2014. The five values for seed 1234567 are widely published test
values (from memory).
"""

import pathlib

MASK = 2**64 - 1
GOLDEN = 0x9E3779B97F4A7C15


def mix(z):
    z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & MASK
    z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & MASK
    return z ^ (z >> 31)


def splitmix64(seed, count):
    return [mix((seed + (k + 1) * GOLDEN) & MASK) for k in range(count)]


assert splitmix64(1234567, 5) == [
    6457827717110365317,
    3203168211198807973,
    9817491932198370423,
    4593380528125082431,
    16408922859458223821,
]


def triangular(channel, frame):
    start = mix(((channel + 1) * GOLDEN) & MASK)
    value = mix((start + (frame + 1) * GOLDEN) & MASK)
    high, low = value >> 32, value & 0xFFFFFFFF
    return high + low + 1 - 2**32


rows = ["channel,frame,value_times_2_32"]
for channel in [0, 1, 2, 7, 65534]:
    for frame in [0, 1, 2, 3, 1000, 2**32 - 1, 2**32, 2**40 + 5]:
        rows.append(f"{channel},{frame},{triangular(channel, frame)}")
path = pathlib.Path(__file__).with_name("triangular_1.csv")
path.write_text("\n".join(rows) + "\n")
