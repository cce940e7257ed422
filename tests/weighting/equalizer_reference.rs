//! Peaks and shelves against the note's formulas in other arithmetic.

use crate::support::unavoidable_db;
use bandproof::design::{equalizer, response};
use bandproof::section::Section;
use bandproof::spec::{EqualizerKind, EqualizerShape, EqualizerStage};
use serde_json::Value;

struct Case {
    stage: EqualizerStage,
    rate_hz: f64,
    section: Section,
}

fn case(entry: &Value) -> Case {
    let number = |key: &str| entry[key].as_f64();
    let stage = EqualizerStage {
        kind: match entry["kind"].as_str().unwrap() {
            "peak" => EqualizerKind::Peak,
            "lowshelf" => EqualizerKind::Lowshelf,
            "highshelf" => EqualizerKind::Highshelf,
            kind => panic!("unknown kind {kind}"),
        },
        hz: number("hz").unwrap(),
        gain_db: number("gain_db").unwrap(),
        shape: match (number("q"), number("slope")) {
            (Some(q), None) => EqualizerShape::Q(q),
            (None, Some(slope)) => EqualizerShape::Slope(slope),
            both => panic!("{both:?}"),
        },
    };
    let rate_hz = number("rate_hz").unwrap();
    Case { stage, rate_hz, section: equalizer::section(&stage, rate_hz).unwrap() }
}

fn numbers(entry: &Value) -> Vec<f64> {
    entry.as_array().unwrap().iter().map(|value| value.as_f64().unwrap()).collect()
}

/// They were computed with cos(w0) in 64-bit floating point: a few units in the last place of
/// figures up to 2.
#[test]
fn coefficients_are_those_of_the_note() {
    let file: Value = serde_json::from_str(include_str!("../reference/cookbook_cases.json")).unwrap();
    let entries = file["entries"].as_array().unwrap();
    assert_eq!(entries.len(), 16);
    for entry in entries {
        let Case { section, .. } = case(entry);
        let want = numbers(&entry["b"]).into_iter().chain(numbers(&entry["a"]));
        for (got, want) in section.b.iter().chain(&section.a).zip(want) {
            assert!((got - want).abs() <= 1.5e-15, "{entry}: {section:?}");
        }
    }
}

/// As near to the exact response as twice what rounding the exact coefficients costs, or,
/// where that was lucky, twice half a unit of the last place of 2 in each polynomial; and what
/// the response changes where the frequency looked at is off by two units in its last place.
#[test]
fn narrow_and_low_ones_keep_their_digits() {
    let cases: Vec<Value> = serde_json::from_str(include_str!("../reference/equalizer_exact.json")).unwrap();
    assert_eq!(cases.len(), 196);
    for entry in &cases {
        let Case { stage, rate_hz, section } = case(entry);
        let floor_db = entry["floor_db"].as_f64().unwrap();
        for (hz, want_db) in numbers(&entry["places_hz"]).into_iter().zip(numbers(&entry["gains_db"])) {
            let got_db = response::gain_db(&[section], hz, rate_hz);
            let slope_db = response::gain_db(&[section], hz * (1.0 + 1e-6), rate_hz) - got_db;
            let within_db =
                2.0 * floor_db.max(unavoidable_db(&section, hz, rate_hz)) + slope_db.abs() * 1e6 * 2.0 * f64::EPSILON;
            assert!(
                (got_db - want_db).abs() <= within_db,
                "{stage:?} at {rate_hz} Hz, {hz} Hz: {got_db} for {want_db}"
            );
        }
    }
}
