"""Holds a bag against the PyPI package bagit, an implementation of RFC 8493 that is
not of this project, and makes sure that the check can fail.

    python3 check_bag.py BAG [COPY]

BAG must be valid and complete. Copies of it (made beside it, or at COPY, and removed
again) are then damaged, one way each, and each must be found invalid.

bagit 1.9.0 undoes the percent-encoding of line breaks and not that of `%` (section
2.1.3 of the RFC): it reads names that hold a `%` wrongly, so BAG must have none.
"""

import logging
import os
import shutil
import sys
from pathlib import Path

import bagit

TAG_FILES = ["bag-info.txt", "bagit.txt", "manifest-sha256.txt", "tagmanifest-sha256.txt"]


def faults(folder):
    """What the package finds wrong with the bag, as one text; empty for nothing."""
    try:
        bagit.Bag(str(folder)).validate()
    except bagit.BagError as error:
        return str(error) or repr(error)
    return ""


def payload(folder):
    """Every file below data/, relative to the bag, `/` between names."""
    return {path.relative_to(folder).as_posix() for path in (folder / "data").rglob("*") if not path.is_dir()}


def change_a_byte(path):
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)


def damages(some_file):
    """Names of damages, and what each does to a copy of the bag."""
    return {
        "one byte of the payload changed": lambda bag: change_a_byte(bag / some_file),
        "a file added to the payload": lambda bag: (bag / "data" / "added.txt").write_text("added"),
        "a file of the payload gone": lambda bag: (bag / some_file).unlink(),
        "one byte of the payload's manifest changed": lambda bag: change_a_byte(bag / "manifest-sha256.txt"),
        "one byte of bag-info.txt changed": lambda bag: change_a_byte(bag / "bag-info.txt"),
        "no declaration": lambda bag: (bag / "bagit.txt").unlink(),
    }


def main(folder, copy):
    wrong = faults(folder)
    assert not wrong, f"{folder} is no valid bag: {wrong}"
    bag = bagit.Bag(str(folder))
    assert bag.version == "1.0" and bag.encoding.upper() == "UTF-8", (bag.version, bag.encoding)

    # Completeness by this script's own walk: all that is there is listed, and nothing else.
    files = payload(folder)
    assert files, "a payload without files proves nothing"
    assert set(bag.payload_entries()) == files, set(bag.payload_entries()) ^ files
    sizes = sum((folder / path).stat().st_size for path in files)
    assert bag.info["Payload-Oxum"] == f"{sizes}.{len(files)}", bag.info["Payload-Oxum"]
    listed = set(bag.tagfile_entries())
    assert set(TAG_FILES) - {"tagmanifest-sha256.txt"} <= listed, listed
    left = [name for name in os.listdir(folder) if name.startswith(".bandproof")]
    assert not left, left

    for name, damage in damages(max(files, key=lambda path: ((folder / path).stat().st_size, path))).items():
        shutil.copytree(folder, copy)
        try:
            damage(copy)
            wrong = faults(copy)
        finally:
            shutil.rmtree(copy)
        assert wrong, f"{name}, and the bag still counts as valid"
    print(f"{folder}: {len(files)} files of payload, valid; {len(damages(''))} kinds of damage found")


if __name__ == "__main__":
    logging.disable(logging.CRITICAL)  # faults are raised too
    folder = Path(sys.argv[1])
    main(folder, Path(sys.argv[2]) if len(sys.argv) > 2 else folder.with_name(folder.name + "-damaged"))
