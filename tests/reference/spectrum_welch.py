"""Writes spectrum_welch.json: SciPy's welch and csd of a signal both sides can make exactly.

numpy 2.4.6, scipy 1.17.1. SciPy's density is |X|^2/(rate * sum w^2), doubled; times
rate/L it is the power spectrum of this project. Lengths are L + m L/2, so that evenly
spread segments coincide with SciPy's hop of L/2.
"""

import json
import pathlib

import numpy
import scipy
from scipy import signal

assert (numpy.__version__, scipy.__version__) == ("2.4.6", "1.17.1")
RATE = 1000.0


def signals(frames):
    n = numpy.arange(frames, dtype=numpy.int64)
    before = ((7919 * n + 31 * n * n) % 1009 - 504) / 1024
    other = ((104729 * n + 17 * n * n) % 997 - 498) / 1024
    delayed = numpy.concatenate([[0.0], before[:-1]])
    return before, 0.5 * before - 0.25 * delayed + 0.125 * other


cases = []
for length, segments in [(240, 5), (250, 1), (256, 8)]:
    before, after = signals(length + (segments - 1) * length // 2)
    phase = 2 * numpy.pi * numpy.arange(length) / length
    window = 0.35875 - 0.48829 * numpy.cos(phase) + 0.14128 * numpy.cos(2 * phase) - 0.01168 * numpy.cos(3 * phase)
    options = dict(fs=RATE, window=window, nperseg=length, noverlap=length // 2, detrend=False)
    scale = RATE / length
    sxx = signal.welch(before, **options)[1] * scale
    syy = signal.welch(after, **options)[1] * scale
    sxy = signal.csd(before, after, **options)[1] * scale
    cases.append(
        dict(
            segment_frames=length,
            segments=segments,
            sxx=sxx.tolist(),
            syy=syy.tolist(),
            sxy_re=sxy.real.tolist(),
            sxy_im=sxy.imag.tolist(),
        )
    )
path = pathlib.Path(__file__).with_suffix(".json")
path.write_text(json.dumps(dict(numpy=numpy.__version__, scipy=scipy.__version__, cases=cases)) + "\n")
