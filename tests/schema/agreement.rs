//! Law: what the reader of spec files accepts, their schema accepts; what the schema accepts
//! and the reader does not hurts one of the relations that no schema can say.

use crate::generator::{apply, damages, document};
use crate::{SPEC, assert_valid, read};
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::{Config, RngSeed, TestRunner};
use serde_json::{Value, json};
use std::collections::BTreeMap;

/// The relations, by words of the reader's messages. The schema's own description lists
/// them for its users.
const RELATIONS: &[&str] = &[
    "is used twice",
    "is not below to_hz",
    "is not in rising order",
    "is not above ripple_db",
    "which is not above 0 Hz",
    "edges fall onto the center",
    "of the row overlap",
    "nothing passes both",
    "except names",
    "into the keep band",
    "inside the keep band",
    "reference_band names",
    "is not above edge_hz",
    "is not below edge_hz",
    "of stop_edges_hz",
    "has no conjugate",
    "has degree",
    "more zeros than poles",
];

/// What reader and schema say of one document.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum Outcome {
    BothAccept,
    BothReject,
    OnlyTheReaderRejects,
}

/// Panics where they contradict each other; counts relations that were hurt.
pub fn judge(document: &Value, hurt: &mut BTreeMap<&'static str, usize>) -> Outcome {
    match (read(document), SPEC.is_valid(document)) {
        (Ok(spec), true) => {
            // What it is normalized to is a spec for both as well.
            assert_valid(&SPEC, &serde_json::to_value(spec).unwrap());
            Outcome::BothAccept
        }
        (Ok(_), false) => {
            assert_valid(&SPEC, document);
            panic!("the schema rejects what the reader accepts: {document}")
        }
        (Err(_), false) => Outcome::BothReject,
        (Err(error), true) => {
            for problem in error.problems() {
                let relation = RELATIONS.iter().find(|relation| problem.message.contains(*relation));
                let relation = relation.unwrap_or_else(|| panic!("a schema could say that {problem}\n{document}"));
                *hurt.entry(relation).or_default() += 1;
            }
            assert!(!error.problems().is_empty(), "{error}");
            Outcome::OnlyTheReaderRejects
        }
    }
}

fn runner() -> TestRunner {
    TestRunner::new(Config { rng_seed: RngSeed::Fixed(1), failure_persistence: None, ..Config::default() })
}

#[test]
fn specs_of_every_kind_are_accepted_by_both() {
    let mut runner = runner();
    let mut words = String::new();
    for _ in 0..1000 {
        let document = document().new_tree(&mut runner).unwrap().current();
        read(&document).unwrap_or_else(|error| panic!("{error}\n{document}"));
        assert_eq!(judge(&document, &mut BTreeMap::new()), Outcome::BothAccept);
        words.push_str(&document.to_string());
    }
    // The generator reaches every key and word.
    for word in [
        "title",
        "beyond_half_rate",
        "leave-out",
        "reference_band",
        "pcm16",
        "float64",
        "triangular",
        "scale",
        "gain_db",
        "lowpass",
        "highpass",
        "bandpass",
        "bandstop",
        "notch",
        "butterworth",
        "chebyshev1",
        "chebyshev2",
        "elliptic",
        "bessel",
        "edges_hz",
        "edge_hz",
        "width_hz",
        "span_hz",
        "\"q\"",
        "harmonics",
        "ripple_db",
        "stop_db",
        "reduce_db",
        "keep_db",
        "residual_dbfs",
        "except",
        "from_hz",
        "stop_edge_hz",
        "stop_edges_hz",
        "peak",
        "lowshelf",
        "highshelf",
        "slope",
        "weighting",
        "riaa",
        "digital",
        "numerator",
        "denominator",
        "sections",
        "zeros\"",
        "poles\"",
        "analog",
        "zeros_hz",
        "poles_hz",
        "match_hz",
        "rate_hz",
        "phase",
        "design",
        "auto\":{",
        "max_sections",
    ] {
        assert!(words.contains(word), "{word}");
    }
}

#[test]
fn damaged_specs_are_judged_alike_but_for_relations() {
    let mut runner = runner();
    let (mut outcomes, mut hurt) = (BTreeMap::new(), BTreeMap::new());
    for _ in 0..8000 {
        let (mut document, damages) = (document(), damages()).new_tree(&mut runner).unwrap().current();
        for (place, damage) in &damages {
            apply(&mut document, place, damage);
        }
        *outcomes.entry(judge(&document, &mut hurt)).or_insert(0) += 1;
    }
    // Neither side can win by saying always the same.
    let count = |outcome| outcomes.get(&outcome).copied().unwrap_or(0);
    assert!(count(Outcome::BothAccept) > 2000, "{outcomes:?}");
    assert!(count(Outcome::BothReject) > 2000, "{outcomes:?}");
    // That the reader is alone is rare, and not for one reason only.
    assert!((40..400).contains(&count(Outcome::OnlyTheReaderRejects)), "{outcomes:?}");
    assert!(hurt.len() >= RELATIONS.len() / 2, "{hurt:?}");
}

/// One document for each relation, so that no entry of the list is there for nothing.
#[test]
fn each_relation_is_out_of_reach_of_the_schema() {
    let range = |name: &str, from_hz: f64, to_hz: f64| json!({"name": name, "from_hz": from_hz, "to_hz": to_hz});
    let limited = |mut band: Value, key: &str, value: Value| {
        band[key] = value;
        band
    };
    let band = |band: Value| json!({"band": [band]});
    let stage = |stage: Value| json!({"stage": [stage]});
    let limits = |place: Value| {
        let mut keys = json!({"family": "bessel", "ripple_db": 1, "stop_db": 40});
        keys.as_object_mut().unwrap().extend(place.as_object().unwrap().clone());
        stage(keys)
    };
    let (keep, reduce) = (limited(range("keep", 1.0, 9.0), "keep_db", json!(1)), |from, to| {
        limited(range("reduce", from, to), "reduce_db", json!(20))
    });
    let documents = [
        ("is used twice", json!({"band": [range("a", 1.0, 2.0), range("a", 3.0, 4.0)]})),
        ("is not below to_hz", band(range("a", 2.0, 2.0))),
        (
            "is not in rising order",
            stage(json!({"kind": "bandpass", "family": "bessel", "order": 1, "edges_hz": [60, 40]})),
        ),
        (
            "is not above ripple_db",
            stage(
                json!({"kind": "lowpass", "family": "elliptic", "order": 1, "edge_hz": 60, "ripple_db": 5, "stop_db": 5}),
            ),
        ),
        ("which is not above 0 Hz", stage(json!({"kind": "notch", "center_hz": 50, "width_hz": 100}))),
        ("edges fall onto the center", band(json!({"name": "a", "center_hz": 1e9, "span_hz": 1e-9}))),
        ("of the row overlap", stage(json!({"kind": "notch", "center_hz": 50, "width_hz": 50, "harmonics": 2}))),
        (
            "nothing passes both",
            stage(json!({"kind": "bandpass", "family": "bessel", "order": 1, "center_hz": 50, "q": 9, "harmonics": 2})),
        ),
        ("except names", band(limited(keep.clone(), "except", json!(["wobble"])))),
        ("inside the keep band", json!({"band": [keep.clone(), reduce(2.0, 3.0)]})),
        ("into the keep band", json!({"band": [keep.clone(), reduce(2.0, 30.0)]})),
        ("reference_band names", limited(band(range("a", 1.0, 2.0)), "reference_band", json!("b"))),
        ("is not above edge_hz", limits(json!({"kind": "lowpass", "edge_hz": 60, "stop_edge_hz": 60}))),
        ("is not below edge_hz", limits(json!({"kind": "highpass", "edge_hz": 60, "stop_edge_hz": 70}))),
        ("of stop_edges_hz", limits(json!({"kind": "bandpass", "edges_hz": [40, 60], "stop_edges_hz": [45, 70]}))),
        ("has no conjugate", stage(json!({"kind": "digital", "poles": [[0.5, 0.5], [0.5, 0.5]], "gain": 1}))),
        ("has degree", stage(json!({"kind": "analog", "numerator": [1, 0, 0], "denominator": [1, 1]}))),
        ("more zeros than poles", stage(json!({"kind": "digital", "zeros": [0.5], "poles": [], "gain": 1}))),
        ("more zeros than poles", stage(json!({"kind": "analog", "zeros": [0, 0], "poles": [-1], "gain": 1}))),
    ];
    for (relation, document) in &documents {
        let mut hurt = BTreeMap::new();
        assert_eq!(judge(document, &mut hurt), Outcome::OnlyTheReaderRejects, "{relation}");
        assert_eq!(hurt.keys().copied().collect::<Vec<_>>(), [*relation]);
    }
    let listed: Vec<_> = documents.iter().map(|(relation, _)| *relation).collect();
    for relation in RELATIONS {
        assert!(listed.contains(relation), "{relation}");
    }
}
