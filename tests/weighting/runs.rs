//! Runs of the binary, from a written spec to samples.

use crate::support::made;
use assert_cmd::Command;
use bandproof::section::Section;
use bandproof::spec::Curve;
use serde_json::Value;
use std::f64::consts::TAU;
use std::path::Path;

const RATE_HZ: u32 = 48_000;

/// The exact frequency behind the nominal 8 kHz, where A is -1.1107 dB.
const TONE_HZ: f64 = 7_943.282_347;

fn bandproof() -> Command {
    Command::cargo_bin("bandproof").unwrap()
}

/// A second of a tone, 64-bit amplitude 0.25, in 32-bit floating point.
fn write_tone(path: &Path) {
    let spec = hound::WavSpec {
        channels: 1,
        sample_rate: RATE_HZ,
        bits_per_sample: 32,
        sample_format: hound::SampleFormat::Float,
    };
    let mut writer = hound::WavWriter::create(path, spec).unwrap();
    for n in 0..RATE_HZ {
        writer.write_sample((0.25 * (TAU * TONE_HZ * f64::from(n) / f64::from(RATE_HZ)).sin()) as f32).unwrap();
    }
    writer.finalize().unwrap();
}

/// Amplitude of the tone in the second half, from the sums with its sine and cosine. Over half
/// a second the two and their own squares mix by less than 1 part in 10^4, 0.001 dB.
fn amplitude(path: &Path) -> f64 {
    let samples: Vec<f64> = hound::WavReader::open(path).unwrap().samples::<f32>().map(|s| s.unwrap().into()).collect();
    let half = samples.len() / 2;
    let (mut re, mut im) = (0.0, 0.0);
    for (n, sample) in samples.iter().enumerate().skip(half) {
        let phase = TAU * TONE_HZ * n as f64 / f64::from(RATE_HZ);
        re += sample * phase.cos();
        im += sample * phase.sin();
    }
    2.0 * re.hypot(im) / half as f64
}

fn change_db(stages: &str) -> f64 {
    let room = tempfile::tempdir().unwrap();
    let (spec, before, after) = (room.path().join("spec.toml"), room.path().join("in"), room.path().join("out"));
    std::fs::write(&spec, stages).unwrap();
    std::fs::create_dir(&before).unwrap();
    write_tone(&before.join("tone.wav"));
    bandproof().arg("filter").args([&spec, &before, &after]).arg("--quiet").assert().success();
    20.0 * (amplitude(&after.join("tone.wav")) / amplitude(&before.join("tone.wav"))).log10()
}

#[test]
fn a_recording_is_weighted_as_the_table_says() {
    for (curve, table_db) in [("A", -1.1107), ("C", -3.0103)] {
        let got_db = change_db(&format!("[[stage]]\nkind = \"weighting\"\ncurve = \"{curve}\"\n"));
        assert!((got_db - table_db).abs() < 0.002, "{curve}: {got_db} dB");
    }
}

#[test]
fn a_peak_raises_its_center_and_its_cut_takes_it_back() {
    let peak =
        |gain_db: f64| format!("[[stage]]\nkind = \"peak\"\ncenter_hz = {TONE_HZ}\ngain_db = {gain_db}\nq = 3\n");
    assert!((change_db(&peak(6.0)) - 6.0).abs() < 0.002);
    assert!(change_db(&(peak(6.0) + &peak(-6.0))).abs() < 0.002);
    let shelf = format!("[[stage]]\nkind = \"highshelf\"\nedge_hz = {TONE_HZ}\ngain_db = -9\nslope = 0.8\n");
    assert!((change_db(&shelf) + 4.5).abs() < 0.002);
}

#[test]
fn design_shows_the_sections_of_a_curve_and_its_sentence() {
    let room = tempfile::tempdir().unwrap();
    let spec = room.path().join("spec.toml");
    std::fs::write(&spec, "[[stage]]\nkind = \"weighting\"\ncurve = \"K\"\n").unwrap();
    let run = |rate: &str| bandproof().arg("design").arg(&spec).args(["--rate", rate, "--json"]).output().unwrap();
    let output = run("44100");
    assert!(output.status.success());
    let report: Value = serde_json::from_slice(&output.stdout).unwrap();
    let design = &report["designs"][0];
    let sections: Vec<Section> = serde_json::from_value(design["sections"].clone()).unwrap();
    assert_eq!(sections, made(Curve::K, 44_100.0).sections);
    assert_eq!(design["stages"][0]["kind"], "weighting");
    let sentence = design["methods"]["sentence"].as_str().unwrap();
    assert!(sentence.contains("the K weighting of ITU-R BS.1770"), "{sentence}");
    let refused = run("99");
    assert_eq!(refused.status.code(), Some(2));
    let text = String::from_utf8(refused.stderr).unwrap();
    assert!(text.contains("stage 1 (weighting): curve K is made for sample rates from 100"), "{text}");
}
