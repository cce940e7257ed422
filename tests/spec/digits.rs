//! The digits of coefficients: what is read of them, and what is written.

use bandproof::spec::document::{Comments, document};
use bandproof::spec::{self, *};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;

use crate::read;
use crate::transfers::c;

/// The numerator of a digital stage that is written like this.
pub fn numerator(keys: &str, syntax: SpecSyntax) -> Vec<Coefficient> {
    let text = match syntax {
        SpecSyntax::Toml => format!("[[stage]]\nkind = 'digital'\ndenominator = [1]\nnumerator = {keys}"),
        SpecSyntax::Json => {
            // Numbers and what looks like numbers before the list.
            format!(
                r#"{{"title": "-1 \\\" [2.5e3, \u0031", "output": {{"gain_db": -1.5}},
                     "stage": [{{"kind": "digital", "denominator": [1e0], "numerator": {keys}}}]}}"#
            )
        }
    };
    let mut spec = spec::parse(text.as_bytes(), syntax, "spec").unwrap_or_else(|error| panic!("{error}"));
    match spec.stages.remove(0) {
        Stage::Digital(DigitalStage {
            filter: DigitalFilter::Transfer(Transfer::Polynomials { numerator, .. }),
            ..
        }) => numerator,
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_coefficient_keeps_the_place_of_its_last_digit() {
    let cases = [
        ("0.7051", 0.7051, 1e-4),
        ("0.7050", 0.705, 1e-4),
        ("-0.7050", -0.705, 1e-4),
        ("7.738860E-02", 0.0773886, 1e-8),
        ("7.738860e-2", 0.0773886, 1e-8),
        ("1234.5", 1234.5, 0.1),
        ("1.2345e3", 1234.5, 0.1),
        ("0.25e-300", 0.25e-300, 1e-302),
        ("1e-5", 1e-5, 1e-5),
        ("0.00001", 1e-5, 1e-5),
        // Whole values are exact, however they are written.
        ("1", 1.0, 0.0),
        ("2.0", 2.0, 0.0),
        ("-1", -1.0, 0.0),
        ("0.0000", 0.0, 0.0),
        ("-0.0", 0.0, 0.0),
        ("1.5e1", 15.0, 0.0),
        ("9007199254740993", 9_007_199_254_740_992.0, 0.0),
        // Below the smallest number there is no unit left.
        ("5.0e-324", 5e-324, 0.0),
    ];
    let literals: Vec<_> = cases.iter().map(|(literal, ..)| *literal).collect();
    let list = format!("[{}]", literals.join(", "));
    let expected: Vec<_> = cases.iter().map(|(_, value, unit)| c(*value, *unit)).collect();
    for syntax in [SpecSyntax::Toml, SpecSyntax::Json] {
        assert_eq!(numerator(&list, syntax), expected, "{syntax:?}");
    }
    // What TOML alone can write.
    assert_eq!(numerator("[0x10, 1_0.2_5, +0.5]", SpecSyntax::Toml), [c(16.0, 0.0), c(10.25, 0.01), c(0.5, 0.1)]);
}

proptest! {
    // The same cases on every run.
    #![proptest_config(ProptestConfig {
        cases: 300,
        rng_seed: RngSeed::Fixed(1),
        failure_persistence: None,
        ..ProptestConfig::default()
    })]

    /// The unit, found in another way: the same number with every digit 0 but the last, 1.
    #[test]
    fn both_notations_give_the_unit_that_the_digits_say(
        literals in proptest::collection::vec("-?(0|[1-9][0-9]{0,5})\\.[0-9]{1,20}([eE][+-]?[0-9]{1,2})?", 1..20)
    ) {
        let expected = |literal: &String| {
            let digits = literal.find(['e', 'E']).unwrap_or(literal.len());
            let zeros: String = literal[..digits - 1].chars().map(|c| if c.is_ascii_digit() { '0' } else { c }).collect();
            let unit: f64 = format!("{zeros}1{}", &literal[digits..]).parse().unwrap();
            let value: f64 = literal.parse().unwrap();
            c(value, if value == value.trunc() { 0.0 } else { unit.abs() })
        };
        let mut expected: Vec<_> = literals.iter().map(expected).collect();
        // A list of nothing but zeros is none.
        expected.push(c(1.0, 0.0));
        let list = format!("[{}, 1]", literals.join(", "));
        prop_assert_eq!(&numerator(&list, SpecSyntax::Toml), &expected);
        prop_assert_eq!(&numerator(&list, SpecSyntax::Json), &expected);
    }
}

#[test]
fn the_shortest_form_has_the_unit_of_its_last_digit() {
    for (value, unit) in [(0.705, 1e-3), (-0.0773886, 1e-7), (1e-8, 1e-8), (0.1 + 0.2, 1e-17), (3.0, 0.0), (1e22, 0.0)]
    {
        assert_eq!(Coefficient::shortest(value), c(value, unit));
    }
}

#[test]
fn zeros_at_the_end_of_a_number_are_kept_in_a_written_spec() {
    let literals = [
        ("0.7050", "0.7050"),
        ("-2.3140", "-2.3140"),
        ("1.0200e3", "1020.0"),
        ("1.02050e1", "10.2050"),
        ("7.738860E-02", "0.07738860"),
        ("1.50e-8", "1.50e-8"),
        ("-0.000000100", "-1.00e-7"),
        ("2.00", "2.0"),
        ("0.10000000000000000000", "0.10000000000000000555"),
    ];
    let given: Vec<_> = literals.iter().map(|(given, _)| *given).collect();
    let list = given.join(", ");
    let spec = read(&format!(
        "[[stage]]\nkind = 'digital'\nnumerator = [{list}]\ndenominator = [1]\n\
         [[stage]]\nkind = 'analog'\npoles_hz = [[-20.60, 3.0], [-20.60, -3.0]]\ngain = 0.50"
    ));
    let written: Vec<_> = literals.iter().map(|(_, written)| *written).collect();
    for syntax in [SpecSyntax::Json, SpecSyntax::Toml] {
        let text = document(&spec, syntax, &Comments::default()).unwrap();
        assert_eq!(spec::parse(text.as_bytes(), syntax, "spec").unwrap(), spec, "{text}");
        let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
        // Whole values have a point in JSON alone.
        let shown = |literal: &str| match syntax {
            SpecSyntax::Json => literal.to_owned(),
            SpecSyntax::Toml => literal.strip_suffix(".0").unwrap_or(literal).to_owned(),
        };
        let list = written.iter().map(|literal| shown(literal)).collect::<Vec<_>>().join(", ");
        assert!(text.contains(&list), "{list} in {text}");
        assert!(text.contains("-20.60, ") && text.contains("0.50"), "{text}");
    }
    // A value has no digits, and its number is the same.
    let value = serde_json::to_value(&spec).unwrap();
    assert_eq!(value["stage"][0]["numerator"][0].to_string(), "0.705");
}

/// Units that a spec can't have are no reason to write other numbers.
#[test]
fn a_number_whose_unit_is_no_place_of_its_digits_is_written_in_its_shortest_form() {
    for unit in [0.1, 1.0, 0.003, 1e300, -1e-5, f64::NAN, f64::INFINITY] {
        assert_eq!(serde_json::to_string(&c(0.125, unit)).unwrap(), "0.125", "{unit}");
    }
    assert_eq!(serde_json::to_string(&c(0.125, 1e-3)).unwrap(), "0.125");
    assert_eq!(serde_json::to_string(&c(2.0, 1e-3)).unwrap(), "2.0");
    assert_eq!(serde_json::to_string(&c(f64::NAN, 1e-3)).unwrap(), "null");
}
