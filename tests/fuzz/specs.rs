//! A hundred thousand damaged specs in both notations.
//!
//! `tests/spec` damages one spec line by line and `tests/schema` damages documents key by
//! key; here the texts of many specs are cut, joined and nested, as bytes and as trees.

use std::sync::LazyLock;

use bandproof::spec::document::Comments;
use bandproof::spec::{self, Spec, SpecError, SpecSyntax};
use serde_json::{Map, Value, json};

use crate::random::Random;
use crate::runner::{self, Plan};

/// Cases in an ordinary run of the tests: a tenth of those of the container.
const CASES: u64 = 1_000_000;

/// A spec with every key there is but those of `AUTO`.
const ALL_KEYS: &str = r#"{
"title": "All keys", "beyond_half_rate": "leave-out", "rate": "acoustic", "reference_band": "calls",
"phase": "causal",
"output": {"encoding": "pcm24", "dither": "none", "overload": "scale", "gain_db": -3.5, "history": true},
"stage": [
  {"kind": "highpass", "family": "bessel", "order": 3, "edge_hz": 40},
  {"kind": "lowpass", "family": "chebyshev1", "order": 4, "ripple_db": 0.5, "edge_hz": 9000.5},
  {"kind": "bandstop", "family": "elliptic", "order": 3, "center_hz": 50, "width_hz": 3.2, "harmonics": 8,
   "ripple_db": 0.1, "stop_db": 40},
  {"kind": "bandpass", "family": "chebyshev2", "order": 2, "edges_hz": [100, 5000], "stop_db": 60},
  {"kind": "notch", "center_hz": 15800, "q": 60},
  {"kind": "lowpass", "family": "bessel", "edge_hz": 900, "stop_edge_hz": 2000, "ripple_db": 1, "stop_db": 40},
  {"kind": "bandstop", "family": "elliptic", "edges_hz": [40, 60], "stop_edges_hz": [48, 52],
   "ripple_db": 1, "stop_db": 40},
  {"kind": "peak", "center_hz": 1200, "gain_db": -6, "q": 1.5},
  {"kind": "highshelf", "edge_hz": 8000, "gain_db": 3.5, "slope": 0.75},
  {"kind": "weighting", "curve": "riaa"},
  {"kind": "digital", "numerator": [0.0675, 0.1350, 0.0675], "denominator": [1, -1.1430, 0.4128]},
  {"kind": "digital", "sections": [{"b": [1, 2, 1], "a": [1, -1.0106, 0.3583]}]},
  {"kind": "digital", "zeros": [-1, [0.25, 0.75], [0.25, -0.75]], "poles": [[0.5, 0.25], [0.5, -0.25], 0], "gain": 0.125},
  {"kind": "analog", "zeros_hz": [0, 0], "poles_hz": [-20.6, -20.6], "gain": 1, "match_hz": 1000}
],
"band": [
  {"name": "hum", "center_hz": 50, "span_hz": 1, "harmonics": 8, "reduce_db": 30},
  {"name": "calls", "from_hz": 90, "to_hz": 6000, "keep_db": 0.5, "except": ["hum"]},
  {"name": "whine", "center_hz": 15800, "q": 100, "residual_dbfs": -90},
  {"name": "rest", "from_hz": 7000, "to_hz": 8000}
]}"#;

/// A spec whose cascade is to be found.
const AUTO: &str = r#"{
"phase": "zero", "design": "auto", "auto": {"family": "elliptic", "max_sections": 12},
"band": [
  {"name": "hum", "center_hz": 50, "span_hz": 1, "harmonics": 2, "reduce_db": 30},
  {"name": "calls", "from_hz": 200, "to_hz": 6000, "keep_db": 0.5}
]}"#;

/// Texts to begin with.
static TEXTS: LazyLock<Vec<(String, SpecSyntax)>> = LazyLock::new(|| {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("filter-specs");
    let mut paths: Vec<_> = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    paths.sort();
    let mut texts = Vec::new();
    for json in [ALL_KEYS, AUTO] {
        spec::parse(json.as_bytes(), SpecSyntax::Json, "spec").unwrap_or_else(|error| panic!("{error}"));
        texts.push((json.to_owned(), SpecSyntax::Json));
        texts.push((toml_of(&document(json)), SpecSyntax::Toml));
    }
    for path in paths {
        let syntax = SpecSyntax::of_path(&path).unwrap();
        let text = std::fs::read_to_string(&path).unwrap();
        // The same in the other notation.
        let spec = spec::parse(text.as_bytes(), syntax, "spec").unwrap_or_else(|error| panic!("{error}"));
        match syntax {
            SpecSyntax::Toml => texts.push((serde_json::to_string(&spec).unwrap(), SpecSyntax::Json)),
            SpecSyntax::Json => texts.push((toml_text(&spec), SpecSyntax::Toml)),
        }
        texts.push((text, syntax));
    }
    texts
});

static TREES: LazyLock<Vec<Value>> = LazyLock::new(|| {
    TEXTS.iter().filter(|(_, syntax)| *syntax == SpecSyntax::Json).map(|(text, _)| document(text)).collect()
});

fn document(text: &str) -> Value {
    serde_json::from_str(text).unwrap()
}

fn toml_text(spec: &Spec) -> String {
    spec::document::document(spec, SpecSyntax::Toml, &Comments::default()).unwrap()
}

fn toml_of(tree: &Value) -> String {
    toml::to_string(tree).unwrap_or_default()
}

/// Every object and list of a tree, and every value in them.
fn visit(tree: &mut Value, at: &mut usize, change: &mut dyn FnMut(&mut Value)) {
    if *at == 0 {
        change(tree);
    }
    // Past 0 this wraps and never comes to 0 again.
    *at = at.wrapping_sub(1);
    match tree {
        Value::Object(keys) => keys.iter_mut().for_each(|(_, value)| visit(value, at, change)),
        Value::Array(values) => values.iter_mut().for_each(|value| visit(value, at, change)),
        _ => {}
    }
}

fn count(tree: &Value) -> usize {
    1 + match tree {
        Value::Object(keys) => keys.values().map(count).sum::<usize>(),
        Value::Array(values) => values.iter().map(count).sum(),
        _ => 0,
    }
}

/// A value of some tree.
fn borrowed(random: &mut Random) -> Value {
    let mut lender = random.pick(&TREES);
    let mut at = random.below(count(&lender));
    let mut found = Value::Null;
    visit(&mut lender, &mut at, &mut |value| found = value.clone());
    found
}

fn odd_value(random: &mut Random) -> Value {
    let number = f64::from_bits(random.next());
    match random.below(14) {
        0 => json!(null),
        1 => json!(0),
        2 => json!(-1),
        3 => json!(u64::MAX),
        4 => json!(i64::MIN),
        5 => json!(5e-324),
        6 => json!(1.797e308),
        7 => json!(if number.is_finite() { number } else { 1.0 }),
        8 => json!("\u{0}\u{1b}[31m\u{202e}"),
        9 => json!("é".repeat(random.below(40))),
        10 => (0..random.below(150)).fold(json!([]), |inner, _| json!([inner])),
        11 => json!({"name": {"name": []}}),
        12 => json!(random.below(1000) as f64 / 4.0),
        _ => borrowed(random),
    }
}

/// Does something to a tree.
fn graft(tree: &mut Value, random: &mut Random) {
    let kind = random.below(7);
    let (value, place) = (odd_value(random), random.next() as usize);
    let other = borrowed(random);
    let mut at = random.below(count(tree));
    visit(tree, &mut at, &mut |target| match target {
        Value::Object(keys) if kind < 5 => {
            let names: Vec<String> = keys.keys().cloned().collect();
            let Some(name) = names.get(place % names.len().max(1)) else { return };
            match kind {
                0 => drop(keys.shift_remove(name)),
                1 => drop(keys.insert(name.clone(), value.clone())),
                // A key misspelled, or of another table.
                2 => {
                    let value = keys.shift_remove(name).unwrap_or_default();
                    let cut = name.char_indices().nth(1).map_or(0, |(at, _)| at);
                    keys.insert(name[cut..].to_owned(), value);
                }
                3 => {
                    if let Value::Object(more) = &other {
                        keys.extend(more.clone());
                    }
                }
                _ => {
                    let swapped: Map<String, Value> = names.iter().cloned().zip(keys.values().rev().cloned()).collect();
                    *keys = swapped;
                }
            }
        }
        Value::Array(values) if kind < 5 => match kind {
            0 => values.truncate(place % (values.len() + 1)),
            1 => values.push(value.clone()),
            2 => values.push(other.clone()),
            3 => values.reverse(),
            _ => {
                let again = values.clone();
                values.extend(again);
            }
        },
        target if kind == 5 => target.clone_from(&other),
        target => target.clone_from(&value),
    });
}

/// Pieces of either notation.
const PIECES: [&str; 34] = [
    "[[band]]\n",
    "[[stage]]\n",
    "[output]\n",
    "[output.x]\n",
    "stage.kind = 1\n",
    "'''",
    "\"\"\"",
    "# ",
    "0x1f",
    "1_000",
    "1e999",
    "+inf",
    "nan",
    "1979-05-27T07:32:00Z",
    "{ a = { b = 1 } }",
    "\\u0000",
    "\\ud800",
    "\u{feff}",
    "\r",
    "\u{0}",
    "[[",
    "]]",
    "{",
    "}",
    ",",
    "=",
    ":",
    "\"",
    "rate = \"header\"\n",
    "history = true\n",
    "design = \"auto\"\n",
    "phase = \"zero\"\n",
    "[0.5, -0.70]",
    "1.50E-02",
];

/// Does something to the bytes of a text.
fn strike(text: &mut Vec<u8>, random: &mut Random) {
    let at = random.below(text.len() + 1);
    let end = (at + random.below(40)).min(text.len());
    match random.below(7) {
        0 => drop(text.drain(at..end)),
        1 => drop(text.splice(at..at, random.pick(&PIECES).bytes())),
        2 => drop(text.splice(at..end, random.pick(&PIECES).bytes())),
        3 => text.truncate(at),
        4 => {
            // The end of another spec.
            let (other, _) = random.pick(&TEXTS);
            text.truncate(at);
            text.extend_from_slice(&other.as_bytes()[random.below(other.len())..]);
        }
        5 => {
            let again = text[at..end].repeat(1 + random.below(3));
            let to = random.below(text.len() + 1);
            drop(text.splice(to..to, again));
        }
        _ => {
            if let Some(byte) = text.get_mut(at) {
                *byte ^= 1 << random.below(8);
            }
        }
    }
}

/// 0: not that notation; 1: no valid spec; 2: read.
fn case(seed: u64, number: u64) -> usize {
    let mut random = Random::of_case(seed, number);
    let (text, syntax) = if random.one_in(3) {
        let (text, syntax) = random.pick(&TEXTS);
        let mut text = text.into_bytes();
        for _ in 0..=random.below(4) {
            strike(&mut text, &mut random);
        }
        (text, syntax)
    } else {
        let mut tree = random.pick(&TREES);
        for _ in 0..=random.below(3) {
            graft(&mut tree, &mut random);
        }
        if random.one_in(2) {
            (toml_of(&tree).into_bytes(), SpecSyntax::Toml)
        } else {
            (serde_json::to_vec(&tree).unwrap(), SpecSyntax::Json)
        }
    };
    match spec::parse(&text, syntax, "a spec") {
        Ok(spec) => {
            // What is read is written so that it is read again, in both notations.
            let json = serde_json::to_vec(&spec).unwrap();
            let again = spec::parse(&json, SpecSyntax::Json, "json").unwrap_or_else(|error| panic!("{error}"));
            assert_eq!(again, spec);
            let toml = toml_text(&spec);
            assert_eq!(
                spec::parse(toml.as_bytes(), SpecSyntax::Toml, "toml").unwrap_or_else(|error| panic!("{error}")),
                again
            );
            2
        }
        Err(error) => {
            check_words(&error, &text, syntax);
            usize::from(matches!(error, SpecError::Invalid { .. }))
        }
    }
}

/// Sentences with a place in the text, fit for a terminal.
fn check_words(error: &SpecError, text: &[u8], syntax: SpecSyntax) {
    let words = error.to_string();
    assert!(!words.chars().any(|c| c.is_control() && c != '\n'), "{words:?}");
    let lines = String::from_utf8_lossy(text).lines().count() + 1;
    match error {
        SpecError::Invalid { problems, .. } => {
            assert!(!problems.is_empty() && problems.len() <= 201);
            for problem in problems {
                assert!(!problem.message.is_empty() && !problem.repair.is_empty(), "{problem:?}");
                match (&problem.place, syntax) {
                    (spec::Place::At { line, column }, SpecSyntax::Toml) => {
                        assert!((1..=lines).contains(line) && *column >= 1, "{problem:?}");
                    }
                    (spec::Place::Path(path), SpecSyntax::Json) => assert!(!path.is_empty(), "{problem:?}"),
                    (spec::Place::Whole, _) => {}
                    _ => panic!("a place of the other notation: {problem:?}"),
                }
            }
        }
        SpecError::Syntax { line, column, message, .. } => {
            // An error at the end of a file without a last line break may stand behind it.
            assert!((1..=lines).contains(line) && *column >= 1 && !message.is_empty(), "{words}");
        }
        SpecError::NotUtf8 { offset, .. } => assert!(*offset < text.len()),
        other => panic!("{other:?}"),
    }
}

#[test]
fn no_spec_panics_hangs_or_is_read_as_another_than_it_writes() {
    let plan = Plan::of_environment(CASES, 10);
    let [foreign, invalid, read] = runner::run("no_spec_panics", plan, case);
    println!("{foreign} of another notation, {invalid} invalid, {read} read");
    if plan.is_large() {
        let all = plan.end - plan.first;
        assert!(foreign > all / 20 && invalid > all / 4 && read > all / 50);
    }
}
