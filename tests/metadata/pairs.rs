//! `measure` on time-expanded pairs: both sides and the idle device mean the same rate.

use crate::build::{FmtFields, PCM, RawChunk, raw, riff};
use crate::chunks::expanded_tenfold;
use crate::fixtures::{Bench, Noise};
use crate::runs::{FRAMES, SPEC, expanded};
use serde_json::Value;
use std::fs;

/// Faint noise, expanded or not.
fn idle(chunks: &[RawChunk]) -> Vec<u8> {
    let mut noise = Noise(3);
    let samples: Vec<u8> = (0..FRAMES).flat_map(|_| ((noise.next() * 3.0).round() as i16).to_le_bytes()).collect();
    let fmt = FmtFields { rate: 38_400, ..FmtFields::plain(PCM, 1, 16) };
    riff(&[&[fmt.chunk()], chunks, &[raw(b"data", &samples)]].concat())
}

/// Before is in `in/`, after what `filter` made of it under `rate = "acoustic"`.
fn pair() -> Bench {
    let bench = Bench::new(&format!("rate = 'acoustic'\n{SPEC}"));
    bench.input("bat.wav", &expanded());
    assert_eq!(bench.filter("").status, 0);
    fs::remove_file(bench.path("out/bandproof-report.json")).unwrap();
    bench
}

fn measured(bench: &Bench, more: &str) -> Value {
    let ran = bench.run(&format!("measure spec.toml in out --replace {more}"));
    assert!(bench.path("bandproof-report.json").exists(), "{}", ran.stderr);
    bench.report_at("bandproof-report.json")["recordings"][0].clone()
}

#[test]
fn a_pair_is_measured_at_the_acoustic_rate() {
    let bench = pair();
    bench.write("idle.wav", &idle(&[expanded_tenfold(384_000)]));
    for noise in ["", "--noise idle.wav"] {
        let recording = measured(&bench, noise);
        assert_eq!(recording["status"], "done", "{recording:#}");
        let input = &recording["input"];
        assert_eq!((&input["rate_hz"], &input["time_expansion"]), (&384_000.into(), &10.0.into()));
        let tone = &recording["channels"][0]["bands"][0];
        assert!((tone["line_hz"].as_f64().unwrap() - 40_000.0).abs() < 40.0, "{tone}");
        assert_eq!(tone["verdict"], "met", "{tone}");
        // Found in noise between dithered and undithered samples: a hundredth of a frame.
        assert!(recording["pair"]["delay_frames"].as_f64().unwrap().abs() < 0.05, "{}", recording["pair"]);
        let notes = recording["notes"].to_string();
        for side in ["before", "after"] {
            assert!(notes.contains(&format!("{side}: time-expanded (`guan` at byte 36")), "{notes}");
        }
        let ran = bench.run(&format!("recheck bandproof-report.json --input in --output out --remeasure {noise}"));
        assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    }
}

#[test]
fn a_side_that_does_not_say_so_is_no_partner() {
    let bench = pair();
    // Another program wrote the recording after and left `guan` out.
    bench.write("out/bat.wav", &idle(&[]));
    let recording = measured(&bench, "");
    assert_eq!(recording["status"], "failed");
    let error = recording["error"].as_str().unwrap();
    assert!(error.contains("before has 384000 Hz (time-expanded to 38400 Hz), the one after 38400 Hz"), "{error}");
    assert_eq!(recording["input"]["time_expansion"], 10.0);
}

#[test]
fn an_idle_recording_of_another_rate_is_refused() {
    let bench = pair();
    bench.write("idle.wav", &idle(&[]));
    let error = measured(&bench, "--noise idle.wav")["error"].as_str().unwrap().to_owned();
    assert!(error.contains("idle.wav has 38400 Hz, this pair 384000 Hz"), "{error}");
}

#[test]
fn without_the_key_neither_side_is_measured() {
    let bench = pair();
    fs::write(bench.path("spec.toml"), SPEC).unwrap();
    let error = measured(&bench, "")["error"].as_str().unwrap().to_owned();
    assert!(error.starts_with("before: byte 36: `guan` says that the recording is time-expanded"), "{error}");
    // The recording after alone is enough.
    bench.input("bat.wav", &crate::chunks::tone(384_000, 40_000.0, FRAMES, &[], &[]));
    let error = measured(&bench, "")["error"].as_str().unwrap().to_owned();
    assert!(error.starts_with("after: byte 36: `guan` says"), "{error}");
}
