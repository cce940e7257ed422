"""Runs exported cascades over a recording and compares with the program's own output.

    python3 check_forms.py PROGRAM SPEC RECORDING

The C form is compiled with cc and must give the samples of the program bit for bit; the
numpy form runs through SciPy's sosfilt and must agree within 1e-12 of full scale, or within
twice the cascade's own rounding noise where that is more. The spec's
output is taken as 64-bit float, so that the program rounds nothing: SPEC must say
`encoding = "same"` or have no `[output]`. Of a zero-phase spec the numpy form's own call of
sosfiltfilt must agree as well; the C form, which is one pass, is not run. Needs numpy, scipy
and soundfile.
"""

import ctypes
import re
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
import soundfile
from scipy.signal import sosfilt, sosfilt_zi, sosfiltfilt

TOLERANCE = 1e-12


def rounding_noise(sections, peak):
    """Level of rounding at the output, relative to full scale.

    sosfilt adds up each section in another order than the program, so the two differ by
    rounding, half a unit in the last place of the peak each time; from a section on that
    passes through its own 1/A and everything behind it (as white noise: root of the sum of
    squares of those responses; common practice, no source).
    """
    impulse = np.zeros(1 << 19)
    impulse[0] = 1
    power = 0.0
    for first in range(len(sections)):
        behind = sections[first:].copy()
        behind[0, :3] = [1, 0, 0]
        power += np.sum(sosfilt(behind, impulse) ** 2)
    return 2.0**-53 * peak * np.sqrt(power)


def export(program, spec, rate_hz, form):
    command = [program, "export", spec, "--rate", str(rate_hz), "--as", form]
    return subprocess.run(command, check=True, capture_output=True, text=True, encoding="utf-8").stdout


def check_numpy(text, before, after):
    names = {}
    exec(compile(text, "numpy form", "exec"), names)
    sections, state = names["sections"], names["state"]
    assert sections.shape == (max(names["section_count"], 1), 6), sections.shape
    assert np.allclose(state, sosfilt_zi(sections), rtol=1e-6, atol=1e-9), "state is not sosfilt_zi"
    worst = 0.0
    padlen = ring_frames(text)
    for x, y in zip(before.T, after.T):
        if padlen is None:
            found, _ = sosfilt(sections, x, zi=state * x[0])
        else:
            found = sosfiltfilt(sections, x, padtype="odd", padlen=min(padlen, len(x) - 1))
        worst = max(worst, np.max(np.abs(found - y)))
    # Each pass adds its own.
    passes = 1 if padlen is None else 2
    tolerance = max(TOLERANCE, 2 * np.sqrt(passes) * rounding_noise(sections, np.max(np.abs(before))))
    assert worst <= tolerance, f"the numpy form is off by {worst}, {tolerance} allowed"
    return f"{worst:.1e} ({tolerance:.1e} allowed)"


def ring_frames(text):
    """The figure in the head's call of sosfiltfilt; None where there is one pass."""
    head = " ".join(line.lstrip("# ") for line in text.splitlines())
    call = re.search(r'sosfiltfilt\(sections, x, padtype="odd", padlen=min\((\d+), len\(x\) - 1\)\)', head)
    assert (call is not None) == ("Passes: 2" in head), "two passes, and no way to run them"
    return int(call[1]) if call else None


def check_c(text, folder, before, after):
    (folder / "cascade.c").write_text(text, encoding="utf-8")
    library = folder / "cascade.so"
    flags = ["-std=c99", "-O2", "-ffp-contract=off", "-Wall", "-Wextra", "-Wpedantic", "-Werror"]
    subprocess.run(["cc", *flags, "-shared", "-fPIC", "-o", library, folder / "cascade.c"], check=True)
    cascade = ctypes.CDLL(str(library))
    doubles = np.ctypeslib.ndpointer(np.float64, flags="C_CONTIGUOUS")
    cascade.cascade_init.argtypes = [ctypes.c_void_p, ctypes.c_double]
    cascade.cascade_process.argtypes = [ctypes.c_void_p, doubles, doubles, ctypes.c_size_t]
    for x, y in zip(before.T, after.T):
        # Larger than any state here.
        state = ctypes.create_string_buffer(1 << 16)
        cascade.cascade_init(state, x[0])
        found = np.empty(len(x))
        start = 0
        for frames in [1, 4096, 999] * (len(x) // 5096 + 1):
            block = np.ascontiguousarray(x[start : start + frames])
            out = np.empty(len(block))
            cascade.cascade_process(state, block, out, len(block))
            found[start : start + frames] = out
            start += frames
        differs = np.flatnonzero(found.view(np.uint64) != np.ascontiguousarray(y).view(np.uint64))
        assert differs.size == 0, f"the C form differs at frame {differs[0]}"


def main(program, spec, recording):
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        text = Path(spec).read_text(encoding="utf-8")
        if "[output]" not in text:
            text = text.replace("\n[[", '\n[output]\nencoding = "same"\n\n[[', 1)
        assert 'encoding = "same"' in text, f"{spec} does not say encoding = \"same\""
        float_spec = folder / "spec.toml"
        float_spec.write_text(text.replace('encoding = "same"', 'encoding = "float64"'), encoding="utf-8")
        run = subprocess.run([program, "filter", float_spec, recording, folder / "out", "--quiet"])
        assert run.returncode in (0, 1), f"filter ended with {run.returncode}"
        before, rate_hz = soundfile.read(recording, dtype="float64", always_2d=True)
        after, _ = soundfile.read(folder / "out" / Path(recording).name, dtype="float64", always_2d=True)
        assert before.shape == after.shape and len(before) > 0, "no frames to compare"
        assert np.max(np.abs(before - after)) > 1e-3, "a filter that does nothing proves nothing"
        numpy_form = export(program, float_spec, rate_hz, "numpy")
        worst = check_numpy(numpy_form, before, after)
        if ring_frames(numpy_form) is None:
            check_c(export(program, float_spec, rate_hz, "c"), folder, before, after)
            print(f"{recording}: C the same bits in {before.size} samples, numpy within {worst}")
        else:
            print(f"{recording}: both passes by numpy within {worst}")


if __name__ == "__main__":
    main(*sys.argv[1:])
