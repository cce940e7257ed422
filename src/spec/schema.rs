//! The JSON Schema of spec files. Keys come from `keys`, words, ranges and the keys of
//! each kind from what the reader uses, so that the two can't part ways.

use schemars::generate::SchemaSettings;
use schemars::{JsonSchema, Schema, SchemaGenerator, json_schema};
use serde_json::{Map, Value, json};
use std::borrow::Cow;

use super::keys::{BandKeys, SpecKeys};
use super::kind::Kind;
use super::quantity::{Low, Quantity};
use super::read::{FREQUENCY, GAIN, HARMONICS, MAX_SECTIONS, Q, Q_AT_ZERO_HZ, WIDTH};
use super::read_band::{FROM, KEEP, REDUCE, REQUIREMENTS, RESIDUAL};
use super::stages::WeightingStage;
use super::transfer::{AnalogStage, DigitalStage};
use super::types::{Band, Phase, RateMeaning, Spec};
use super::words::{DesignWay, Word};
use crate::schema::document;

/// The JSON Schema (draft 2020-12) of spec files as a person writes them, in either
/// notation: keys that have a default may be left out.
///
/// Every spec that [`parse`](super::parse) accepts satisfies it. The converse holds but for
/// what no schema can say, which its description lists.
pub fn schema() -> Value {
    document::<Spec>(SchemaSettings::draft2020_12().for_deserialize(), "Spec file of bandproof")
}

/// Schema of the word for a stage's kind, `kind`.
pub(crate) fn kind_schema(_: &mut SchemaGenerator) -> Schema {
    choice::<Kind>()
}

impl JsonSchema for Spec {
    fn schema_name() -> Cow<'static, str> {
        "Spec".into()
    }

    fn json_schema(generator: &mut SchemaGenerator) -> Schema {
        let mut schema = SpecKeys::json_schema(generator);
        let some = |key: &str| json!({"required": [key], "properties": {key: {"minItems": 1}}});
        schema.insert("anyOf".to_owned(), json!([some("stage"), some("band")]));
        let halves = [WeightingStage::KIND_NAME, DigitalStage::KIND_NAME, AnalogStage::KIND_NAME];
        let whole = json!({"properties": {"kind": {"not": {"enum": halves}}}});
        let zero = rule("phase", &[Phase::Zero.name()], json!({"properties": {"stage": {"items": whole}}}));
        let bands = json!({
            "contains": {"required": ["reduce_db"]},
            "items": {"properties": {"residual_dbfs": false}},
        });
        let auto = json!({
            "if": {"anyOf": [{"required": ["design"]}, {"required": ["auto"]}]},
            "then": {"required": ["band"], "properties": {"stage": {"maxItems": 0}, "band": bands}},
        });
        schema.insert("allOf".to_owned(), json!([zero, auto]));
        schema
    }
}

impl JsonSchema for Band {
    fn schema_name() -> Cow<'static, str> {
        "Band".into()
    }

    fn json_schema(generator: &mut SchemaGenerator) -> Schema {
        let mut schema = BandKeys::json_schema(generator);
        let ways = [
            one_way(&["from_hz", "to_hz"], &["center_hz", "span_hz", "q", "harmonics"]),
            one_way(&["center_hz", "span_hz"], &["from_hz", "to_hz", "q"]),
            one_way(&["center_hz", "q"], &["from_hz", "to_hz", "span_hz"]),
        ];
        schema.insert("oneOf".to_owned(), json!(ways));
        // At most one requirement.
        let alone = |key: &str| {
            let others: Vec<_> = REQUIREMENTS.into_iter().filter(|other| *other != key).collect();
            (key.to_owned(), json!({"properties": forbidden(&others)}))
        };
        schema.insert("dependentSchemas".to_owned(), REQUIREMENTS.into_iter().map(alone).collect::<Map<_, _>>().into());
        schema.insert("dependentRequired".to_owned(), json!({"except": ["keep_db"]}));
        schema
    }
}

/// What `then` says of a table whose `key` is one of `words`.
pub(super) fn rule(key: &str, words: &[&str], then: Value) -> Value {
    json!({"if": {"properties": {key: {"enum": words}}, "required": [key]}, "then": then})
}

/// Keys that must be there, and keys that must not.
pub(super) fn one_way(required: &[&str], without: &[&str]) -> Value {
    json!({"required": required, "properties": forbidden(without)})
}

pub(super) fn forbidden(keys: &[&str]) -> Map<String, Value> {
    keys.iter().map(|key| ((*key).to_owned(), false.into())).collect()
}

/// One of a choice of words.
pub(super) fn choice<W: Word>() -> Schema {
    let words: Vec<_> = W::ALL.iter().map(|choice| choice.word()).collect();
    json_schema!({"type": "string", "enum": words})
}

/// Text without a character of the class `forbidden`. As a `not`, since `^...$` lets a last
/// line break pass in some languages; the characters themselves and no escapes or names of
/// classes, since languages differ in those too.
fn text_without(forbidden: &str) -> Schema {
    json_schema!({"type": "string", "not": {"pattern": format!("[{forbidden}]")}})
}

/// A number in the range of `quantity`.
pub(super) fn number(quantity: &Quantity) -> Schema {
    in_range("number", quantity)
}

/// A whole number in the range of `quantity`.
pub(super) fn whole(quantity: &Quantity) -> Schema {
    in_range("integer", quantity)
}

fn in_range(of: &str, quantity: &Quantity) -> Schema {
    let (key, low) = match quantity.low {
        Low::Above(low) => ("exclusiveMinimum", low),
        Low::From(low) => ("minimum", low),
    };
    json_schema!({"type": of, key: plain(low), "maximum": plain(quantity.high)})
}

/// Whole numbers without a decimal point.
pub(super) fn plain(number: f64) -> Value {
    let whole = number as i64;
    if whole as f64 == number { whole.into() } else { number.into() }
}

/// Functions that give the schema of a key.
macro_rules! parts {
    ($($name:ident => $schema:expr),+ $(,)?) => {
        $(
            #[doc = concat!("Schema of the keys that hold a ", stringify!($name), ".")]
            pub(super) fn $name(_: &mut SchemaGenerator) -> Schema {
                $schema
            }
        )+
    };
}

parts! {
    // Of the control characters (C0, DEL, C1) line breaks and tabs alone are allowed.
    title => text_without("\0-\u{8}\u{b}\u{c}\u{e}-\u{1f}\u{7f}-\u{9f}"),
    name => {
        let mut schema = text_without("\0-\u{1f}\u{7f}-\u{9f}");
        // Not blank: some character outside Unicode's White_Space.
        let pattern = "[^ \u{a0}\u{1680}\u{2000}-\u{200a}\u{2028}\u{2029}\u{202f}\u{205f}\u{3000}]";
        schema.insert("pattern".to_owned(), pattern.into());
        schema
    },
    rate => choice::<RateMeaning>(),
    design => choice::<DesignWay>(),
    max_sections => whole(&MAX_SECTIONS),
    frequency => number(&FREQUENCY),
    edges => json_schema!({"type": "array", "items": number(&FREQUENCY), "minItems": 2, "maxItems": 2}),
    width => number(&WIDTH),
    // The reader takes any Q and then says that the line reaches down to 0 Hz.
    q => number(&Quantity { low: Low::Above(Q_AT_ZERO_HZ), ..Q }),
    harmonics => whole(&HARMONICS),
    from => number(&FROM),
    reduce => number(&REDUCE),
    keep => number(&KEEP),
    residual => number(&RESIDUAL),
    gain => number(&GAIN),
}

pub(super) use parts;

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::kind;
    use crate::spec::read::{AUTO_KEYS, OUTPUT_KEYS, TOP_KEYS};
    use crate::spec::read_band;
    use crate::spec::read_transfer::SECTION_KEYS;

    fn keys(schema: &Value) -> Vec<&str> {
        let mut keys: Vec<_> = schema["properties"].as_object().unwrap().keys().map(String::as_str).collect();
        keys.sort_unstable();
        keys
    }

    #[test]
    fn every_table_has_the_keys_the_reader_knows() {
        let schema = schema();
        let tables = [
            (&schema, TOP_KEYS),
            (&schema["$defs"]["Output"], OUTPUT_KEYS),
            (&schema["$defs"]["Auto"], AUTO_KEYS),
            (&schema["$defs"]["Stage"], kind::KEYS),
            (&schema["$defs"]["Stage"]["properties"]["sections"]["items"], SECTION_KEYS),
            (&schema["$defs"]["Band"], read_band::KEYS),
        ];
        for (table, known) in tables {
            let mut known = known.to_vec();
            known.sort_unstable();
            assert_eq!(keys(table), known);
        }
    }

    #[test]
    fn the_description_states_the_limit_of_files() {
        let limit = format!("no more than {} bytes", crate::spec::MAX_FILE_BYTES);
        assert!(schema()["description"].as_str().unwrap().contains(&limit));
    }
}
