//! `bandproof export` as it is typed.

use assert_cmd::Command;
use predicates::prelude::*;
use serde_json::Value;

fn export(arguments: &[&str]) -> Command {
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
    command.current_dir(env!("CARGO_MANIFEST_DIR")).arg("export").args(arguments);
    command
}

const REED_BED: &str = "filter-specs/reed-bed.toml";

#[test]
fn the_form_goes_to_stdout_and_nothing_to_stderr() {
    for form in ["json", "c", "rust", "numpy", "equation", "fixed"] {
        let output = export(&[REED_BED, "--rate", "48000", "--as", form]).output().unwrap();
        assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0), "{form}");
        let again = export(&[REED_BED, "--rate", "48000", "--as", form, "--quiet"]).output().unwrap();
        assert_eq!(output.stdout, again.stdout, "{form}");
        let text = String::from_utf8(output.stdout).unwrap();
        assert!(text.contains("reed-bed.toml") && text.contains("48000") && text.ends_with('\n'), "{form}");
    }
}

#[test]
fn rate_and_form_are_required() {
    export(&[REED_BED, "--as", "c"]).assert().code(2).stdout("").stderr(predicate::str::contains("--rate"));
    export(&[REED_BED, "--rate", "48000"]).assert().code(2).stdout("").stderr(predicate::str::contains("--as"));
    let twice = ["--rate", "48000", "--rate", "44100", "--as", "c"];
    export(&[REED_BED]).args(twice).assert().code(2).stdout("");
}

#[test]
fn digits_and_bits_out_of_range_or_place_are_refused_with_the_range() {
    for (form, option, value, told) in [
        ("c", "--digits", "0", "from 1 to 17"),
        ("c", "--digits", "18", "from 1 to 17"),
        ("c", "--digits", "-3", "from 1 to 17"),
        ("c", "--digits", "4.5", "from 1 to 17"),
        ("fixed", "--bits", "7", "from 8 to 32"),
        ("fixed", "--bits", "33", "from 8 to 32"),
        ("fixed", "--digits", "9", "--bits"),
        ("equation", "--bits", "16", "--digits"),
    ] {
        let arguments = [REED_BED, "--rate", "48000", "--as", form, option, value];
        export(&arguments).assert().code(2).stdout("").stderr(predicate::str::contains(told));
    }
}

#[test]
fn what_a_spec_can_not_be_at_a_rate_is_refused() {
    let arguments = [REED_BED, "--rate", "22050", "--as", "json"];
    export(&arguments).assert().code(2).stdout("").stderr(predicate::str::starts_with("bandproof: at 22050 Hz"));
    let arguments = ["tests/cli/specs/out-of-reach.toml", "--rate", "48000", "--as", "json"];
    export(&arguments).assert().code(2).stdout("").stderr(predicate::str::contains("low voices"));
    export(&["nowhere.toml", "--rate", "48000", "--as", "c"]).assert().code(2).stdout("");
}

#[test]
fn too_few_digits_are_refused_where_a_requirement_is_lost_and_told_where_it_is_weaker() {
    // Poles at 50 Hz leave the unit circle.
    let output = export(&[REED_BED, "--rate", "48000", "--as", "c", "--digits", "3"]).output().unwrap();
    let error = String::from_utf8(output.stderr).unwrap();
    assert_eq!((output.status.code(), output.stdout.len()), (Some(2), 0), "{error}");
    assert!(error.starts_with("bandproof: with 3 digits: ") && error.ends_with(" digits or more hold\n"), "{error}");
    // One digit fewer than it takes: the form is there, and so is what it no longer does.
    let json = export(&[REED_BED, "--rate", "48000", "--as", "json"]).output().unwrap().stdout;
    let fewest = serde_json::from_slice::<Value>(&json).unwrap()["fewest_digits"].as_u64().unwrap();
    let fewer = (fewest - 1).to_string();
    let output = export(&[REED_BED, "--rate", "48000", "--as", "json", "--digits", &fewer]).output().unwrap();
    let error = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(1), "{error}");
    assert!(error.starts_with(&format!("bandproof: with {fewer} digits: band \"")), "{error}");
    assert!(error.contains(&format!("; {fewest} digits or more hold")), "{error}");
    let document: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(document["digits"].as_u64(), Some(fewest - 1));
}

#[test]
fn a_loss_says_which_way_it_goes_and_what_holds() {
    let complaint = |spec: &str, rate_hz: &str, form: &str, option: [&str; 2], code: i32| {
        let output = export(&[spec, "--rate", rate_hz, "--as", form]).args(option).output().unwrap();
        let error = String::from_utf8(output.stderr).unwrap();
        assert_eq!(output.status.code(), Some(code), "{error}");
        error
    };
    // A tone that is to come down is raised.
    let error = complaint("filter-specs/notch-997.toml", "48000", "c", ["--digits", "3"], 2);
    assert!(
        error.contains("band \"test tone\" is raised by 15.104 dB or more, and has to be down by 27 dB"),
        "{error}"
    );
    // Two numbers do not run into each other.
    let error = complaint(REED_BED, "48000", "c", ["--digits", "1"], 2);
    assert!(error.starts_with("bandproof: with 1 digit: 27 of 27 sections are unstable"), "{error}");
    // Integers too name what would do, whether the document is there or not.
    let bits = |error: &str| error.trim_end().ends_with(" bits hold, and no fewer do");
    let error = complaint("filter-specs/converter-whine.toml", "96000", "fixed", ["--bits", "8"], 2);
    assert!(bits(&error), "{error}");
    let error = complaint("filter-specs/converter-whine.toml", "44100", "fixed", ["--bits", "8"], 1);
    assert!(error.contains("rounding makes noise") && bits(&error), "{error}");
}
