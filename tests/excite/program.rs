//! `bandproof excite` from outside.

use assert_cmd::Command;
use serde_json::Value;
use sha2::{Digest as _, Sha256};
use std::fs;
use std::path::Path;

fn excite(spec: &str, file: &Path, rest: &[&str]) -> Command {
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
    command.env_remove("NO_COLOR").current_dir(env!("CARGO_MANIFEST_DIR"));
    command.arg("excite").arg(spec).arg(file).args(rest);
    command
}

const REED_BED: &str = "filter-specs/reed-bed.toml";
const A_MINUTE: [&str; 4] = ["--rate", "48000", "--seconds", "60"];

#[test]
fn the_tables_tell_parts_bands_and_what_to_know() {
    let folder = tempfile::tempdir().unwrap();
    let output = excite(REED_BED, &folder.path().join("e.wav"), &A_MINUTE).output().unwrap();
    assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
    let text = String::from_utf8(output.stdout).unwrap();
    for part in [
        "Excitation for: Reed-bed recorders beside the pumping station, filter-specs/reed-bed.toml",
        "mono, 24 bit, 8.64 MB",
        "sweep            0     3        5  23520     -15.81      -15.89",
        "pink noise       3    60     2.93  24000      -6.02      -14.76",
        "pump hum x8",
        "within 0.5 dB",
        "Before you measure",
        "narrow the band",
    ] {
        assert!(text.contains(part), "{part} is missing:\n{text}");
    }
    assert!(!text.contains('\u{1b}'));
    let too_wide = |line: &&str| line.chars().count() > 100 && !line.contains("e.wav");
    assert_eq!(text.lines().find(too_wide), None);
}

#[test]
fn json_is_one_document_that_agrees_with_the_file() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("e.wav");
    let output = excite(REED_BED, &file, &A_MINUTE).arg("--json").output().unwrap();
    assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
    let document: Value = serde_json::from_slice(&output.stdout).unwrap();
    let bytes = fs::read(&file).unwrap();
    let hash: String = Sha256::digest(&bytes).iter().map(|byte| format!("{byte:02x}")).collect();
    assert_eq!(document["sha256"], hash);
    assert_eq!(document["bytes"], bytes.len());
    assert_eq!(document["file"], file.to_str().unwrap());
    assert_eq!((&document["frames"], &document["rate_hz"]), (&2_880_000.into(), &48_000.into()));
    assert_eq!(document["generator"], "pink-octaves-1");
    let parts = document["parts"].as_array().unwrap();
    assert_eq!(parts.len(), 2);
    assert_eq!((&parts[0]["to_s"], &parts[1]["from_s"]), (&3.0.into(), &3.0.into()));
    assert_eq!(parts[1]["peak_dbfs"], -6.021);
    let bands = document["bands"].as_array().unwrap();
    assert_eq!(bands.len(), 14);
    assert_eq!((&bands[0]["name"], &bands[0]["require"]["reduce_db"]), (&"pump hum x1".into(), &30.0.into()));
    for band in bands {
        assert!(band["level_dbfs"].as_f64().unwrap() > -60.0, "{band}");
        let required = band["required_attenuation_db"].is_null();
        assert_eq!(required, band["demonstrable_16_bit_db"].is_null(), "{band}");
    }
    assert_eq!(document["notes"].as_array().unwrap().len(), 2);
}

#[test]
fn what_can_not_be_ends_with_2_and_a_sentence_and_writes_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let there = folder.path().join("there.wav");
    fs::write(&there, "precious").unwrap();
    let file = folder.path().join("e.wav");
    let cases: [(&str, &Path, &[&str], &str); 8] = [
        ("filter-specs/missing.toml", &file, &A_MINUTE, "missing.toml"),
        (REED_BED, &there, &A_MINUTE, "exists already"),
        (REED_BED, &folder.path().join("e.mp3"), &A_MINUTE, ".wav"),
        (REED_BED, &folder.path().join("none/e.wav"), &A_MINUTE, "no such folder"),
        (REED_BED, &file, &["--rate", "22050", "--seconds", "60"], "half the sample rate"),
        (REED_BED, &file, &["--rate", "48000", "--seconds", "1"], "too short"),
        (REED_BED, &file, &["--rate", "48000", "--seconds", "99999"], "4 GiB"),
        (REED_BED, &file, &["--rate", "48000", "--seconds", "-3"], "--seconds"),
    ];
    for (spec, file, rest, sentence) in cases {
        let output = excite(spec, file, rest).output().unwrap();
        let error = String::from_utf8(output.stderr).unwrap();
        assert_eq!((output.status.code(), output.stdout.len()), (Some(2), 0), "{error}");
        assert!(error.starts_with("bandproof: ") && error.contains(sentence), "{error}");
    }
    let left: Vec<_> = fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert_eq!(left, ["there.wav"]);
    assert_eq!(fs::read(&there).unwrap(), b"precious");
}

#[test]
fn replace_replaces_and_quiet_is_quiet() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("e.wav");
    fs::write(&file, "old").unwrap();
    excite(REED_BED, &file, &A_MINUTE).args(["--replace", "--quiet"]).assert().code(0).stdout("").stderr("");
    assert_eq!(fs::metadata(&file).unwrap().len(), 2_880_000 * 3 + 68);
}

#[cfg(target_os = "linux")]
#[test]
fn output_that_nobody_can_read_is_a_failure() {
    let folder = tempfile::tempdir().unwrap();
    let full = fs::OpenOptions::new().write(true).open("/dev/full").unwrap();
    let output = std::process::Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .arg("excite")
        .arg(REED_BED)
        .arg(folder.path().join("e.wav"))
        .args(A_MINUTE)
        .stdout(full)
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(3));
}
