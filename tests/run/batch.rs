//! A folder with good and bad recordings: every good one comes out, every bad one is
//! named.

use super::fixtures::{Bench, NOTCH_SPEC, entry, hum_and_noise, raw_wav, wav, wav_float, wav16};
use std::fs;

#[test]
fn bad_recordings_among_good_ones_cost_nothing_but_themselves() {
    let bench = Bench::new(NOTCH_SPEC);
    let good = wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1));
    bench.input("a/good.wav", &good);
    bench.input("a/also good.WAV", &wav(44_100, 2, 24, &hum_and_noise(88_200, 8.0, 0.2, 2)));
    bench.input("b/Good.bwf", &wav_float(16_000, 1, &vec![0.1; 160_000]));
    bench.input("a/text.wav", b"these are field notes, not samples, in a file named .wav\n");
    bench.input("a/twelve.wav", b"RIFF\x04\0\0\0WAVE");
    bench.input("b/nothing.wav", b"");
    bench.input("b/no frames.wave", &raw_wav(1, 1, 48_000, 16, 0));
    bench.input("b/adpcm.wav", &raw_wav(2, 1, 48_000, 16, 64));
    bench.input("b/no channels.wav", &raw_wav(1, 0, 48_000, 16, 64));
    bench.input("b/no rate.wav", &raw_wav(1, 1, 0, 16, 64));
    let mut floats = vec![0.25f32; 1000];
    floats[617] = f32::NAN;
    floats[800] = f32::INFINITY;
    bench.input("b/nan.wav", &wav_float(16_000, 1, &floats));
    bench.input("a/._good.wav", b"resource fork");
    bench.input("a/notes.txt", b"not copied");
    bench.input("readme", b"not copied");
    let before = bench.tree("in");

    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}{}", ran.stdout, ran.stderr);
    assert_eq!(bench.tree("in"), before, "inputs are never changed");
    let made: Vec<String> = bench.tree("out").into_iter().map(|(name, _)| name).collect();
    assert_eq!(made, ["a/also good.WAV", "a/good.wav", "b/Good.bwf", "bandproof-report.json"]);

    let report = bench.report();
    let paths: Vec<&str> =
        report["recordings"].as_array().unwrap().iter().map(|one| one["path"].as_str().unwrap()).collect();
    assert!(paths.is_sorted(), "{paths:?}");
    assert_eq!(report["summary"]["recordings"], 11);
    assert_eq!((&report["summary"]["done"], &report["summary"]["failed"]), (&3.into(), &8.into()));
    assert_eq!(report["summary"]["skipped"]["dot_underscore"], 1);
    assert_eq!(report["summary"]["skipped"]["other_files"], 2);
    for (path, words) in [
        ("a/text.wav", &["RIFF", "byte 0"][..]),
        ("a/twelve.wav", &["12"]),
        ("b/nothing.wav", &["empty"]),
        ("b/no frames.wave", &["empty"]),
        ("b/adpcm.wav", &["ADPCM"]),
        ("b/no channels.wav", &["channel"]),
        ("b/no rate.wav", &["rate"]),
        ("b/nan.wav", &["617", "NaN"]),
    ] {
        let recording = entry(&report, path);
        assert_eq!((&recording["status"], &recording["output"]), (&"failed".into(), &serde_json::Value::Null));
        let error = recording["error"].as_str().unwrap();
        for word in words {
            assert!(error.contains(word), "{path}: {error:?} does not say {word:?}");
        }
        assert!(ran.stderr.contains(path), "stderr does not name {path}: {}", ran.stderr);
        assert!(ran.stdout.contains(path), "the summary does not name {path}: {}", ran.stdout);
    }
    let good = entry(&report, "a/good.wav");
    assert_eq!(good["channels"][0]["bands"][0]["verdict"], "met", "{good}");
}

#[cfg(unix)]
#[test]
fn an_unreadable_recording_fails_by_name() {
    use std::os::unix::fs::{MetadataExt, PermissionsExt};
    use std::os::unix::process::CommandExt;
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("good.wav", &wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1)));
    let closed = bench.input("closed.wav", &wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 2)));
    fs::set_permissions(&closed, fs::Permissions::from_mode(0o000)).unwrap();
    fs::set_permissions(bench.path(""), fs::Permissions::from_mode(0o777)).unwrap();
    let mut command = std::process::Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
    if fs::metadata(&closed).unwrap().uid() == 0 {
        // Permissions do not bind root: a copy of the binary runs as nobody.
        let copy = bench.path("bandproof");
        // Not `fs::copy`: a test that starts a program at that moment would inherit the file
        // open for writing, and the copy could not be run ("text file busy").
        let made = std::process::Command::new("cp").arg(assert_cmd::cargo::cargo_bin!("bandproof")).arg(&copy).status();
        assert!(made.unwrap().success());
        command = std::process::Command::new(copy);
        command.uid(65_534).gid(65_534);
    }
    let output = command.args(["filter", "spec.toml", "in", "out"]).current_dir(bench.path("")).output().unwrap();
    let stderr = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(3), "{stderr}");
    assert!(stderr.contains("closed.wav") && stderr.contains("ermission denied"), "{stderr}");
    assert_eq!(entry(&bench.report(), "good.wav")["status"], "done");
    let stdout = String::from_utf8_lossy(&output.stdout);
    assert!(stdout.contains(": 128 kB read in"), "8 s at 8 kHz in 16 bits, the good one alone: {stdout}");
}

#[cfg(unix)]
#[test]
fn permissions_and_times_are_carried_over() {
    use std::os::unix::fs::PermissionsExt;
    let bench = Bench::new(NOTCH_SPEC);
    let input = bench.input("a.wav", &wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1)));
    let recorded = std::time::SystemTime::UNIX_EPOCH + std::time::Duration::new(1_234_567_890, 500_000_000);
    fs::File::options().write(true).open(&input).unwrap().set_modified(recorded).unwrap();
    fs::set_permissions(&input, fs::Permissions::from_mode(0o640)).unwrap();
    assert_eq!(bench.filter("").status, 0);
    let output = fs::metadata(bench.path("out/a.wav")).unwrap();
    assert_eq!(output.modified().unwrap(), recorded);
    assert_eq!(output.permissions().mode() & 0o777, 0o640);
}

#[cfg(unix)]
#[test]
fn links_are_not_followed() {
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("a.wav", &wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1)));
    std::os::unix::fs::symlink(bench.path("in/a.wav"), bench.path("in/link.wav")).unwrap();
    std::os::unix::fs::symlink(bench.path("in"), bench.path("in/loop")).unwrap();
    assert_eq!(bench.filter("").status, 0);
    let report = bench.report();
    assert_eq!(
        (&report["summary"]["recordings"], &report["summary"]["skipped"]["other_files"]),
        (&1.into(), &2.into())
    );
}

#[test]
fn include_and_exclude_choose_by_name_or_path() {
    let bench = Bench::new(NOTCH_SPEC);
    let bytes = wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1));
    for path in ["a/day1.wav", "a/day2.wav", "b/day1.wav", "b/test.wav"] {
        bench.input(path, &bytes);
    }
    let made = |arguments: &str| -> Vec<String> {
        let ran = bench.filter(&format!("{arguments} --replace"));
        assert_eq!(ran.status, 0, "{}", ran.stderr);
        let made = bench.tree("out").into_iter().map(|(name, _)| name).filter(|name| name.ends_with(".wav")).collect();
        fs::remove_dir_all(bench.path("out")).unwrap();
        made
    };
    assert_eq!(made("--include day1.*"), ["a/day1.wav", "b/day1.wav"]);
    assert_eq!(made("--exclude test.wav --exclude a/**"), ["b/day1.wav"]);
    assert_eq!(made("--include a/*.wav --exclude day2.wav"), ["a/day1.wav"]);
    let none = bench.filter("--include nothing*");
    assert_eq!(none.status, 2);
    assert!(none.stderr.contains("4 recordings left out by --include or --exclude"), "{}", none.stderr);
}

#[cfg(target_os = "linux")] // elsewhere a file system may refuse the name
#[test]
fn two_names_that_read_alike_are_two_recordings() {
    use std::os::unix::ffi::OsStrExt;
    let bench = Bench::new(NOTCH_SPEC);
    let plain = bench.input("x%E9.wav", &wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1)));
    let bytes = std::ffi::OsStr::from_bytes(b"x\xE9.wav");
    fs::write(plain.with_file_name(bytes), wav16(8000, 1, &hum_and_noise(8000, 9.0, 0.3, 2))).unwrap();
    assert_eq!(bench.filter("").status, 0);
    let report = bench.report();
    let found: Vec<_> = report["recordings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|one| (one["path"].as_str().unwrap(), one["input"]["frames"].as_u64().unwrap(), one["notes"].to_string()))
        .collect();
    assert_eq!(report["summary"]["recordings"], 2);
    assert!(
        matches!(&found[..], [("x%E9.wav", 64_000, none), ("x%E9.wav", 72_000, said)] if none == "[]" && said.contains("UTF-8")),
        "{found:?}"
    );
}

#[cfg(target_os = "linux")]
#[test]
fn a_dry_run_shows_a_name_that_is_not_utf8_in_one_way() {
    use std::os::unix::ffi::OsStrExt;
    let bench = Bench::new(NOTCH_SPEC);
    let bytes = wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1));
    fs::write(bench.path("in").join(std::ffi::OsStr::from_bytes(b"x\xE9.wav")), bytes).unwrap();
    let ran = bench.filter("--dry-run");
    assert!(ran.stdout.lines().any(|line| line.ends_with("  x%E9.wav")), "{}", ran.stdout);
    assert!(!ran.stdout.contains('\u{FFFD}'), "{}", ran.stdout);
}
