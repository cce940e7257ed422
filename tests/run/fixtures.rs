//! Folders, recordings and specs made on the spot.

use assert_cmd::Command;
use std::f64::consts::TAU;
use std::fs;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// A folder with `in/` for recordings, `spec.toml` and room for `out/`.
pub struct Bench {
    folder: TempDir,
}

/// How one run of the binary ended.
pub struct Ran {
    pub status: i32,
    pub stdout: String,
    pub stderr: String,
}

/// Hum at 50 Hz comes down by 20 dB, 200 to 2000 Hz stays; settles in under a second.
pub const NOTCH_SPEC: &str = r#"
[[stage]]
kind = "notch"
center_hz = 50
width_hz = 8

[[band]]
name = "hum"
center_hz = 50
span_hz = 4
reduce_db = 3

[[band]]
name = "voice"
from_hz = 200
to_hz = 2000
keep_db = 0.5
"#;

impl Bench {
    pub fn new(spec: &str) -> Self {
        let bench = Bench { folder: TempDir::new().unwrap() };
        fs::create_dir(bench.path("in")).unwrap();
        fs::write(bench.path("spec.toml"), spec).unwrap();
        bench
    }

    pub fn path(&self, relative: &str) -> PathBuf {
        self.folder.path().join(relative)
    }

    /// Writes bytes below `in/`.
    pub fn input(&self, relative: &str, bytes: &[u8]) -> PathBuf {
        self.write(&format!("in/{relative}"), bytes)
    }

    /// Writes bytes below the folder.
    pub fn write(&self, relative: &str, bytes: &[u8]) -> PathBuf {
        let path = self.path(relative);
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(&path, bytes).unwrap();
        path
    }

    /// Runs the binary in the folder with space-separated arguments.
    pub fn run(&self, arguments: &str) -> Ran {
        self.run_with(&arguments.split_whitespace().collect::<Vec<_>>())
    }

    pub fn run_with(&self, arguments: &[&str]) -> Ran {
        let output =
            Command::cargo_bin("bandproof").unwrap().args(arguments).current_dir(&self.folder).output().unwrap();
        Ran {
            status: output.status.code().unwrap_or(-1),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }

    /// `filter spec.toml in out` with more arguments.
    pub fn filter(&self, more: &str) -> Ran {
        self.run(&format!("filter spec.toml in out {more}"))
    }

    pub fn report(&self) -> serde_json::Value {
        self.report_at("out/bandproof-report.json")
    }

    pub fn report_at(&self, relative: &str) -> serde_json::Value {
        serde_json::from_slice(&fs::read(self.path(relative)).unwrap()).unwrap()
    }

    /// Every file below a folder, relative and sorted, with its bytes.
    pub fn tree(&self, relative: &str) -> Vec<(String, Vec<u8>)> {
        tree(&self.path(relative))
    }
}

fn tree(root: &Path) -> Vec<(String, Vec<u8>)> {
    let mut files: Vec<(String, Vec<u8>)> = walkdir::WalkDir::new(root)
        .into_iter()
        .map(Result::unwrap)
        .filter(|entry| entry.file_type().is_file())
        .map(|entry| {
            let name = entry.path().strip_prefix(root).unwrap().to_string_lossy().into_owned();
            (name, fs::read(entry.path()).unwrap())
        })
        .collect();
    files.sort();
    files
}

/// The recording entry of a path in a report.
pub fn entry<'a>(report: &'a serde_json::Value, path: &str) -> &'a serde_json::Value {
    let recordings = report["recordings"].as_array().unwrap();
    recordings.iter().find(|recording| recording["path"] == path).unwrap_or_else(|| panic!("no entry for {path}"))
}

/// Seeded uniform noise, -1 to 1 (splitmix64: S. Vigna, public domain description).
pub struct Noise(pub u64);

impl Noise {
    pub fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^= z >> 31;
        (z >> 11) as f64 / (1u64 << 52) as f64 - 1.0
    }
}

/// A hum of amplitude `hum` at 50 Hz over noise of amplitude 0.05, -1 to 1.
pub fn hum_and_noise(rate_hz: u32, seconds: f64, hum: f64, seed: u64) -> Vec<f64> {
    let mut noise = Noise(seed);
    let frames = (seconds * f64::from(rate_hz)) as usize;
    let line = |n: usize| hum * (TAU * 50.0 * n as f64 / f64::from(rate_hz)).sin();
    (0..frames).map(|n| line(n) + 0.05 * noise.next()).collect()
}

/// 16-bit WAV bytes of interleaved samples.
pub fn wav16(rate_hz: u32, channels: u16, samples: &[f64]) -> Vec<u8> {
    wav(rate_hz, channels, 16, samples)
}

/// Integer WAV bytes of interleaved samples.
pub fn wav(rate_hz: u32, channels: u16, bits: u16, samples: &[f64]) -> Vec<u8> {
    let spec = hound::WavSpec {
        channels,
        sample_rate: rate_hz,
        bits_per_sample: bits,
        sample_format: hound::SampleFormat::Int,
    };
    let scale = 2f64.powi(i32::from(bits) - 1);
    encode(spec, |writer| {
        for &sample in samples {
            let code = (sample * scale).round().clamp(-scale, scale - 1.0);
            writer.write_sample(code as i32).unwrap();
        }
    })
}

/// 32-bit float WAV bytes of interleaved samples.
pub fn wav_float(rate_hz: u32, channels: u16, samples: &[f32]) -> Vec<u8> {
    let spec = hound::WavSpec {
        channels,
        sample_rate: rate_hz,
        bits_per_sample: 32,
        sample_format: hound::SampleFormat::Float,
    };
    encode(spec, |writer| samples.iter().for_each(|&sample| writer.write_sample(sample).unwrap()))
}

fn encode(spec: hound::WavSpec, fill: impl FnOnce(&mut hound::WavWriter<&mut std::io::Cursor<Vec<u8>>>)) -> Vec<u8> {
    let mut bytes = std::io::Cursor::new(Vec::new());
    let mut writer = hound::WavWriter::new(&mut bytes, spec).unwrap();
    fill(&mut writer);
    writer.finalize().unwrap();
    bytes.into_inner()
}

/// WAV bytes with a plain 16-byte `fmt ` of the given fields and zeros for samples.
pub fn raw_wav(tag: u16, channels: u16, rate_hz: u32, bits: u16, data_bytes: u32) -> Vec<u8> {
    let align = channels * bits.div_ceil(8);
    let mut bytes = Vec::new();
    bytes.extend(b"RIFF");
    bytes.extend((36 + data_bytes).to_le_bytes());
    bytes.extend(b"WAVEfmt ");
    bytes.extend(16u32.to_le_bytes());
    bytes.extend(tag.to_le_bytes());
    bytes.extend(channels.to_le_bytes());
    bytes.extend(rate_hz.to_le_bytes());
    bytes.extend((rate_hz.wrapping_mul(u32::from(align))).to_le_bytes());
    bytes.extend(align.to_le_bytes());
    bytes.extend(bits.to_le_bytes());
    bytes.extend(b"data");
    bytes.extend(data_bytes.to_le_bytes());
    bytes.resize(bytes.len() + data_bytes as usize, 0);
    bytes
}
