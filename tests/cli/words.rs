//! Commands, options, help and complaints.

use crate::{bandproof, spec, stderr, stdout};
use predicates::prelude::*;

#[test]
fn help_names_the_commands_and_what_each_status_means() {
    let help = stdout(bandproof().arg("--help"));
    for word in ["filter", "design", "Exit status:", "130"] {
        assert!(help.contains(word), "{word} is missing:\n{help}");
    }
    bandproof().arg("--help").assert().code(0).stderr("");
}

#[test]
fn help_names_every_option_of_a_command() {
    let common = ["--jobs <N>", "--quiet", "--json", "--color <WHEN>"];
    let filter = [
        "<SPEC>",
        "<IN>",
        "<OUT>",
        "--report <FILE>",
        "--dry-run",
        "--scan",
        "--replace",
        "--include <GLOB>",
        "--exclude <GLOB>",
        "--strict",
    ];
    let help = stdout(bandproof().args(["filter", "--help"]));
    for word in common.iter().chain(&filter) {
        assert!(help.contains(word), "{word} is missing:\n{help}");
    }
    let help = stdout(bandproof().args(["design", "--help"]));
    for word in common.iter().chain(&["<SPEC>", "--rate <HZ>"]) {
        assert!(help.contains(word), "{word} is missing:\n{help}");
    }
}

#[test]
fn help_fits_a_hundred_columns() {
    for arguments in [&["--help"][..], &["-h"], &["filter", "--help"], &["filter", "-h"], &["design", "--help"]] {
        let help = stdout(bandproof().args(arguments));
        assert!(!help.is_empty());
        for line in help.lines() {
            assert!(line.chars().count() <= 100, "{arguments:?}: {line}");
        }
    }
}

#[test]
fn version_is_the_name_and_the_number() {
    bandproof().arg("--version").assert().code(0).stdout(format!("bandproof {}\n", env!("CARGO_PKG_VERSION")));
}

#[test]
fn without_a_command_the_help_goes_to_stderr() {
    bandproof().assert().code(2).stdout("").stderr(predicate::str::contains("Usage: bandproof"));
}

#[test]
fn what_is_not_known_is_refused_by_name() {
    let quay = spec("quay.toml");
    for (arguments, named) in [
        (vec!["polish"], "polish"),
        (vec!["design", &quay, "--colour", "always"], "--colour"),
        (vec!["design", &quay, "--color", "sometimes"], "sometimes"),
        (vec!["design", &quay, "--rate", "0"], "--rate"),
        (vec!["design", &quay, "--rate", "44.1k"], "44.1k"),
        (vec!["design", &quay, "--jobs", "0"], "--jobs"),
        (vec!["design"], "SPEC"),
        (vec!["filter", &quay, "in"], "OUT"),
        (vec!["filter", &quay, "in", "out", "--scan"], "--dry-run"),
    ] {
        let output = bandproof().args(&arguments).output().unwrap();
        let error = String::from_utf8(output.stderr).unwrap();
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(output.stdout.is_empty(), "{arguments:?}");
        assert!(error.starts_with("bandproof: ") && error.contains(named), "{arguments:?}: {error}");
    }
}

#[test]
fn a_number_that_is_none_is_told_what_was_expected() {
    let quay = spec("quay.toml");
    for (option, value, expected) in [
        ("--rate", "0", "whole number of hertz from 1 to 4294967295"),
        ("--rate", "-5", "whole number of hertz"),
        ("--rate", "44100.5", "whole number of hertz"),
        ("--rate", "4294967296", "whole number of hertz"),
        ("--jobs", "0", "whole number of threads, at least 1"),
        ("--jobs", "-1", "whole number of threads"),
        ("--jobs", "many", "whole number of threads"),
    ] {
        let error = stderr(bandproof().args(["design", &quay, option, value]));
        assert!(error.contains(&format!("'{value}'")) && error.contains(expected), "{option} {value}: {error}");
        bandproof().args(["design", &quay, option, value]).assert().code(2).stdout("");
    }
}

#[test]
fn a_spec_that_can_not_be_read_is_refused_before_anything_else() {
    for command in [&["design", "absent.toml"][..], &["filter", "absent.toml", "absent", "absent-out"]] {
        let error = stderr(bandproof().args(command));
        assert!(error.starts_with("bandproof: absent.toml: "), "{error}");
        bandproof().args(command).assert().code(2).stdout("");
    }
    assert!(!std::path::Path::new("absent-out").exists());
}

#[test]
fn every_line_of_a_complaint_says_who_complains() {
    let error = stderr(bandproof().args(["design", &spec("misspelled.toml")]));
    assert!(error.lines().count() >= 2, "{error}");
    for line in error.lines() {
        assert!(line.starts_with("bandproof: "), "{line}");
    }
    assert!(error.contains("edge_hz"), "the repair names the key: {error}");
}
