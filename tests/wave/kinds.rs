//! Kinds of headers that conformance collections of WAV files hold, legal and not: each
//! as bytes of our own.

use crate::build::{FLOAT, FmtFields, PCM, RawChunk, pcm16_mono, raw, riff};
use crate::run::{copy, error};

/// A file with this body of `fmt `.
fn with_fmt(body: &[u8], pad: Option<&[u8]>) -> Vec<u8> {
    riff(&[RawChunk { pad: pad.map(<[u8]>::to_vec), ..raw(b"fmt ", body) }, raw(b"data", &[3; 24])])
}

fn same(file: &[u8]) -> Vec<String> {
    let copied = copy(file).unwrap();
    assert!(copied.output == file);
    assert!(copied.header.frames > 0 && copied.written.chunks.iter().all(|c| c.kept));
    copied.header.notes
}

#[test]
fn a_file_cut_at_any_byte_of_its_header_says_where() {
    let file = pcm16_mono(&[], 20, &[]);
    for cut in 1..44 {
        let expected = match cut {
            ..12 => format!("byte {cut}: the file ends inside its header, expected 12 bytes"),
            12 => "byte 12: the file ends, expected a `data` chunk".into(),
            13..20 => format!("byte 12: the file ends {} bytes into a chunk header of 8", cut - 12),
            20..36 => format!("byte 12: `fmt ` holds {} bytes, expected at least 16", cut - 20),
            36 => "byte 36: the file ends, expected a `data` chunk".into(),
            _ => format!("byte 36: the file ends {} bytes into a chunk header of 8", cut - 36),
        };
        let text = error(&file[..cut]);
        assert!(text.starts_with(&expected), "{cut}: {text}");
    }
    assert!(error(&file[..44]).starts_with("empty: `data` at byte 36 holds 0 bytes"));
}

#[test]
fn whatever_follows_the_known_fields_of_fmt_is_carried_along() {
    let pcm = FmtFields::plain(PCM, 1, 16).body();
    let float = FmtFields::plain(FLOAT, 1, 32).body();
    let wide = FmtFields::plain(PCM, 1, 16).extensible(16, 4).body();
    for (body, size_at) in [(&pcm, 16), (&float, 16), (&wide, 16)] {
        // With an extension size of 0, one that counts four more bytes, and bytes after it.
        for (extension, more) in [(0u16, &b""[..]), (0, b"xy"), (4, b"more"), (4, b"more and more.")] {
            let mut body = body.clone();
            body.resize(body.len().max(18), 0);
            let known = u16::from_le_bytes([body[size_at], body[size_at + 1]]);
            body[size_at..size_at + 2].copy_from_slice(&(known + extension).to_le_bytes());
            body.extend_from_slice(more);
            assert_eq!(same(&with_fmt(&body, None)), Vec::<String>::new());
        }
    }
    // A float `fmt ` that lacks its extension size, or half of it.
    assert_eq!(same(&with_fmt(&float[..16], None)), Vec::<String>::new());
    assert_eq!(same(&with_fmt(&float[..17], None)), Vec::<String>::new());
    // One byte more, with its pad byte or without.
    for bytes in [17, 19] {
        let mut body = pcm.clone();
        body.resize(bytes, 0);
        assert_eq!(same(&with_fmt(&body, None)), Vec::<String>::new());
        let note =
            format!("chunk `fmt ` at byte 12 of {bytes} bytes has no pad byte (byte {}); kept as it is", 20 + bytes);
        assert_eq!(same(&with_fmt(&body, Some(&[]))), [note]);
    }
}

#[test]
fn an_extensible_fmt_that_is_cut_anywhere_is_named() {
    let wide = FmtFields::plain(PCM, 1, 16).extensible(16, 4).body();
    for bytes in 16..40 {
        let text = error(&with_fmt(&wide[..bytes], None));
        assert!(text.starts_with(&format!("byte 12: `fmt ` holds {bytes} bytes, expected at least 40")), "{text}");
    }
    for extension in [0u16, 2, 21, 23, 500] {
        let mut body = wide.clone();
        body[16..18].copy_from_slice(&extension.to_le_bytes());
        let text = error(&with_fmt(&body, None));
        let expected =
            format!("byte 36: `fmt ` says an extension of {extension} bytes in a chunk of 40, expected at least 22");
        assert!(text.starts_with(&expected), "{text}");
    }
}

#[test]
fn a_fmt_longer_than_its_size_is_named_by_what_follows() {
    // An extension that is there and not counted, letters among it.
    let mut body = FmtFields::plain(FLOAT, 1, 32).body();
    body[16] = 9;
    body.extend(b"\x64\x32\x1e\xff\x0cNZ\\f");
    let file = riff(&[raw(b"fmt ", &body).declaring(22).padded(&[0]), raw(b"data", &[0; 24])]);
    let text = error(&file);
    assert!(text.starts_with("byte 42: found the bytes 0c 4e 5a 5c where a chunk"), "{text}");
    assert!(text.contains("the size of chunk `fmt ` at byte 12, 22 bytes, is wrong"), "{text}");
}

#[test]
fn channel_masks_are_kept_whatever_they_say() {
    for mask in [0, 1, 3, 0x8000_0000, u32::MAX] {
        let fmt = FmtFields::plain(PCM, 3, 16).extensible(16, mask);
        assert_eq!(same(&riff(&[fmt.chunk(), raw(b"data", &[3; 24])])), Vec::<String>::new());
    }
}

#[test]
fn sampler_chunks_are_kept_whatever_they_say() {
    // `smpl`: 36 bytes, the number of loops at 28, that of bytes after them at 32 (Multimedia
    // Programming Interface and Data Specifications 1.0, 1991).
    let smpl = |loops: u32, after: u32, body: usize| {
        let mut bytes = vec![7; 36];
        bytes[28..32].copy_from_slice(&loops.to_le_bytes());
        bytes[32..36].copy_from_slice(&after.to_le_bytes());
        bytes.resize(body, 9);
        raw(b"smpl", &bytes)
    };
    let all =
        [smpl(0, 0, 36), smpl(1, 0, 60), smpl(2, 0, 60), smpl(0, 4, 36), smpl(1, 4, 70), smpl(0, 0, 0), smpl(9, 9, 36)];
    for chunk in &all {
        let one = std::slice::from_ref(chunk);
        assert_eq!(same(&pcm16_mono(one, 5, &[])), Vec::<String>::new());
        assert_eq!(same(&pcm16_mono(&[], 5, one)), Vec::<String>::new());
    }
    assert_eq!(same(&pcm16_mono(&all, 5, &all)), Vec::<String>::new());
}
