//! `design --write`, from outside.

use assert_cmd::Command;
use bandproof::spec::{self, SpecSyntax};
use serde_json::Value;
use std::fs;
use std::path::Path;

const AUTO: &str = r#"
title = "Reed bed"
design = "auto"
[[band]]
name = "rumble"
from_hz = 0
to_hz = 30
reduce_db = 30
[[band]]
name = "calls"
from_hz = 120
to_hz = 6000
keep_db = 0.5
except = ["hum"]
[[band]]
name = "hum"
center_hz = 200
span_hz = 0.4
harmonics = 3
reduce_db = 25
"#;

fn bandproof(folder: &Path, arguments: &[&str]) -> (i32, String, String) {
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
    let output = command.env_remove("NO_COLOR").current_dir(folder).args(arguments).output().unwrap();
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
    (output.status.code().unwrap(), text(output.stdout), text(output.stderr))
}

fn folder_with(name: &str, text: &str) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join(name), text).unwrap();
    folder
}

#[test]
fn what_is_written_is_the_cascade_that_was_found() {
    let folder = folder_with("bands.toml", AUTO);
    let rates = ["--rate", "22050", "--rate", "96000", "--json"];
    let found = [&["design", "bands.toml", "--write", "stages.toml"], &rates[..]].concat();
    let (status, found, errors) = bandproof(folder.path(), &found);
    assert_eq!((status, errors.as_str()), (0, ""));
    let (status, again, _) = bandproof(folder.path(), &[&["design", "stages.toml"], &rates[..]].concat());
    assert_eq!(status, 0);
    let (found, again): (Value, Value) = (serde_json::from_str(&found).unwrap(), serde_json::from_str(&again).unwrap());
    for design in 0..2 {
        assert_eq!(found["designs"][design]["sections"], again["designs"][design]["sections"]);
    }
    assert_eq!(found["found"]["spec"], again["spec"]["normalized"]);
    assert_eq!(found["found"]["section_count"], found["designs"][1]["sections"].as_array().unwrap().len());
    let text = fs::read_to_string(folder.path().join("stages.toml")).unwrap();
    assert!(text.starts_with("# Stages found from the bands of bands.toml.\n# "), "{text}");
    assert!(text.contains("22050 and 96000 Hz") && !text.contains("design = "), "{text}");
    assert!(text.contains("dB to spare") && text.contains("exceptions take "), "{text}");
    let spec = spec::parse(text.as_bytes(), SpecSyntax::Toml, "stages.toml").unwrap();
    assert!(!spec.stages.is_empty() && spec.auto.is_none());
}

#[test]
fn figures_that_a_person_edits_have_few_digits() {
    let folder = folder_with("bands.toml", AUTO);
    assert_eq!(bandproof(folder.path(), &["design", "bands.toml", "--write", "stages.toml", "--quiet"]).0, 0);
    let text = fs::read_to_string(folder.path().join("stages.toml")).unwrap();
    for line in text.lines().filter(|line| !line.starts_with('#')) {
        let digits = line.split('=').nth(1).unwrap_or("").chars().filter(char::is_ascii_digit).count();
        assert!(digits <= 14, "{line}"); // two edges of seven
    }
}

#[test]
fn the_text_says_what_was_found_and_what_it_has_to_spare() {
    let folder = folder_with("bands.toml", AUTO);
    let (status, text, _) = bandproof(folder.path(), &["design", "bands.toml"]);
    assert_eq!(status, 0);
    for part in ["Found from the bands", "second-order sections", "to spare dB", "hum x1 to x3", "down by 25 dB"] {
        assert!(text.contains(part), "{part} is missing:\n{text}");
    }
    assert!(text.lines().all(|line| line.chars().count() <= 100), "{text}");
}

/// Names that read like a line of another band's row.
#[test]
fn each_comment_stands_above_its_own_band() {
    let text = AUTO.replace("\"hum\"", "\"old xray\"").replace("\"calls\"", "\"old\"");
    let folder = folder_with("bands.toml", &text);
    assert_eq!(bandproof(folder.path(), &["design", "bands.toml", "--write", "stages.toml", "--quiet"]).0, 0);
    let text = fs::read_to_string(folder.path().join("stages.toml")).unwrap();
    let lines: Vec<&str> = text.lines().collect();
    let bands = lines.iter().enumerate().filter(|(_, line)| **line == "[[band]]");
    let told: Vec<_> = bands.map(|(index, _)| (lines[index - 2], lines[index - 1], lines[index + 1])).collect();
    let names: Vec<&str> = told.iter().map(|told| told.2).collect();
    assert_eq!(names, ["name = \"rumble\"", "name = \"old\"", "name = \"old xray\""], "{text}");
    for (before, above, name) in told {
        assert!(above.starts_with("# At least ") && before.is_empty(), "one comment above {name}:\n{text}");
        assert_eq!(above.contains("exceptions take"), name == "name = \"old\"", "{text}");
    }
}

#[test]
fn a_file_that_exists_is_never_overwritten() {
    let folder = folder_with("bands.toml", AUTO);
    let target = folder.path().join("stages.toml");
    fs::write(&target, "mine").unwrap();
    let (status, text, errors) = bandproof(folder.path(), &["design", "bands.toml", "--write", "stages.toml"]);
    assert_eq!((status, text.as_str()), (2, ""));
    assert!(errors.contains("stages.toml exists, and a spec is written to new files only"), "{errors}");
    assert_eq!(fs::read_to_string(target).unwrap(), "mine");
    let (status, _, errors) = bandproof(folder.path(), &["design", "bands.toml", "--write", "stages.yaml"]);
    assert_eq!(status, 2);
    assert!(errors.contains("a spec is written as .toml or .json"), "{errors}");
    let (status, _, errors) = bandproof(folder.path(), &["design", "bands.toml", "--write", "no/such/stages.toml"]);
    assert_eq!(status, 3);
    assert!(errors.contains("can't be written: no such folder"), "{errors}");
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 2);
}

#[test]
fn a_spec_with_stages_is_written_normalized_in_either_notation() {
    let text = "[[stage]]\nkind = \"highpass\"\nfamily = \"butterworth\"\norder = 4\nedge_hz = 40.5\n";
    let folder = folder_with("own.toml", text);
    let own = spec::parse(text.as_bytes(), SpecSyntax::Toml, "own").unwrap();
    for (name, syntax) in [("new.toml", SpecSyntax::Toml), ("new.json", SpecSyntax::Json)] {
        assert_eq!(bandproof(folder.path(), &["design", "own.toml", "--write", name, "--quiet"]).0, 0);
        let written = fs::read(folder.path().join(name)).unwrap();
        assert_eq!(spec::parse(&written, syntax, name).unwrap(), own);
    }
}

#[test]
fn bands_that_no_cascade_parts_are_refused_and_nothing_is_written() {
    let folder = folder_with("bands.toml", &AUTO.replace("to_hz = 30\n", "to_hz = 120\n"));
    let (status, text, errors) = bandproof(folder.path(), &["design", "bands.toml", "--write", "stages.toml"]);
    assert_eq!((status, text.as_str()), (2, ""));
    assert!(errors.contains("\"rumble\" (0 to 120 Hz, down by 30 dB) and \"calls\""), "{errors}");
    assert!(!folder.path().join("stages.toml").exists());
}
