//! The part of the JSON Schema of spec files that is about stages: which keys go with which
//! kind, and the values of their keys.

use schemars::{JsonSchema, Schema, SchemaGenerator, json_schema};
use serde_json::{Value, json};
use std::borrow::Cow;

use super::keys::StageKeys;
use super::kind::{KEYS, Kind};
use super::quantity::{Low, Quantity};
use super::read::{Q, Q_AT_ZERO_HZ};
use super::read_equalizer::{BOOST, SHAPE_Q, SLOPE};
use super::read_filter::{RIPPLE, STOP, order_range};
use super::read_transfer::{MAX_LIST, RATE};
use super::schema::{forbidden, number, one_way, parts, rule, whole};
use super::stages::{EqualizerKind, Family, FilterKind, Stage};
use super::words::Word;

impl JsonSchema for Stage {
    fn schema_name() -> Cow<'static, str> {
        "Stage".into()
    }

    fn json_schema(generator: &mut SchemaGenerator) -> Schema {
        let mut schema = StageKeys::json_schema(generator);
        let mut rules: Vec<_> = GROUPS.iter().map(|kinds| kind_rule(kinds)).collect();
        rules.extend(family_rules());
        schema.insert("allOf".to_owned(), rules.into());
        schema
    }
}

/// Kinds of one rule together.
const GROUPS: &[&[Kind]] = &[
    &[Kind::Filter(FilterKind::Lowpass), Kind::Filter(FilterKind::Highpass)],
    &[Kind::Filter(FilterKind::Bandpass), Kind::Filter(FilterKind::Bandstop)],
    &[Kind::Notch],
    &[Kind::Equalizer(EqualizerKind::Peak)],
    &[Kind::Equalizer(EqualizerKind::Lowshelf), Kind::Equalizer(EqualizerKind::Highshelf)],
    &[Kind::Weighting],
    &[Kind::Digital],
    &[Kind::Analog],
];

/// What a stage of one of these kinds may have and must have.
fn kind_rule(kinds: &[Kind]) -> Value {
    let Some(&kind) = kinds.first() else { return true.into() };
    let names: Vec<_> = kinds.iter().map(|kind| kind.word()).collect();
    let others: Vec<_> = KEYS.iter().copied().filter(|key| !kind.keys().contains(key)).collect();
    let (required, ways) = needs(kind);
    let mut then = one_way(&required, &others);
    if !ways.is_empty() {
        then["oneOf"] = ways.into();
    }
    // One key, two ranges.
    let q = match kind {
        Kind::Filter(FilterKind::Bandpass | FilterKind::Bandstop) | Kind::Notch => Some(row_q()),
        Kind::Equalizer(_) => Some(number(&SHAPE_Q)),
        _ => None,
    };
    if let Some(q) = q {
        then["properties"]["q"] = q.to_value();
    }
    if kind == Kind::Analog {
        for poles in ["poles", "poles_hz"] {
            then["properties"][poles] = json!({"minItems": 1});
        }
    }
    rule("kind", &names, then)
}

/// Keys that every stage of a kind has, and the ways to choose among the others.
fn needs(kind: Kind) -> (Vec<&'static str>, Vec<Value>) {
    match kind {
        Kind::Filter(FilterKind::Lowpass | FilterKind::Highpass) => (
            vec!["family", "edge_hz"],
            vec![
                one_way(&["order"], &["stop_edge_hz"]),
                one_way(&["stop_edge_hz", "ripple_db", "stop_db"], &["order"]),
            ],
        ),
        Kind::Filter(FilterKind::Bandpass | FilterKind::Bandstop) => (
            vec!["family"],
            vec![
                one_way(&["order", "edges_hz"], &["stop_edges_hz", "center_hz", "width_hz", "q", "harmonics"]),
                one_way(&["order", "center_hz", "width_hz"], &["stop_edges_hz", "edges_hz", "q"]),
                one_way(&["order", "center_hz", "q"], &["stop_edges_hz", "edges_hz", "width_hz"]),
                one_way(
                    &["stop_edges_hz", "edges_hz", "ripple_db", "stop_db"],
                    &["order", "center_hz", "width_hz", "q", "harmonics"],
                ),
            ],
        ),
        Kind::Notch => (vec!["center_hz"], vec![one_way(&["width_hz"], &["q"]), one_way(&["q"], &["width_hz"])]),
        Kind::Equalizer(EqualizerKind::Peak) => (vec!["center_hz", "gain_db", "q"], Vec::new()),
        Kind::Equalizer(EqualizerKind::Lowshelf | EqualizerKind::Highshelf) => {
            (vec!["edge_hz", "gain_db"], vec![one_way(&["q"], &["slope"]), one_way(&["slope"], &["q"])])
        }
        Kind::Weighting => (vec!["curve"], Vec::new()),
        Kind::Digital => (
            Vec::new(),
            vec![
                one_way(&["numerator", "denominator"], &["sections", "zeros", "poles", "gain"]),
                one_way(&["sections"], &["numerator", "denominator", "zeros", "poles", "gain"]),
                one_way(&["poles", "gain"], &["numerator", "denominator", "sections"]),
            ],
        ),
        Kind::Analog => (
            Vec::new(),
            vec![
                one_way(&["numerator", "denominator"], &["zeros", "poles", "zeros_hz", "poles_hz", "gain"]),
                one_way(&["poles", "gain"], &["numerator", "denominator", "zeros_hz", "poles_hz"]),
                one_way(&["poles_hz", "gain"], &["numerator", "denominator", "zeros", "poles"]),
            ],
        ),
    }
}

/// Order, ripple and stop band attenuation of each family with an order, families of one rule
/// together.
fn family_rules() -> Vec<Value> {
    let mut groups: Vec<(Value, Vec<&str>)> = Vec::new();
    for &family in Family::ALL {
        let choices = [("ripple_db", family.takes_ripple()), ("stop_db", family.takes_stop())];
        let keys = |taken: bool| {
            choices.into_iter().filter(|(_, takes)| *takes == taken).map(|(key, _)| key).collect::<Vec<_>>()
        };
        let mut rules = forbidden(&keys(false));
        rules.insert("order".to_owned(), json!({"maximum": family.highest_order()}));
        let then = json!({"required": keys(true), "properties": rules});
        match groups.iter_mut().find(|(same, _)| *same == then) {
            Some((_, names)) => names.push(family.name()),
            None => groups.push((then, vec![family.name()])),
        }
    }
    let with_order = |(then, names): (Value, Vec<&str>)| {
        let mut rule = rule("family", &names, then);
        rule["if"]["required"] = json!(["family", "order"]);
        rule
    };
    groups.into_iter().map(with_order).collect()
}

/// The reader takes any Q of a row and then says that the line reaches down to 0 Hz.
fn row_q() -> Schema {
    number(&Quantity { low: Low::Above(Q_AT_ZERO_HZ), ..Q })
}

/// A number that is not 0. As a range, since validators differ in which small numbers equal
/// the constant 0.
fn nonzero() -> Value {
    json!({"type": "number", "not": {"minimum": 0, "maximum": 0}})
}

/// Coefficients, not all of them 0.
fn coefficients() -> Schema {
    json_schema!({"type": "array", "items": {"type": "number"}, "contains": nonzero(), "minItems": 1, "maxItems": MAX_LIST})
}

/// Coefficients of which the first is not 0.
fn leading() -> Schema {
    json_schema!({
        "type": "array", "prefixItems": [nonzero()], "items": {"type": "number"}, "minItems": 1, "maxItems": MAX_LIST,
    })
}

/// Those of a second-order section.
fn three(of: Schema, description: &str) -> Value {
    let mut three = of.to_value();
    three["description"] = description.into();
    three["minItems"] = 3.into();
    three["maxItems"] = 3.into();
    three
}

fn root_list() -> Schema {
    let pair = json!({"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2});
    json_schema!({"type": "array", "items": {"anyOf": [{"type": "number"}, pair]}, "maxItems": MAX_LIST})
}

parts! {
    order => whole(&order_range(None)),
    q => number(&Quantity { low: Low::Above(0.0), ..Q }),
    ripple => number(&RIPPLE),
    stop => number(&STOP),
    boost => {
        let mut schema = number(&BOOST);
        schema.insert("not".to_owned(), nonzero()["not"].take());
        schema
    },
    slope => number(&SLOPE),
    numerator => coefficients(),
    denominator => leading(),
    sections => json_schema!({
        "type": "array", "minItems": 1, "maxItems": MAX_LIST,
        "items": {
            "description": "A second-order section.",
            "type": "object", "required": ["b", "a"], "additionalProperties": false,
            "properties": {
                "b": three(coefficients(), "Numerator, constant term first, not all 0."),
                "a": three(leading(), "Denominator likewise; it doesn't begin with 0, and need not with 1."),
            },
        },
    }),
    zeros => {
        let mut schema = root_list();
        schema.insert("default".to_owned(), json!([]));
        schema
    },
    roots => root_list(),
    sample_rate => whole(&RATE),
    gain => json_schema!({"type": "number", "not": nonzero()["not"]}),
}
