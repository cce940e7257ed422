#!/usr/bin/env python3
"""Writes both_ways_scipy.json: outputs of scipy.signal.sosfiltfilt for tests/cascade/scipy_both_ways.rs.

The cascades and the input are those of cascade_scipy.py, the input with an offset and a
slope. Both times the extension is SciPy's odd one: over 500 frames, and over as many as
there are but one. Outputs are kept at every 89th frame and at the first and the last.
Made with numpy 2.4.6, scipy 1.17.1.
"""
import json
from pathlib import Path

import numpy as np
import scipy.signal as sig

from cascade_scipy import CASCADES, FRAMES, STRIDE, noise

SHORT = 500


def main():
    cases = []
    for seed, (name, sos) in enumerate(CASCADES.items(), start=1):
        sos = np.ascontiguousarray(sos)
        # Exact in both languages: a product and two sums, in this order.
        x = 0.25 * noise(seed, FRAMES) + 0.5 + np.arange(FRAMES) / 2**14
        both = lambda padlen: sig.sosfiltfilt(sos, x, padtype="odd", padlen=padlen)
        kept = lambda y: list(y[::STRIDE]) + [y[-1]]
        cases.append(
            {
                "name": name,
                "seed": seed,
                "frames": FRAMES,
                "stride": STRIDE,
                "sections": [{"b": list(row[:3]), "a": list(row[3:])} for row in sos],
                "short_frames": SHORT,
                "short": kept(both(SHORT)),
                "long": kept(both(FRAMES - 1)),
            }
        )
    path = Path(__file__).with_suffix(".json")
    path.write_text("[\n" + ",\n".join(json.dumps(case) for case in cases) + "\n]\n")


if __name__ == "__main__":
    main()
