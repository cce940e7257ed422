//! Transfer functions for tests.

use bandproof::design::recipe::Recipe;
use bandproof::design::{self, Design, response, transfer};
use bandproof::section::Section;
use bandproof::spec::{self, AnalogStage, Coefficient, DigitalFilter, Root, RootUnit, SpecSyntax, Transfer};
use serde_json::Value;

pub fn exact(value: f64) -> Coefficient {
    Coefficient { value, unit: 0.0 }
}

pub fn all_exact(values: &[f64]) -> Vec<Coefficient> {
    values.iter().map(|&value| exact(value)).collect()
}

/// As printed to so many decimals.
pub fn decimals(values: &[f64], decimals: usize) -> Vec<Coefficient> {
    let unit: f64 = format!("1e-{decimals}").parse().unwrap();
    let each = values.iter().map(|value| format!("{value:.decimals$}").parse().unwrap());
    each.map(|value| Coefficient { value, unit }).collect()
}

/// As printed to so many significant digits.
pub fn significant(values: &[f64], digits: usize) -> Vec<Coefficient> {
    let each = values.iter().map(|value| {
        let text = format!("{value:.*e}", digits - 1);
        let power: i32 = text.split_once('e').unwrap().1.parse().unwrap();
        let unit: f64 = format!("1e{}", power + 1 - i32::try_from(digits).unwrap()).parse().unwrap();
        Coefficient { value: text.parse().unwrap(), unit }
    });
    each.collect()
}

pub fn root(re: f64, im: f64) -> Root {
    Root { re: exact(re), im: exact(im) }
}

pub fn polynomials(numerator: Vec<Coefficient>, denominator: Vec<Coefficient>) -> Transfer {
    Transfer::Polynomials { numerator, denominator }
}

pub fn digital(numerator: &[f64], denominator: &[f64]) -> DigitalFilter {
    DigitalFilter::Transfer(polynomials(all_exact(numerator), all_exact(denominator)))
}

pub fn analog(transfer: Transfer, match_hz: Option<f64>) -> AnalogStage {
    AnalogStage { transfer, unit: RootUnit::RadiansPerSecond, match_hz }
}

pub fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|number| number.as_f64().unwrap()).collect()
}

pub fn roots(value: &Value) -> Vec<Root> {
    value.as_array().unwrap().iter().map(numbers).map(|pair| root(pair[0], pair[1])).collect()
}

/// How much rounding of its coefficients by 2^-53 moves the response of sections at a frequency,
/// relative, added up: for each polynomial the sum of its coefficients' sizes over its own
/// size there.
pub fn conditioning(sections: &[Section], hz: f64, rate_hz: f64) -> f64 {
    let plain = |p: [f64; 3]| {
        let size = response::at(&[Section { b: p, a: [1.0, 0.0, 0.0] }], hz, rate_hz).norm();
        p.iter().map(|c| c.abs()).sum::<f64>() / size
    };
    sections.iter().map(|section| plain(section.b) + plain(section.a)).sum()
}

/// Coefficients of the product of two polynomials.
pub fn times(a: &[f64], b: &[f64]) -> Vec<f64> {
    let mut product = vec![0.0; a.len() + b.len() - 1];
    for (i, x) in a.iter().enumerate() {
        for (j, y) in b.iter().enumerate() {
            product[i + j] += x * y;
        }
    }
    product
}

/// The design of a spec in TOML.
pub fn designed(toml: &str, rate_hz: u32) -> Design {
    let spec =
        spec::parse(toml.as_bytes(), SpecSyntax::Toml, "test.toml").unwrap_or_else(|error| panic!("{error}\n{toml}"));
    design::design(&spec, rate_hz).unwrap_or_else(|error| panic!("{error}\n{toml}"))
}

/// Numerator and denominator of a whole cascade.
pub fn expand(sections: &[Section]) -> (Vec<f64>, Vec<f64>) {
    let trimmed = |p: [f64; 3]| if p[2] == 0.0 { p[..2].to_vec() } else { p.to_vec() };
    sections.iter().fold((vec![1.0], vec![1.0]), |(b, a), section| {
        (times(&b, &trimmed(section.b)), times(&a, &trimmed(section.a)))
    })
}

/// Frequencies from 0 to just below half the rate, dense at the lower end too.
pub fn frequencies(rate_hz: f64) -> impl Iterator<Item = f64> {
    let even = (0..200).map(move |i| f64::from(i) / 400.0 * rate_hz);
    let low = (0..60).map(move |i| rate_hz * 1e-4 * 1.12f64.powi(i));
    even.chain(low.filter(move |hz| *hz < rate_hz / 2.0))
}

/// A gain lies within what the digits allow, and 1e-9 dB for the arithmetic of the test.
pub fn assert_within(recipe: &Recipe, hz: f64, rate_hz: f64, gain_db: f64, what: &str) {
    let bounds = transfer::gain_bounds(recipe, hz, rate_hz).unwrap();
    let holds = bounds.low_db - 1e-9 <= gain_db && gain_db <= bounds.high_db + 1e-9;
    assert!(holds, "{what}: {gain_db} dB at {hz} Hz is not within {bounds:?}");
}
