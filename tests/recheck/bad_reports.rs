//! Files that are no report, or none that can be checked by.

use crate::dataset::{DONE, Dataset, REPORT, entry_mut};
use bandproof::report::{read_report, write_report};
use serde_json::{Value, json};
use std::fs;

/// Rechecks by `report` and requires a refusal that says all of `parts`, on one line,
/// before anything else is looked at.
fn refused(dataset: &Dataset, report: &[u8], parts: &[&str]) {
    fs::write(dataset.path(REPORT), report).unwrap();
    // With every recording gone: a refusal comes before they are missed.
    let ran = dataset.recheck("");
    assert_eq!((ran.status, ran.stdout.as_str()), (2, ""), "{parts:?}: {}", ran.stderr);
    let start = format!("bandproof: the report {REPORT} ");
    assert!(ran.stderr.starts_with(&start) && ran.stderr.lines().count() == 1, "{}", ran.stderr);
    for part in parts {
        assert!(ran.stderr.contains(part), "{part} is missing: {}", ran.stderr);
    }
}

fn edited(report: &Value, change: impl FnOnce(&mut Value)) -> Vec<u8> {
    let mut report = report.clone();
    change(&mut report);
    serde_json::to_vec_pretty(&report).unwrap()
}

#[test]
fn what_is_no_report_is_refused_with_what_it_is() {
    let dataset = Dataset::new();
    refused(&dataset, b"", &["is empty"]);
    refused(&dataset, b"  \n ", &["cut off", "line 2"]);
    refused(&dataset, b"title = \"a spec\"\n", &["is not JSON", "line 1, column "]);
    refused(&dataset, b"RIFF\0\0", &["is not JSON", "line 1, column 1"]);
    refused(&dataset, b"{\"report\": \"a\xFF\"}", &["is not JSON", "line 1"]);
    refused(&dataset, b"[1, 2]", &["does not hold to format 1", "expected a report", "line 1"]);
    refused(&dataset, b"{\"title\": \"a spec\"}", &["is no report of bandproof", "`report` is missing"]);
    refused(&dataset, b"{\"report\": \"another\", \"format\": 1}", &["a report of `another`"]);
    refused(&dataset, b"{\"report\": 1}", &["does not hold to format 1", "expected a string"]);
    fs::remove_file(dataset.path(REPORT)).unwrap();
    let ran = dataset.recheck("");
    assert_eq!(ran.status, 2);
    assert!(ran.stderr.contains("can't be read: "), "{}", ran.stderr);
    let ran = dataset.bench.run("recheck out");
    assert_eq!(ran.status, 2, "a folder: {}", ran.stderr);
}

#[test]
fn a_report_reads_back_as_it_was_written() {
    let dataset = Dataset::new();
    let bytes = fs::read(dataset.path(REPORT)).unwrap();
    let mut recordings = Vec::new();
    let (head, summary) = read_report(bytes.as_slice(), &mut |recording| {
        recordings.push(serde_json::to_string(&recording).unwrap());
        Ok(())
    })
    .unwrap();
    let mut again = Vec::new();
    write_report(&mut again, &head, recordings.into_iter().map(Ok), &summary).unwrap();
    assert!(again == bytes, "{}", String::from_utf8_lossy(&again));
}

#[test]
fn another_format_is_refused_by_its_number_whatever_it_holds() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    for format in [json!(2), json!(0), json!(1.5), json!("1"), json!(null)] {
        let parts = format!("is a report of format {format}: this version reads format 1");
        refused(&dataset, &edited(&report, |report| report["format"] = format), &[&parts]);
    }
    refused(&dataset, b"{\"report\": \"bandproof\", \"format\": 3, \"takes\": [], \"run\": 7}", &["of format 3"]);
    // Keys in another order, the number at the end.
    refused(&dataset, b"{\"takes\": [], \"report\": \"bandproof\", \"format\": 3}", &["of format 3"]);
}

#[test]
fn a_report_cut_off_anywhere_is_refused() {
    let dataset = Dataset::new();
    let report = fs::read(dataset.path(REPORT)).unwrap();
    let text = String::from_utf8(report.clone()).unwrap();
    let end = text.trim_end().len();
    for cut in (1..60).map(|step| end * step / 60).chain([1, end - 1]) {
        let line = 1 + text[..cut].matches('\n').count();
        refused(&dataset, &report[..cut], &["is cut off", &format!("line {line}, column ")]);
    }
    // Without the line break at its end it is whole; with more after it, it is damaged.
    fs::write(dataset.path(REPORT), &report[..end]).unwrap();
    assert_eq!(dataset.recheck("").status, 0);
    refused(&dataset, &[report.as_slice(), b"{}"].concat(), &["is not JSON", "trailing characters"]);
}

/// Every object of a report, by a pointer to it.
fn objects(value: &Value, pointer: String, found: &mut Vec<String>) {
    match value {
        Value::Object(map) => {
            for (key, child) in map {
                objects(child, format!("{pointer}/{key}"), found);
            }
            found.push(pointer);
        }
        // One entry of a list stands for all.
        Value::Array(items) => {
            if let Some(first) = items.first() {
                objects(first, format!("{pointer}/0"), found);
            }
        }
        _ => {}
    }
}

#[test]
fn no_key_may_be_missing_and_none_added_at_any_depth() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    let mut pointers = Vec::new();
    objects(&report, String::new(), &mut pointers);
    // What the spec may hold is the spec's matter; a requirement is one of three keys.
    pointers.retain(|pointer| !pointer.starts_with("/spec/normalized") && !pointer.ends_with("/require"));
    assert!(pointers.len() >= 18, "{pointers:?}");
    for pointer in pointers {
        let object = report.pointer(&pointer).unwrap().as_object().unwrap();
        let added = edited(&report, |report| report.pointer_mut(&pointer).unwrap()["surplus"] = 1.into());
        refused(&dataset, &added, &["`surplus`"]);
        for key in object.keys() {
            let cut = edited(&report, |report| {
                _ = report.pointer_mut(&pointer).unwrap().as_object_mut().unwrap().shift_remove(key);
            });
            refused(&dataset, &cut, &[&format!("`{key}`"), "missing"]);
        }
    }
}

#[test]
fn a_key_given_twice_or_of_another_type_is_refused_with_its_place() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    let text = String::from_utf8(fs::read(dataset.path(REPORT)).unwrap()).unwrap();
    for key in ["\"complete\": true,", "\"frames\": 24000,"] {
        let twice = text.replacen(key, &format!("{key} {key}"), 1);
        refused(&dataset, twice.as_bytes(), &["duplicate field", "line "]);
    }
    for (pointer, value) in [
        ("/recordings/0/status", json!("lost")),
        ("/recordings/0/input/bytes", json!(-1)),
        ("/recordings/0/input/bytes", json!(1.5)),
        ("/recordings/0/input", json!([])),
        ("/recordings/0/channels/0/bands/0/before_dbfs", json!("loud")),
        ("/recordings/0/channels/0/bands/0/require", json!({"raise_db": 3.0})),
        ("/recordings", json!({})),
        ("/designs/0/sections/0/b", json!([1.0, 2.0])),
        ("/summary/verdict", json!("maybe")),
    ] {
        let changed = edited(&report, |report| *report.pointer_mut(pointer).unwrap() = value);
        refused(&dataset, &changed, &["does not hold to format 1", "line "]);
    }
    let changed = edited(&report, |report| report["recordings"][2]["input"]["bytes"] = "many".into());
    refused(&dataset, &changed, &["in entry 3 of `recordings`"]);
}

#[test]
fn hashes_that_are_none_are_refused() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    let good = report["recordings"][0]["output"]["sha256"].as_str().unwrap().to_owned();
    for bad in ["", &good[1..], &format!("{good}0"), &good.to_uppercase(), &good.replace(&good[..1], "g")] {
        for side in ["input", "output"] {
            let changed = edited(&report, |report| entry_mut(report, "a.wav")[side]["sha256"] = bad.into());
            let parts = ["in entry 1 of `recordings`", &format!("`{side}.sha256`"), "64 lower-case hexadecimal digits"];
            refused(&dataset, &changed, &parts);
        }
        let changed = edited(&report, |report| report["spec"]["file_sha256"] = bad.into());
        refused(&dataset, &changed, &["`spec.file_sha256`"]);
    }
}

#[test]
fn paths_that_lead_out_of_the_folder_are_refused() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    for bad in [
        "",
        "/etc/a.wav",
        "../a.wav",
        "station/../../a.wav",
        "station/..",
        "./a.wav",
        "station//a.wav",
        "station/",
        "..\\a.wav",
        "station\\..\\a.wav",
        "\\\\server\\share\\a.wav",
        "\\a.wav",
        "C:\\a.wav",
        "c:/a.wav",
        "a\0.wav",
    ] {
        let named = format!("is `{}`", bad.escape_debug());
        let changed = edited(&report, |report| entry_mut(report, "a.wav")["path"] = bad.into());
        refused(&dataset, &changed, &["in entry 1 of `recordings`, `path` ", &named]);
        let changed = edited(&report, |report| entry_mut(report, "station/b.wav")["output"]["path"] = bad.into());
        refused(&dataset, &changed, &["in entry 3 of `recordings`, `output.path` ", &named]);
    }
}

#[test]
fn a_path_may_be_listed_once() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    let again = edited(&report, |report| {
        let first = report["recordings"][0].clone();
        report["recordings"].as_array_mut().unwrap().push(first);
    });
    refused(&dataset, &again, &["in entry 5 of `recordings`, `a.wav` is listed a second time"]);
    let shared = edited(&report, |report| entry_mut(report, "station/b.wav")["output"]["path"] = "a.wav".into());
    refused(&dataset, &shared, &["in entry 3 of `recordings`, `a.wav` is the recording after a second time"]);
}

#[test]
fn entries_that_contradict_themselves_are_refused() {
    let dataset = Dataset::new();
    let report = dataset.bench.report();
    for (path, key, value, part) in [
        ("a.wav", "input", Value::Null, "`a.wav` is done but has no `input`"),
        ("a.wav", "output", Value::Null, "`a.wav` is done but has no `output`"),
        ("a.wav", "error", "why".into(), "`a.wav` is done but has an `error`"),
        ("a.wav", "status", "failed".into(), "`a.wav` failed but has no `error`"),
        ("broken.wav", "status", "done".into(), "`broken.wav` is done but has no `input`"),
        ("broken.wav", "output", report["recordings"][0]["output"].clone(), "failed but has an `output`"),
    ] {
        let changed = edited(&report, |report| entry_mut(report, path)[key] = value);
        refused(&dataset, &changed, &[part]);
    }
}

#[test]
fn a_spec_that_can_not_be_used_matters_only_where_it_is_needed() {
    let dataset = Dataset::new();
    dataset.edit(|report| report["spec"]["normalized"]["stage"][0]["width_hz"] = (-3.0).into());
    assert_eq!(dataset.recheck("--input in").status, 0);
    for more in ["--input in --replay", "--input in --remeasure"] {
        let ran = dataset.recheck(more);
        assert_eq!(ran.status, 2, "{}", ran.stdout);
        assert!(ran.stderr.contains("the spec in the report") && ran.stderr.contains("width_hz"), "{}", ran.stderr);
    }
}

#[test]
fn lengths_beyond_any_file_are_disagreements_and_nothing_worse() {
    let dataset = Dataset::new();
    dataset.edit(|report| {
        for path in DONE {
            for side in ["input", "output"] {
                entry_mut(report, path)[side]["bytes"] = u64::MAX.into();
            }
        }
    });
    let changed = |side: &'static str| DONE.map(|path| format!("changed {side} {path}"));
    assert_eq!(dataset.found(""), changed("output"));
    let mut both = [changed("input"), changed("output")].concat();
    both.sort_by_key(|line| line.split(' ').next_back().map(str::to_owned));
    assert_eq!(dataset.found("--input in --remeasure"), both);
}
