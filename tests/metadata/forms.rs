//! The same in the other forms of a WAV file: RIFX, RF64 and BW64.

use crate::build::{Ds64, FmtFields, PCM, RawChunk, pcm16_mono, raw, rifx, wide};
use crate::chunks::{BEXT_BYTES, bext, guan, plain_bext};
use crate::history::rewritten;
use bandproof::wave::{Changes, Form, History, RateMeaning, Reader, Writer, stale_chunks};
use std::io::Cursor;

fn big_endian(chunks: &[RawChunk]) -> Vec<u8> {
    let fmt = FmtFields { rate: 38_400, ..FmtFields::plain(PCM, 1, 16) };
    rifx(&[&[raw(b"fmt ", &fmt.big_endian(true)), raw(b"data", &[0; 100])], chunks].concat())
}

/// EBU Tech 3285 has no big-endian form; by RIFX all numbers of a file are (from memory).
fn reversed_bext(version: u16, loudness: i16) -> RawChunk {
    let mut body = bext(1, [0; 5], b"");
    body[346..348].copy_from_slice(&version.to_be_bytes());
    body[412..414].copy_from_slice(&loudness.to_be_bytes());
    raw(b"bext", &body)
}

fn stale(file: Vec<u8>) -> usize {
    stale_chunks(Reader::open(Cursor::new(file)).unwrap().header()).len()
}

#[test]
fn numbers_in_rifx_have_their_highest_byte_first() {
    assert_eq!(stale(big_endian(&[reversed_bext(2, -2300)])), 1);
    assert_eq!(stale(big_endian(&[reversed_bext(2, 0x7fff)])), 0);
    assert_eq!(stale(big_endian(&[reversed_bext(1, -2300)])), 0);
    // Read the other way round, version 256 would be one above 2.
    assert_eq!(stale(pcm16_mono(&[reversed_bext(1, -2300)], 10, &[])), 1);
}

#[test]
fn rifx_tells_its_rate_and_takes_a_history() {
    let body = b"GUANO|Version: 1.0\nTE: 10\n";
    let file = big_endian(&[raw(b"guan", body), raw(b"tail", b"xyz")]);
    let header = Reader::open_as(Cursor::new(&file), Some(RateMeaning::Acoustic)).unwrap().header().clone();
    assert_eq!((header.form, header.rate_hz, header.header_rate_hz), (Form::Rifx, 384_000, 38_400));
    let (output, _) = rewritten(&file, None);
    let again = Reader::open(Cursor::new(&output)).unwrap().header().clone();
    assert_eq!((again.form, again.notes.len(), again.chunks.len()), (Form::Rifx, 0, header.chunks.len()));
    let (guan, tail) = (&again.chunks[2], &again.chunks[3]);
    let text = &output[guan.offset as usize + 8..][..guan.bytes as usize];
    assert!(text.starts_with(body) && text[body.len()..].starts_with(b"Bandproof|History: "));
    assert_eq!(output[tail.offset as usize + 8..][..3], *b"xyz");
}

#[test]
fn forms_of_64_bits_take_a_history_and_keep_their_sizes_right() {
    for (id, form) in [(b"RF64", Form::Rf64), (b"BW64", Form::Bw64)] {
        for chunk in [plain_bext(b"A=PCM\r\n"), guan(&["GUANO|Version: 1.0"])] {
            let fmt = FmtFields::plain(PCM, 1, 16).chunk();
            let file = wide(id, &Ds64::frames(50), &[fmt, chunk.clone(), raw(b"data", &[0; 100])]);
            let (output, figures) = rewritten(&file, None);
            assert!(figures.notes[0].contains(" was appended to `"), "{:?}", figures.notes);
            let again = Reader::open(Cursor::new(&output)).unwrap().header().clone();
            assert_eq!((again.form, again.frames, again.notes.len()), (form, 50, 0), "{:?}", again.notes);
            let place = again.chunks.iter().find(|found| found.id == chunk.id).unwrap();
            assert!(place.bytes > chunk.body.len() as u64 + 64 && output.len() > file.len() + 64);
        }
    }
}

/// A RIFF output that the history makes pass the limit becomes RF64 as any other does.
#[test]
fn a_history_may_be_what_passes_the_limit() {
    let history = History { tool: "bandproof 0.1.0".to_owned(), both_ways: false, spec_sha256: "ab".repeat(32) };
    let file = pcm16_mono(&[raw(b"JUNK", &[0; 28]), plain_bext(b"")], 50, &[]);
    let mut reader = Reader::open(Cursor::new(&file)).unwrap();
    let changes = Changes {
        history: Some(history),
        riff_limit_bytes: file.len() as u64,
        ..Changes::samples(reader.header().format)
    };
    let mut writer = Writer::begin(Vec::new(), &mut reader, &changes).unwrap();
    let mut planes = vec![Vec::new()];
    while reader.read(100, &mut planes).unwrap() > 0 {}
    writer.write(&planes).unwrap();
    reader.finish().unwrap();
    let (output, _) = writer.finish(&mut reader).unwrap();
    let again = Reader::open(Cursor::new(&output)).unwrap().header().clone();
    assert_eq!((again.form, again.frames, again.notes.len()), (Form::Rf64, 50, 0), "{:?}", again.notes);
    let place = again.chunks.iter().find(|found| found.id == *b"bext").unwrap();
    assert!(place.bytes > BEXT_BYTES as u64 + 64);
}
