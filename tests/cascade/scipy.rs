//! The same cascades run by SciPy's `sosfilt` (`tests/reference/cascade_scipy.py`).

use crate::helpers::{noise, run_one};
use crate::rounding::{Errors, bound};
use bandproof::section::Section;
use serde::Deserialize;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Case {
    name: String,
    seed: u64,
    frames: usize,
    stride: usize,
    sections: Vec<Section>,
    from_rest: Vec<f64>,
    steady: Vec<f64>,
}

fn cases() -> Vec<Case> {
    serde_json::from_str(include_str!("../reference/cascade_scipy.json")).expect("cases as the script writes them")
}

/// Both sides round, in different orders: twice what one of them may be off.
#[track_caller]
fn compare(case: &Case, input: &[f64], expected: &[f64], what: &str) {
    let found = run_one(&case.sections, input);
    let tolerance = 2.0 * bound(&case.sections, input, Errors::Independent);
    let worst = found
        .iter()
        .step_by(case.stride)
        .zip(expected)
        .fold(0.0, |worst: f64, (found, expected)| worst.max((found - expected).abs()));
    assert_eq!(found.iter().step_by(case.stride).len(), expected.len());
    assert!(worst <= tolerance, "{} {what}: off by {worst:e}, rounding explains {tolerance:e}", case.name);
}

#[test]
fn from_rest_the_cascade_agrees_with_sosfilt() {
    let cases = cases();
    assert_eq!(cases.len(), 6);
    for case in &cases {
        let mut input = noise(case.seed, case.frames);
        input[0] = 0.0;
        compare(case, &input, &case.from_rest, "from rest");
    }
}

#[test]
fn from_the_steady_state_the_cascade_agrees_with_sosfilt() {
    for case in &cases() {
        let input: Vec<f64> = noise(case.seed, case.frames).iter().map(|x| 0.25 * x + 0.5).collect();
        compare(case, &input, &case.steady, "steady");
    }
}
