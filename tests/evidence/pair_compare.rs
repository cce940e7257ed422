//! Gains as a reference, and against a design.

use crate::pair_support::{Pair, lines};
use crate::support::{Biquad, Noise, RATE, band, expect, filter, frames, keep, reduce};
use bandproof::evidence::{ReasonCode, Verdict, deviation, reference_gain};
use bandproof::spec::Requirement;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// The response of `chain`, from its coefficients.
fn response(chain: &[Biquad], hz: f64) -> Complex64 {
    let w = TAU * hz / f64::from(RATE);
    let at = |c: &[f64; 3]| {
        let turn = |k: f64| Complex64::new(libm::cos(k * w), -libm::sin(k * w));
        Complex64::new(c[0], 0.0) + turn(1.0) * c[1] + turn(2.0) * c[2]
    };
    chain.iter().map(|section| at(&section.b) / at(&section.a)).product()
}

#[test]
fn the_reference_band_reads_0_db_afterwards() {
    let x = Noise::new(1).white(frames(20.0), -20.0);
    for gain_db in [-31.7, 0.0, 12.3] {
        let y = Biquad::scale(libm::pow(10.0, gain_db / 20.0)).run(&x);
        let noise = Noise::new(2).white(x.len(), -60.0 + gain_db);
        let mut pair = Pair::noisy(x.clone(), &y, &noise, RATE as usize);
        // One sub-band, a row of them, and a band that would be reduced.
        for reference in [keep(1000.0, 1015.0, 0.1), keep(500.0, 2000.0, 0.1), reduce(1000.0, 1015.0, 20.0)] {
            pair.gain = 1.0;
            let bands = [reference.clone()];
            let gain = pair.measured(&bands, |measured| reference_gain(measured, &reference)).unwrap();
            let seen_db = 20.0 * libm::log10(gain);
            // 40 dB of noise, 39 segments of 15 bins: 0.003 dB of error.
            assert!((seen_db - gain_db).abs() < 0.012, "{gain_db} {seen_db}");
            pair.gain = gain;
            let single = pair.judge_one(&keep(1000.0, 1015.0, 0.1));
            expect(&single, Verdict::Met, None);
            let narrow = reference.to_hz < 1100.0;
            let tolerance_db = if narrow { 0.0 } else { 0.012 };
            assert!(single.gain_min_db.unwrap().abs() <= tolerance_db, "{single:#?}");
            expect(&pair.judge_one(&keep(90.0, 3900.0, 0.1)), Verdict::Met, None);
            // Set or not, it is the same gain.
            let again = pair.measured(&bands, |measured| reference_gain(measured, &reference)).unwrap();
            assert!((again / gain - 1.0).abs() < 1e-12);
        }
    }
}

#[test]
fn a_silent_reference_band_gives_no_gain() {
    let x = Noise::new(3).white(frames(20.0), -20.0);
    let silent = Pair::new(x.clone(), vec![0.0; x.len()], RATE as usize);
    let unrelated = Pair::new(x.clone(), Noise::new(4).white(x.len(), -20.0), RATE as usize);
    let reference = keep(500.0, 2000.0, 0.1);
    for pair in [silent, unrelated] {
        let bands = [reference.clone()];
        assert_eq!(pair.measured(&bands, |measured| reference_gain(measured, &reference)), None);
    }
    // Nor does a band of no bins, or one wholly above what interpolation leaves alone.
    let mut pair = Pair::new(x.clone(), x, RATE as usize);
    pair.reaches_hz = 400.0;
    for reference in [reference, keep(500.2, 500.7, 0.1)] {
        let bands = [reference.clone()];
        assert_eq!(pair.measured(&bands, |measured| reference_gain(measured, &reference)), None);
    }
}

#[test]
fn a_device_that_is_its_design_deviates_by_its_errors_only() {
    let chain = [Biquad::highpass(RATE, 200.0), Biquad::notch(RATE, 1500.0, 300.0)];
    let x = Noise::new(5).white(frames(30.0), -20.0);
    let y = filter(&chain, &x);
    let bands = [keep(300.0, 1200.0, 3.0), reduce(1490.0, 1510.0, 20.0), band(2000.0, 3000.0, Requirement::Observe)];
    let settled = |v: &[f64]| v[frames(1.0)..].to_vec();
    let pair = Pair::new(settled(&x), settled(&y), RATE as usize);
    let design = |hz: f64| response(&chain, hz);
    let off = pair.measured(&bands, |measured| deviation(measured, &bands, &design)).unwrap();
    assert!(off.db.abs() < 0.02, "{off:?}");
    // Half the gain everywhere but for the reference: 6.02 dB, or nothing.
    let half = |hz: f64| response(&chain, hz) * 0.5;
    let off = pair.measured(&bands, |measured| deviation(measured, &bands, &half)).unwrap();
    assert!((off.db - 6.021).abs() < 0.02, "{off:?}");
    let mut referred = Pair::new(settled(&x), settled(&y), RATE as usize);
    referred.gain = 2.0;
    let off = referred.measured(&bands, |measured| deviation(measured, &bands, &half)).unwrap();
    assert!(off.db.abs() < 0.02, "{off:?}");
}

#[test]
fn a_deviation_is_found_where_it_is_and_with_its_sign() {
    let x = Noise::new(6).white(frames(30.0), -20.0);
    let dip = [Biquad::notch(RATE, 1000.0, 40.0)];
    let y = filter(&dip, &x);
    let pair = Pair::new(x, y, RATE as usize);
    let bands = [keep(600.0, 980.0, 3.0), band(1100.0, 3000.0, Requirement::Observe)];
    let flat = |_: f64| Complex64::new(1.0, 0.0);
    let off = pair.measured(&bands, |measured| deviation(measured, &bands, &flat)).unwrap();
    // The uppermost sub-band, 970 to 980 Hz: at its center 25 Hz off the notch, it reads
    // the response there within its bend.
    let there_db = -dip[0].attenuation_db(RATE, 975.0);
    assert!((off.at_hz - 975.0).abs() < 1e-9 && (off.db - there_db).abs() < 0.05, "{off:?} {there_db}");
    // Only reduce bands: nothing to hold against the design.
    let reduce = [reduce(990.0, 1010.0, 10.0)];
    assert_eq!(pair.measured(&reduce, |measured| deviation(measured, &reduce, &flat)), None);
}

#[test]
fn a_band_resolved_to_less_than_0_9_is_not_met_in_a_pair() {
    // Hardly anything is played above 2500 Hz, so that only the device's noise comes out
    // there: 80 and 92 % of the bands are resolved.
    let mut low = lines(80..2500, -48.0, 10);
    low.iter_mut().zip(Noise::new(7).white(frames(10.0), -80.0)).for_each(|(x, played)| *x += played);
    let noise = Noise::new(8).white(low.len(), -50.0);
    let pair = Pair::noisy(low.clone(), &low, &noise, RATE as usize);
    let figures = pair.judge(&[keep(100.0, 3100.0, 0.5), keep(100.0, 2700.0, 0.5)]);
    expect(&figures[0], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
    assert!((figures[0].resolved.unwrap() - 0.8).abs() < 0.01, "{figures:#?}");
    expect(&figures[1], Verdict::Met, None);
    assert!((figures[1].resolved.unwrap() - 0.923).abs() < 0.01, "{figures:#?}");
}
