"""Recordings that check_bext.py and check_guano.py put chunks around; standard library only."""

import math
import struct

RATE_HZ = 48_000


def chunk(name, body):
    return name + struct.pack("<I", len(body)) + body + b"\0" * (len(body) % 2)


def recording(before=b"", after=b"", seconds=2.0):
    """A tone at 1 kHz over something like noise, 16 bits, mono, between chunks."""
    frames = int(seconds * RATE_HZ)
    state, codes = 1, []
    for frame in range(frames):
        state = (1_103_515_245 * state + 12_345) % 2**31
        tone = 6000 * math.sin(2 * math.pi * 1000 * frame / RATE_HZ)
        codes.append(round(tone + (state >> 20) - 1024))
    fmt = chunk(b"fmt ", struct.pack("<HHIIHH", 1, 1, RATE_HZ, 2 * RATE_HZ, 2, 16))
    chunks = fmt + before + chunk(b"data", struct.pack(f"<{frames}h", *codes)) + after
    return b"RIFF" + struct.pack("<I", 4 + len(chunks)) + b"WAVE" + chunks
