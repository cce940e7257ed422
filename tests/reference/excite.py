"""Reference values for tests/excite: the excitation written again from its formulas.

Everything here follows the documentation of `excite::Sweep`, `excite::Pink` and
`excite::Fade`, none of it the program. Written with Python's own integers and math module,
spectra with scipy.signal.welch. Versions used: Python 3, numpy 2.4.6, scipy 1.17.1.

    python3 tests/reference/excite.py > tests/reference/excite.json
"""

import hashlib
import json
import math

import numpy as np
from scipy.signal import welch
from scipy.signal.windows import blackmanharris

MASK = (1 << 64) - 1
GOLDEN = 0x9E3779B97F4A7C15
START = int.from_bytes(b"pink-oct", "big")
PEAK = 0.5
FAST = 1.14


def mix(z):
    """Finalizer of SplitMix64 (Steele, Lea, Flood, OOPSLA 2014)."""
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9 & MASK
    z = (z ^ (z >> 27)) * 0x94D049BB133111EB & MASK
    return z ^ (z >> 31)


def pink(rate, lowest_hz, frames):
    octaves = 2
    while 2 * rate / 2**octaves > lowest_hz:
        octaves += 1
    weights = [FAST, FAST] + [1.0] * (octaves - 2)
    amplitude = PEAK / math.fsum(weights)
    first = mix(START)
    signs = [1 if first >> k & 1 else -1 for k in range(octaves)]
    out = []
    for frame in range(frames):
        if frame:
            word = mix((START + frame * GOLDEN) & MASK)
            signs[0] = 1 if word >> 63 else -1
            turn = 1
            while frame % 2**turn == 0:
                turn += 1
            if turn < octaves:
                signs[turn] = 1 if word >> 62 & 1 else -1
        out.append(amplitude * (FAST * (signs[0] + signs[1]) + sum(signs[2:])))
    return octaves, 2 * 0.7244 * amplitude**2, out


def sweep(rate, f1, f2, frames, peak):
    length, log_ratio = frames / rate, math.log(f2 / f1)
    return [
        peak * math.sin(2 * math.pi * math.fmod(f1 * length / log_ratio * math.expm1(log_ratio * n / frames), 1.0))
        for n in range(frames)
    ]


def faded(samples, fade):
    out, last = list(samples), len(samples) - 1
    for n in range(fade):
        factor = math.sin(math.pi / 2 * (n + 0.5) / fade) ** 2
        out[n] *= factor
        out[last - n] *= factor
    return out


def excitation(rate, seconds, lowest_edge, highest_edge):
    frames = round(seconds * rate)
    frames += frames % 2
    sweep_frames = min(frames // 20, round(5 * rate))
    fade = min(round(0.05 * rate), sweep_frames // 8)
    f1, f2 = lowest_edge / 2, min(2 * highest_edge, 0.49 * rate)
    octaves, per_octave, noise = pink(rate, f1, frames - sweep_frames)
    parts = faded(sweep(rate, f1, f2, sweep_frames, math.sqrt(2 * per_octave * math.log(f2 / f1))), fade), faded(noise, fade)
    return octaves, fade, [round(x * 2**23) for part in parts for x in part], sweep_frames


def case(rate, seconds, lowest_edge, highest_edge):
    octaves, fade, samples, sweep_frames = excitation(rate, seconds, lowest_edge, highest_edge)
    data = b"".join(x.to_bytes(3, "little", signed=True) for x in samples)
    noise = np.array(samples[sweep_frames + fade : -fade]) / 2**23
    segment = 4096
    f, s = welch(noise, rate, blackmanharris(segment, sym=False), segment, segment // 2, detrend=False)
    # Octave bands from 8 bins up; the last ends at half the rate.
    octave_bands, k = [], 8
    while k < segment // 2:
        end = min(2 * k, segment // 2)
        power = float(np.sum(s[k:end]) * (f[1] - f[0]))
        octave_bands.append({"from_hz": float(f[k]), "to_hz": float(f[end]), "mean_square": power})
        k *= 2
    return {
        "rate_hz": rate,
        "seconds": seconds,
        "lowest_edge_hz": lowest_edge,
        "highest_edge_hz": highest_edge,
        "octaves": octaves,
        "frames": len(samples),
        "data_sha256": hashlib.sha256(data).hexdigest(),
        "sweep_samples": samples[:24],
        "noise_samples": samples[sweep_frames + fade : sweep_frames + fade + 24],
        "octave_bands": octave_bands,
    }


cases = [case(48000, 6.0, 40.0, 6000.0), case(44100, 5.00001, 90.0, 22050.0), case(8000, 12.0, 0.75, 3000.0)]
print(json.dumps({"cases": cases}, indent=1))
