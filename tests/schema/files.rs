//! Spec files that come with the project.

use crate::{SPEC, assert_valid, project, read};
use bandproof::spec;
use serde_json::Value;
use std::path::PathBuf;

/// Every file of the spec folders.
fn paths() -> Vec<PathBuf> {
    let mut paths: Vec<_> = ["filter-specs"]
        .iter()
        .flat_map(|folder| std::fs::read_dir(project(folder)).unwrap())
        .map(|entry| entry.unwrap().path())
        .collect();
    paths.sort();
    paths
}

/// A spec file as JSON.
fn document(path: &std::path::Path) -> Value {
    let text = std::fs::read_to_string(path).unwrap();
    if path.extension().unwrap() == "toml" {
        serde_json::to_value(toml::from_str::<toml::Value>(&text).unwrap()).unwrap()
    } else {
        serde_json::from_str(&text).unwrap()
    }
}

#[test]
fn every_spec_of_the_project_is_valid_as_written_and_normalized() {
    assert!(paths().len() >= 5);
    for path in paths() {
        assert_valid(&SPEC, &document(&path));
        let normalized = serde_json::to_value(spec::load(&path).unwrap().spec).unwrap();
        assert_valid(&SPEC, &normalized);
        assert_eq!(serde_json::to_value(read(&normalized).unwrap()).unwrap(), normalized);
    }
}

#[test]
fn a_spec_with_every_key_is_valid() {
    let all = serde_json::json!({
        "title": "two\nlines", "beyond_half_rate": "leave-out", "reference_band": "calls", "rate": "header",
        "output": {"encoding": "pcm24", "dither": "none", "overload": "scale", "gain_db": -1.5, "history": true},
        "stage": [
            {"kind": "highpass", "family": "butterworth", "order": 4, "edge_hz": 40},
            {"kind": "bandstop", "family": "elliptic", "order": 14, "center_hz": 50, "width_hz": 3.2, "harmonics": 8,
             "ripple_db": 0.1, "stop_db": 40},
            {"kind": "bandpass", "family": "chebyshev2", "order": 5.0, "edges_hz": [20, 21000.5], "stop_db": 60},
            {"kind": "notch", "center_hz": 15800, "q": 60}
        ],
        "band": [
            {"name": "hum", "center_hz": 50, "span_hz": 1, "harmonics": 8, "reduce_db": 30},
            {"name": "calls", "from_hz": 0, "to_hz": 6000, "keep_db": 0.5, "except": ["hum"]},
            {"name": "whine", "from_hz": 15750, "to_hz": 15850, "residual_dbfs": -90},
            {"name": "overtones", "center_hz": 700, "q": 50}
        ]
    });
    assert_valid(&SPEC, &all);
    read(&all).unwrap();
}

#[test]
fn names_are_one_line_that_is_not_blank_for_schema_and_reader_alike() {
    // The second column: whether it can be a name.
    let names = [
        ("a", true),
        (" a ", true),
        ("Rohrdommel é 鳥", true),
        ("\u{feff}", true),
        ("", false),
        (" \u{a0}\u{2003}\u{3000}", false),
        ("a\n", false),
        ("a\tb", false),
        ("a\u{85}", false),
        ("\u{7f}a", false),
        ("\u{0}", false),
    ];
    for (name, is_name) in names {
        let document = serde_json::json!({"band": [{"name": name, "from_hz": 1, "to_hz": 2}]});
        assert_eq!(SPEC.is_valid(&document), is_name, "{name:?}");
        assert_eq!(read(&document).is_ok(), is_name, "{name:?}");
    }
    for (title, is_title) in [("two\nlines\tand\r\n", true), ("", true), ("\u{1b}[31m", false), ("\u{9b}", false)] {
        let document = serde_json::json!({"title": title, "band": [{"name": "a", "from_hz": 1, "to_hz": 2}]});
        assert_eq!(SPEC.is_valid(&document), is_title, "{title:?}");
        assert_eq!(read(&document).is_ok(), is_title, "{title:?}");
    }
}
