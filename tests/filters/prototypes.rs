//! Prototypes against `prototypes.json`.

use crate::support::family;
use bandproof::design::prototype::{self, Prototype};
use bandproof::spec::Family;
use serde_json::Value;

fn number(value: &Value) -> f64 {
    value.as_str().unwrap().parse().unwrap()
}

fn figure(entry: &Value, key: &str) -> Option<f64> {
    entry.get(key).map(number)
}

/// (re, im) in the upper half-plane or on the real axis, largest imaginary part first.
fn upper(list: &Value) -> Vec<(f64, f64)> {
    let mut all: Vec<(f64, f64)> =
        list.as_array().unwrap().iter().map(|z| (number(&z[0]), number(&z[1]))).filter(|z| z.1 >= 0.0).collect();
    all.sort_by(|a, b| b.1.total_cmp(&a.1));
    all
}

fn own(prototype: &Prototype) -> Vec<(f64, f64)> {
    let mut all: Vec<(f64, f64)> = prototype.poles.iter().map(|p| (p.re.hi, p.im.hi)).collect();
    all.extend(prototype.real_pole.map(|re| (re.hi, 0.0)));
    all.sort_by(|a, b| b.1.total_cmp(&a.1));
    all
}

/// Largest relative deviation, each part for itself: the real part of a pole near the
/// imaginary axis decides its damping.
fn deviation(got: f64, want: f64) -> f64 {
    if want == 0.0 { got.abs() } else { (got / want - 1.0).abs() }
}

/// Both parts of every entry to the last digits of f64, to which they are rounded; the gain
/// and the norms of Bessel are products of up to twenty of them.
#[test]
fn zeros_poles_and_gain_are_those_of_the_closed_forms() {
    let file: Value = serde_json::from_str(include_str!("../reference/prototypes.json")).unwrap();
    let (mut seen, mut worst, mut worst_at) = (0, 0.0, String::new());
    for entry in file["entries"].as_array().unwrap() {
        let order = u32::try_from(entry["n"].as_u64().unwrap()).unwrap();
        let family = family(entry["family"].as_str().unwrap());
        let made = prototype::new(family, order, figure(entry, "rp_db"), figure(entry, "rs_db")).unwrap();
        assert_eq!(made.order(), order as usize);

        // Ours is the -3 dB norm; the entries of the delay norm say where that is, and
        // the phase norm has a product of poles of 1.
        let norm = entry.get("norm").and_then(Value::as_str).unwrap_or("mag");
        let poles = upper(&entry["poles"]);
        let scale = match norm {
            "delay" => figure(entry, "omega_3db_delay_norm").unwrap(),
            "phase" => (1.0 / made.gain().hi).powf(1.0 / f64::from(order)),
            _ => 1.0,
        };
        let zeros = upper(&entry["zeros"]);
        let mut own_zeros: Vec<f64> = made.zeros_rad.iter().map(|zero| zero.hi).collect();
        own_zeros.sort_by(|a, b| b.total_cmp(a));
        assert_eq!(zeros.len(), own_zeros.len());
        assert_eq!(poles.len(), own(&made).len());

        let mut deviations: Vec<f64> = zeros.iter().zip(&own_zeros).map(|(z, own)| deviation(*own, z.1)).collect();
        for (want, got) in poles.iter().zip(own(&made)) {
            deviations.extend([deviation(got.0 * scale, want.0), deviation(got.1 * scale, want.1)]);
        }
        deviations.push(deviation(made.gain().hi * scale.powi(order as i32), number(&entry["gain"])));
        let largest = deviations.iter().copied().fold(0.0, f64::max);
        assert!(largest < 5e-15, "{family:?} {order} {norm} {largest:e}: {made:?} for {entry}");
        if largest > worst {
            (worst, worst_at) = (largest, format!("{family:?} {order} {norm}"));
        }
        seen += 1;
    }
    println!("{seen} prototypes, worst relative deviation {worst:.2e} ({worst_at})");
    assert_eq!(seen, 398);
}

#[test]
fn orders_outside_the_range_are_errors() {
    for (family, highest) in [
        (Family::Butterworth, 20),
        (Family::Chebyshev1, 20),
        (Family::Chebyshev2, 20),
        (Family::Elliptic, 14),
        (Family::Bessel, 20),
    ] {
        let new = |order| prototype::new(family, order, Some(1.0), Some(40.0));
        assert!(new(0).is_err() && new(highest + 1).is_err() && new(u32::MAX).is_err());
        assert_eq!(new(highest).unwrap().order(), highest as usize);
    }
}

#[test]
fn missing_or_contradictory_figures_are_errors_that_name_the_key() {
    for (family, ripple_db, stop_db, says) in [
        (Family::Chebyshev1, None, Some(40.0), "Chebyshev I needs ripple_db as a positive number of dB; it is missing"),
        (Family::Chebyshev1, Some(-2.5), None, "needs ripple_db as a positive number of dB; it is -2.5"),
        (Family::Chebyshev2, None, Some(f64::NAN), "Chebyshev II needs stop_db"),
        (Family::Elliptic, Some(1.0), None, "elliptic needs stop_db"),
        (Family::Elliptic, Some(3.0), Some(3.0), "must be the larger"),
    ] {
        let message = prototype::new(family, 3, ripple_db, stop_db).unwrap_err().to_string();
        assert!(message.contains(says), "{message}");
    }
}
