//! Documents made from the report's schema, and the types that read reports: what the one
//! describes the others read.

use crate::REPORT;
use bandproof::report::{Head, Recording, Summary, schema};
use serde_json::{Map, Value, json};

/// Texts for the patterns of the report's schema.
const TEXTS: &[(&str, &str)] = &[
    ("^[0-9a-f]{64}$", "0123456789abcdef0123456789abcdef0123456789abcdef0123456789abcdef"),
    ("^[0-9]{4}-[0-9]{2}-[0-9]{2}T[0-9]{2}:[0-9]{2}:[0-9]{2}Z$", "2031-05-02T06:10:00Z"),
    ("^[^/]", "station-a/0512.wav"),
    ("^([ -$&-~]|%[0-9A-F]{2}){4}$", "fmt "),
];

/// A document that satisfies a part of `schema`. `nulls`: whether to choose null where that
/// is allowed; `pick`: which of several choices to take, counted round.
pub fn sample(schema: &Value, part: &Value, nulls: bool, pick: usize) -> Value {
    let again = |part: &Value| sample(schema, part, nulls, pick);
    if let Some(reference) = part["$ref"].as_str() {
        if reference == "#/$defs/Spec" {
            return normalized();
        }
        return again(schema.pointer(reference.trim_start_matches('#')).unwrap());
    }
    let nullable = |of: &Value| of == "null" || of.as_array().is_some_and(|types| types.contains(&json!("null")));
    if let Some(constant) = part.get("const") {
        return constant.clone();
    }
    if let Some(choices) = part["anyOf"].as_array().or(part["oneOf"].as_array()) {
        let is_null = |choice: &&Value| nullable(&choice["type"]);
        let choices: Vec<_> = match (choices.iter().find(is_null), nulls) {
            (Some(null), true) => vec![null],
            _ => choices.iter().filter(|choice| !is_null(choice)).collect(),
        };
        return again(choices[pick % choices.len()]);
    }
    if nullable(&part["type"]) && nulls || part["type"] == "null" {
        return Value::Null;
    }
    if let Some(choices) = part["enum"].as_array() {
        let choices: Vec<_> = choices.iter().filter(|choice| !choice.is_null()).collect();
        return choices[pick % choices.len()].clone();
    }
    let is = |of: &str| part["type"] == of || part["type"].as_array().is_some_and(|types| types.contains(&json!(of)));
    if is("object") {
        let properties = part["properties"].as_object().unwrap();
        return properties.iter().map(|(key, part)| (key.clone(), again(part))).collect::<Map<_, _>>().into();
    }
    if is("array") {
        let first = part["prefixItems"].as_array().into_iter().flatten();
        let least = part["minItems"].as_u64().unwrap_or(2) as usize;
        let rest = std::iter::repeat(&part["items"]);
        return first.chain(rest).take(least).map(again).collect();
    }
    if is("string") {
        return match part["pattern"].as_str() {
            Some(pattern) => TEXTS.iter().find(|(known, _)| *known == pattern).map(|(_, text)| *text).unwrap().into(),
            None => "words".into(),
        };
    }
    if is("boolean") {
        return pick.is_multiple_of(2).into();
    }
    assert!(is("integer") || is("number"), "no sample for {part}");
    let low = part["minimum"].as_f64().unwrap_or(0.0);
    if is("integer") { json!(low as u64 + 1) } else { json!(low + 0.25) }
}

/// A normalized spec as a report holds it.
fn normalized() -> Value {
    let spec = json!({"band": [{"name": "a", "from_hz": 1, "to_hz": 2, "keep_db": 1}], "reference_band": "a"});
    serde_json::to_value(crate::read(&spec).unwrap()).unwrap()
}

/// Reports made from the schema: all null and none, each with every choice.
pub fn reports() -> Vec<Value> {
    let schema = schema();
    let one = |nulls| (0..7).map(move |pick| (nulls, pick));
    one(false).chain(one(true)).map(|(nulls, pick)| sample(&schema, &schema, nulls, pick)).collect()
}

/// Reads a report by the types it is written from and gives it back as they write it.
pub fn through_types(report: &Value) -> serde_json::Result<Value> {
    let mut head = report.as_object().cloned().unwrap_or_default();
    let recordings = head.shift_remove("recordings").unwrap_or_default();
    let summary = head.shift_remove("summary").unwrap_or_default();
    let head: Head = serde_json::from_value(head.into())?;
    let recordings: Vec<Recording> = serde_json::from_value(recordings)?;
    let summary: Summary = serde_json::from_value(summary)?;
    serde_json::to_value(bandproof::report::Report { head, recordings, summary })
}

#[test]
fn what_the_schema_describes_the_types_read_and_write_back_unchanged() {
    for report in reports() {
        crate::assert_valid(&REPORT, &report);
        let again = through_types(&report).unwrap();
        assert!(again == report, "{again:#}\nfrom\n{report:#}");
    }
}

#[test]
fn the_samples_reach_every_key_and_both_sides_of_null() {
    let text = reports().iter().map(Value::to_string).collect::<String>();
    for key in ["pair", "unpaired", "witness", "violation", "line", "error"] {
        let all = text.matches(&format!("\"{key}\":")).count();
        let nulls = text.matches(&format!("\"{key}\":null")).count();
        assert!(nulls > 0 && nulls < all, "{key}: {nulls} of {all} are null");
    }
    for word in ["nothing-there", "out-of-range", "unproven", "given", "residual_dbfs", "delay_frames\":0.25"] {
        assert!(text.contains(word), "{word}");
    }
}
