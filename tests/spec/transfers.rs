//! A user's own transfer functions: what is read of each number, and what is refused.

use bandproof::spec::*;

use crate::digits::numerator;
use crate::{any_rate, read, refused, refused_json};

/// A number with one unit of its last digit.
pub fn c(value: f64, unit: f64) -> Coefficient {
    Coefficient { value, unit }
}

/// The one stage of a spec.
fn stage(keys: &str) -> Stage {
    read(&format!("[[stage]]\n{keys}")).stages.remove(0)
}

/// What is said of a stage whose keys begin in line 2.
fn said(keys: &str) -> String {
    refused(&format!("[[stage]]\n{keys}"))
}

/// What is said of a digital stage whose other keys begin in line 3.
fn digital(keys: &str) -> String {
    said(&format!("kind = 'digital'\n{keys}"))
}

/// What is said of an analog stage whose other keys begin in line 3.
fn analog(keys: &str) -> String {
    said(&format!("kind = 'analog'\n{keys}"))
}

#[test]
fn a_digital_stage_may_name_the_sample_rate_it_is_for() {
    let rate_hz = |stage: &Stage| match stage {
        Stage::Digital(digital) => digital.rate_hz,
        other => panic!("{other:?}"),
    };
    let ways = [
        "numerator = [1]\ndenominator = [1, 0.5]",
        "sections = [{b = [1, 0, 0], a = [1, 0.5, 0]}]",
        "poles = [0.5]\ngain = 1",
    ];
    for way in ways {
        let keys = format!("kind = 'digital'\n{way}\n");
        assert_eq!(rate_hz(&stage(&keys)), None);
        let read = stage(&format!("{keys}rate_hz = 44.1e3"));
        assert_eq!(rate_hz(&read), Some(44_100));
        assert!(serde_json::to_string(&read).unwrap().contains(r#""rate_hz":44100"#));
    }
    let with = |rate: &str| digital(&format!("poles = [0.5]\ngain = 1\nrate_hz = {rate}"));
    assert_eq!(
        with("44100.5"),
        "spec.toml:5:11: rate_hz is 44100.5, not a whole number; give a sample rate of at least 1 Hz"
    );
    assert_eq!(with("0"), "spec.toml:5:11: rate_hz = 0 is out of range; give a sample rate of at least 1 Hz");
    assert_eq!(
        analog("poles = [-5]\ngain = 1\nrate_hz = 48000"),
        "spec.toml:5:1: rate_hz in the analog stage: it belongs to digital; remove it, or choose one of these kinds"
    );
}

/// What is in the place of the gain has been refused, and once is enough.
#[test]
fn decibels_in_place_of_the_gain_are_one_problem() {
    assert_eq!(
        digital("poles = [0.5]\ngain_db = 6"),
        "spec.toml:4:1: gain_db in the digital stage: the gain of a transfer function is a plain factor; \
         write gain instead"
    );
}

/// The sections of a worked example: A. V. Oppenheim and R. W. Schafer, Discrete-Time Signal
/// Processing, 2nd ed. (1999), example 7.3, from memory; the digits are the book's.
#[test]
fn sections_are_read_with_their_digits() {
    let read = stage(
        "kind = 'digital'\nsections = [{b = [0.0007378, 0.0014756, 0.0007378], a = [1, -1.2686, 0.7051]},\n\
         {b = [1, 2, 1], a = [1, -1.0106, 0.3583]}, {b = [1, 2, 1], a = [1, -0.9044, 0.2155]}]",
    );
    let Stage::Digital(DigitalStage { filter: DigitalFilter::Sections(sections), .. }) = &read else {
        panic!("{read:?}")
    };
    assert_eq!(sections.len(), 3);
    assert_eq!(sections[0].b, [c(0.0007378, 1e-7), c(0.0014756, 1e-7), c(0.0007378, 1e-7)]);
    assert_eq!(sections[2].a, [c(1.0, 0.0), c(-0.9044, 1e-4), c(0.2155, 1e-4)]);
    assert_eq!(
        serde_json::to_value(&read).unwrap()["sections"][1].to_string(),
        r#"{"b":[1.0,2.0,1.0],"a":[1.0,-1.0106,0.3583]}"#
    );
}

#[test]
fn roots_are_read_in_the_unit_of_their_keys() {
    let real = |value: f64, unit: f64| Root { re: c(value, unit), im: c(0.0, 0.0) };
    let pair = |re: Coefficient, im: f64, unit: f64| [im, -im].map(|im| Root { re, im: c(im, unit) });
    assert_eq!(
        stage("kind = 'digital'\nzeros = [-1, [0.5, 0.0]]\npoles = [[0.5, 0.25], [0.5, -0.25]]\ngain = 0.1"),
        any_rate(DigitalFilter::Transfer(Transfer::Roots {
            zeros: vec![real(-1.0, 0.0), real(0.5, 0.1)],
            poles: pair(c(0.5, 0.1), 0.25, 0.01).to_vec(),
            gain: c(0.1, 0.1),
        }))
    );
    // Zeros may be left out, and a digital filter may have no poles.
    assert_eq!(
        stage("kind = 'digital'\npoles = []\ngain = -2"),
        any_rate(DigitalFilter::Transfer(Transfer::Roots { zeros: vec![], poles: vec![], gain: c(-2.0, 0.0) }))
    );
    let read = stage("kind = 'analog'\npoles_hz = [-20.6, -20.6]\nzeros_hz = [0, 0]\ngain = 1\nmatch_hz = 1000");
    let roots = Transfer::Roots { zeros: vec![real(0.0, 0.0); 2], poles: vec![real(-20.6, 0.1); 2], gain: c(1.0, 0.0) };
    let expected = AnalogStage { transfer: roots.clone(), unit: RootUnit::Hertz, match_hz: Some(1000.0) };
    assert_eq!(read, Stage::Analog(expected));
    assert_eq!(
        serde_json::to_value(&read).unwrap().to_string(),
        "{\"kind\":\"analog\",\"zeros_hz\":[0.0,0.0],\"poles_hz\":[-20.6,-20.6],\"gain\":1.0,\"match_hz\":1000.0}"
    );
    let radians = stage("kind = 'analog'\npoles = [-20.6, -20.6]\nzeros = [0, 0]\ngain = 1");
    let expected = AnalogStage { transfer: roots, unit: RootUnit::RadiansPerSecond, match_hz: None };
    assert_eq!(radians, Stage::Analog(expected));
}

#[test]
fn a_numerator_may_begin_with_zeros_and_have_the_degree_of_the_denominator() {
    stage("kind = 'analog'\nnumerator = [0, 0, 1, 0, 0]\ndenominator = [1, 2, 1]");
    stage("kind = 'digital'\nnumerator = [0, 0, 1]\ndenominator = [2]");
}

#[test]
fn which_way_it_is_given() {
    let digital_ways = "give numerator and denominator, or sections, or zeros, poles and gain";
    let analog_ways =
        "give numerator and denominator, or zeros, poles and gain in rad/s, or zeros_hz, poles_hz and gain in Hz";
    assert_eq!(digital(""), format!("spec.toml:1:1: the digital stage has no transfer function; {digital_ways}"));
    assert_eq!(analog(""), format!("spec.toml:1:1: the analog stage has no transfer function; {analog_ways}"));
    assert_eq!(
        digital("numerator = [1]\npoles = []\ndenominator = [1]\ngain = 1"),
        format!("spec.toml:4:1: the digital stage says twice what it is, by numerator and by poles; {digital_ways}")
    );
    assert_eq!(
        analog("zeros = [1]\npoles_hz = [1]\ngain = 1"),
        format!("spec.toml:4:1: the analog stage says twice what it is, by zeros and by poles_hz; {analog_ways}")
    );
    assert_eq!(
        digital("numerator = [1]"),
        "spec.toml:1:1: the digital stage has no denominator; add its coefficients, [1] where it has no poles"
    );
    assert_eq!(
        analog("denominator = [1]"),
        "spec.toml:1:1: the analog stage has no numerator; add its coefficients, [1] where it has no zeros"
    );
    assert_eq!(
        digital("gain = 2"),
        "spec.toml:1:1: the digital stage has no poles; add its poles, [] where it has none"
    );
    assert_eq!(
        analog("zeros_hz = [0]"),
        "spec.toml:1:1: the analog stage has no poles_hz; add its poles in hertz\n\
         spec.toml:1:1: the analog stage has no gain; \
         add the factor before the product of the roots, 1 where there is none"
    );
    assert_eq!(
        digital("numerator = [1]\ndenominator = [1]\ngain = 2"),
        "spec.toml:5:1: gain in the digital stage: numerator and denominator hold the gain already; \
         multiply the numerator by it, and remove it"
    );
    assert_eq!(
        digital("sections = [{b = [1, 0, 0], a = [1, 0, 0]}]\ngain = 2"),
        "spec.toml:4:1: gain in the digital stage: sections hold the gain already; \
         multiply one b by it, and remove it"
    );
}

#[test]
fn keys_of_the_other_kind() {
    assert_eq!(
        digital("poles_hz = [1]\ngain = 1"),
        "spec.toml:3:1: poles_hz in the digital stage: roots in hertz are those of an analog filter; \
         write zeros and poles in the z plane, or choose kind = \"analog\""
    );
    assert_eq!(
        digital("numerator = [1]\ndenominator = [1]\nmatch_hz = 100"),
        "spec.toml:5:1: match_hz in the digital stage: it belongs to analog; remove it, or choose one of these kinds"
    );
}

#[test]
fn coefficients_that_are_no_numbers_or_none_at_all() {
    let with = |list: &str| digital(&format!("denominator = [1]\nnumerator = {list}"));
    assert_eq!(with("1"), "spec.toml:4:13: numerator is 1, not a list of numbers; write numerator = [...]");
    assert_eq!(with("[1, 'x']"), "spec.toml:4:17: numerator holds the text \"x\", not a number; write a plain number");
    for (written, shown) in [("nan", "NaN"), ("inf", "inf"), ("-inf", "-inf")] {
        assert_eq!(
            with(&format!("[{written}]")),
            format!("spec.toml:4:14: numerator holds {shown}, not a finite number; give a finite number")
        );
    }
    let repair = "give the coefficients of the transfer function";
    assert_eq!(with("[]"), format!("spec.toml:4:13: numerator is empty; {repair}"));
    assert_eq!(with("[0, -0.0]"), format!("spec.toml:4:13: numerator holds nothing but zeros; {repair}"));
    let long = format!("[{}]", vec!["1"; 65].join(", "));
    assert_eq!(
        with(&long),
        "spec.toml:4:13: numerator is a list of 65 numbers, more than 64; write the filter as several stages"
    );
    assert_eq!(numerator(&format!("[{}]", vec!["1"; 64].join(", ")), SpecSyntax::Toml).len(), 64);
    assert_eq!(
        refused_json(r#"{"stage": [{"kind": "digital", "numerator": [1, null], "denominator": [0, {}, 1]}]}"#),
        "spec.json: stage[0].numerator[1]: numerator holds null, not a number; write a plain number\n\
         spec.json: stage[0].denominator[1]: denominator holds a table, not a number; write a plain number"
    );
}

#[test]
fn a_denominator_that_begins_with_zero() {
    assert_eq!(
        digital("numerator = [1]\ndenominator = [0, 1, 0.5]"),
        "spec.toml:4:15: denominator begins with 0, its constant term, so that there is no output to compute; \
         write powers of z^-1, the constant term first, and leave out common delays"
    );
    assert_eq!(
        analog("numerator = [1]\ndenominator = [0.0, 1, 0.5]"),
        "spec.toml:4:15: denominator begins with 0, the coefficient of its highest power of s; \
         remove the zeros in front, or write the highest power first"
    );
}

#[test]
fn an_analog_numerator_of_a_higher_degree() {
    assert_eq!(
        analog("numerator = [0, 1, 0, 0, 2]\ndenominator = [1, 2, 1]"),
        "spec.toml:3:13: numerator has degree 3 in s, and denominator degree 2; \
         its gain would grow without end: give a numerator of degree 2 at most, the highest power of s first"
    );
    for unit in ["", "_hz"] {
        assert_eq!(
            analog(&format!("zeros{unit} = [0, 0]\npoles{unit} = [-1]\ngain = 1")),
            format!(
                "spec.toml:3:{}: the analog stage has more zeros than poles, 2 and 1; \
                 its gain would grow without end: check both lists",
                9 + unit.len()
            )
        );
        assert_eq!(
            analog(&format!("poles{unit} = []\ngain = 1")),
            format!(
                "spec.toml:3:{}: poles{unit} is empty; an analog stage has at least one pole: give it",
                9 + unit.len()
            )
        );
    }
}

#[test]
fn a_digital_stage_with_more_zeros_than_poles() {
    assert_eq!(
        digital("zeros = [0.5]\npoles = []\ngain = 1"),
        "spec.toml:3:9: the digital stage has more zeros than poles, 1 and 0; \
         its output would come before its input: add poles at 0, each of which delays by one sample"
    );
}

#[test]
fn a_root_without_its_conjugate() {
    assert_eq!(
        digital("poles = [0.5, [0.5, 0.7], [0.5, -0.6], [-0.1, 0.2], [-0.1, -0.2]]\ngain = 1"),
        "spec.toml:3:15: the pole [0.5, 0.7] has no conjugate in poles; \
         add [0.5, -0.7], without which the filter is not real\n\
         spec.toml:3:27: the pole [0.5, -0.6] has no conjugate in poles; \
         add [0.5, 0.6], without which the filter is not real"
    );
    assert_eq!(
        refused_json(r#"{"stage": [{"kind": "analog", "zeros_hz": [[0, 60]], "poles_hz": [-1, -1], "gain": 1}]}"#),
        "spec.json: stage[0].zeros_hz[0]: the zero [0, 60] has no conjugate in zeros_hz; \
         add [0, -60], without which the filter is not real"
    );
    // A zero is no conjugate of a pole, and one conjugate serves one root.
    assert!(digital("zeros = [[0.5, -0.7]]\npoles = [[0.5, 0.7]]\ngain = 1").lines().count() == 2);
    let twice = digital("poles = [[0.5, 0.7], [0.5, 0.7], [0.5, -0.7]]\ngain = 1");
    assert!(twice.starts_with("spec.toml:3:22: the pole [0.5, 0.7] has no conjugate"), "{twice}");
}

#[test]
fn conjugates_are_equal_within_half_a_unit_of_the_last_digit() {
    let poles = |first: &str, second: &str| format!("kind = 'digital'\ngain = 1\npoles = [[{first}], [{second}]]");
    for (first, second) in [
        ("0.7050, 0.25", "0.7050, -0.25"),
        ("0.7050, 0.25", "0.70504, -0.25"),
        ("0.7050, 0.25", "0.70505, -0.2549"),
        ("0.7050, -0.25", "0.70496, 0.245"),
        ("1, 3", "1, -3"),
    ] {
        stage(&poles(first, second));
    }
    for (first, second) in [
        ("0.7050, 0.25", "0.70506, -0.25"),
        ("0.7050, 0.25", "0.7051, -0.25"),
        ("0.7050, 0.25", "0.7050, -0.2551"),
        ("1, 3", "1, -3.06"),
        ("0.5, 0.25", "0.5, 0.25"),
    ] {
        assert_eq!(said(&poles(first, second)).lines().count(), 2, "{first} and {second}");
    }
    // The nearest is the conjugate: 0.703 has none but 0.70, which is near 0.701 as well.
    stage("kind = 'digital'\ngain = 1\npoles = [[0.701, 0.3], [0.70, -0.3], [0.7010, -0.3], [0.703, 0.3]]");
}

#[test]
fn roots_that_are_none() {
    assert_eq!(
        digital("poles = [[0.5, 0.5, 0.5]]\ngain = 1"),
        "spec.toml:3:10: poles holds a list of 3, which is no root; write a number, or [re, im] off the real axis"
    );
    assert_eq!(
        digital("poles = ['0.5+0.5j']\ngain = 1"),
        "spec.toml:3:10: poles holds the text \"0.5+0.5j\", which is no root; write a number, or [re, im] off the real axis"
    );
    assert_eq!(
        digital("poles = [0.5]\ngain = 0"),
        "spec.toml:4:8: gain = 0 lets nothing through; give the gain of the transfer function"
    );
    let long = format!("[{}]", vec!["0.5"; 65].join(", "));
    assert_eq!(
        digital(&format!("poles = {long}\ngain = 1")),
        "spec.toml:3:9: poles is a list of 65 roots, more than 64; write the filter as several stages"
    );
}

#[test]
fn sections_that_are_none() {
    let with = |sections: &str| digital(&format!("sections = {sections}"));
    assert_eq!(with("[]"), "spec.toml:3:12: sections is empty; give at least one section");
    assert_eq!(
        with("[[1, 2, 1, 1, 0, 0]]"),
        "spec.toml:3:13: the section is a list, not a table; write a table of keys"
    );
    assert_eq!(
        with("[{b = [1, 2], a = [1, 0, 0, 0]}]"),
        "spec.toml:3:18: b is a list of 2, not of three numbers; \
         write three, 0 for those that are not there: b = [1, 0, 0]\n\
         spec.toml:3:30: a is a list of 4, not of three numbers; \
         write three, 0 for those that are not there: a = [1, 0, 0]"
    );
    assert_eq!(
        with("[{b = [1, 0, 0]}]"),
        "spec.toml:3:13: the section has no a; write three, 0 for those that are not there: a = [1, 0, 0]"
    );
    assert_eq!(
        with("[{b = [0, 0, 0], a = [0, 1, 0]}]"),
        "spec.toml:3:18: b holds nothing but zeros; give the coefficients of the transfer function\n\
         spec.toml:3:33: a begins with 0, its constant term, so that there is no output to compute; \
         write powers of z^-1, the constant term first, and leave out common delays"
    );
    assert_eq!(
        with("[{num = [1, 0, 0], a = [1, 0, 0]}]"),
        "spec.toml:3:14: unknown key \"num\" in the section; did you mean b?"
    );
    let long = vec!["{b = [1, 0, 0], a = [1, 0, 0]}"; 65].join(", ");
    assert_eq!(
        with(&format!("[{long}]")),
        "spec.toml:3:12: sections is a list of 65 tables, more than 64; write the filter as several stages"
    );
}
