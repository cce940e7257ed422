//! `filter` as seen by whoever reads its streams and its status.

use crate::{bandproof, spec};
use serde_json::Value;
use std::f64::consts::TAU;
use std::fs;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// A folder with recordings in `in`, to be filtered into `out`.
struct Folder {
    root: TempDir,
}

/// How a run ended.
struct Ended {
    status: i32,
    stdout: String,
    stderr: String,
}

impl Folder {
    fn new() -> Self {
        let root = TempDir::new().unwrap();
        fs::create_dir(root.path().join("in")).unwrap();
        Folder { root }
    }

    fn path(&self, relative: &str) -> PathBuf {
        self.root.path().join(relative)
    }

    fn filter(&self, spec_name: &str, options: &[&str]) -> Ended {
        let output = bandproof()
            .args(["filter", &spec(spec_name)])
            .args([self.path("in"), self.path("out")])
            .args(options)
            .output()
            .unwrap();
        Ended {
            status: output.status.code().unwrap(),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }
}

/// A second of a tone at 8 kHz, amplitude 0.25, 16 bits.
fn tone(path: &Path, frequency_hz: f64) {
    let format =
        hound::WavSpec { channels: 1, sample_rate: 8000, bits_per_sample: 16, sample_format: hound::SampleFormat::Int };
    let mut writer = hound::WavWriter::create(path, format).unwrap();
    for frame in 0..8000 {
        let sample = 0.25 * libm::sin(TAU * frequency_hz * f64::from(frame) / 8000.0);
        writer.write_sample((sample * 32_768.0) as i16).unwrap();
    }
    writer.finalize().unwrap();
}

#[test]
fn json_is_the_report_to_the_byte_and_nothing_else() {
    let folder = Folder::new();
    tone(&folder.path("in/a.wav"), 1000.0);
    let elsewhere = folder.path("report.json");
    let ended = folder.filter("tone.toml", &["--json", "--report", elsewhere.to_str().unwrap()]);
    assert_eq!((ended.status, ended.stderr.as_str()), (0, ""));
    assert_eq!(ended.stdout, fs::read_to_string(elsewhere).unwrap());
    assert!(!folder.path("out/bandproof-report.json").exists());
}

#[test]
fn the_summary_names_what_was_missed_and_where_the_report_is() {
    let folder = Folder::new();
    tone(&folder.path("in/drifted.wav"), 1100.0);
    let ended = folder.filter("tone.toml", &[]);
    assert_eq!(ended.status, 1, "{}", ended.stdout);
    assert!(ended.stdout.starts_with("1 of 1 recording filtered and measured"), "{}", ended.stdout);
    for part in ["Missed\n  drifted.wav, channel 1, tone: down by", "Verdict: missed", "not sound pressure"] {
        assert!(ended.stdout.contains(part), "{part} is missing:\n{}", ended.stdout);
    }
    assert!(ended.stdout.contains(&format!("Report: {}", folder.path("out/bandproof-report.json").display())));
    assert!(ended.stdout.lines().all(|line| line.chars().count() <= 100 || line.starts_with("Report: ")));
}

#[test]
fn a_recording_that_fails_is_named_on_both_streams_and_outweighs_what_was_missed() {
    let folder = Folder::new();
    tone(&folder.path("in/drifted.wav"), 1100.0);
    fs::write(folder.path("in/empty.wav"), b"").unwrap();
    let ended = folder.filter("tone.toml", &[]);
    assert_eq!(ended.status, 3);
    assert!(ended.stderr.starts_with("bandproof: empty.wav: "), "{}", ended.stderr);
    assert_eq!(ended.stderr.lines().count(), 1, "{}", ended.stderr);
    assert!(ended.stdout.contains("Failed, nothing written for these\n  empty.wav: "), "{}", ended.stdout);
}

#[test]
fn quiet_leaves_errors_status_and_report() {
    let folder = Folder::new();
    tone(&folder.path("in/a.wav"), 1000.0);
    let ended = folder.filter("tone.toml", &["--quiet"]);
    assert_eq!((ended.status, ended.stdout.as_str(), ended.stderr.as_str()), (0, "", ""));
    assert!(folder.path("out/bandproof-report.json").exists());
    // A run with another spec would write over the first.
    let ended = folder.filter("fixed-rate.toml", &["--quiet"]);
    assert_eq!((ended.status, ended.stdout.as_str()), (2, ""));
    assert!(ended.stderr.starts_with("bandproof: ") && ended.stderr.contains("--replace"), "{}", ended.stderr);
}

#[test]
fn a_dry_run_tells_the_plan_and_writes_nothing() {
    let folder = Folder::new();
    tone(&folder.path("in/a.wav"), 1000.0);
    fs::write(folder.path("in/empty.wav"), b"").unwrap();
    let ended = folder.filter("tone.toml", &["--dry-run"]);
    assert_eq!(ended.status, 3);
    for part in
        ["At 8000 Hz", "8000  1.00 s  a.wav", "Would fail or overload\n  empty.wav: ", "nothing written: 1 recording"]
    {
        assert!(ended.stdout.contains(part), "{part} is missing:\n{}", ended.stdout);
    }
    let ended = folder.filter("tone.toml", &["--dry-run", "--scan", "--json"]);
    let document: Value = serde_json::from_str(&ended.stdout).unwrap();
    assert_eq!((document["dry_run"].clone(), document["scanned"].clone()), (Value::Bool(true), Value::Bool(true)));
    let told: Vec<_> = document["recordings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|recording| (recording["path"].as_str().unwrap(), recording["fails"].as_bool().unwrap()))
        .collect();
    assert_eq!(told, [("a.wav", false), ("empty.wav", true)]);
    assert!(!folder.path("out").exists());
}

#[test]
fn include_and_exclude_choose_recordings() {
    let folder = Folder::new();
    for name in ["a.wav", "b.wav", "c.wav"] {
        tone(&folder.path("in").join(name), 1000.0);
    }
    let chosen = ["--include", "a.wav", "--include", "b.*", "--exclude", "b.wav"];
    let ended = folder.filter("tone.toml", &chosen);
    assert_eq!(ended.status, 0, "{}", ended.stderr);
    assert!(folder.path("out/a.wav").exists());
    assert!(!folder.path("out/b.wav").exists() && !folder.path("out/c.wav").exists());
}
