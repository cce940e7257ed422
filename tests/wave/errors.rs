//! What can't be read fails with a sentence: place, what was found, what was
//! expected.

use std::io::Cursor;

use bandproof::wave::{Changes, Encoding, Reader, SampleFormat, Writer};

use crate::build::{FLOAT, FmtFields, PCM, pcm16_mono, raw, riff};
use crate::run::{copy, error};

#[test]
fn files_that_are_no_wav_files_say_what_they_begin_with() {
    assert!(error(b"").starts_with("empty: the file has 0 bytes"));
    assert!(error(b"Dear diary, a text file named .wav").starts_with("byte 0: found `Dear`, expected `RIFF`"));
    assert!(error(b"\x00\x01").starts_with("byte 0: found the bytes 00 01, expected `RIFF`"));
    assert!(error(b"RIFF\x04\0\0\0AVI ").starts_with("byte 8: found `AVI `, expected `WAVE`"));
    for cut in 1..12 {
        let text = error(&b"RIFF\x04\0\0\0WAVE"[..cut]);
        assert!(text.starts_with(&format!("byte {cut}: the file ends inside its header")), "{text}");
    }
    let only_head = error(b"RIFF\x04\0\0\0WAVE");
    assert!(only_head.starts_with("byte 12: the file ends, expected a `data` chunk"), "{only_head}");
    let form = error(b"FORM\0\0\0\x04AIFF");
    assert!(form.starts_with("byte 0: FORM files") && form.contains("convert"), "{form}");
}

#[test]
fn arrangements_not_read_are_named_with_their_place() {
    let fmt = FmtFields::plain(PCM, 1, 16).chunk();
    let data = raw(b"data", &[0; 4]);
    let cases = [
        (riff(&[fmt.clone(), data.clone(), data.clone()]), "byte 48: a second `data` chunk is not read"),
        (riff(&[fmt.clone(), fmt.clone(), data.clone()]), "byte 36: a second `fmt ` chunk is not read"),
        (riff(&[fmt.clone(), raw(b"LIST", b"wavldata\0\0\0\0")]), "byte 36: a `wavl` list"),
        (riff(&[fmt.clone(), data.clone(), raw(b"RIFF", b"WAVE")]), "byte 48: a second `RIFF`"),
        (riff(std::slice::from_ref(&data)), "byte 12: `data` without a `fmt ` chunk"),
        (riff(&[fmt.clone(), raw(b"LIST", b"INFO")]), "byte 48: the file ends, expected a `data` chunk"),
        (
            riff(&[fmt.clone(), raw(b"LIST", b"INFO").declaring(9000), data.clone()]),
            "byte 36: chunk `LIST` claims 9000 bytes, the file ends after 16",
        ),
        (
            riff(&[fmt.clone(), raw(b"\0\0\0\0", &[]), data.clone()]),
            "byte 36: found the bytes 00 00 00 00 where a chunk before `data` should begin",
        ),
    ];
    for (file, expected) in cases {
        let text = error(&file);
        assert!(text.starts_with(expected), "{text}");
    }
    let endless: Vec<_> = (0..5000).map(|_| raw(b"abcd", &[])).collect();
    assert!(error(&riff(&[vec![fmt], endless, vec![data]].concat())).contains("more than 4096 chunks"));
}

#[test]
fn codings_other_than_pcm_and_float_are_named() {
    // Format tags as registered in RFC 2361, Appendix A (from memory).
    let cases = [
        (0x0002, "Microsoft ADPCM"),
        (0x0006, "A-law"),
        (0x0007, "mu-law"),
        (0x0011, "IMA ADPCM"),
        (0x0031, "GSM 6.10"),
        (0x0050, "MPEG layer 1 or 2"),
        (0x0055, "MPEG layer 3"),
        (0xabcd, "format tag 0xabcd"),
    ];
    for (tag, name) in cases {
        let plain = FmtFields::plain(tag, 1, 8);
        let text = error(&riff(&[plain.chunk(), raw(b"data", &[0; 4])]));
        assert!(text.starts_with(&format!("byte 20: samples are stored as {name}")), "{text}");
        let text = error(&riff(&[plain.extensible(8, 4).chunk(), raw(b"data", &[0; 4])]));
        assert!(text.starts_with(&format!("byte 44: samples are stored as {name}")), "{text}");
    }
    let mut fmt = FmtFields::plain(PCM, 1, 8).extensible(8, 4).chunk();
    fmt.body[30] ^= 1;
    let text = error(&riff(&[fmt, raw(b"data", &[0; 4])]));
    assert!(text.contains("sub-format 0100000000001100800000aa00389b71"), "{text}");
}

#[test]
fn fields_of_fmt_that_can_not_be_are_named_with_their_place() {
    let damaged = |at: usize, bytes: &[u8], fmt: FmtFields| {
        let mut chunk = fmt.chunk();
        chunk.body[at..at + bytes.len()].copy_from_slice(bytes);
        error(&riff(&[chunk, raw(b"data", &[0; 24])]))
    };
    let pcm = FmtFields::plain(PCM, 2, 16);
    let float = FmtFields::plain(FLOAT, 1, 32);
    let wide = pcm.extensible(16, 3);
    let cases = [
        (damaged(2, &[0, 0], pcm), "byte 22: `fmt ` says 0 channels, expected at least 1"),
        (damaged(4, &[0; 4], pcm), "byte 24: `fmt ` says a sample rate of 0 Hz"),
        (damaged(14, &[0, 0], pcm), "byte 34: `fmt ` says 0 bits a sample for PCM, expected 1 to 32"),
        (damaged(14, &[64, 0], pcm), "byte 34: `fmt ` says 64 bits a sample for PCM"),
        (damaged(14, &[16, 0], float), "byte 34: `fmt ` says 16 bits a sample for IEEE float, expected 32 or 64"),
        (damaged(8, &[0, 0, 0, 0, 0, 0], pcm), "byte 32: `fmt ` says a block align of 0 for 2 channels of 16 bits"),
        (damaged(8, &[0, 0, 0, 0, 5, 0], pcm), "byte 32: `fmt ` says a block align of 5"),
        (damaged(8, &[0, 0, 0, 0, 2, 0], pcm), "byte 32: `fmt ` says a block align of 2"),
        (damaged(18, &[17, 0], wide), "byte 38: `fmt ` says 17 valid bits, expected 1 to 16"),
        (damaged(16, &[20, 0], wide), "byte 36: `fmt ` says an extension of 20 bytes in a chunk of 40"),
    ];
    for (text, expected) in cases {
        assert!(text.starts_with(expected), "{text}");
    }
    let short = error(&riff(&[raw(b"fmt ", &pcm.body()[..14]), raw(b"data", &[0; 24])]));
    assert!(short.starts_with("byte 12: `fmt ` holds 14 bytes, expected at least 16"), "{short}");
    let short = error(&riff(&[raw(b"fmt ", &wide.body()[..24]), raw(b"data", &[0; 24])]));
    assert!(short.starts_with("byte 12: `fmt ` holds 24 bytes, expected at least 40"), "{short}");
}

#[test]
fn two_of_bits_block_align_and_byte_rate_outvote_the_third() {
    let with = |byte_rate: u32, align: u16| {
        let mut chunk = FmtFields::plain(PCM, 2, 16).chunk();
        chunk.body[8..12].copy_from_slice(&byte_rate.to_le_bytes());
        chunk.body[12..14].copy_from_slice(&align.to_le_bytes());
        riff(&[chunk, raw(b"data", &[0; 24])])
    };
    for (file, frames, encoding, note) in [
        (with(48_000 * 4, 4), 6, Encoding::Pcm16, None),
        (with(48_000 * 4, 3), 6, Encoding::Pcm16, Some("block align of 3 (byte 32)")),
        (with(48_000 * 4, 0), 6, Encoding::Pcm16, Some("block align of 0 (byte 32)")),
        (with(1, 4), 6, Encoding::Pcm16, Some("declares 1 bytes a second (byte 28)")),
        (with(48_000 * 8, 8), 3, Encoding::Pcm32, Some("16 bits in the upper part of 4 bytes")),
    ] {
        let copied = copy(&file).unwrap();
        assert_eq!((copied.header.frames, copied.header.format.encoding), (frames, encoding));
        assert!(copied.output == file);
        assert_eq!(copied.header.notes.len(), usize::from(note.is_some()));
        assert!(note.is_none_or(|note| copied.header.notes[0].contains(note)), "{:?}", copied.header.notes);
    }
}

#[test]
fn zero_frames_are_empty() {
    let text = error(&pcm16_mono(&[], 0, &[]));
    assert!(text.starts_with("empty: `data` at byte 36 holds 0 bytes and a frame takes 2"), "{text}");
    let text = error(&riff(&[FmtFields::plain(PCM, 2, 16).chunk(), raw(b"data", &[0; 3])]));
    assert!(text.starts_with("empty: `data` at byte 36 holds 3 bytes and a frame takes 4"), "{text}");
    for empty in [Vec::new(), pcm16_mono(&[], 0, &[])] {
        assert!(Reader::open(Cursor::new(empty)).unwrap_err().to_string().starts_with("empty: "));
    }
    assert!(!Reader::open(Cursor::new(b"text")).unwrap_err().to_string().starts_with("empty: "));
}

#[test]
fn the_first_sample_that_is_not_finite_is_named_by_frame_and_channel() {
    for (bits, value) in [(32, f64::NAN), (32, f64::INFINITY), (64, f64::NAN), (64, f64::NEG_INFINITY)] {
        let mut values = vec![0.25f64; 3 * 50_000];
        // Frame 40000: channels 2 and 3; a later frame: channel 1.
        for at in [3 * 40_000 + 1, 3 * 40_000 + 2, 3 * 40_001] {
            values[at] = value;
        }
        let bytes: Vec<u8> = match bits {
            32 => values.iter().flat_map(|&x| (x as f32).to_le_bytes()).collect(),
            _ => values.iter().flat_map(|x| x.to_le_bytes()).collect(),
        };
        let fmt = FmtFields::plain(FLOAT, 3, bits);
        let text = error(&riff(&[fmt.chunk(), raw(b"data", &bytes)]));
        let offset = 46 + (3 * 40_000 + 1) * u64::from(bits / 8);
        let expected = format!(
            "byte {offset}: the sample of frame 40000 (counted from 0), channel 2 (from 1) is {value}, expected a finite"
        );
        assert!(text.starts_with(&expected), "{text}");
    }
}

#[test]
fn the_writer_refuses_what_its_format_can_not_hold() {
    let file = pcm16_mono(&[], 4, &[]);
    let try_to_write = |encoding, value| {
        let mut reader = Reader::open(Cursor::new(&file)).unwrap();
        let mut writer =
            Writer::begin(Vec::new(), &mut reader, &Changes::samples(SampleFormat::full(encoding))).unwrap();
        writer.write(&[vec![0.0, 0.0, value, 0.0]]).map_err(|e| e.to_string())
    };
    let next_up = |x: f64| f64::from_bits(x.to_bits() + 1);
    for (encoding, good, bad) in [
        (Encoding::Pcm8, 127.0 / 128.0, 1.0),
        (Encoding::Pcm16, -1.0, -1.0 - 1.0 / 32768.0),
        (Encoding::Pcm24, 1.0 / 8_388_608.0, 1.0 / 16_777_216.0),
        (Encoding::Pcm32, 1.0 - 1.0 / 2_147_483_648.0, 1.0),
        (Encoding::Float32, 0.5, next_up(0.5)),
        (Encoding::Float32, f64::from(f32::MAX), f64::INFINITY),
        (Encoding::Float64, next_up(0.5), f64::INFINITY),
    ] {
        try_to_write(encoding, good).unwrap();
        for value in [bad, f64::NAN] {
            let text = try_to_write(encoding, value).unwrap_err();
            assert!(text.starts_with("frame 2 (counted from 0), channel 1 (from 1)"), "{text}");
            assert!(text.contains(encoding.name()), "{text}");
        }
    }
}

#[test]
fn the_writer_holds_the_caller_to_the_input_s_frames_and_channels() {
    let file = pcm16_mono(&[], 4, &[]);
    let format = SampleFormat::full(Encoding::Pcm16);
    let mut reader = Reader::open(Cursor::new(&file)).unwrap();
    let mut writer = Writer::begin(Vec::new(), &mut reader, &Changes::samples(format)).unwrap();
    assert!(writer.write(&[vec![0.0], vec![0.0]]).unwrap_err().to_string().contains("2 channels"));
    writer.write(&[vec![0.0; 3]]).unwrap();
    assert!(writer.write(&[vec![0.0; 2]]).unwrap_err().to_string().starts_with("5 frames written, expected 4"));
    let text = writer.finish(&mut reader).unwrap_err().to_string();
    assert!(text.starts_with("3 frames written, expected 4"), "{text}");
    assert!(reader.finish().unwrap_err().to_string().starts_with("0 frames read, expected 4"));
}
