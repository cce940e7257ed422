//! Transfer functions in report, methods sentence and design table.

use crate::support::designed;
use assert_cmd::Command;
use bandproof::report::DesignEntry;

/// A low-pass from a textbook to four decimals, a pair of poles in Hz, and a section.
const SPEC: &str = r#"
[[stage]]
kind = "digital"
numerator = [0.245, 0.245]
denominator = [1, -0.5095]

[[stage]]
kind = "analog"
zeros_hz = [[0, 0], [0, 0]]
poles_hz = [[-20.5, 20.5], [-20.5, -20.5]]
gain = 1
match_hz = 100

[[stage]]
kind = "digital"
sections = [{ b = [1, 0, 0.25], a = [2, 0, 0.5] }]

[[band]]
name = "calls"
from_hz = 200
to_hz = 1000
keep_db = 10
"#;

#[test]
fn a_report_of_transfer_functions_has_finite_figures_and_names_them() {
    for rate_hz in [8_000, 48_000, 384_000] {
        let design = designed(SPEC, rate_hz);
        let entry = DesignEntry::new(&design, "triangular-1", None).unwrap();
        let text = serde_json::to_string(&entry).unwrap();
        assert!(!text.contains("NaN") && serde_json::from_str::<DesignEntry>(&text).is_ok());
        assert!(entry.stages.iter().all(|stage| stage.edges_hz.is_empty() && stage.order.is_none()));
        let totals: Vec<u32> = entry.stages.iter().map(|stage| stage.total_order).collect();
        assert_eq!(totals, [1, 2, 2]);
        let sentence = &entry.methods.sentence;
        for words in [
            "a digital transfer function given by its numerator and denominator (order 1); ",
            "an analog transfer function given by its zeros, poles, and gain (order 2), brought to digital form by the \
             bilinear transform matched at 100 Hz; and ",
            "a digital transfer function given as one section (order 2). ",
            "has its transfer function in z as given, has its transfer function in s as given and brought to z by the \
             bilinear transform, ran",
        ] {
            assert!(sentence.contains(words), "no \"{words}\" in {sentence}");
        }
        let ways = entry.methods.design.as_ref().unwrap();
        assert!(ways.starts_with("second-order sections as given; transfer functions in z as given, "), "{ways}");
    }
}

#[test]
fn the_design_command_tells_what_the_digits_are_good_for_and_refuses_what_can_not_run() {
    let folder = tempfile::tempdir().unwrap();
    let run = |spec: &str| {
        let path = folder.path().join("spec.toml");
        std::fs::write(&path, spec).unwrap();
        Command::cargo_bin("bandproof").unwrap().arg("design").arg(path).args(["--rate", "48000"]).output().unwrap()
    };
    let done = run(SPEC);
    let shown = String::from_utf8(done.stdout).unwrap().split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(done.status.success());
    assert!(shown.contains("Stage 1: coefficients are given to 3 to 4 significant digits: in \"calls\""), "{shown}");

    let done = run(&SPEC.replace("-0.5095", "-1.5095"));
    let told = String::from_utf8(done.stderr).unwrap().split_whitespace().collect::<Vec<_>>().join(" ");
    assert_eq!(done.status.code(), Some(2), "{told}");
    assert!(
        told.contains("stage 1 (digital): it has a pole of radius 1.5095 at 0 Hz, outside the unit circle"),
        "{told}"
    );
}
