"""Holds GUANO metadata before a run against what is there after it, as read by the PyPI
package guano, an implementation of the GUANO metadata specification that is not of this
project, and makes sure that the check can fail.

    python3 check_guano.py make FOLDER
    python3 check_guano.py check IN OUT [--history]

`make` writes recordings with `guan` chunks into FOLDER; it needs the standard library only.
`check` reads every recording of IN that has GUANO metadata and the one of the same name in
OUT: every field must be the same, and with --history (the run's spec had `history = true`)
exactly one must have been added, in the namespace `Bandproof`. Recordings with a `bext`
chunk get their history there: their fields are the same either way. Some recordings that
`make` writes are time-expanded, so the spec must say `rate`.

guano 1.0.16 splits lines at LF alone and takes no field without a value: recordings here
end their lines by LF or CR LF.
"""

import sys
from pathlib import Path

from recordings import RATE_HZ, chunk, recording

NAMESPACE = "Bandproof"


FIELDS = [
    "GUANO|Version: 1.0",
    "Timestamp: 2031-05-02T22:10:00+02:00",
    "Loc Position: 53.5001 9.9002",
    "Length: 2.00",
    "Filter HP: 16.0",
    "Note: bittern, then rain\\nsecond line",
    "Species Manual ID: caf\u00e9",
    "Recorder|Gain: 12",
    "Recorder|Firmware Version: 3.1|b",
]


def guan(lines, end="\n", pad=b""):
    return chunk(b"guan", "".join(line + end for line in lines).encode() + pad)


def make(folder):
    folder.mkdir(parents=True, exist_ok=True)
    own_rate = [*FIELDS, f"Samplerate: {RATE_HZ}", "TE: 1"]
    expanded = [*FIELDS, f"Samplerate: {10 * RATE_HZ}", "TE: 10"]
    bext = chunk(b"bext", b"Reed bed".ljust(602, b"\0"))
    files = {
        "before.wav": recording(before=guan(own_rate)),
        "after.wav": recording(after=guan(own_rate)),
        "crlf.wav": recording(after=guan(own_rate, "\r\n")),
        "open-end.wav": recording(after=chunk(b"guan", "\n".join(own_rate).encode())),
        "padded.wav": recording(before=guan(own_rate, pad=bytes(600))),
        "padded-little.wav": recording(before=guan(own_rate, pad=bytes(7))),
        "former-run.wav": recording(after=guan([*own_rate, "Bandproof|History: by hand"])),
        "expanded.wav": recording(after=guan(expanded)),
        "with-bext.wav": recording(before=bext, after=guan(own_rate)),
        "without.wav": recording(),
    }
    for name, content in files.items():
        (folder / name).write_bytes(content)


def fields(path):
    """Every field by its full key."""
    from guano import GuanoFile

    return {f"{space}|{key}" if space else key: value for space, key, value in GuanoFile(str(path)).items_namespaced()}


def has_bext(path):
    return b"bext" in path.read_bytes()[:4096]


def faults(before, after, history):
    """What is wrong with the fields after, by what they were before."""
    found = [f"{key}: {before[key]!r} became {after.get(key)!r}" for key in before if after.get(key) != before[key]]
    added = [key for key in after if key not in before]
    mine = [key for key in added if key.startswith(f"{NAMESPACE}|History")]
    if len(added) != history or len(mine) != history:
        found.append(f"{history} fields were to be added, found {added}")
    found += [f"{key}: {after[key]!r} names no SHA-256" for key in mine if len(after[key].split()[-1]) != 64]
    return found


def check(source, target, history):
    seen = added = 0
    for path in sorted(source.rglob("*.wav")):
        other = target / path.relative_to(source)
        before = fields(path)
        if not before:
            continue
        after = fields(other)
        expected = int(history and not has_bext(path))
        found = faults(before, after, expected)
        assert not found, f"{other}: {'; '.join(found)}"
        seen += 1
        added += expected
        # A check that can't fail shows nothing.
        key = next(iter(before))
        assert faults(before, {**after, key: "?"}, expected), "a changed field went unseen"
        assert faults(before, {k: v for k, v in after.items() if k != key}, expected), "a lost field went unseen"
        assert faults(before, {**after, "Other|Key": "x"}, expected), "an added field went unseen"
        assert faults(before, after, 1 - expected), "a history too many or too few went unseen"
    assert seen >= 9, f"{seen} recordings with GUANO metadata in {source}, expected those of `make`"
    print(f"guano: {seen} recordings with the same fields before and after, {added} fields of history added")


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
