//! Reports with one thing wrong are invalid, wherever it is.

use crate::REPORT;
use crate::reports::{DEMO, FAILED};
use crate::samples::{reports, through_types};
use serde_json::{Value, json};
use std::collections::HashSet;

/// Keys of a spec without which it is a spec of another meaning; the report does not say
/// which of them the spec had. `keep_db` is none of them: the normalized spec has `except`
/// beside it, if only an empty one, and that needs it.
const OPTIONAL_IN_SPECS: &[&str] = &["title", "reference_band", "harmonics", "except", "reduce_db", "residual_dbfs"];

/// Where the normalized spec stands.
const SPEC: &str = "/spec/normalized";

/// JSON pointers of all values of a document, the root's too.
fn pointers(value: &Value, pointer: &str, found: &mut Vec<String>) {
    found.push(pointer.to_owned());
    match value {
        Value::Object(object) => {
            object.iter().for_each(|(key, child)| pointers(child, &format!("{pointer}/{key}"), found));
        }
        Value::Array(items) => {
            items.iter().enumerate().for_each(|(index, item)| pointers(item, &format!("{pointer}/{index}"), found));
        }
        _ => {}
    }
}

/// The pointer without the indexes of lists: what the schema tells apart.
fn shape(pointer: &str) -> String {
    let step = |step: &str| if step.parse::<usize>().is_ok() { "*".to_owned() } else { step.to_owned() };
    pointer.split('/').map(step).collect::<Vec<_>>().join("/")
}

/// One value of each shape and type for every place, with its document: trying all the
/// bands of all the recordings would try the same part of the schema a thousand times.
fn places(documents: &[&Value]) -> Vec<(usize, String)> {
    let mut seen = HashSet::new();
    let mut places = Vec::new();
    for (index, document) in documents.iter().enumerate() {
        let mut found = Vec::new();
        pointers(document, "", &mut found);
        for pointer in found {
            let value = document.pointer(&pointer).unwrap();
            // Of objects also by their keys: stages and bands of several kinds.
            let keys = value.as_object().map(|object| object.keys().cloned().collect::<Vec<_>>());
            if seen.insert((shape(&pointer), type_of(value), keys)) {
                places.push((index, pointer));
            }
        }
    }
    places
}

fn type_of(value: &Value) -> &'static str {
    match value {
        Value::Null => "null",
        Value::Bool(_) => "boolean",
        Value::Number(_) => "number",
        Value::String(_) => "string",
        Value::Array(_) => "array",
        Value::Object(_) => "object",
    }
}

/// Calls `check` with every place of real and of made-up reports.
fn everywhere(mut check: impl FnMut(&Value, &str)) {
    let made = reports();
    let mut documents = vec![&*DEMO, &*FAILED];
    documents.extend(&made);
    for (index, pointer) in places(&documents) {
        check(documents[index], &pointer);
    }
}

fn with(document: &Value, pointer: &str, change: impl FnOnce(&mut Value)) -> Value {
    let mut changed = document.clone();
    change(changed.pointer_mut(pointer).unwrap());
    changed
}

#[test]
fn without_any_one_key() {
    let (mut removed, mut exempt) = (0, HashSet::new());
    everywhere(|document, pointer| {
        let Some(object) = document.pointer(pointer).unwrap().as_object() else { return };
        for key in object.keys() {
            let changed = with(document, pointer, |value| {
                value.as_object_mut().unwrap().shift_remove(key);
            });
            let is_valid = REPORT.is_valid(&changed);
            if pointer.starts_with(SPEC) && OPTIONAL_IN_SPECS.contains(&key.as_str()) {
                assert!(is_valid, "{pointer} without {key}");
                exempt.insert(key.clone());
            } else {
                removed += 1;
                assert!(!is_valid, "{pointer} without {key}");
            }
        }
    });
    assert!(removed > 180, "{removed}");
    // Each exemption is needed.
    let mut exempt: Vec<_> = exempt.into_iter().collect();
    exempt.sort();
    let mut optional = OPTIONAL_IN_SPECS.to_vec();
    optional.sort_unstable();
    assert_eq!(exempt, optional);
}

#[test]
fn with_any_one_key_more() {
    let mut added = 0;
    everywhere(|document, pointer| {
        if document.pointer(pointer).unwrap().is_object() {
            added += 1;
            let changed = with(document, pointer, |value| value["wobble"] = json!(1));
            assert!(!REPORT.is_valid(&changed), "{pointer} with one more key");
        }
    });
    assert!(added > 30, "{added}");
}

#[test]
fn with_a_value_of_another_type() {
    let others = [json!(true), json!(0.5), json!("words"), json!([null]), json!({"wobble": 1})];
    let mut changes = 0;
    everywhere(|document, pointer| {
        let value = document.pointer(pointer).unwrap();
        for other in others.iter().filter(|other| type_of(other) != type_of(value)) {
            let changed = with(document, pointer, |value| value.clone_from(other));
            // A null of one document may stand for any type: there the types decide.
            if value.is_null() && through_types(&changed).is_ok() {
                continue;
            }
            changes += 1;
            assert!(!REPORT.is_valid(&changed), "{pointer} = {other}");
        }
    });
    assert!(changes > 1000, "{changes}");
}

#[test]
fn null_is_valid_exactly_where_the_types_read_it() {
    let (mut valid, mut invalid) = (0, 0);
    everywhere(|document, pointer| {
        if pointer.starts_with(SPEC) || document.pointer(pointer).unwrap().is_null() {
            return;
        }
        let changed = with(document, pointer, |value| *value = Value::Null);
        let is_valid = REPORT.is_valid(&changed);
        assert_eq!(is_valid, through_types(&changed).is_ok(), "{pointer}");
        if is_valid { valid += 1 } else { invalid += 1 }
    });
    assert!(valid > 40 && invalid > 100, "{valid} valid, {invalid} invalid");
}

#[test]
fn with_values_out_of_range() {
    for (pointer, wrong) in [
        ("/report", json!("other")),
        ("/format", json!(2)),
        ("/level_reference", json!("dB SPL")),
        ("/run/started", json!("2031-05-02 06:10")),
        ("/run/started", json!("2031-05-02T06:10:00Z\n")),
        ("/run/jobs", json!(0)),
        ("/run/seconds", json!(-1)),
        ("/spec/file_sha256", json!("AB".repeat(32))),
        ("/spec/file_sha256", json!("ab".repeat(31))),
        ("/spec/normalized/stage/0/order", json!(21)),
        ("/spec/normalized/beyond_half_rate", json!("ignore")),
        ("/designs/0/max_pole_radius", json!(1)),
        ("/designs/0/rounding_db", json!(-1e-9)),
        ("/designs/0/rounding_db", json!(null)),
        ("/designs/0/rounding_at_hz", json!(-1)),
        ("/designs/0/dither", json!("triangular")),
        ("/designs/0/sections/0/b", json!([1.0, 2.0])),
        ("/designs/0/sections/0/a", json!([0.5, 0.0, 0.0])),
        ("/designs/0/sections/0/a", json!([1.0, 0.0, 0.0, 0.0])),
        ("/designs/0/stages/0/stage", json!(0)),
        ("/designs/0/stages/0/kind", json!("comb")),
        ("/designs/0/stages/0/family", json!("butter")),
        ("/designs/0/stages/0/edges_hz", json!([1, 2, 3])),
        ("/designs/0/bands/0/check", json!("likely")),
        ("/designs/0/bands/0/from_hz", json!(-0.5)),
        ("/designs/0/bands/0/require", json!({"reduce_db": 30, "keep_db": 1})),
        ("/recordings/0/path", json!("/root/0512.wav")),
        ("/recordings/0/path", json!("")),
        ("/recordings/0/status", json!("skipped")),
        ("/recordings/0/input/encoding", json!("same")),
        ("/recordings/0/input/frames", json!(1.5)),
        ("/recordings/0/input/channels", json!(65536)),
        ("/recordings/0/chunks/0/id", json!("fmt")),
        ("/recordings/0/chunks/0/id", json!("a%zzbc")),
        ("/recordings/0/spectrum/window", json!("hann")),
        ("/recordings/0/channels/0/channel", json!(0)),
        ("/recordings/0/channels/0/bands/0/resolved", json!(1.5)),
        ("/recordings/0/channels/0/bands/0/resolved", json!(-0.1)),
        ("/recordings/0/channels/0/bands/0/verdict", json!("passed")),
        ("/recordings/0/channels/0/bands/0/reason_code", json!("too_short")),
        ("/summary/done", json!(-1)),
        ("/summary/verdict", json!(null)),
    ] {
        assert!(DEMO.pointer(pointer).is_some(), "{pointer} is no place of the report");
        let changed = with(&DEMO, pointer, |value| value.clone_from(&wrong));
        assert!(!REPORT.is_valid(&changed), "{pointer} = {wrong}");
    }
}

#[test]
fn with_other_values_of_the_same_meaning_it_stays_valid() {
    for (pointer, right) in [
        ("/run/seconds", json!(0)),
        ("/designs/0/max_pole_radius", json!(0)),
        ("/designs/0/rounding_at_hz", json!(null)),
        ("/designs/0/sections/0/a", json!([1, 0, 0])),
        ("/designs/0/bands/0/group_delay_s", json!(-0.001)),
        ("/recordings/0/chunks/0/id", json!("a%00b ")),
        ("/recordings/0/channels/0/bands/0/resolved", json!(1)),
        ("/recordings/0/channels/0/bands/0/require", json!(null)),
        ("/recordings/0/output", json!(null)),
    ] {
        let changed = with(&DEMO, pointer, |value| value.clone_from(&right));
        assert!(REPORT.is_valid(&changed), "{pointer} = {right}");
    }
}
