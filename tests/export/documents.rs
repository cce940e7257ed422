//! `json` and what the documents say about themselves.

use crate::support::{IDENTITY, SHORT, designed, exported, specs, text, written};
use bandproof::cascade::start_states;
use bandproof::export::{Form, rounding};
use bandproof::section::Section;
use serde_json::Value;

fn sections(document: &Value) -> Vec<Section> {
    serde_json::from_value(document["sections"].clone()).unwrap()
}

#[test]
fn sections_read_back_as_the_same_bits() {
    for (name, spec, rates_hz) in specs() {
        for rate_hz in rates_hz {
            let document: Value = serde_json::from_str(&text(&spec, rate_hz, Form::Json)).unwrap();
            let full = designed(&spec, rate_hz).sections;
            let bits = |sections: &[Section]| -> Vec<u64> {
                sections.iter().flat_map(|section| [section.b, section.a].concat()).map(f64::to_bits).collect()
            };
            assert_eq!(bits(&sections(&document)), bits(&full), "{name} at {rate_hz} Hz");
            assert_eq!(document["section_count"], full.len());
            let state: Vec<[f64; 2]> = serde_json::from_value(document["state"].clone()).unwrap();
            assert_eq!(state, start_states(&full, 1.0), "{name} at {rate_hz} Hz");
        }
    }
}

#[test]
fn the_head_says_where_it_is_from() {
    let mut spec = written(SHORT);
    spec.spec.title = Some("Quay, \u{201c}east\u{201d}".to_owned());
    spec.spec.output.gain_db = 12.0;
    let document: Value = serde_json::from_str(&text(&spec, 44_100, Form::Json)).unwrap();
    assert_eq!(document["spec"]["title"], "Quay, \u{201c}east\u{201d}");
    assert_eq!(document["spec"]["file"], "spec.toml");
    assert_eq!(document["spec"]["file_sha256"], spec.file_sha256.as_str());
    assert_eq!((&document["rate_hz"], &document["passes"]), (&Value::from(44_100), &Value::from(1)));
    assert_eq!(document["tool_version"], env!("CARGO_PKG_VERSION"));
    assert!(document["not_included"].as_str().unwrap().contains("output gain of 12 dB"));
    for form in [Form::C, Form::Rust, Form::Numpy, Form::Equation] {
        let text = text(&spec, 44_100, form);
        let head = text.replace(['\n', '#'], " ").replace("//", " ");
        let head = head.split_whitespace().collect::<Vec<_>>().join(" ");
        for part in [
            "Quay, \u{201c}east\u{201d}",
            "file \"spec.toml\"",
            &spec.file_sha256,
            "Sample rate: 44100 Hz",
            "Digits: every coefficient reads back as the same f64",
            "Passes: 1, forward",
            "output gain of 12 dB",
            env!("CARGO_PKG_VERSION"),
        ] {
            assert!(head.contains(part), "{form:?} does not say {part}: {text}");
        }
    }
}

#[test]
fn zero_phase_is_named_and_only_one_pass_is_there() {
    let mut spec = written(SHORT);
    spec.spec.phase = bandproof::spec::Phase::Zero;
    let design = designed(&spec, 48_000);
    let document: Value = serde_json::from_str(&text(&spec, 48_000, Form::Json)).unwrap();
    assert_eq!((&document["passes"], sections(&document)), (&Value::from(2), design.sections));
    for form in [Form::C, Form::Rust, Form::Numpy, Form::Equation] {
        let text = text(&spec, 48_000, form);
        assert!(text.contains("Passes: 2, forward and then backward"), "{form:?}: {text}");
        assert_eq!(text.contains("sosfiltfilt"), form == Form::Numpy, "{form:?}: {text}");
    }
}

#[test]
fn digits_asked_for_are_kept_to_in_every_decimal_form() {
    let spec = written(SHORT);
    let rounded: Vec<Section> =
        designed(&spec, 48_000).sections.iter().map(|section| rounding::to_digits(section, 5)).collect();
    let json = exported(&spec, 48_000, Form::Json, Some(5), None).unwrap().text;
    let document: Value = serde_json::from_str(&json).unwrap();
    assert_eq!((sections(&document), &document["digits"]), (rounded.clone(), &Value::from(5)));
    let first = format!("{:?}", rounded[0].b[0]);
    for form in [Form::C, Form::Rust, Form::Numpy, Form::Equation] {
        let text = exported(&spec, 48_000, form, Some(5), None).unwrap().text;
        assert!(text.contains(&first) && text.contains("5 significant, as asked for"), "{form:?}: {text}");
    }
}

#[test]
fn the_design_check_is_that_of_the_rounded_sections() {
    let (_, spec, _) = specs().remove(0);
    let of = |digits| {
        let text = exported(&spec, 48_000, Form::Json, digits, None).unwrap().text;
        serde_json::from_str::<Value>(&text).unwrap()
    };
    let (full, rounded) = (of(None), of(Some(9)));
    assert_eq!(full["bands"].as_array().unwrap().len(), 14);
    assert_eq!(full["bands"][8]["name"], "wind rumble");
    assert_eq!(full["bands"][8]["check"], "guaranteed");
    assert_ne!(full["bands"][0]["attenuation_min_db"], rounded["bands"][0]["attenuation_min_db"]);
    let design = designed(&spec, 48_000);
    let least_db = full["bands"][0]["attenuation_min_db"].as_f64().unwrap();
    assert!((least_db - design.bands[0].attenuation_min_db).abs() <= 0.0005);
}

#[test]
fn an_identity_is_a_form_too() {
    let spec = written(IDENTITY);
    for form in [Form::Json, Form::Fixed] {
        let document: Value = serde_json::from_str(&text(&spec, 48_000, form)).unwrap();
        assert_eq!((&document["section_count"], &document["sections"]), (&Value::from(0), &Value::Array(Vec::new())));
    }
    assert!(text(&spec, 48_000, Form::Equation).ends_with("\ny[n] = x[n]\n"));
    let numpy = text(&spec, 48_000, Form::Numpy);
    assert!(
        numpy.contains("section_count = 0\n") && numpy.contains("    [1.0, 0.0, 0.0, 1.0, 0.0, 0.0],\n"),
        "{numpy}"
    );
}
