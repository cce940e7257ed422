//! Spec files as people write them, of every kind, and ways to damage them.

use crate::generator_stage::{stage, whole_stage};
use bandproof::spec::{BeyondHalfRate, Dither, Family, OutputEncoding, Overload, Phase, RateMeaning};
use proptest::prelude::*;
use proptest::sample::{Index, select};
use serde_json::{Map, Value, json};

/// Adds keys of `more` to `table`.
pub fn and(mut table: Value, more: Value) -> Value {
    let (Value::Object(table_keys), Value::Object(more)) = (&mut table, more) else { panic!("no tables") };
    table_keys.extend(more);
    table
}

/// Each key of a table is there or not.
pub fn some_of(table: Map<String, Value>) -> impl Strategy<Value = Value> {
    let keys: Vec<_> = table.into_iter().collect();
    let size = keys.len();
    proptest::sample::subsequence(keys, 0..=size).prop_map(|keys| Value::Object(keys.into_iter().collect()))
}

/// Whole and broken numbers, as both can be written.
pub fn number(from: f64, to: f64) -> impl Strategy<Value = Value> {
    prop_oneof![
        (from..to).prop_map(|number| json!(number)),
        (from.ceil() as i64..=to.floor() as i64).prop_map(|number| json!(number)),
    ]
}

pub fn frequency() -> impl Strategy<Value = Value> {
    number(1.0, 20_000.0)
}

/// `center_hz` with `width_key` or `q`, narrow enough for as many lines.
pub fn row(width_key: &'static str, most: u32) -> impl Strategy<Value = Value> {
    let harmonics = prop_oneof![Just(None), (1..=most).prop_map(Some)];
    (1.0..5000.0_f64, harmonics, 0.001..0.9_f64, any::<bool>()).prop_map(move |(center_hz, harmonics, share, by_q)| {
        let mut row = match by_q {
            true => json!({"center_hz": center_hz, "q": f64::from(harmonics.unwrap_or(1)) / share}),
            false => json!({"center_hz": center_hz, width_key: center_hz * share}),
        };
        if let Some(harmonics) = harmonics {
            row["harmonics"] = json!(harmonics);
        }
        row
    })
}

/// Bands that agree with each other: names have numbers, and what must be kept excepts all
/// that must be reduced.
fn bands() -> impl Strategy<Value = Vec<Value>> {
    let range = (number(0.0, 9000.0), 0.001..5000.0_f64)
        .prop_map(|(from, width)| json!({"to_hz": from.as_f64().unwrap() + width, "from_hz": from}));
    let limit = prop_oneof![
        number(0.1, 200.0).prop_map(|db| json!({"reduce_db": db})),
        number(0.1, 200.0).prop_map(|db| json!({"keep_db": db})),
        number(-200.0, 0.0).prop_map(|db| json!({"residual_dbfs": db})),
        Just(json!({})),
    ];
    let band = (prop_oneof![range, row("span_hz", 30)], limit).prop_map(|(place, limit)| and(place, limit));
    proptest::collection::vec(band, 0..5).prop_map(|mut bands| {
        for (index, band) in bands.iter_mut().enumerate() {
            band["name"] = json!(format!("band {index}"));
        }
        let reduced: Vec<_> =
            bands.iter().filter(|band| band.get("reduce_db").is_some()).map(|band| band["name"].clone()).collect();
        for band in bands.iter_mut().filter(|band| band.get("keep_db").is_some()) {
            if !reduced.is_empty() {
                band["except"] = json!(reduced);
            }
        }
        bands
    })
}

/// Keys of the top that say how the cascade comes about, with stages where it is not found.
fn cascade() -> impl Strategy<Value = Value> {
    let phase = prop_oneof![Just(json!({})), select(Phase::ALL).prop_map(|phase| json!({"phase": phase.name()}))];
    let limits = (select(Family::ALL), 1..=200_u32)
        .prop_map(|(family, most)| json!({"family": family.name(), "max_sections": most}))
        .prop_flat_map(|limits| some_of(limits.as_object().unwrap().clone()));
    let ways = limits.prop_map(|limits| json!({"design": "auto", "auto": limits, "stage": []}));
    let auto = (phase, ways.prop_flat_map(|ways| some_of(ways.as_object().unwrap().clone())))
        .prop_map(|(phase, ways)| and(phase, ways));
    let with = |phase: Option<Phase>, stages: Vec<Value>| {
        let mut keys = json!({});
        if let Some(phase) = phase {
            keys["phase"] = json!(phase.name());
        }
        if !stages.is_empty() {
            keys["stage"] = stages.into();
        }
        keys
    };
    let any = prop_oneof![2 => stage().boxed(), 1 => whole_stage().boxed()];
    let causal = (select(&[None, Some(Phase::Causal)][..]), proptest::collection::vec(any, 0..4));
    let zero = proptest::collection::vec(stage(), 0..4);
    prop_oneof![
        3 => causal.prop_map(move |(phase, stages)| with(phase, stages)),
        1 => zero.prop_map(move |stages| with(Some(Phase::Zero), stages)),
        1 => auto,
    ]
}

/// A valid spec, any key left out that may be.
pub fn document() -> impl Strategy<Value = Value> {
    let output = (
        select(OutputEncoding::ALL),
        select(Dither::ALL),
        select(Overload::ALL),
        number(-200.0, 200.0),
        any::<bool>(),
    )
        .prop_flat_map(|(encoding, dither, overload, gain_db, history)| {
            let all = json!({
                "encoding": encoding.name(), "dither": dither.name(), "overload": overload.name(), "gain_db": gain_db,
                "history": history,
            });
            some_of(all.as_object().unwrap().clone())
        });
    let top = (select(BeyondHalfRate::ALL), select(RateMeaning::ALL), output, "\\PC{0,12}");
    let top = top.prop_flat_map(|(beyond, rate, output, title)| {
        let all = json!({"title": title, "beyond_half_rate": beyond.name(), "rate": rate.name(), "output": output});
        some_of(all.as_object().unwrap().clone())
    });
    (top, cascade(), bands(), any::<Option<Index>>())
        .prop_map(|(top, cascade, bands, reference)| {
            let mut top = and(top, cascade);
            let has = |key: &str| bands.iter().any(|band| band.get(key).is_some());
            if !has("reduce_db") || has("residual_dbfs") {
                // Nothing can be found from these bands.
                for key in ["design", "auto"] {
                    top.as_object_mut().unwrap().shift_remove(key);
                }
            }
            let gains = |band: &&Value| {
                let single = band.get("harmonics").is_none_or(|lines| lines == 1);
                single && band.get("reduce_db").is_none() && band.get("residual_dbfs").is_none()
            };
            let gains: Vec<_> = bands.iter().filter(gains).map(|band| band["name"].clone()).collect();
            if let (Some(index), false) = (reference, gains.is_empty()) {
                top["reference_band"] = index.get(&gains).clone();
            }
            if !bands.is_empty() {
                top["band"] = bands.into();
            }
            top
        })
        .prop_filter("an empty spec is none", |spec| {
            let has = |key: &str| spec.get(key).is_some_and(|entries| entries != &json!([]));
            has("stage") || has("band")
        })
}

/// What is done to a document.
#[derive(Clone, Debug)]
pub enum Damage {
    /// A key less.
    Drop,
    /// A key more, known somewhere or nowhere, with this value.
    Add(&'static str, Value),
    /// Another value in place of one.
    Replace(Value),
    /// A value of another key of the same document.
    Swap(Index),
}

/// Keys of all tables, and some of none.
const KEYS: &[&str] = &[
    "title",
    "beyond_half_rate",
    "reference_band",
    "rate",
    "output",
    "stage",
    "band",
    "encoding",
    "dither",
    "overload",
    "gain_db",
    "history",
    "kind",
    "family",
    "order",
    "edge_hz",
    "edges_hz",
    "center_hz",
    "width_hz",
    "q",
    "harmonics",
    "ripple_db",
    "stop_db",
    "phase",
    "design",
    "auto",
    "max_sections",
    "stop_edge_hz",
    "stop_edges_hz",
    "gain_db",
    "slope",
    "curve",
    "numerator",
    "denominator",
    "sections",
    "zeros",
    "poles",
    "zeros_hz",
    "poles_hz",
    "gain",
    "match_hz",
    "rate_hz",
    "b",
    "a",
    "name",
    "from_hz",
    "to_hz",
    "span_hz",
    "reduce_db",
    "keep_db",
    "residual_dbfs",
    "except",
    "wobble",
    "",
];

/// Values of every type, within and beyond every range.
fn value() -> impl Strategy<Value = Value> {
    let numbers = vec![
        json!(0),
        json!(-0.0),
        json!(1),
        json!(-1),
        json!(0.5),
        json!(0.500001),
        json!(2.5),
        json!(3.0103),
        json!(3.02),
        json!(12),
        json!(12.001),
        json!(14),
        json!(15),
        json!(20),
        json!(21),
        json!(50.0),
        json!(200),
        json!(200.5),
        json!(-200),
        json!(-200.5),
        json!(500),
        json!(501),
        json!(2_147_483_647.5),
        json!(2_147_483_648.0),
        json!(1e12),
        json!(1.1e12),
        json!(1e300),
        json!(5e-324),
        json!(u64::MAX),
        json!(i64::MIN),
    ];
    let texts = vec![
        json!(""),
        json!(" "),
        json!("band 0"),
        json!("band 1"),
        json!("band 0 x1"),
        json!("line\n"),
        json!("50 Hz"),
        json!("none"),
        json!("same"),
        json!("error"),
        json!("clip"),
        json!("pcm8"),
        json!("lowpass"),
        json!("bandstop"),
        json!("bandpass"),
        json!("notch"),
        json!("butterworth"),
        json!("chebyshev1"),
        json!("chebyshev2"),
        json!("elliptic"),
        json!("Bessel"),
        json!("auto"),
        json!("zero"),
        json!("causal"),
        json!("peak"),
        json!("lowshelf"),
        json!("weighting"),
        json!("digital"),
        json!("analog"),
        json!("K"),
        json!("riaa"),
    ];
    let others = vec![
        json!(null),
        json!(true),
        json!(false),
        json!([]),
        json!([40, 60]),
        json!([60, 40]),
        json!([40]),
        json!([1, 2, 3]),
        json!(["band 0"]),
        json!(["band 1", "band 2"]),
        json!([0, 5]),
        json!({}),
        json!({"dither": "none"}),
        json!([{"name": "a", "from_hz": 1, "to_hz": 2}]),
        json!([{"kind": "notch", "center_hz": 50, "q": 9}]),
        json!([{}]),
        json!([0, 1, 2]),
        json!([1, 0, 0]),
        json!([0, 0, 0]),
        json!([0.5]),
        json!([[0.5, 0.7], [0.5, -0.7]]),
        json!([[0.5, 0.7]]),
        json!([[1, 2, 3]]),
        json!([{"b": [1, 2, 1], "a": [1, 0, 0.5]}]),
        json!([{"b": [1, 2, 1], "a": [1, 0]}]),
        json!({"max_sections": 3}),
    ];
    prop_oneof![2 => select(numbers), 1 => select(texts), 1 => select(others)]
}

/// Damages, few enough that some documents stay valid.
pub fn damages() -> impl Strategy<Value = Vec<(Index, Damage)>> {
    let damage = prop_oneof![
        2 => Just(Damage::Drop),
        2 => (select(KEYS), value()).prop_map(|(key, value)| Damage::Add(key, value)),
        4 => value().prop_map(Damage::Replace),
        1 => any::<Index>().prop_map(Damage::Swap),
    ];
    proptest::collection::vec((any::<Index>(), damage), 0..3)
}

/// JSON pointers of every value but the document itself, and of its tables, itself too.
fn places(document: &Value) -> (Vec<String>, Vec<String>) {
    fn collect(value: &Value, pointer: &str, values: &mut Vec<String>, tables: &mut Vec<String>) {
        match value {
            Value::Object(object) => {
                tables.push(pointer.to_owned());
                object.iter().for_each(|(key, child)| {
                    let place = format!("{pointer}/{key}");
                    values.push(place.clone());
                    collect(child, &place, values, tables);
                });
            }
            Value::Array(items) => items.iter().enumerate().for_each(|(index, item)| {
                let place = format!("{pointer}/{index}");
                values.push(place.clone());
                collect(item, &place, values, tables);
            }),
            _ => {}
        }
    }
    let (mut values, mut tables) = (Vec::new(), Vec::new());
    collect(document, "", &mut values, &mut tables);
    (values, tables)
}

/// The place an index stands for.
fn at<'p>(index: &Index, places: &'p [String]) -> &'p str {
    index.get::<String>(places)
}

/// Does it.
pub fn apply(document: &mut Value, place: &Index, damage: &Damage) {
    let (values, tables) = places(document);
    match damage {
        Damage::Add(key, value) => {
            let table = document.pointer_mut(at(place, &tables)).unwrap();
            table.as_object_mut().unwrap().insert((*key).to_owned(), value.clone());
        }
        _ if values.is_empty() => {}
        Damage::Drop => {
            let (parent, key) = at(place, &values).rsplit_once('/').unwrap();
            match document.pointer_mut(parent).unwrap() {
                Value::Object(object) => drop(object.shift_remove(key)),
                Value::Array(items) => drop(items.remove(key.parse().unwrap())),
                _ => {}
            }
        }
        Damage::Replace(value) => *document.pointer_mut(at(place, &values)).unwrap() = value.clone(),
        Damage::Swap(other) => {
            let value = document.pointer(at(other, &values)).unwrap().clone();
            *document.pointer_mut(at(place, &values)).unwrap() = value;
        }
    }
}
