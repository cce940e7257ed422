//! Chunks of metadata, byte by byte.

use crate::build::{FmtFields, PCM, RawChunk, raw, riff};
use std::f64::consts::TAU;

/// Length of `bext` before its coding history (EBU Tech 3285 v2, from memory).
pub const BEXT_BYTES: usize = 602;

/// A `bext` body of a version with some of every field; `loudness` are the five figures of
/// version 2.
pub fn bext(version: u16, loudness: [i16; 5], history: &[u8]) -> Vec<u8> {
    let mut body = Vec::with_capacity(BEXT_BYTES + history.len());
    let mut text = |text: &str, bytes: usize| {
        let end = body.len() + bytes;
        body.extend_from_slice(text.as_bytes());
        body.resize(end, 0);
    };
    text("Reed bed, second week", 256);
    text("a recorder", 32);
    text("RB0002", 32);
    text("2031-05-02", 10);
    text("06:10:00", 8);
    body.extend(1_065_600_000_u64.to_le_bytes());
    body.extend(version.to_le_bytes());
    body.extend((0..64).map(|k| if version > 0 { k } else { 0 }));
    for figure in loudness {
        body.extend(if version > 1 { figure } else { 0 }.to_le_bytes());
    }
    body.resize(BEXT_BYTES, 0);
    body.extend_from_slice(history);
    body
}

/// `bext` as most recorders write it.
pub fn plain_bext(history: &[u8]) -> RawChunk {
    raw(b"bext", &bext(1, [0; 5], history))
}

/// A `guan` chunk of these lines, each ended by LF.
pub fn guan(lines: &[&str]) -> RawChunk {
    raw(b"guan", lines.iter().map(|line| format!("{line}\n")).collect::<String>().as_bytes())
}

/// What a recorder that expands time tenfold writes, sampled at `rate_hz`.
pub fn expanded_tenfold(rate_hz: u32) -> RawChunk {
    guan(&["GUANO|Version: 1.0", "Timestamp: 2031-05-02T22:10:00", "TE: 10", &format!("Samplerate: {rate_hz}")])
}

/// Two markers: `cue ` and their labels in a `LIST` of type `adtl`.
pub fn markers() -> [RawChunk; 2] {
    let mut cue = 2_u32.to_le_bytes().to_vec();
    for (name, at) in [(1_u32, 10_u32), (2, 500)] {
        cue.extend(name.to_le_bytes());
        cue.extend(at.to_le_bytes());
        cue.extend(b"data");
        cue.extend([0; 8]);
        cue.extend(at.to_le_bytes());
    }
    let mut adtl = b"adtl".to_vec();
    for (name, label) in [(1_u32, "heron\0\0\0"), (2, "pump\0\0\0\0")] {
        adtl.extend(b"labl");
        adtl.extend((4 + label.len() as u32).to_le_bytes());
        adtl.extend(name.to_le_bytes());
        adtl.extend(label.as_bytes());
    }
    [raw(b"cue ", &cue), raw(b"LIST", &adtl)]
}

/// A `smpl` chunk with one loop.
pub fn smpl() -> RawChunk {
    let fields: [u32; 15] = [0, 0, 20_833, 60, 0, 0, 0, 1, 0, 1, 0, 100, 400, 0, 0];
    raw(b"smpl", &fields.iter().flat_map(|field| field.to_le_bytes()).collect::<Vec<_>>())
}

/// A tone of amplitude 0.25 over noise, 16 bits, mono, between chunks.
pub fn tone(rate_hz: u32, tone_hz: f64, frames: usize, before: &[RawChunk], after: &[RawChunk]) -> Vec<u8> {
    let mut noise = crate::fixtures::Noise(9);
    let sample = |k: usize| 0.25 * (TAU * tone_hz * k as f64 / f64::from(rate_hz)).sin() + 0.02 * noise.next();
    let codes: Vec<u8> =
        (0..frames).map(sample).flat_map(|value| ((value * 32768.0).round() as i16).to_le_bytes()).collect();
    let fmt = FmtFields { rate: rate_hz, ..FmtFields::plain(PCM, 1, 16) };
    let mut chunks = vec![fmt.chunk()];
    chunks.extend_from_slice(before);
    chunks.push(raw(b"data", &codes));
    chunks.extend_from_slice(after);
    riff(&chunks)
}

/// The bodies of all chunks with an id, of a file without damage.
pub fn bodies<'f>(file: &'f [u8], id: &[u8; 4]) -> Vec<&'f [u8]> {
    all_chunks(file).into_iter().filter(|(found, _)| *found == id).map(|(_, body)| body).collect()
}

/// Ids and bodies of all chunks, of a file without damage.
pub fn all_chunks(file: &[u8]) -> Vec<(&[u8], &[u8])> {
    let mut found = Vec::new();
    let mut at = 12;
    while at + 8 <= file.len() {
        let size = u32::from_le_bytes(file[at + 4..at + 8].try_into().unwrap()) as usize;
        found.push((&file[at..at + 4], &file[at + 8..at + 8 + size]));
        at += 8 + size + size % 2;
    }
    assert_eq!(at, file.len(), "chunks fill the file");
    found
}

/// Whether the RIFF size is that of the file.
pub fn riff_size_fits(file: &[u8]) -> bool {
    file[4..8] == (file.len() as u32 - 8).to_le_bytes()
}
