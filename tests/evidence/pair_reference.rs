//! Figures of a pair against SciPy's coherence and cross-spectrum, and against the truth:
//! `tests/reference/evidence_pairs.py` made the pair and its figures (scipy 1.17.1).

use crate::support::band;
use bandproof::evidence::{BandFigures, Measured, Pairing, judge, pair_ranges};
use bandproof::spec::Requirement;
use bandproof::spectrum::{Accumulator, SegmentPlan, Transform};

const SAMPLES: &[u8] = include_bytes!("../reference/evidence_pairs.bin");
const FIGURES: &str = include_str!("../reference/evidence_pairs.csv");
const RATE: u32 = 4000;
const LENGTH: usize = 2000;

/// A band's figures and the row of the script for it.
fn rows() -> Vec<(BandFigures, [f64; 8])> {
    let values: Vec<f64> =
        SAMPLES.chunks_exact(2).map(|b| f64::from(i16::from_le_bytes([b[0], b[1]])) / 32768.0).collect();
    let before: Vec<f64> = values.iter().step_by(2).copied().collect();
    let after: Vec<f64> = values.iter().skip(1).step_by(2).copied().collect();
    let rows = FIGURES.lines().skip(1).map(|line| {
        let row: Vec<f64> = line.split(',').map(|value| value.parse().unwrap()).collect();
        let row: [f64; 8] = row.try_into().unwrap();
        let task = band(row[0], row[1], Requirement::Observe);
        let ranges = pair_ranges(RATE, LENGTH, std::slice::from_ref(&task));
        let mut sums = Accumulator::new(Transform::new(LENGTH), ranges);
        let plan = SegmentPlan::spread(LENGTH, 0..before.len() as u64);
        for start in &plan.starts {
            let segment = *start as usize..*start as usize + LENGTH;
            sums.add(&before[segment.clone()], &after[segment]);
        }
        assert_eq!((plan.starts.len(), plan.independent_segments()), (23, 23));
        let rounding = libm::ldexp(1.0, -30) / 12.0;
        let measured = Measured {
            rate_hz: RATE,
            seconds: 6.0,
            spectra: &sums.finish(),
            independent_segments: 23,
            rounding_power_before: rounding,
            rounding_power_after: rounding,
            gain: 1.0,
            pair: Some(Pairing { noise: None, delay_scatter_s: 0.0, delay_certain: true, reaches_hz: 2000.0 }),
        };
        (judge(&measured, &task), row)
    });
    rows.collect()
}

#[test]
fn levels_floors_and_gains_of_a_pair_are_those_of_scipy() {
    let (mut floors, mut gains) = (0, 0);
    for (figures, row) in rows() {
        let [from_hz, to_hz, after, after_floor, gain, error, ..] = row;
        // Figures are rounded to 0.001 dB.
        let close = |seen: Option<f64>, expected: f64, tolerance: f64| {
            assert!((seen.unwrap() - expected).abs() <= tolerance, "{row:?} {figures:#?}");
        };
        close(figures.after_dbfs, after, 0.000_6);
        // Far leakage is bounded by blocks of 64 bins: up to 0.2 dB higher, never lower.
        close(figures.after_floor_dbfs, after_floor + 0.1, 0.100_6);
        floors += 1;
        if to_hz - from_hz < 40.0 && figures.gain_min_db.is_some() {
            // Under 20 bins: a single sub-band.
            close(figures.gain_min_db, gain, 0.000_6);
            close(figures.gain_max_db, gain, 0.000_6);
            close(figures.gain_error_db, error, 0.000_6);
            gains += 1;
        }
    }
    assert!(floors == 7 && gains >= 4, "{floors} {gains}");
}

#[test]
fn gains_and_noise_of_a_pair_are_the_true_ones() {
    let (mut gains, mut stops) = (0, 0);
    for (figures, row) in rows() {
        let [from_hz, to_hz, .., true_gain, true_noise] = row;
        if to_hz - from_hz < 40.0 && true_gain > -20.0 {
            let gain = figures.gain_min_db.unwrap();
            let error = figures.gain_error_db.unwrap();
            assert!(error < 0.06, "{figures:#?}");
            // Four errors, and what the response bends within 38 Hz (0.02 dB for a
            // low-pass of second order at 1200 Hz).
            assert!((gain - true_gain).abs() < 4.0 * error + 0.02, "{true_gain} {figures:#?}");
            gains += 1;
        }
        if from_hz > 1400.0 {
            // In the stop little more than the device's noise comes out; its estimate has a
            // variance of 2.76/(22 * bins), and noise beside the band leaks 0.6 bins' worth.
            let bins = (to_hz - from_hz) / 2.0;
            let scatter_db = 4.343 * (2.76 / (22.0 * bins)).sqrt();
            let over_db = figures.after_floor_dbfs.unwrap() - true_noise;
            assert!(over_db > -3.0 * scatter_db, "{true_noise} {figures:#?}");
            assert!(over_db < 3.0 * scatter_db + 4.343 * 0.6 / bins, "{true_noise} {figures:#?}");
            stops += 1;
        }
    }
    assert_eq!((gains, stops), (4, 2));
}
