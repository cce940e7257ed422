//! Finished sections against SciPy 1.17.1 (`make_scipy_filters.py`).

use crate::support::{Filter, family, kind, notch};
use bandproof::design::{response, sections};
use num_complex::Complex64;
use serde_json::Value;

fn file() -> Value {
    serde_json::from_str(include_str!("../reference/scipy_filters.json")).unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|number| number.as_f64().unwrap()).collect()
}

/// SciPy's own error against the exact magnitude is stated with each filter (at most
/// 2e-13); its phase is as good as its magnitude, and 1e-12 of ours is added.
#[test]
fn responses_are_those_of_scipy_in_gain_and_phase() {
    let mut seen = 0;
    for entry in file()["filters"].as_array().unwrap() {
        let filter = Filter {
            family: family(entry["family"].as_str().unwrap()),
            kind: kind(entry["kind"].as_str().unwrap()),
            order: u32::try_from(entry["order"].as_u64().unwrap()).unwrap(),
            ripple_db: entry["ripple_db"].as_f64(),
            stop_db: entry["stop_db"].as_f64(),
            edges_hz: numbers(&entry["edges_hz"]),
            rate_hz: entry["rate_hz"].as_f64().unwrap(),
        };
        let scipy_error = entry["scipy_error"].as_f64().unwrap();
        let sections = filter.sections();
        for point in entry["response"].as_array().unwrap() {
            let point = numbers(point);
            let want = Complex64::new(point[1], point[2]);
            let got = response::at(&sections, point[0], filter.rate_hz);
            let deviation = (got - want).norm() / want.norm();
            assert!(deviation < 1e-12 + 5.0 * scipy_error, "{filter:?} at {} Hz: {got} for {want}", point[0]);
            seen += 1;
        }
    }
    assert!(seen == 480, "{seen}");
}

/// iirnotch has the digital -3 dB width exact as well. Coefficients are sums of a few
/// rounded terms up to 2 on both sides: 4 units of 2^-52. The numerator's gain may be
/// moved by 2e-8 for the sake of its zeros.
#[test]
fn notches_are_those_of_iirnotch() {
    let file = file();
    let notches = file["notches"].as_array().unwrap();
    for entry in notches {
        let figure = |key: &str| entry[key].as_f64().unwrap();
        let placed = notch(figure("center_hz"), figure("width_hz"));
        let built = sections::build(&[placed], figure("rate_hz")).unwrap();
        assert_eq!(built.len(), 1);
        let (b, a) = (numbers(&entry["b"]), numbers(&entry["a"]));
        assert!((built[0].b[0] - b[0]).abs() < 2e-8, "{built:?} for {entry}");
        for i in 0..3 {
            assert!((built[0].b[i] / built[0].b[0] - b[i] / b[0]).abs() < 9e-16, "{built:?} for {entry}");
            assert!((built[0].a[i] - a[i]).abs() < 9e-16, "{built:?} for {entry}");
        }
    }
    assert_eq!(notches.len(), 5);
}
