//! K of ITU-R BS.1770.

use crate::support::{RATES_HZ, made, rows};
use bandproof::design::response;
use bandproof::section::Section;
use bandproof::spec::Curve;
use std::f64::consts::PI;

/// The printed coefficients.
fn printed() -> Vec<Section> {
    let file: serde_json::Value = serde_json::from_str(include_str!("../reference/bs1770_k_48k.json")).unwrap();
    serde_json::from_value(file["sections"].clone()).unwrap()
}

/// Their response in plain complex arithmetic, from 24 kHz on what it is there, dB.
fn printed_db(hz: f64) -> f64 {
    let w = 2.0 * PI * hz.min(24_000.0) / 48_000.0;
    let power = |p: [f64; 3]| {
        let re = p[0] + p[1] * w.cos() + p[2] * (2.0 * w).cos();
        let im = p[1] * w.sin() + p[2] * (2.0 * w).sin();
        re * re + im * im
    };
    printed().iter().map(|section| 10.0 * (power(section.b) / power(section.a)).log10()).sum()
}

/// The usual way to other rates: an analog shelf and high-pass whose bilinear transform at
/// 48 kHz has the printed coefficients, transformed again, with the numerator of the high-pass
/// as printed. (Constants after B. De Man's derivation; a test below checks them.)
fn bilinear(rate_hz: f64) -> [Section; 2] {
    let (high, q) = (10f64.powf(3.999843853973347 / 20.0), 0.7071752369554196);
    let band = high.powf(0.4996667741545416);
    let k = (PI * 1681.974450955533 / rate_hz).tan();
    let a0 = 1.0 + k / q + k * k;
    let shelf = Section {
        b: [(high + band * k / q + k * k) / a0, 2.0 * (k * k - high) / a0, (high - band * k / q + k * k) / a0],
        a: [1.0, 2.0 * (k * k - 1.0) / a0, (1.0 - k / q + k * k) / a0],
    };
    let (k, q) = ((PI * 38.13547087602444 / rate_hz).tan(), 0.5003270373238773);
    let a0 = 1.0 + k / q + k * k;
    let highpass = Section { b: [1.0, -2.0, 1.0], a: [1.0, 2.0 * (k * k - 1.0) / a0, (1.0 - k / q + k * k) / a0] };
    [shelf, highpass]
}

#[test]
fn at_48_khz_the_coefficients_are_the_printed_ones() {
    assert_eq!(made(Curve::K, 48_000.0).sections, printed());
}

/// The table has four decimals.
#[test]
fn at_48_khz_the_response_is_that_of_the_printed_coefficients() {
    let made = made(Curve::K, 48_000.0);
    for row in rows(include_str!("../reference/bs1770_k_48k_response.csv")) {
        assert!((made.gain_db(row[0]) - row[3]).abs() <= 5.1e-5, "{row:?}: {}", made.gain_db(row[0]));
    }
}

/// The Recommendation's -0.691 takes it off again.
#[test]
fn the_gain_at_997_hz_is_0_691_db_at_every_rate() {
    for rate_hz in RATES_HZ {
        let gain_db = made(Curve::K, rate_hz).gain_db(997.0);
        assert!((gain_db - 0.691).abs() < 5e-5, "{gain_db} dB at {rate_hz} Hz");
        assert!((gain_db - printed_db(997.0)).abs() < 1e-9);
    }
}

/// Up to 0.45 of the lower of the two rates. Measured: 0.0001 dB at 8 kHz, less above but at
/// the rates where two sections do.
#[test]
fn at_other_rates_the_response_is_that_at_48_khz() {
    for rate_hz in RATES_HZ {
        let made = made(Curve::K, rate_hz);
        let up_to_hz = 0.45 * rate_hz.min(48_000.0);
        let worst_db = made.worst_db(up_to_hz, printed_db);
        assert!(worst_db < 5e-4, "{rate_hz} Hz is off by {worst_db} dB");
        assert_eq!(made.sections.len(), if rate_hz < 20_000.0 { 3 } else { 2 }, "{rate_hz} Hz");
    }
}

/// Above it stays level, as the shelf does there: within 0.001 dB of the gain at 24 kHz.
#[test]
fn above_24_khz_the_gain_stays() {
    for rate_hz in RATES_HZ {
        let made = made(Curve::K, rate_hz);
        let worst_db = made.worst_db(made.top_hz(), printed_db);
        assert!(worst_db < 1e-3, "{rate_hz} Hz is off by {worst_db} dB");
    }
}

/// The constants are right (at 48 kHz they give the printed coefficients), and at every other
/// rate the design here is at least ten times nearer to the response.
#[test]
fn the_usual_bilinear_way_is_farther_off_at_every_other_rate() {
    let (at_48, printed) = (bilinear(48_000.0), printed());
    for (got, want) in at_48.iter().zip(&printed) {
        let pairs = got.b.iter().chain(&got.a).zip(want.b.iter().chain(&want.a));
        assert!(pairs.clone().all(|(got, want)| (got - want).abs() < 1e-14), "{got:?} for {want:?}");
    }
    for rate_hz in RATES_HZ.into_iter().filter(|rate_hz| *rate_hz != 48_000.0) {
        let up_to_hz = 0.45 * rate_hz.min(48_000.0);
        let usual = bilinear(rate_hz);
        let places = (1..=1_000).map(|i| up_to_hz * f64::from(i) / 1_000.0);
        let usual_db =
            places.map(|hz| (response::gain_db(&usual, hz, rate_hz) - printed_db(hz)).abs()).fold(0.0, f64::max);
        let own_db = made(Curve::K, rate_hz).worst_db(up_to_hz, printed_db);
        assert!(usual_db > 10.0 * own_db && usual_db > 0.005, "{rate_hz} Hz: {usual_db} and {own_db} dB");
    }
}
