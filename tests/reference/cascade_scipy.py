#!/usr/bin/env python3
"""Writes cascade_scipy.json: outputs of scipy.signal.sosfilt for tests/cascade/scipy.rs.

The input is not stored: it is the counter-hash noise of tests/cascade/helpers.rs,
exact in both languages. Outputs are kept at every 89th frame.
Made with numpy 2.4.6, scipy 1.17.1.
"""
import json
from fractions import Fraction
from pathlib import Path

import numpy as np
import scipy.signal as sig

FRAMES = 8000
STRIDE = 89
MASK = 2**64 - 1


def noise(seed, frames):
    out = np.empty(frames)
    for i in range(frames):
        z = (seed * 0x9E3779B97F4A7C15 + i * 0xD1B54A32D192ED03) & MASK
        z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & MASK
        z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & MASK
        z ^= z >> 31
        out[i] = (z >> 11) / 2**52 - 1
    return out


def notches(lines, width_hz, rate):
    return np.vstack([np.hstack(sig.iirnotch(f, f / width_hz, rate)).reshape(1, 6) for f in lines])


CASCADES = {
    "Butterworth high-pass of order 4 at 90 Hz and eight notches, 48 kHz": np.vstack(
        [sig.butter(4, 90, "highpass", fs=48000, output="sos"), notches(range(50, 401, 50), 2, 48000)]
    ),
    "elliptic low-pass of order 9 at 5 kHz, 48 kHz": sig.ellip(9, 0.1, 80, 5000, fs=48000, output="sos"),
    "Chebyshev I band-pass of order 2 x 6 from 2 to 6 kHz, 48 kHz": sig.cheby1(
        6, 0.5, [2000, 6000], "bandpass", fs=48000, output="sos"
    ),
    "24 notches, 44.1 kHz": notches(range(60, 1441, 60), 10, 44100),
    "Chebyshev II band-stop of order 2 x 17 from 4 to 7 kHz, 32 kHz": sig.cheby2(
        17, 60, [4000, 7000], "bandstop", fs=32000, output="sos"
    ),
    "Butterworth low-pass of order 2 at 10 Hz, 192 kHz": sig.butter(2, 10, fs=192000, output="sos"),
}


def steady_state(sos, constant):
    """The states under a constant input, rounded once: scipy.signal.sosfilt_zi solves
    in f64 and is off by 4e-10 for the 10 Hz low-pass."""
    x = Fraction(constant)
    rows = []
    for row in sos:
        b0, b1, b2, _, a1, a2 = map(Fraction, row.tolist())
        y = (b0 + b1 + b2) / (1 + a1 + a2) * x
        s2 = b2 * x - a2 * y
        rows.append([float(b1 * x - a1 * y + s2), float(s2)])
        x = y
    return np.array(rows)


def main():
    cases = []
    for seed, (name, sos) in enumerate(CASCADES.items(), start=1):
        sos = np.ascontiguousarray(sos)
        x = noise(seed, FRAMES)
        x[0] = 0.0  # the steady state of 0 is the rest from which sosfilt starts
        from_rest = sig.sosfilt(sos, x)
        offset = 0.25 * noise(seed, FRAMES) + 0.5
        steady, _ = sig.sosfilt(sos, offset, zi=steady_state(sos, offset[0]))
        cases.append(
            {
                "name": name,
                "seed": seed,
                "frames": FRAMES,
                "stride": STRIDE,
                "sections": [{"b": list(row[:3]), "a": list(row[3:])} for row in sos],
                "from_rest": list(from_rest[::STRIDE]),
                "steady": list(steady[::STRIDE]),
            }
        )
    path = Path(__file__).with_suffix(".json")
    path.write_text("[\n" + ",\n".join(json.dumps(case) for case in cases) + "\n]\n")


if __name__ == "__main__":
    main()
