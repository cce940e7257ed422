//! What happens when filtered samples exceed full scale.

use super::fixtures::{Bench, entry, wav_float, wav16};
use std::f64::consts::TAU;

fn spec(output: &str) -> String {
    format!("[output]\n{output}\n[[band]]\nname = \"all\"\nfrom_hz = 100\nto_hz = 3000\n")
}

/// A sine of amplitude 0.75 (24 576 steps of 16 bits) at 1 kHz.
fn sine() -> Vec<f64> {
    (0..40_000).map(|n| 0.75 * (TAU * n as f64 / 8.0).sin()).collect()
}

#[test]
fn refuse_names_the_peak_and_repairs_that_work() {
    let bench = Bench::new(&spec("gain_db = 6"));
    bench.input("a.wav", &wav16(8000, 1, &sine()));
    let ran = bench.filter("");
    assert_eq!(ran.status, 3);
    let report = bench.report();
    let error = entry(&report, "a.wav")["error"].as_str().unwrap();
    // 0.75 at +6 dB is 3.50 dB over full scale.
    assert!(error.contains("+3.50 dB") && error.contains("float32") && error.contains("gain_db = 2"), "{error}");
    assert!(!bench.path("out/a.wav").exists());
    // It was read to its end, so its hash is known.
    assert_eq!(entry(&report, "a.wav")["input"]["sha256"].as_str().map(str::len), Some(64));
    for repaired in ["gain_db = 2", "gain_db = 6\nencoding = \"float32\""] {
        let bench = Bench::new(&spec(repaired));
        bench.input("a.wav", &wav16(8000, 1, &sine()));
        let ran = bench.filter("");
        assert_eq!(ran.status, 0, "{repaired}: {}", ran.stderr);
        assert_eq!(entry(&bench.report(), "a.wav")["output"]["clipped_samples"], 0);
    }
}

#[test]
fn clip_saturates_and_counts() {
    let bench = Bench::new(&spec("gain_db = 6\noverload = \"clip\"\ndither = \"none\""));
    bench.input("a.wav", &wav16(8000, 1, &sine()));
    assert_eq!(bench.filter("").status, 0);
    let report = bench.report();
    let output = &entry(&report, "a.wav")["output"];
    // sin takes 0, 0.53, 0.75, 0.53, ... at 8 points a cycle: two of them reach 1.06
    // and two 1.50, half of all samples.
    assert_eq!(output["clipped_samples"], 30_000);
    assert_eq!(output["peak_dbfs"], 0.0);
    assert_eq!(output["gain_db"], 6.0);
}

#[test]
fn scale_filters_again_with_the_gain_that_fits_and_says_so() {
    let bench = Bench::new(&spec("gain_db = 6\noverload = \"scale\""));
    bench.input("a.wav", &wav16(8000, 1, &sine()));
    bench.input("quiet.wav", &wav16(8000, 1, &sine().iter().map(|sample| sample / 4.0).collect::<Vec<_>>()));
    assert_eq!(bench.filter("").status, 0);
    let report = bench.report();
    let loud = entry(&report, "a.wav");
    assert_eq!(loud["output"]["clipped_samples"], 0);
    let gain_db = loud["output"]["gain_db"].as_f64().unwrap();
    // 24 576 of 32 768 steps leave 2.499 dB, less three steps (0.0008 dB) of room.
    assert!((2.495..2.499).contains(&gain_db), "{gain_db}");
    assert!(loud["notes"].as_array().unwrap().iter().any(|note| note.as_str().unwrap().contains("compared")), "{loud}");
    // Figures are taken back by the gain.
    let band = &loud["channels"][0]["bands"][0];
    assert!(band["gain_max_db"].as_f64().unwrap().abs() < 0.01, "{band}");
    assert_eq!(entry(&report, "quiet.wav")["output"]["gain_db"], 6.0);
}

#[test]
fn floats_are_never_clamped() {
    let bench = Bench::new(&spec("gain_db = 12"));
    bench.input("a.wav", &wav_float(8000, 1, &sine().iter().map(|&sample| 2.0 * sample as f32).collect::<Vec<_>>()));
    assert_eq!(bench.filter("").status, 0);
    let peak_dbfs = entry(&bench.report(), "a.wav")["output"]["peak_dbfs"].as_f64().unwrap();
    assert!((peak_dbfs - (20.0 * 1.5f64.log10() + 12.0)).abs() < 0.001, "{peak_dbfs}");
}
