//! Runs over recordings above 4 GiB, whole files on disk:
//!
//! ```sh
//! cargo test --features slow-tests --test slow
//! ```
//!
//! Each computes for about 45 s and takes 4.3 and 4.8 GB of disk for as long, since the inputs
//! are mostly holes; 81 MB of memory. With `-- --test-threads=1` they take turns.
//! `BANDPROOF_SLOW_FOLDER` names another folder for their files.

#![allow(clippy::unwrap_used, clippy::disallowed_methods, reason = "tests")]

use std::f64::consts::TAU;
use std::fs::{self, File};
use std::io::{Read, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};

use assert_cmd::Command;
use tempfile::TempDir;

/// Rate of the recordings, Hz.
const RATE_HZ: u32 = 384_000;

/// Frames of sound at the start and at the end; between them is a hole in the file.
const SOUND: u64 = RATE_HZ as u64;

/// A tone that stays and one that a high-pass at 10 kHz takes out, amplitudes 0.4.
const STAYS_HZ: f64 = 48_000.0;
const GOES_HZ: f64 = 100.0;

struct Bench {
    folder: TempDir,
}

impl Bench {
    /// Unless told otherwise below the build's own folder for temporary files: /tmp may be
    /// in memory.
    fn new(spec: &str) -> Self {
        let place = std::env::var_os("BANDPROOF_SLOW_FOLDER");
        let place = place.map_or_else(|| PathBuf::from(env!("CARGO_TARGET_TMPDIR")), PathBuf::from);
        let folder = TempDir::new_in(place).unwrap();
        fs::create_dir(folder.path().join("in")).unwrap();
        fs::write(folder.path().join("spec.toml"), spec).unwrap();
        Bench { folder }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// Runs `filter` and gives the report's entry of the one recording.
    fn filter(&self) -> serde_json::Value {
        let mut command = Command::cargo_bin("bandproof").unwrap();
        let ran = command.args(["filter", "spec.toml", "in", "out"]).current_dir(&self.folder).output().unwrap();
        let text = String::from_utf8_lossy(&ran.stderr).into_owned() + &String::from_utf8_lossy(&ran.stdout);
        assert_eq!(ran.status.code(), Some(0), "{text}");
        let report = fs::read(self.path("out/bandproof-report.json")).unwrap();
        let mut report: serde_json::Value = serde_json::from_slice(&report).unwrap();
        let entry = report["recordings"][0].take();
        assert_eq!(entry["status"], "done", "{entry}");
        entry
    }
}

fn sample(frame: u64) -> f64 {
    let t = frame as f64 / f64::from(RATE_HZ);
    0.4 * (TAU * STAYS_HZ * t).sin() + 0.4 * (TAU * GOES_HZ * t).sin()
}

/// Writes `head` and `frames` frames of one channel in `bytes` bytes each.
fn recording(path: &Path, head: &[u8], frames: u64, bytes: u64) {
    let mut file = File::create_new(path).unwrap();
    file.set_len(head.len() as u64 + frames * bytes).unwrap();
    file.write_all(head).unwrap();
    for from in [0, frames - SOUND] {
        let scale = libm::ldexp(1.0, 8 * bytes as i32 - 1);
        let code = |frame| ((sample(frame) * scale).round() as i32).to_le_bytes();
        let sound: Vec<u8> = (from..from + SOUND).flat_map(|k| code(k).into_iter().take(bytes as usize)).collect();
        file.seek(SeekFrom::Start(head.len() as u64 + from * bytes)).unwrap();
        file.write_all(&sound).unwrap();
    }
}

/// The `fmt ` chunk of plain PCM, one channel.
fn fmt(bytes: u16) -> Vec<u8> {
    let mut chunk = b"fmt \x10\0\0\0\x01\0\x01\0".to_vec();
    chunk.extend(RATE_HZ.to_le_bytes());
    chunk.extend((RATE_HZ * u32::from(bytes)).to_le_bytes());
    chunk.extend(bytes.to_le_bytes());
    chunk.extend((8 * bytes).to_le_bytes());
    chunk
}

fn bytes_at(file: &mut File, offset: u64, bytes: usize) -> Vec<u8> {
    let mut buffer = vec![0; bytes];
    file.seek(SeekFrom::Start(offset)).unwrap();
    file.read_exact(&mut buffer).unwrap();
    buffer
}

/// Amplitude of a tone in samples that hold whole periods of it.
fn amplitude(samples: &[f64], hz: f64) -> f64 {
    let (mut re, mut im) = (0.0, 0.0);
    for (k, x) in samples.iter().enumerate() {
        let phase = TAU * hz * k as f64 / f64::from(RATE_HZ);
        re += x * phase.cos();
        im += x * phase.sin();
    }
    2.0 * (re * re + im * im).sqrt() / samples.len() as f64
}

#[test]
fn a_recording_beyond_four_gibibytes_is_filtered_to_its_end() {
    let bench = Bench::new(
        r#"
[output]
dither = "none"

[[stage]]
kind = "highpass"
family = "butterworth"
order = 4
edge_hz = 10000

[[band]]
name = "calls"
from_hz = 40000
to_hz = 60000
keep_db = 0.5
"#,
    );
    // 24 bits: an odd number of bytes, with its pad byte, and a chunk after it.
    let frames: u64 = (1 << 32) / 3 + 2 * SOUND;
    let data = frames * 3;
    assert!(data > 1 << 32 && data % 2 == 1);
    let tail = b"\0guan\x12\0\0\0GUANO|Version: 1.0";
    let mut head = b"RF64\xff\xff\xff\xffWAVEds64\x1c\0\0\0".to_vec();
    let head_bytes = 12 + 36 + 24 + 8;
    head.extend((head_bytes + data + tail.len() as u64 - 8).to_le_bytes());
    head.extend(data.to_le_bytes());
    head.extend(frames.to_le_bytes());
    head.extend([0; 4]);
    head.extend(fmt(3));
    head.extend(b"data\xff\xff\xff\xff");
    assert_eq!(head.len() as u64, head_bytes);
    recording(&bench.path("in/long.wav"), &head, frames, 3);
    let mut input = File::options().append(true).open(bench.path("in/long.wav")).unwrap();
    input.write_all(tail).unwrap();

    let entry = bench.filter();
    assert_eq!(entry["notes"], serde_json::json!([]));
    assert_eq!(entry["input"]["frames"], frames);
    assert_eq!(entry["channels"][0]["bands"][0]["verdict"], "met", "{entry}");
    let mut output = File::open(bench.path("out/long.wav")).unwrap();
    assert_eq!(output.metadata().unwrap().len(), head_bytes + data + tail.len() as u64);
    assert_eq!(bytes_at(&mut output, 0, head.len()), head);
    assert_eq!(bytes_at(&mut output, head_bytes + data, tail.len()), tail);

    let mut read = |from: u64, frames: usize| -> Vec<f64> {
        let bytes = bytes_at(&mut output, head_bytes + from * 3, frames * 3);
        let code = |b: &[u8]| f64::from(i32::from_le_bytes([0, b[0], b[1], b[2]])) / 2_147_483_648.0;
        bytes.chunks_exact(3).map(code).collect()
    };
    // A tenth of a second within the sound: whole periods of both tones. At 48 kHz the
    // filter's gain differs from 1 by (10/48)^8 / 2 = 2e-6, at 100 Hz it is 1e-8; steps of
    // 24 bits are 1.2e-7.
    for from in [SOUND / 2, frames - SOUND / 2] {
        let sound = read(from, 38_400);
        assert!((amplitude(&sound, STAYS_HZ) - 0.4).abs() < 3e-6, "{}", amplitude(&sound, STAYS_HZ));
        assert!(amplitude(&sound, GOES_HZ) < 1e-7, "{}", amplitude(&sound, GOES_HZ));
    }
    // The hole: what rings after the sound has died away in a second.
    for from in [2 * SOUND, frames / 2, (1 << 32) / 3, frames - SOUND - 1000] {
        assert!(read(from, 1000).iter().all(|&x| x == 0.0), "{from}");
    }
}

#[test]
fn a_riff_recording_that_doubles_past_four_gibibytes_becomes_rf64() {
    let bench = Bench::new(
        r#"
[output]
encoding = "float32"

[[band]]
name = "calls"
from_hz = 40000
to_hz = 60000
"#,
    );
    let frames: u64 = (1 << 30) + (1 << 27);
    let data = frames * 2;
    let mut head = b"RIFF".to_vec();
    head.extend((80 - 8 + data as u32).to_le_bytes());
    head.extend(b"WAVEJUNK\x1c\0\0\0");
    head.extend([0; 28]);
    head.extend(fmt(2));
    head.extend(b"data");
    head.extend((data as u32).to_le_bytes());
    assert_eq!(head.len(), 80);
    recording(&bench.path("in/long.wav"), &head, frames, 2);

    let entry = bench.filter();
    let notes = entry["notes"].to_string();
    assert!(notes.contains("became RF64: `JUNK` at byte 12 was turned into its `ds64`"), "{notes}");
    let mut output = File::open(bench.path("out/long.wav")).unwrap();
    // `fmt ` grows by its extension size, and `fact` comes after it.
    let head_bytes = 80 + 2 + 12;
    assert_eq!(output.metadata().unwrap().len(), head_bytes + 2 * data);
    let head = bytes_at(&mut output, 0, head_bytes as usize);
    assert_eq!(head[..20], *b"RF64\xff\xff\xff\xffWAVEds64\x1c\0\0\0");
    assert_eq!(head[20..28], (head_bytes + 2 * data - 8).to_le_bytes());
    assert_eq!(head[28..36], (2 * data).to_le_bytes());
    assert_eq!(head[36..44], frames.to_le_bytes());
    assert_eq!(head[44..48], [0; 4]);
    assert_eq!(
        head[74..94],
        [&b"fact\x04\0\0\0"[..], &(frames as u32).to_le_bytes(), b"data\xff\xff\xff\xff"].concat()
    );
    // Every float is the integer it was.
    for from in [0, SOUND, frames / 2, frames - 1000] {
        let bytes = bytes_at(&mut output, head_bytes + from * 4, 4000);
        for (k, bytes) in bytes.as_chunks::<4>().0.iter().enumerate() {
            let frame = from + k as u64;
            let sound = frame < SOUND || frame >= frames - SOUND;
            let expected = if sound { (sample(frame) * 32768.0).round() / 32768.0 } else { 0.0 };
            assert_eq!(f64::from(f32::from_le_bytes(*bytes)), expected, "{frame}");
        }
    }
}
