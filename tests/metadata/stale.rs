//! Chunks that describe samples which are gone are named, and no others.

use crate::build::{RawChunk, pcm16_mono, raw};
use crate::chunks::{bext, expanded_tenfold, markers, plain_bext, smpl};
use bandproof::wave::{Reader, stale_chunks};
use std::io::Cursor;

fn named(chunk: &RawChunk) -> Vec<String> {
    let file = pcm16_mono(std::slice::from_ref(chunk), 100, &[]);
    stale_chunks(Reader::open(Cursor::new(file)).unwrap().header())
}

#[test]
fn what_describes_the_samples_is_named() {
    let utf16 = |text: &str| text.encode_utf16().flat_map(u16::to_le_bytes).collect::<Vec<_>>();
    for (chunk, what) in [
        (raw(b"PEAK", &[0; 16]), "the peaks"),
        (raw(b"levl", &[0; 128]), "the peak envelope"),
        (raw(b"qlty", b"A01"), "the quality report"),
        (raw(b"MD5 ", &[7; 16]), "the checksum"),
        (raw(b"C2PA", &[7; 16]), "the signed checksum"),
        (raw(b"dbmd", &[1; 20]), "the loudness"),
        (raw(b"bext", &bext(2, [-2300, 0x7fff, 0x7fff, 0x7fff, 0x7fff], b"")), "the loudness"),
        (raw(b"bext", &bext(2, [0, 0, 0, 0, 1], b"")), "the loudness"),
        (raw(b"iXML", b"<BWFXML><LOUDNESS><LOUDNESS_VALUE>-23"), "the loudness"),
        (raw(b"axml", b"<audioProgramme><loudnessMetadata><integratedLoudness>"), "the loudness"),
        (raw(b"ID3 ", b"ID3\x04TXXX\0\0\0\x03REPLAYGAIN_TRACK_GAIN\0-3 dB"), "the loudness"),
        (raw(b"id3 ", &utf16("replaygain_track_peak")), "the loudness"),
    ] {
        let name = chunk.id.escape_ascii();
        let expected = format!("chunk `{name}` at byte 36 was kept and gives {what} of the samples before filtering");
        assert_eq!(named(&chunk), [expected], "{what}");
    }
}

#[test]
fn what_stays_right_is_not_named() {
    let [cue, adtl] = markers();
    for chunk in [
        plain_bext(b"A=PCM\r\n"),
        // Version 1 has no figures there, whatever stands in it; in version 2 0x7fff is none.
        raw(b"bext", &{
            let mut body = bext(1, [0; 5], b"");
            body[412..422].fill(9);
            body
        }),
        raw(b"bext", &bext(2, [0x7fff; 5], b"")),
        raw(b"bext", &bext(2, [0; 5], b"")),
        raw(b"bext", &[0xff; 421]),
        cue,
        adtl,
        smpl(),
        raw(b"inst", &[60, 0, 0, 0, 127, 0, 127]),
        raw(b"fact", &100_u32.to_le_bytes()),
        expanded_tenfold(480_000),
        raw(b"iXML", b"<BWFXML><SPEED><FILE_SAMPLE_RATE>48000"),
        raw(b"axml", b"<audioFormatExtended/>"),
        raw(b"ID3 ", b"ID3\x04TIT2"),
        raw(b"JUNK", b"loudness replaygain"),
    ] {
        assert_eq!(named(&chunk), [""; 0], "{}", chunk.id.escape_ascii());
    }
}
