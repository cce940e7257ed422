//! Wrong command lines, specs and folders get a sentence and the right status.

use super::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use std::fs;

fn bench() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("one.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 1)));
    bench
}

#[test]
fn missing_and_empty_inputs_are_refused() {
    let bench = bench();
    let missing = bench.run("filter spec.toml nowhere out");
    assert_eq!(missing.status, 2);
    assert!(missing.stderr.contains("nowhere"), "{}", missing.stderr);
    fs::create_dir(bench.path("hollow")).unwrap();
    let hollow = bench.run("filter spec.toml hollow out");
    assert_eq!(hollow.status, 2);
    assert!(hollow.stderr.contains("no recordings") && hollow.stderr.contains(".wav"), "{}", hollow.stderr);
    fs::write(bench.path("hollow/notes.txt"), b"x").unwrap();
    let texts = bench.run("filter spec.toml hollow out");
    assert_eq!(texts.status, 2);
    assert!(texts.stderr.contains("1 other file"), "{}", texts.stderr);
    assert!(!bench.path("out").exists());
}

#[test]
fn a_place_that_cant_be_written_is_refused_before_any_work() {
    let bench = bench();
    fs::write(bench.path("file"), b"x").unwrap();
    for arguments in
        ["filter spec.toml in file", "filter spec.toml in file/out", "filter spec.toml in out --report nowhere/r.json"]
    {
        let ran = bench.run(arguments);
        assert_eq!(ran.status, 2, "{arguments}: {}", ran.stderr);
        assert!(!ran.stderr.is_empty());
        assert!(!bench.path("out").exists(), "{arguments}");
    }
    assert_eq!(fs::read(bench.path("file")).unwrap(), b"x");
}

#[test]
fn specs_that_are_missing_or_unreadable_say_so() {
    let bench = bench();
    let missing = bench.run("filter absent.toml in out");
    assert_eq!(missing.status, 2);
    assert!(missing.stderr.contains("absent.toml"), "{}", missing.stderr);
    fs::write(bench.path("broken.toml"), "[[stage]\nkind = 3").unwrap();
    let broken = bench.run("filter broken.toml in out");
    assert_eq!(broken.status, 2);
    assert!(broken.stderr.contains("broken.toml:1:"), "{}", broken.stderr);
}

#[test]
fn a_band_above_half_a_rate_names_the_recording_and_the_repair() {
    let bench = Bench::new(&NOTCH_SPEC.replace("to_hz = 2000", "to_hz = 5000"));
    bench.input("one.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 1)));
    let ran = bench.filter("");
    assert_eq!(ran.status, 2);
    for word in ["voice", "one.wav", "4000", "leave-out"] {
        assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr);
    }
    let lenient = fs::read_to_string(bench.path("spec.toml")).unwrap();
    fs::write(bench.path("spec.toml"), format!("beyond_half_rate = \"leave-out\"\n{lenient}")).unwrap();
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let report = bench.report();
    assert!(report["designs"][0]["left_out"].to_string().contains("voice"), "{}", report["designs"][0]["left_out"]);
}

#[test]
fn strict_counts_unproven_as_missed() {
    let bench = Bench::new(NOTCH_SPEC);
    // Too short for the hum band at 4 Hz: 10 bins take 2.5 s beside the settling.
    bench.input("short.wav", &wav16(8000, 1, &hum_and_noise(8000, 0.8, 0.3, 1)));
    assert_eq!(bench.filter("").status, 0);
    assert_eq!(bench.filter("--strict --replace").status, 1);
    assert_eq!(bench.report()["summary"]["verdict"], "unproven");
}
