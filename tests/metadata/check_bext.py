"""Holds `bext`, markers and loops before a run against what is there after it, as read by
the PyPI package wavinfo, a reader that is not of this project, and makes sure that the check
can fail.

    python3 check_bext.py make FOLDER
    python3 check_bext.py check IN OUT [--history]

`make` writes recordings with such chunks into FOLDER; it needs the standard library only.
`check` reads every recording of IN and the one of the same name in OUT: everything that the
package reads but the samples must be the same, and with --history (the run's spec had
`history = true`) the coding history must have exactly one line more, at its end. The spec
must keep the encoding, or the format of the samples is another.
"""

import struct
import sys
from pathlib import Path

from recordings import chunk, recording

BEXT_BYTES = 602


def bext(version, history=b""):
    """EBU Tech 3285 v2, from memory: texts, time reference, version, UMID, five loudness figures, reserve."""
    umid = bytes(range(64)) if version > 0 else bytes(64)
    loudness = (-2300, 500, -100, -2000, -2100) if version > 1 else (0,) * 5
    texts = (b"Reed bed, second week", b"a recorder", b"RB0002", b"2031-05-02", b"06:10:00")
    body = struct.pack("<256s32s32s10s8sQH64s5h180s", *texts, 1_065_600_000, version, umid, *loudness, b"")
    assert len(body) == BEXT_BYTES
    return chunk(b"bext", body + history)


def markers():
    cues = [(1, 10), (2, 500)]
    cue = struct.pack("<I", len(cues)) + b"".join(struct.pack("<II4sIII", n, at, b"data", 0, 0, at) for n, at in cues)
    texts = [chunk(b"labl", struct.pack("<I", n) + f"marker {n}".encode() + b"\0") for n, _ in cues]
    texts.append(chunk(b"note", struct.pack("<I", 1) + b"heron?\0"))
    return chunk(b"cue ", cue) + chunk(b"LIST", b"adtl" + b"".join(texts))


def info():
    return chunk(b"LIST", b"INFO" + chunk(b"INAM", b"Reed bed\0") + chunk(b"ICMT", b"second week\0"))


def smpl():
    return chunk(b"smpl", struct.pack("<9I", 0, 0, 20_833, 60, 0, 0, 0, 1, 0) + struct.pack("<6I", 1, 0, 100, 400, 0, 0))


def make(folder):
    folder.mkdir(parents=True, exist_ok=True)
    line = b"A=PCM,F=48000,W=16,M=mono,T=recorder\r\n"
    everything = markers() + info() + smpl()
    files = {
        "version-0.wav": recording(before=bext(0)),
        "version-1.wav": recording(before=bext(1, line), after=everything),
        "version-2.wav": recording(before=bext(2, 2 * line), after=everything),
        "after-data.wav": recording(before=everything, after=bext(1, line)),
        "open-end.wav": recording(before=bext(1, line.rstrip())),
        "padded.wav": recording(before=bext(1, line + bytes(400))),
        "padded-little.wav": recording(before=bext(1, line + bytes(3))),
        "without.wav": recording(before=everything),
    }
    for name, content in files.items():
        (folder / name).write_bytes(content)


def facts(path):
    """Everything the package reads, by scope and key, the coding history apart as its lines."""
    from wavinfo import WavInfoReader

    read = {f"{scope}.{key}": value for scope, key, value in WavInfoReader(str(path)).walk()}
    history = read.pop("bext.coding_history", None)
    return read, None if history is None else history.splitlines()


def faults(before, after, history):
    """What is wrong with the facts after, by what they were before."""
    (read, lines), (read_after, lines_after) = before, after
    keys = {**read, **read_after}
    found = [f"{key}: {read.get(key)!r} became {read_after.get(key)!r}" for key in keys if read.get(key) != read_after.get(key)]
    if lines is None or lines_after is None:
        return found + ([] if lines is lines_after is None else ["`bext` came or went"])
    if lines_after[: len(lines)] != lines:
        found.append(f"the coding history {lines!r} became {lines_after!r}")
    added = lines_after[len(lines) :]
    if len(added) != history:
        found.append(f"{history} lines were to be added to the coding history, found {added!r}")
    for line in added:
        letters = [field[:2] for field in line.split(",")]
        if letters != ["A=", "F=", "W=", "M=", "T="] or len(line.split()[-1]) != 64:
            found.append(f"{line!r} is no line of a coding history with a SHA-256 at its end")
    return found


def check(source, target, history):
    seen = added = 0
    for path in sorted(source.rglob("*.wav")):
        other = target / path.relative_to(source)
        before, after = facts(path), facts(other)
        expected = int(history and before[1] is not None)
        found = faults(before, after, expected)
        assert not found, f"{other}: {'; '.join(found)}"
        seen += 1
        added += expected
        # A check that can't fail shows nothing.
        read, lines = after
        for key in [key for key in read if before[0][key]][:40]:
            assert faults(before, ({**read, key: None}, lines), expected), f"{key} went unseen"
        if lines is not None:
            assert faults(before, after, 1 - expected), "a line too many or too few went unseen"
            assert faults(before, (read, ["A=ANALOGUE", *lines[1:]]), expected), "a changed line went unseen"
    assert seen >= 8, f"{seen} recordings in {source}, expected those of `make`"
    print(f"wavinfo: {seen} recordings with the same facts before and after, {added} lines of coding history added")


def main(arguments):
    match arguments:
        case ["make", folder]:
            make(Path(folder))
        case ["check", source, target]:
            check(Path(source), Path(target), False)
        case ["check", source, target, "--history"]:
            check(Path(source), Path(target), True)
        case _:
            sys.exit(__doc__)


if __name__ == "__main__":
    main(sys.argv[1:])
