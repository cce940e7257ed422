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
        ];
        let band = format!("pump hum x{harmonic}");
        assert_eq!(verdicts(&report, &band), expected(&rows), "{band}");
    }
    for band in ["warblers", "converter whine"] {
        let found = verdicts(&report, band);
        assert_eq!(found.len(), 8);
        assert!(found.values().all(|v| v == "met -"), "{band}: {found:?}");
    }
    // Nothing but the drifted hum is missed.
    for band in ["wind rumble", "booming bird", "all bird calls"] {
        let found = verdicts(&report, band);
        assert!(found.values().all(|v| !v.starts_with("missed")), "{band}: {found:?}");
        for name in ["station-a/0512.wav:1", "station-a/0542.wav:1", "station-b/0512.wav:1", "station-b/0512.wav:2"] {
            assert_eq!(found[name], "met -", "{band}");
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
    assert_eq!(each(&report, "recordings").len(), 7);
    for recording in each(&report, "recordings") {
        let gain_db = recording["output"]["gain_db"].as_f64().unwrap();
        let scaled = recording["path"] == "hydrophone/0512.wav";
        assert_eq!(gain_db < 0.0, scaled, "{recording}");
        assert_eq!(recording["output"]["clipped_samples"], 0);
    }
}
