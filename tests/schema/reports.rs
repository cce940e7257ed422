//! Real reports.

use crate::samples::through_types;
use crate::{REPORT, SPEC, assert_valid, project};
use assert_cmd::Command;
use bandproof::report::{Head, Recording, Report, Summary, write_report};
use serde_json::Value;
use std::path::{Path, PathBuf};
use std::sync::LazyLock;

/// A report of `filter` over a folder, by the spec file at `spec`.
fn filter(spec: &Path, input: &Path) -> Value {
    let out = tempfile::tempdir().unwrap();
    let output = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
        .args(["filter", "--quiet", "--json"])
        .args([spec, input, &out.path().join("out")])
        .output()
        .unwrap();
    serde_json::from_slice(&output.stdout).unwrap()
}

/// A spec of the project.
fn spec(name: &str) -> PathBuf {
    project("filter-specs").join(name)
}

/// The report of the demo.
pub static DEMO: LazyLock<Value> = LazyLock::new(|| filter(&spec("reed-bed.toml"), &project("demo-audio")));

/// A report with recordings that fail.
pub static FAILED: LazyLock<Value> = LazyLock::new(|| {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("empty.wav"), b"").unwrap();
    std::fs::write(folder.path().join("no-wave.wav"), b"This is no recording at all.").unwrap();
    let good = std::fs::read_dir(project("demo-audio/station-c")).unwrap();
    let good =
        good.map(|entry| entry.unwrap().path()).find(|path| path.extension().is_some_and(|e| e == "wav")).unwrap();
    let bytes = std::fs::read(good).unwrap();
    std::fs::write(folder.path().join("cut.wav"), &bytes[..bytes.len() / 3]).unwrap();
    filter(&spec("third-octave.toml"), folder.path())
});

#[test]
fn the_demo_report_is_valid() {
    assert_valid(&REPORT, &DEMO);
    assert!(DEMO["recordings"].as_array().unwrap().len() >= 7);
    assert_valid(&SPEC, &DEMO["spec"]["normalized"]);
}

#[test]
fn a_report_with_failures_is_valid() {
    assert_valid(&REPORT, &FAILED);
    let failed = FAILED["recordings"].as_array().unwrap().iter().filter(|r| r["status"] == "failed").count();
    assert_eq!(failed, 2);
}

#[test]
fn a_reference_band_stands_in_the_report_of_filter_and_changes_nothing_else() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("third-octave.toml");
    let text = std::fs::read_to_string(spec("third-octave.toml")).unwrap();
    std::fs::write(&path, format!("reference_band = \"middle\"\n{text}")).unwrap();
    let input = project("demo-audio/station-c");
    let (with, without) = (filter(&path, &input), filter(&spec("third-octave.toml"), &input));
    assert_valid(&REPORT, &with);
    assert_eq!(with["spec"]["normalized"]["reference_band"], "middle");
    assert_eq!(without["spec"]["normalized"].get("reference_band"), None);
    for part in ["designs", "recordings", "summary"] {
        assert!(with[part] == without[part], "{part}");
    }
}

#[test]
fn the_view_of_a_whole_report_is_what_the_writer_writes() {
    for report in [&*DEMO, &*FAILED] {
        assert!(&through_types(report).unwrap() == report);
        let mut head = report.as_object().unwrap().clone();
        let recordings = head.shift_remove("recordings").unwrap();
        let summary: Summary = serde_json::from_value(head.shift_remove("summary").unwrap()).unwrap();
        let head: Head = serde_json::from_value(head.into()).unwrap();
        let recordings: Vec<Recording> = serde_json::from_value(recordings).unwrap();
        let lines = recordings.iter().map(|recording| Ok(serde_json::to_string(recording).unwrap()));
        let mut written = Vec::new();
        write_report(&mut written, &head, lines, &summary).unwrap();
        let view = serde_json::to_value(Report { head, recordings: recordings.clone(), summary }).unwrap();
        // As text, so that the order of keys counts.
        let written: Value = serde_json::from_slice(&written).unwrap();
        let (view, written) = (view.to_string(), written.to_string());
        assert!(view == written, "{view}\nand\n{written}");
    }
}
