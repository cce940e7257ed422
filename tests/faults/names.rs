//! Names, depths and numbers of files.

use super::fixtures::{Bench, NOTCH_SPEC, entry, hum_and_noise, raw_wav, wav16};
use std::ffi::{OsStr, OsString};
use std::fs;
use std::os::unix::ffi::OsStrExt;
use std::process::Command;

fn sound(seed: u64) -> Vec<u8> {
    wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, seed))
}

#[test]
fn odd_names_are_done_and_shown_without_steering_the_terminal() {
    let bench = Bench::new(NOTCH_SPEC);
    let odd: [&[u8]; 7] = [
        b"d\xffr/50%\xe9.wav",
        b"two\nlines.wav",
        b"bell\x07 and \x1b[31mred.wav",
        b"tab\tand\rreturn.wav",
        b" .wav",
        b"-v.wav",
        "\u{202e}vaw.\u{65e5}\u{672c}.WAV".as_bytes(),
    ];
    for (seed, name) in odd.iter().enumerate() {
        let path = bench.path("in").join(OsStr::from_bytes(name));
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(&path, sound(seed as u64)).unwrap();
    }
    // The same in complaints.
    fs::write(bench.path("in").join(OsStr::from_bytes(b"broken\n\x1b[31m\xff.wav")), b"RIFF").unwrap();
    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    assert_eq!(bench.report()["summary"]["done"], 7);
    for name in odd {
        assert!(bench.path("out").join(OsStr::from_bytes(name)).is_file(), "{}", name.escape_ascii());
    }
    for text in [&ran.stdout, &ran.stderr] {
        let control = text.chars().find(|&character| character.is_control() && character != '\n');
        assert_eq!(control, None, "{text:?}");
    }
    assert_eq!(ran.stderr.lines().count(), 1, "{}", ran.stderr);
    assert!(ran.stderr.starts_with("bandproof: broken\\n\\u{1b}[31m%FF.wav: "), "{}", ran.stderr);
    // Again, for an error of the whole run that names such a file, the first of those there.
    for name in ["bandproof-report.json", " .wav", "-v.wav"] {
        fs::remove_file(bench.path("out").join(name)).unwrap();
    }
    let ran = bench.filter("");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(ran.stderr.contains("bell\\u{7} and \\u{1b}[31mred.wav exists already"), "{:?}", ran.stderr);
    assert!(!ran.stderr.chars().any(|character| character.is_control() && character != '\n'), "{:?}", ran.stderr);
}

#[test]
fn a_name_as_long_as_the_system_takes_is_done() {
    let bench = Bench::new(NOTCH_SPEC);
    let name = format!("{}.wav", "n".repeat(251));
    bench.input(&name, &sound(1));
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    assert!(bench.path("out").join(name).is_file());
}

#[test]
fn sixty_four_levels_of_folders_are_mirrored() {
    let bench = Bench::new(NOTCH_SPEC);
    let levels = (1..=64).map(|level| format!("level-{level}")).collect::<Vec<_>>().join("/");
    bench.input(&format!("{levels}/deep.wav"), &sound(1));
    bench.input("top.wav", &sound(2));
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let report = bench.report();
    assert_eq!(entry(&report, &format!("{levels}/deep.wav"))["status"], "done");
    assert!(bench.path("out").join(levels).join("deep.wav").is_file());
}

/// Linux takes paths of at most 4095 bytes; folders below that can only be reached in steps.
#[test]
fn folders_deeper_than_a_path_can_name_fail_by_name_and_nothing_else() {
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("top.wav", &sound(1));
    fs::write(bench.path("deep.wav"), sound(2)).unwrap();
    let folder = "f".repeat(200);
    let script = format!(
        "cp deep.wav in/deep.wav && cd in && for step in 1 2 3 4 5 6 7 8 9 10 11 12 13 14 15 16 17 18 19 20 21 22; \
         do mkdir {folder} && mv deep.wav {folder} && cd -P {folder} || exit 9; done"
    );
    let made = Command::new("sh").args(["-c", &script]).current_dir(bench.path("")).status().unwrap();
    assert!(made.success(), "{made}");
    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    let report = bench.report();
    assert_eq!(entry(&report, "top.wav")["status"], "done");
    let failed = report["recordings"].as_array().unwrap().iter().find(|one| one["status"] == "failed").unwrap();
    let error = failed["error"].as_str().unwrap();
    assert!(error.contains("name too long"), "{error}");
    assert!(failed["path"].as_str().unwrap().starts_with(&folder));
    assert_eq!(report["summary"]["recordings"], 2);
}

#[test]
fn thousands_of_files_that_hold_nothing_each_get_their_entry() {
    let bench = Bench::new(NOTCH_SPEC);
    for index in 0..1500 {
        bench.input(&format!("{index:05}.wav"), b"");
        bench.input(&format!("{index:05}-head.wav"), &raw_wav(1, 1, 8000, 16, 0));
        bench.input(&format!("{index:05}-tiny.wav"), &raw_wav(1, 1, 8000, 16, 2));
    }
    bench.input("good.wav", &sound(1));
    let ran = bench.filter("--quiet");
    assert_eq!(ran.status, 3);
    assert_eq!(ran.stderr.lines().count(), 3000);
    let report = bench.report();
    let recordings = report["recordings"].as_array().unwrap();
    assert_eq!(recordings.len(), 4501);
    for (index, three) in recordings.chunks(3).take(1500).enumerate() {
        for (one, (ending, status)) in three.iter().zip([("-head", "failed"), ("-tiny", "done"), ("", "failed")]) {
            assert_eq!(one["path"], format!("{index:05}{ending}.wav"));
            assert_eq!(one["status"], status);
            let empty = one["error"].as_str().is_none_or(|error| error.starts_with("empty: "));
            assert!(empty, "{}", one["error"]);
        }
    }
    assert_eq!(fs::read_dir(bench.path("out")).unwrap().count(), 1502);
}

/// On a disk that tells case apart both are done; `collide` has its own tests for those
/// that do not.
#[test]
fn names_that_differ_by_case_alone_are_two_recordings_where_the_disk_says_so() {
    let bench = Bench::new(NOTCH_SPEC);
    for (seed, name) in ["Station/a.wav", "station/A.WAV", "station/a.wav"].into_iter().enumerate() {
        bench.input(name, &sound(seed as u64));
    }
    if bench.tree("in").len() < 3 {
        // This disk does not.
        return;
    }
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let names: Vec<OsString> = bench.tree("out").into_iter().map(|(name, _)| name.into()).collect();
    assert_eq!(names, ["Station/a.wav", "bandproof-report.json", "station/A.WAV", "station/a.wav"]);
}
