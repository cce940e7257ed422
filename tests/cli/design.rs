//! `design`, which needs no recordings.

use crate::{bandproof, spec, stderr, stdout};
use predicates::prelude::*;
use serde_json::Value;

#[test]
fn without_a_rate_it_takes_48000_and_says_so() {
    let text = stdout(bandproof().args(["design", &spec("quay.toml")]));
    assert!(text.contains("No --rate given, so this is for 48000 Hz."), "{text}");
    assert!(text.contains("At 48000 Hz"), "{text}");
}

#[test]
fn the_table_shows_stages_sections_and_bands() {
    let text = stdout(bandproof().args(["design", &spec("quay.toml"), "--rate", "96000"]));
    for part in [
        "Spec: Microphones on the harbor quay",
        "At 96000 Hz",
        "butterworth",
        "58 to 62",
        "pole pair: radius",
        "Settling takes",
        "generator x3",
        "down by 30 dB",
        "guaranteed",
        "depends",
        "shortest recording s",
    ] {
        assert!(text.contains(part), "{part} is missing:\n{text}");
    }
    assert!(!text.contains("No --rate given"));
}

#[test]
fn each_rate_has_its_sentence_for_a_methods_section() {
    let text = stdout(bandproof().args(["design", &spec("quay.toml"), "--rate", "22050", "--rate", "96000"]));
    let told: Vec<_> = text.split("For a methods section, once recordings are filtered with this\n").skip(1).collect();
    assert_eq!(told.len(), 2, "{text}");
    for (told, rate) in told.iter().zip(["22.05 kHz", "96 kHz"]) {
        let sentence = told.split("\n\n").next().unwrap().replace('\n', " ");
        let start =
            format!("Recordings sampled at {rate} were filtered with bandproof {} in", env!("CARGO_PKG_VERSION"));
        assert!(sentence.starts_with(&start), "{sentence}");
        // At 22.05 kHz the notch at 14 kHz and the band around it are left out.
        let high = rate == "96 kHz";
        assert_eq!([sentence.contains("14000 Hz"), sentence.contains("beacon")], [high, high], "{sentence}");
    }
    let rates = ["--rate", "96000", "--json"];
    let json = stdout(bandproof().args(["design", &spec("quay.toml")]).args(rates));
    let json: Value = serde_json::from_str(&json).unwrap();
    let printed = told[1].replace('\n', " ");
    assert_eq!(json["designs"][0]["methods"]["sentence"].as_str().unwrap(), printed.trim_end());
}

#[test]
fn no_line_is_wider_than_a_hundred_columns() {
    let text = stdout(bandproof().args(["design", &spec("quay.toml"), "--rate", "22050", "--rate", "384000"]));
    assert!(text.contains("At 22050 Hz") && text.contains("At 384000 Hz"));
    for line in text.lines() {
        assert!(line.chars().count() <= 100, "{line}");
    }
}

#[test]
fn what_does_not_fit_at_a_rate_is_listed() {
    let text = stdout(bandproof().args(["design", &spec("quay.toml"), "--rate", "22050"]));
    let (_, left_out) = text.split_once("Left out at this rate").unwrap();
    let (left_out, rest) = left_out.split_once("\n\n").unwrap();
    assert!(left_out.contains("stage 3") && left_out.contains("beacon"), "{left_out}");
    assert!(!rest.contains("beacon"), "{rest}");
}

#[test]
fn what_must_fit_and_does_not_is_refused() {
    let design = ["design", &spec("fixed-rate.toml"), "--rate", "22050"];
    bandproof().args(design).assert().code(2).stderr(predicate::str::starts_with("bandproof: at 22050 Hz"));
    // A rate at which it fits is shown all the same.
    let text = stdout(bandproof().args(design).args(["--rate", "48000"]));
    assert!(text.contains("At 48000 Hz") && !text.contains("At 22050 Hz"), "{text}");
}

#[test]
fn a_requirement_out_of_reach_is_shown_and_refused() {
    let output = bandproof().args(["design", &spec("out-of-reach.toml")]).output().unwrap();
    let (text, error) = (String::from_utf8(output.stdout).unwrap(), String::from_utf8(output.stderr).unwrap());
    assert_eq!(output.status.code(), Some(2));
    assert!(text.contains("impossible"), "{text}");
    assert!(error.starts_with("bandproof: ") && error.contains("low voices") && error.contains("60 Hz"), "{error}");
}

#[test]
fn json_is_one_document_with_spec_and_designs() {
    let rates = ["--rate", "48000", "--rate", "22050", "--rate", "48000"];
    let output = bandproof().args(["design", &spec("quay.toml"), "--json"]).args(rates).output().unwrap();
    assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
    let document: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(document.as_object().unwrap().keys().collect::<Vec<_>>(), ["spec", "designs"]);
    assert_eq!(document["spec"]["title"], "Microphones on the harbor quay");
    assert_eq!(document["spec"]["normalized"]["output"]["encoding"], "same");
    let designs = document["designs"].as_array().unwrap();
    let told: Vec<_> = designs.iter().map(|design| design["rate_hz"].as_u64().unwrap()).collect();
    assert_eq!(told, [48_000, 22_050], "in the order asked for, each once");
    let entries: Vec<bandproof::report::DesignEntry> = serde_json::from_value(document["designs"].clone()).unwrap();
    assert_eq!((entries[0].dither.as_str(), entries[0].witness.is_none()), ("triangular-1", true));
}

#[test]
fn sections_of_the_stages_add_up_to_the_cascade() {
    for rate in ["22050", "48000", "384000"] {
        let text = stdout(bandproof().args(["design", &spec("quay.toml"), "--json", "--rate", rate]));
        let document: Value = serde_json::from_str(&text).unwrap();
        let design = &document["designs"][0];
        let counted: u64 =
            design["stages"].as_array().unwrap().iter().map(|stage| stage["sections"].as_u64().unwrap()).sum();
        assert_eq!(counted as usize, design["sections"].as_array().unwrap().len(), "at {rate} Hz");
    }
}

#[test]
fn equal_questions_get_equal_bytes() {
    let design = ["design", &spec("quay.toml"), "--json", "--rate", "44100"];
    let one = stdout(bandproof().args(design).args(["--jobs", "1"]));
    assert_eq!(one, stdout(bandproof().args(design).args(["--jobs", "7"])));
}

#[test]
fn quiet_leaves_the_status_and_the_complaints() {
    bandproof().args(["design", &spec("quay.toml"), "--quiet"]).assert().code(0).stdout("").stderr("");
    let error = stderr(bandproof().args(["design", &spec("out-of-reach.toml"), "--quiet"]));
    assert!(error.contains("low voices"), "{error}");
    bandproof().args(["design", &spec("out-of-reach.toml"), "--quiet"]).assert().code(2).stdout("");
}

#[test]
fn color_is_for_terminals_unless_asked_for() {
    let design = ["design", &spec("quay.toml")];
    // Here stdout is a pipe.
    let escape = "\u{1b}[";
    for (option, no_color, colored) in [
        (None, None, false),
        (Some("auto"), None, false),
        (Some("never"), None, false),
        (Some("always"), None, true),
        (Some("always"), Some("1"), true),
    ] {
        let mut command = bandproof();
        command.args(design);
        option.inspect(|option| {
            command.args(["--color", option]);
        });
        no_color.inspect(|value| {
            command.env("NO_COLOR", value);
        });
        assert_eq!(stdout(&mut command).contains(escape), colored, "{option:?} {no_color:?}");
    }
    let json = stdout(bandproof().args(design).args(["--json", "--color", "always"]));
    assert!(!json.contains(escape));
}

#[cfg(unix)]
#[test]
fn a_reader_that_has_seen_enough_is_no_failure() {
    use std::process::Stdio;
    let program = assert_cmd::cargo::cargo_bin!("bandproof");
    // A hundred rates print more than a pipe holds, so the writer meets the closed end.
    let rates = (0..100).flat_map(|step| ["--rate".to_owned(), (48_000 + step).to_string()]);
    let mut child = std::process::Command::new(program)
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args(["design", &spec("fixed-rate.toml")])
        .args(rates)
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(String::from_utf8(output.stderr).unwrap(), "");
}

#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_is_a_failure() {
    let full = std::fs::OpenOptions::new().write(true).open("/dev/full").unwrap();
    let output = std::process::Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args(["design", &spec("quay.toml")])
        .stdout(full)
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(3));
    assert!(String::from_utf8(output.stderr).unwrap().starts_with("bandproof: printing"));
}

/// A band of 0.1 % at order 14 can't be held to 1e-4 dB. Of one of 40 % nothing is to be told.
#[test]
fn what_rounding_costs_is_said_where_it_is_more_than_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("narrow.toml");
    let told = |edges: &str| {
        let stage = format!(
            "[[stage]]\nkind = \"bandpass\"\nfamily = \"elliptic\"\norder = 14\nedges_hz = {edges}\nripple_db = 3\nstop_db = 20\n"
        );
        std::fs::write(&path, stage).unwrap();
        let text = stdout(bandproof().arg("design").arg(&path).args(["--rate", "48000"]));
        text.split_whitespace().collect::<Vec<_>>().join(" ")
    };
    let narrow = told("[657.3, 657.9573]");
    let (_, rest) = narrow.split_once("the response is up to ").unwrap_or_else(|| panic!("{narrow}"));
    let (db, rest) = rest.split_once(" dB off what the stages ask for (at ").unwrap();
    let (hz, _) = rest.split_once(" Hz)").unwrap();
    // The largest error of these sections against mpmath is 0.016 dB (tests/filters/accuracy.rs).
    assert!((0.012..0.017).contains(&db.parse().unwrap()), "{db} dB");
    assert!((650.0..665.0).contains(&hz.parse().unwrap()), "{hz} Hz");
    assert!(!told("[600, 900]").contains("Rounding"));
}
