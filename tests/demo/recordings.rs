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

/// Chunks in the order of the file, sizes and pad bytes followed by hand.
fn chunks(bytes: &[u8]) -> Vec<(String, &[u8])> {
    let size_at = |at: usize| u32::from_le_bytes([bytes[at], bytes[at + 1], bytes[at + 2], bytes[at + 3]]) as usize;
    assert_eq!((&bytes[..4], &bytes[8..12]), (&b"RIFF"[..], &b"WAVE"[..]));
    assert_eq!(size_at(4), bytes.len() - 8);
    let (mut at, mut found) = (12, Vec::new());
    while at < bytes.len() {
        let size = size_at(at + 4);
        found.push((String::from_utf8_lossy(&bytes[at..at + 4]).into_owned(), &bytes[at + 8..at + 8 + size]));
        at += 8 + size + size % 2;
    }
    assert_eq!(at, bytes.len());
    found
}

#[test]
fn recordings_are_whole_and_of_the_formats_the_generator_lists() {
    let expected = [
        ("hydrophone/0512.wav", 96_000, 1, 32, 240_000),
        ("station-a/0512.wav", 48_000, 1, 16, 480_000),
        ("station-a/0542.wav", 48_000, 1, 16, 480_000),
        ("station-a/0612.wav", 48_000, 1, 16, 384_000),
        ("station-b/0512.wav", 44_100, 2, 24, 396_900),
        ("station-b/0542.wav", 44_100, 1, 24, 132_301),
        ("station-c/0512.wav", 44_100, 1, 16, 352_800),
    ];
    for (path, rate_hz, channels, bits, frames) in expected {
        let bytes = fs::read(folder("demo-audio").join(path)).unwrap();
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
        for (id, body) in chunks(&file.bytes).into_iter().filter(|(id, _)| id == "fmt " || id == "data") {
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
    assert_eq!(ids("station-a/0512.wav"), ["fmt ", "wthr", "data", "LIST", "cue ", "LIST"]);
    assert_eq!(ids("station-b/0512.wav"), ["fmt ", "JUNK", "bext", "data", "iXML"]);
    assert_eq!(ids("station-b/0542.wav"), ["fmt ", "JUNK", "bext", "data"]);
}
