"""Holds outputs against the PyPI package soundfile, whose reader is not of this project.

    python3 check_soundfile.py make FOLDER
    python3 check_soundfile.py check IN OUT [--history]

`make` writes one recording of each form and sample format into FOLDER: two tones, 997 Hz
to be filtered out and 3 kHz to be kept. `check` takes that folder and what a spec made of
it that cuts 997 Hz out and keeps the encoding. Each output must be of the form it was, its own
sizes must be those of the file, the package must read the frames, rate, channels, sample
format and samples that stand in its bytes as this script reads them, and of the tones only
one may be left. Then each output is damaged in several ways, and each must be found. With
--history (the spec had `history = true`) the recordings with a `bext` chunk must also name
this program there.

Layouts: Microsoft and IBM, "Multimedia Programming Interface and Data Specifications 1.0"
(1991); Microsoft, "Multiple Channel Audio Data and WAVE Files" (2001); EBU Tech 3306 and
ITU-R BS.2088 for `ds64`; all from memory.
"""

import struct
import sys
import tempfile
from pathlib import Path

import numpy as np
import soundfile

RATE_HZ = 48000
FRAMES = 3 * RATE_HZ + 1  # odd: 24-bit mono ends on an odd byte
CUT_HZ, KEPT_HZ = 997, 3000
NOT_KNOWN = 0xFFFFFFFF
GUID_TAIL = bytes.fromhex("800000aa00389b71")

# name: form, sample format as soundfile calls it, channels, extensible
RECORDINGS = {
    "riff-pcm8.wav": ("RIFF", "PCM_U8", 1, False),
    "riff-pcm16.wav": ("RIFF", "PCM_16", 2, False),
    "riff-pcm24.wav": ("RIFF", "PCM_24", 1, False),
    "riff-pcm32.wav": ("RIFF", "PCM_32", 1, False),
    "riff-float32.wav": ("RIFF", "FLOAT", 2, False),
    "riff-float64.wav": ("RIFF", "DOUBLE", 1, False),
    "riff-unfinished.wav": ("RIFF", "PCM_16", 2, False),
    "extensible-pcm24.wav": ("RIFF", "PCM_24", 4, True),
    "extensible-float32.wav": ("RIFF", "FLOAT", 2, True),
    "rf64-pcm16.wav": ("RF64", "PCM_16", 2, False),
    "rf64-pcm24.wav": ("RF64", "PCM_24", 1, False),
    "rf64-extensible-float32.wav": ("RF64", "FLOAT", 3, True),
    "bw64-pcm24.wav": ("BW64", "PCM_24", 2, False),
    "bw64-float32.wav": ("BW64", "FLOAT", 1, False),
    "rifx-pcm16.wav": ("RIFX", "PCM_16", 2, False),
    "rifx-pcm24.wav": ("RIFX", "PCM_24", 1, False),
    "rifx-float32.wav": ("RIFX", "FLOAT", 1, False),
    "rifx-extensible-pcm32.wav": ("RIFX", "PCM_32", 2, True),
}
# Those with a `bext` chunk, which the history goes into (EBU Tech 3285; R98 for its lines).
WITH_BEXT = {"riff-pcm16.wav", "rf64-pcm16.wav", "bw64-pcm24.wav"}
CODING_HISTORY = b"A=PCM,F=48000,W=16,M=mono,T=recorder\r\n"
BITS = {"PCM_U8": 8, "PCM_16": 16, "PCM_24": 24, "PCM_32": 32, "FLOAT": 32, "DOUBLE": 64}
# libsndfile 1.2.2 does not know the form under its later name; it is the same in all else.
READ_AS = {"BW64": b"RF64"}


def samples_of(channels):
    """Two tones, a little apart in phase from channel to channel."""
    time = np.arange(FRAMES)[:, None] / RATE_HZ
    phase = np.arange(channels)[None, :]
    return 0.3 * np.sin(2 * np.pi * CUT_HZ * time + phase) + 0.2 * np.sin(2 * np.pi * KEPT_HZ * time + phase)


def encoded(samples, subtype, big):
    order = ">" if big else "<"
    if subtype in ("FLOAT", "DOUBLE"):
        return samples.astype(order + ("f4" if subtype == "FLOAT" else "f8")).tobytes()
    bits = BITS[subtype]
    steps = np.rint(samples * 2.0 ** (bits - 1)).astype(np.int64)
    if subtype == "PCM_U8":
        return (steps + 128).astype("u1").tobytes()
    wide = steps.astype(order + "i4").tobytes()
    if bits == 32:
        return wide
    wide = np.frombuffer(wide, "u1").reshape(-1, 4)
    used = wide[:, 4 - bits // 8 :] if big else wide[:, : bits // 8]
    return used.tobytes()


def made(name):
    """The bytes of a recording, by its row in the table."""
    form, subtype, channels, extensible = RECORDINGS[name]
    order = ">" if form == "RIFX" else "<"
    wide = form in ("RF64", "BW64")
    samples = encoded(samples_of(channels), subtype, form == "RIFX")
    bits = BITS[subtype]
    frame = channels * bits // 8
    code = 3 if subtype in ("FLOAT", "DOUBLE") else 1
    tag = 0xFFFE if extensible else code
    fmt = struct.pack(order + "HHIIHH", tag, channels, RATE_HZ, RATE_HZ * frame, frame, bits)
    if extensible:
        fmt += struct.pack(order + "HHI", 22, bits, (1 << channels) - 1) + struct.pack(order + "IHH", code, 0, 16) + GUID_TAIL

    def chunk(name, body):
        return name + struct.pack(order + "I", len(body)) + body + b"\0" * (len(body) % 2)

    body = b"WAVE" + (b"\0" * 36 if wide else b"") + chunk(b"fmt ", fmt)
    if code == 3:
        body += chunk(b"fact", struct.pack(order + "I", FRAMES))
    if name in WITH_BEXT:
        body += chunk(b"bext", b"Two tones".ljust(602, b"\0") + CODING_HISTORY)
    # libsndfile 1.2.2 does not find the samples of an RF64 behind a chunk of odd size.
    body += chunk(b"note", b"even" if wide else b"odd") + chunk(b"data", samples) + chunk(b"next", b"odd")
    sized = bytearray(form.encode() + struct.pack(order + "I", len(body)) + body)
    data = sized.index(b"data")
    if wide:
        sizes = struct.pack("<QQQI", len(body), len(samples), FRAMES, 0)
        sized[12:48] = b"ds64" + struct.pack("<I", len(sizes)) + sizes
        struct.pack_into("<I", sized, 4, NOT_KNOWN)
        struct.pack_into("<I", sized, data + 4, NOT_KNOWN)
    if name == "riff-unfinished.wav":  # the battery went flat within the last frame
        sized = sized[: data + 8 + len(samples) - 1]
        struct.pack_into("<I", sized, 4, 0)
        struct.pack_into("<I", sized, data + 4, 0)
    return bytes(sized)


def parsed(content):
    """Form, `fmt ` fields and samples of a file whose sizes must all be right."""
    form = content[:4].decode()
    order = ">" if form == "RIFX" else "<"
    size = struct.unpack_from(order + "I", content, 4)[0]
    assert content[8:12] == b"WAVE", content[8:12]
    wide = None
    if form in ("RF64", "BW64"):
        assert content[12:16] == b"ds64" and size == NOT_KNOWN, (content[12:16], size)
        size, wide, frames = struct.unpack_from("<QQQ", content, 20)
    assert size == len(content) - 8, f"the size of the whole is {size}, there are {len(content) - 8} bytes"
    at, found = 12, {}
    while at < len(content):
        name, size = struct.unpack_from(order + "4sI", content, at)
        if name == b"data" and wide is not None:
            assert size == NOT_KNOWN, size
            size = wide
        assert at + 8 + size <= len(content), f"{name} ends after the file"
        assert name not in found, f"{name} twice"
        found[name] = content[at + 8 : at + 8 + size]
        at += 8 + size + size % 2
    assert at == len(content), f"the last chunk ends at {at}, the file at {len(content)}"
    tag, channels, rate, second, frame, bits = struct.unpack_from(order + "HHIIHH", found[b"fmt "])
    if tag == 0xFFFE:
        tag = struct.unpack_from(order + "I", found[b"fmt "], 24)[0]
    assert frame == channels * bits // 8 and second == rate * frame and len(found[b"data"]) % frame == 0
    if wide is not None:
        assert frames in (0, len(found[b"data"]) // frame), f"ds64 says {frames} frames"
    subtype = {1: {8: "PCM_U8", 16: "PCM_16", 24: "PCM_24", 32: "PCM_32"}, 3: {32: "FLOAT", 64: "DOUBLE"}}[tag][bits]
    return form, subtype, channels, rate, decoded(found[b"data"], subtype, order).reshape(-1, channels)


def decoded(data, subtype, order):
    """Samples in units of full scale, exact in f64."""
    if subtype in ("FLOAT", "DOUBLE"):
        return np.frombuffer(data, order + ("f4" if subtype == "FLOAT" else "f8")).astype("f8")
    if subtype == "PCM_U8":
        return (np.frombuffer(data, "u1").astype("f8") - 128) / 128
    if subtype == "PCM_24":
        three = np.frombuffer(data, "u1").reshape(-1, 3).astype("i4")
        low, middle, high = (three[:, place] for place in ((2, 1, 0) if order == ">" else (0, 1, 2)))
        steps = low | middle << 8 | high << 16
        return (steps - ((steps & 0x800000) << 1)).astype("f8") / 2.0**23
    bits = BITS[subtype]
    return np.frombuffer(data, f"{order}i{bits // 8}").astype("f8") / 2.0 ** (bits - 1)


def level(samples, hz):
    """Amplitude of a tone in each channel, over whole periods once the filter has settled."""
    settled = samples[RATE_HZ : 3 * RATE_HZ]
    time = np.arange(len(settled))[:, None] / RATE_HZ
    window = np.hanning(len(settled))[:, None]
    return 2 * np.abs((settled * window * np.exp(-2j * np.pi * hz * time)).sum(axis=0)) / window.sum()


def check_file(name, content):
    """Raises whatever is not as it should be of the output `content`."""
    form, subtype, channels, _ = RECORDINGS[name]
    frames = FRAMES - (name == "riff-unfinished.wav")
    own = parsed(content)
    assert own[:4] == (form, subtype, channels, RATE_HZ), own[:4]
    assert own[4].shape == (frames, channels), own[4].shape
    with tempfile.NamedTemporaryFile(suffix=".wav") as file:
        file.write(READ_AS.get(form, content[:4]) + content[4:])
        file.flush()
        with soundfile.SoundFile(file.name) as sound:
            seen = (sound.frames, sound.samplerate, sound.channels, sound.subtype, sound.endian)
            samples = sound.read(dtype="float64", always_2d=True)
    order = "BIG" if form == "RIFX" else "FILE"
    assert seen == (frames, RATE_HZ, channels, subtype, order), seen
    assert np.array_equal(samples, own[4]), "the package reads other samples"
    # 8 bits are dithered by two steps, peak to peak: 2^-7 and less in one bin.
    kept, cut = level(samples, KEPT_HZ), level(samples, CUT_HZ)
    assert np.all(np.abs(kept - 0.2) < 0.002), f"{KEPT_HZ} Hz came out at {kept}, 0.2 went in"
    assert np.all(cut < 0.003), f"{CUT_HZ} Hz came out at {cut}"


def damages(content):
    """What may befall an output, by name."""
    order = ">" if content[:4] == b"RIFX" else "<"
    fmt, data = content.index(b"fmt "), content.index(b"data")
    wide = content[:4] in (b"RF64", b"BW64")

    def put(at, form, value):
        changed = bytearray(content)
        struct.pack_into(order + form, changed, at, value)
        return bytes(changed)

    yield "cut off", content[:-1000]
    yield "the size of the whole", put(20, "Q", len(content)) if wide else put(4, "I", len(content))
    yield "the size of the samples", put(28, "Q", 4800) if wide else put(data + 4, "I", 4800)
    yield "the sample rate", put(fmt + 12, "I", 44100)
    yield "the number of channels", put(fmt + 10, "H", 7)
    middle = data + 8 + (len(content) - data) // 2
    yield "a stretch of samples", content[:middle] + bytes(40000) + content[middle + 40000 :]
    yield "not filtered", None


def make(folder):
    folder.mkdir(parents=True, exist_ok=True)
    for name in RECORDINGS:
        (folder / name).write_bytes(made(name))


def check(before, after, history):
    count = 0
    for name in RECORDINGS:
        assert (before / name).read_bytes() == made(name), f"{name} is not what was made"
        content = (after / name).read_bytes()
        try:
            check_file(name, content)
        except Exception as error:
            raise AssertionError(f"{name}: {error}") from error
        assert (b"bandproof" in content) == (history and name in WITH_BEXT), f"{name}: a history too many or too few"
        for damage, changed in damages(content):
            if changed is None:
                changed = made(name)
            try:
                check_file(name, changed)
            except Exception:
                count += 1
            else:
                raise AssertionError(f"{name}: damaged ({damage}), and it still counts as right")
    listed = {path.name for path in after.iterdir() if path.suffix == ".wav"}
    assert listed == set(RECORDINGS), listed ^ set(RECORDINGS)
    print(f"{after}: {len(RECORDINGS)} outputs read alike by soundfile; {count} damaged copies found")


if __name__ == "__main__":
    match sys.argv[1:]:
        case ["make", folder]:
            make(Path(folder))
        case ["check", before, after]:
            check(Path(before), Path(after), False)
        case ["check", before, after, "--history"]:
            check(Path(before), Path(after), True)
        case _:
            sys.exit(__doc__)
