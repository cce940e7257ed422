//! What is committed is what the generator writes.

use crate::{folder, generator};
use std::{collections::BTreeSet, fs};

#[test]
fn committed_files_equal_what_the_generator_writes() {
    let files = generator::files().unwrap();
    assert!(files.len() > 7);
    for file in &files {
        let committed = fs::read(folder("demo-audio").join(file.path)).unwrap();
        // Not assert_eq: a difference would print a megabyte.
        let first = committed.iter().zip(&file.bytes).position(|(a, b)| a != b);
        assert!(first.is_none() && committed.len() == file.bytes.len(), "{} differs at {first:?}", file.path);
    }
    let paths: Vec<_> = files.iter().map(|f| f.path).collect();
    assert!(paths.is_sorted());
}

#[test]
fn nothing_else_lies_in_the_folders_of_recordings() {
    let root = folder("demo-audio");
    let mut expected: BTreeSet<_> = generator::files().unwrap().iter().map(|f| root.join(f.path)).collect();
    for entry in fs::read_dir(&root).unwrap() {
        let entry = entry.unwrap();
        let (path, name) = (entry.path(), entry.file_name());
        if path.is_dir() && name != "generator" {
            for inner in fs::read_dir(&path).unwrap() {
                let inner = inner.unwrap().path();
                assert!(expected.remove(&inner), "{}", inner.display());
            }
        }
    }
    assert_eq!(expected, BTreeSet::from([root.join("notes.txt")]));
}

#[test]
fn the_demo_stays_small_enough_to_clone() {
    let total: usize = generator::files().unwrap().iter().map(|f| f.bytes.len()).sum();
    assert!(total < 8_000_000, "{total} bytes");
}

/// Chunks in the order of the file, sizes and pad bytes followed by hand. In RF64 the size
/// of `data` stands in `ds64` (EBU Tech 3306).
fn chunks(bytes: &[u8]) -> Vec<(String, &[u8])> {
    let number = |at: usize, length: usize| {
        bytes[at..at + length].iter().rev().fold(0, |number, &byte| number << 8 | usize::from(byte))
    };
    let (size_at, wide_at) = (|at| number(at, 4), |at| number(at, 8));
    assert_eq!(&bytes[8..12], b"WAVE");
    let rf64 = &bytes[..4] == b"RF64";
    if rf64 {
        assert_eq!((&bytes[12..16], size_at(4), wide_at(20)), (&b"ds64"[..], u32::MAX as usize, bytes.len() - 8));
    } else {
        assert_eq!((&bytes[..4], size_at(4)), (&b"RIFF"[..], bytes.len() - 8));
    }
    let (mut at, mut found) = (12, Vec::new());
    while at < bytes.len() {
        let wide = rf64 && &bytes[at..at + 4] == b"data";
        let size = if wide { wide_at(28) } else { size_at(at + 4) };
        found.push((String::from_utf8_lossy(&bytes[at..at + 4]).into_owned(), &bytes[at + 8..at + 8 + size]));
        at += 8 + size + size % 2;
    }
    assert_eq!(at, bytes.len());
    found
}

/// The recording that the battery cut off, with the sizes that it should have.
fn mended(bytes: &[u8]) -> Vec<u8> {
    let samples = (bytes.len() - 44) / 2 * 2;
    let mut mended = bytes[..44 + samples].to_vec();
    mended[4..8].copy_from_slice(&(36 + samples as u32).to_le_bytes());
    mended[40..44].copy_from_slice(&(samples as u32).to_le_bytes());
    mended
}

const CUT_OFF: &str = "station-d/0512.wav";

#[test]
fn one_recording_ends_within_a_frame_under_a_header_without_sizes() {
    let bytes = fs::read(folder("demo-audio").join(CUT_OFF)).unwrap();
    assert_eq!((&bytes[4..8], &bytes[36..44]), (&[0; 4][..], &b"data\0\0\0\0"[..]));
    assert_eq!((bytes.len() - 44) % 2, 1, "16 bit, mono");
}

#[test]
fn recordings_are_of_the_lengths_and_formats_the_generator_lists() {
    let expected = [
        ("hydrophone/0512.wav", 96_000, 1, 32, 240_000),
        ("station-a/0512.wav", 48_000, 1, 16, 480_000),
        ("station-a/0542.wav", 48_000, 1, 16, 480_000),
        ("station-a/0612.wav", 48_000, 1, 16, 384_000),
        ("station-b/0512.wav", 44_100, 2, 24, 396_900),
        ("station-b/0542.wav", 44_100, 1, 24, 132_301),
        ("station-c/0512.wav", 44_100, 1, 16, 352_800),
        (CUT_OFF, 44_100, 1, 16, 352_799),
    ];
    for (path, rate_hz, channels, bits, frames) in expected {
        let bytes = fs::read(folder("demo-audio").join(path)).unwrap();
        let bytes = if path == CUT_OFF { mended(&bytes) } else { bytes };
        let chunks = chunks(&bytes);
        let body = |id: &str| chunks.iter().find(|(found, _)| found == id).unwrap().1;
        let (format, data) = (body("fmt "), body("data"));
        let short = |at: usize| u16::from_le_bytes([format[at], format[at + 1]]);
        let rate = u32::from_le_bytes(format[4..8].try_into().unwrap());
        assert_eq!((rate, short(2), short(14)), (rate_hz, channels, bits), "{path}");
        assert_eq!(data.len(), frames * usize::from(channels * bits / 8), "{path}");
    }
}

/// With the metadata taken out, hound reads what the generator meant. (It takes no pad
/// bytes into account, so an odd-sized chunk before the samples stops it.)
#[test]
fn only_the_knock_on_the_hydrophone_reaches_full_scale() {
    for file in generator::files().unwrap().iter().filter(|f| f.path.ends_with("12.wav") && !f.path.contains("._")) {
        let mut plain = b"RIFF\0\0\0\0WAVE".to_vec();
        let bytes = if file.path == CUT_OFF { mended(&file.bytes) } else { file.bytes.clone() };
        for (id, body) in chunks(&bytes).into_iter().filter(|(id, _)| id == "fmt " || id == "data") {
            plain.extend(id.bytes().chain((body.len() as u32).to_le_bytes()).chain(body.iter().copied()));
        }
        let mut reader = hound::WavReader::new(&plain[..]).unwrap();
        let full_scale = f64::from(1u32 << (reader.spec().bits_per_sample - 1));
        let peak = match reader.spec().sample_format {
            hound::SampleFormat::Float => {
                reader.samples::<f32>().map(|s| f64::from(s.unwrap()).abs()).fold(0.0, f64::max)
            }
            hound::SampleFormat::Int => {
                reader.samples::<i32>().map(|s| f64::from(s.unwrap()).abs() / full_scale).fold(0.0, f64::max)
            }
        };
        let expected = if file.path.starts_with("hydrophone") { 1.2..1.5 } else { 0.05..0.5 };
        assert!(expected.contains(&peak), "{}: {peak}", file.path);
    }
}

#[test]
fn metadata_stands_before_and_after_the_samples() {
    let files = generator::files().unwrap();
    let ids = |path: &str| -> Vec<String> {
        chunks(&files.iter().find(|f| f.path == path).unwrap().bytes).into_iter().map(|(id, _)| id).collect()
    };
    assert_eq!(ids("hydrophone/0512.wav"), ["ds64", "fmt ", "data"]);
    assert_eq!(ids("station-a/0512.wav"), ["fmt ", "wthr", "data", "LIST", "cue ", "LIST"]);
    assert_eq!(ids("station-b/0512.wav"), ["fmt ", "JUNK", "bext", "data", "iXML"]);
    assert_eq!(ids("station-b/0542.wav"), ["fmt ", "JUNK", "bext", "data"]);
}
