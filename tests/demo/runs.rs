//! The whole tool on the demo recordings ends as the scenario says.

use crate::folder;
use assert_cmd::Command;
use serde_json::Value;
use std::{collections::BTreeMap, error::Error};

/// Filters the demo by a spec and returns exit status and report.
fn run(spec: &str) -> Result<(Option<i32>, Value), Box<dyn Error>> {
    let out = tempfile::tempdir()?;
    let output = Command::cargo_bin("bandproof")?
        .args(["filter", "--quiet", "--json"])
        .args([folder("filter-specs").join(spec), folder("demo-audio"), out.path().join("out")])
        .output()?;
    assert_eq!(String::from_utf8_lossy(&output.stderr), "", "nothing to complain about");
    Ok((output.status.code(), serde_json::from_slice(&output.stdout)?))
}

/// The elements of a JSON array; empty for anything else.
fn each<'a>(parent: &'a Value, key: &str) -> &'a [Value] {
    parent[key].as_array().map_or(&[], Vec::as_slice)
}

/// Verdict and reason code of a band in every channel of every recording:
/// `station-b/0512.wav:2` is the second channel.
fn verdicts(report: &Value, band: &str) -> BTreeMap<String, String> {
    let mut found = BTreeMap::new();
    for recording in each(report, "recordings") {
        assert_eq!(recording["status"], "done", "{recording}");
        for channel in each(recording, "channels") {
            let figures = each(channel, "bands").iter().find(|b| b["name"] == band).unwrap_or(&Value::Null);
            let word = |value: &Value| value.as_str().unwrap_or("-").to_owned();
            let name = format!("{}:{}", word(&recording["path"]), channel["channel"]);
            found.insert(name, [word(&figures["verdict"]), word(&figures["reason_code"])].join(" "));
        }
    }
    found
}

fn expected(rows: &[(&str, &str)]) -> BTreeMap<String, String> {
    rows.iter().map(|(name, verdict)| ((*name).to_owned(), (*verdict).to_owned())).collect()
}

#[test]
fn the_clean_up_is_proven_but_for_the_hum_that_drifted() {
    let (status, report) = run("reed-bed.toml").unwrap();
    assert_eq!(status, Some(1));
    for harmonic in 1..=8 {
        let drifted = if harmonic == 1 { "missed -" } else { "met -" };
        let rows = [
            ("hydrophone/0512.wav:1", "unproven too-short"),
            ("station-a/0512.wav:1", "met -"),
            ("station-a/0542.wav:1", "met -"),
            ("station-a/0612.wav:1", drifted),
            ("station-b/0512.wav:1", "met -"),
            ("station-b/0512.wav:2", "met -"),
            ("station-b/0542.wav:1", "unproven too-short"),
            ("station-c/0512.wav:1", "unproven nothing-there"),
            ("station-d/0512.wav:1", "met -"),
        ];
        let band = format!("pump hum x{harmonic}");
        assert_eq!(verdicts(&report, &band), expected(&rows), "{band}");
    }
    for band in ["warblers", "converter whine"] {
        let found = verdicts(&report, band);
        assert_eq!(found.len(), 9);
        assert!(found.values().all(|v| v == "met -"), "{band}: {found:?}");
    }
    // Nothing but the drifted hum is missed.
    for band in ["wind rumble", "booming bird", "all bird calls"] {
        let found = verdicts(&report, band);
        assert!(found.values().all(|v| !v.starts_with("missed")), "{band}: {found:?}");
        for name in ["a/0512.wav:1", "a/0542.wav:1", "b/0512.wav:1", "b/0512.wav:2", "d/0512.wav:1"] {
            assert_eq!(found[&format!("station-{name}")], "met -", "{band}");
        }
    }
    // The report says where the line went.
    let drifted = each(&report, "recordings").iter().find(|r| r["path"] == "station-a/0612.wav").unwrap();
    let line_hz = drifted["channels"][0]["bands"][0]["line_hz"].as_f64().unwrap();
    assert!((line_hz - 51.2).abs() < 0.01, "{line_hz}");
    assert_eq!(report["summary"]["verdict"], "missed");
}

#[test]
fn the_other_specs_hold_on_every_recording_that_can_show_it() {
    for spec in ["converter-whine.toml", "converter-whine.json", "notch-997.toml", "third-octave.toml"] {
        let (status, report) = run(spec).unwrap();
        assert_eq!(status, Some(0), "{spec}");
        let bands = each(&report["summary"], "bands");
        assert!(bands.len() >= 2);
        for band in bands {
            assert!(band["missed"] == 0 && band["met"].as_u64() >= Some(6), "{spec}: {band}");
        }
    }
}

#[test]
fn the_hydrophones_knock_is_scaled_to_fit_where_the_spec_says_so() {
    let (_, report) = run("converter-whine.toml").unwrap();
    assert_eq!(each(&report, "recordings").len(), 8);
    for recording in each(&report, "recordings") {
        let gain_db = recording["output"]["gain_db"].as_f64().unwrap();
        let scaled = recording["path"] == "hydrophone/0512.wav";
        assert_eq!(gain_db < 0.0, scaled, "{recording}");
        assert_eq!(recording["output"]["clipped_samples"], 0);
    }
}

/// The sizes were never written, and half a frame is lost: that is said, and the output is
/// a recording like any other.
#[test]
fn the_recording_that_the_battery_cut_off_is_recovered_with_a_note() {
    let out = tempfile::tempdir().unwrap();
    let ran = Command::cargo_bin("bandproof")
        .unwrap()
        .args(["filter", "--quiet", "--json", "--include", "station-d/*"])
        .args([folder("filter-specs").join("reed-bed.toml"), folder("demo-audio"), out.path().join("out")])
        .output()
        .unwrap();
    assert_eq!(ran.status.code(), Some(0), "{}", String::from_utf8_lossy(&ran.stderr));
    let report: Value = serde_json::from_slice(&ran.stdout).unwrap();
    let [recording] = each(&report, "recordings") else { panic!("one recording: {report}") };
    // 705600 bytes were due, and the last did not reach the card.
    let notes: Vec<&str> = each(recording, "notes").iter().filter_map(Value::as_str).collect();
    let of = |words: &[&str]| notes.iter().filter(|note| words.iter().all(|word| note.contains(word))).count();
    assert_eq!(of(&["`data`", "declares 0", "705599", "352799"]), 1, "declared and found: {notes:?}");
    assert_eq!(of(&["RIFF size", "declares 0"]), 1, "{notes:?}");
    assert_eq!(recording["input"]["frames"], 352_799);

    let bytes = std::fs::read(out.path().join("out/station-d/0512.wav")).unwrap();
    let size = |at: usize| u32::from_le_bytes(bytes[at..at + 4].try_into().unwrap()) as usize;
    assert_eq!((size(4), size(40)), (bytes.len() - 8, bytes.len() - 44));
    assert_eq!(hound::WavReader::new(&bytes[..]).unwrap().duration(), 352_799);
}

#[test]
fn the_hydrophones_recording_stays_rf64() {
    let (_, report) = run("notch-997.toml").unwrap();
    let hydrophone = &each(&report, "recordings")[0];
    assert_eq!((&hydrophone["path"], &hydrophone["notes"][1]), (&"hydrophone/0512.wav".into(), &Value::Null));
    // `ds64`, the samples, and nothing else but the form's own fields.
    assert_eq!(hydrophone["input"]["bytes"], hydrophone["output"]["bytes"]);
    let chunks: Vec<_> = each(hydrophone, "chunks").iter().map(|chunk| (&chunk["id"], &chunk["kept"])).collect();
    let (kept, other) = (Value::Bool(true), Value::Bool(false));
    let ids = ["ds64", "fmt ", "data"].map(Value::from);
    assert_eq!(chunks, [(&ids[0], &kept), (&ids[1], &kept), (&ids[2], &other)]);
}
