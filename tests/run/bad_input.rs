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

/// Found by damaging files at random: several sizes are wrong at once, so that right ones
/// make another recording of the same bytes.
#[test]
fn a_recording_whose_output_would_be_read_otherwise_fails_and_leaves_none() {
    let bench = Bench::new("[[band]]\nname = \"all\"\nfrom_hz = 10\nto_hz = 100\n");
    let digits = "52494646f200000057415645647336341c000000f2000000000000008400000000000000000000000000000000000000 \
                  666d7420100000000100020044ac000010b10200040010006c69737404000000494e464f4a554e4b0000000064617461 \
                  ffffffff0080c2d30294fea160e58634c8fecf0097d77af9135137748e48fc49ff7fc6e30080b48543037d220c2e0000 \
                  58ae1246cbe33465ff7f452804bc5754462790688487177be1d65edeff7fab82ff7fec6fc59f55369f95a2c3c04d8142 \
                  322e132b00802e7a0000cf8f49b72bccc977b45863c84a554e4b0100000009004a554e4b00000000";
    let digits: String = digits.split_whitespace().collect();
    let bytes: Vec<u8> =
        (0..digits.len() / 2).map(|k| u8::from_str_radix(&digits[2 * k..2 * k + 2], 16).unwrap()).collect();
    bench.input("torn.wav", &bytes);
    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}", ran.stdout);
    assert!(ran.stderr.contains("torn.wav: byte 92: the sizes around `data` contradict each other"), "{}", ran.stderr);
    assert!(!bench.path("out/torn.wav").exists());
}
