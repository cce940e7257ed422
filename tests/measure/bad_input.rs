//! What is wrong gets a sentence and its exit status, and costs nothing but itself.

use crate::fixtures::{Bench, entry, wav16};
use crate::laws::{RATE, SPEC};
use crate::sound::{Sound, straight};

fn sound(frames: usize) -> Vec<f64> {
    Sound::new(RATE, 20.0, 7, straight).samples(0.0, 1.0, frames)
}

/// Measures one pair beside one that is well; the error of the first.
fn failed(before: &[u8], after: &[u8], more: &str) -> String {
    let bench = Bench::new(SPEC);
    let good = wav16(RATE, 1, &sound(120_000));
    for side in ["before", "after"] {
        bench.write(&format!("{side}/good.wav"), &good);
    }
    bench.write("before/bad.wav", before);
    bench.write("after/bad.wav", after);
    let ran = bench.run(&format!("measure spec.toml before after {more}"));
    assert_eq!(ran.status, 3, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report_at("bandproof-report.json");
    assert_eq!(entry(&report, "good.wav")["status"], "done", "{report:#}");
    let bad = entry(&report, "bad.wav");
    assert_eq!((&bad["status"], bad["channels"].as_array().unwrap().len()), (&"failed".into(), 0));
    let error = bad["error"].as_str().unwrap().to_owned();
    assert!(ran.stdout.contains("bad.wav") && ran.stderr.contains("bad.wav"), "{}{}", ran.stdout, ran.stderr);
    error
}

#[test]
fn pairs_that_are_none_fail_by_themselves() {
    let long = sound(120_000);
    let good = wav16(RATE, 1, &long);
    let says = |error: String, words: &[&str]| {
        for word in words {
            assert!(error.contains(word), "{word:?} in {error:?}");
        }
    };
    says(failed(&good, &wav16(16_000, 1, &long), ""), &["sample rate", "8000 Hz", "16000 Hz"]);
    let stereo: Vec<f64> = long.iter().flat_map(|&sample| [sample, sample]).collect();
    says(failed(&good, &wav16(RATE, 2, &stereo), ""), &["channels", "1 channel", "2 channels"]);
    says(failed(&good, b"RIFF", ""), &["after: "]);
    says(failed(b"RIFF", &good, ""), &["before: "]);
    says(failed(&good, &wav16(RATE, 1, &vec![0.0; 120_000]), ""), &["AFTER is silent"]);
    says(failed(&wav16(RATE, 1, &vec![0.25; 120_000]), &good, ""), &["BEFORE is constant"]);
    // Another sound altogether.
    let other = Sound::new(RATE, 20.0, 8, straight).samples(0.0, 1.0, 120_000);
    says(failed(&good, &wav16(RATE, 1, &other), ""), &["--max-delay"]);
}

#[test]
fn a_recording_shorter_than_its_delay_has_no_partner() {
    let error = {
        let bench = Bench::new(SPEC);
        bench.write("before.wav", &wav16(RATE, 1, &sound(120_000)));
        bench.write("after.wav", &wav16(RATE, 1, &sound(12_000)));
        let ran = bench.run("measure spec.toml before.wav after.wav --delay 12001");
        assert_eq!(ran.status, 3, "{}{}", ran.stdout, ran.stderr);
        bench.report_at("bandproof-report.json")["recordings"][0]["error"].as_str().unwrap().to_owned()
    };
    assert!(error.contains("12001 frames") && error.contains("12000 frames"), "{error}");
}

#[test]
fn a_run_without_pairs_is_refused() {
    let bench = Bench::new(SPEC);
    bench.write("before/a.wav", &wav16(RATE, 1, &sound(8000)));
    bench.write("after/b.wav", &wav16(RATE, 1, &sound(8000)));
    bench.write("nothing/readme.txt", b"x");
    for (sides, words) in [
        ("before after", &["no pairs", "1 recording", "a.wav", "b.wav"][..]),
        ("before nothing", &["no pairs", "0 recordings"]),
        ("before after/b.wav", &["a folder", "a file"]),
        ("before missing", &["missing"]),
    ] {
        let ran = bench.run(&format!("measure spec.toml {sides}"));
        assert_eq!(ran.status, 2, "{sides}: {}{}", ran.stdout, ran.stderr);
        for word in words {
            assert!(ran.stderr.contains(word), "{sides}: {word:?} in {}", ran.stderr);
        }
        assert!(!bench.path("bandproof-report.json").exists(), "{sides}");
    }
}

#[test]
fn a_noise_recording_that_does_not_serve_is_refused() {
    let bench = Bench::new(SPEC);
    let recording = wav16(RATE, 1, &sound(120_000));
    bench.write("before.wav", &recording);
    bench.write("after.wav", &recording);
    bench.write("idle.wav", b"not a recording");
    let ran = bench.run("measure spec.toml before.wav after.wav --noise idle.wav");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    bench.write("idle.wav", &wav16(16_000, 1, &sound(120_000)));
    let ran = bench.run("measure spec.toml before.wav after.wav --noise idle.wav --replace");
    assert!(ran.status == 3 && ran.stderr.contains("16000 Hz"), "{}", ran.stderr);
    bench.write("idle.wav", &wav16(RATE, 1, &sound(8000)));
    let ran = bench.run("measure spec.toml before.wav after.wav --noise idle.wav --replace");
    assert!(ran.status == 3 && ran.stderr.contains("1.0 s"), "{}", ran.stderr);
}

#[test]
fn odd_options_are_refused() {
    let bench = Bench::new(SPEC);
    for more in
        ["--delay x", "--delay nan", "--max-delay 0", "--max-delay -1", "--max-delay 1e9", "--delay 1 --max-delay 2"]
    {
        let ran = bench.run(&format!("measure spec.toml a b {more}"));
        assert_eq!(ran.status, 2, "{more}: {}", ran.stderr);
    }
}
