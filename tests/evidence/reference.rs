//! Levels, floors and gains against SciPy's spectra and direct double sums:
//! `tests/reference/evidence_figures.py` wrote the figures (scipy 1.17.1).

use crate::support::{Biquad, Take, band};
use bandproof::spec::Requirement;

const FIGURES: &str = include_str!("../reference/evidence_figures.csv");
const RATE: u32 = 8000;
const LENGTH: usize = 8000;

/// The recording of the script, by the same congruential generator.
fn take() -> Take {
    let mut state: u32 = 12345;
    let mut before: Vec<f64> = (0..28_000)
        .map(|_| {
            state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            0.001 * (f64::from(state) / 2_147_483_648.0 - 1.0) + 0.05
        })
        .collect();
    for (hz, amplitude) in [(443.3, 0.1), (1200.5, 0.25)] {
        for (n, sample) in before.iter_mut().enumerate() {
            *sample += amplitude * libm::sin(std::f64::consts::TAU * hz * n as f64 / f64::from(RATE));
        }
    }
    let mut take = Take::exact(before, &[Biquad::notch(RATE, 443.0, 6.0)]);
    take.skipped = 0;
    take.rounding_before = 1e-11;
    take.rounding_after = 3e-11;
    take
}

#[test]
fn levels_floors_and_gains_are_those_of_scipy_and_direct_sums() {
    let take = take();
    let mut rows = 0;
    for row in FIGURES.lines().skip(1) {
        let values: Vec<f64> = row.split(',').map(|value| value.parse().unwrap()).collect();
        let [from_hz, to_hz, before, before_floor, after, after_floor, gain, error] = values[..] else {
            panic!("{row}");
        };
        let task = band(from_hz, to_hz, Requirement::Observe);
        let spectra = take.spectra_of(std::slice::from_ref(&task), LENGTH);
        let figures = take.judge_with(&spectra, &task);
        // Figures are rounded to 0.001 dB.
        let close = |seen: Option<f64>, expected: f64, tolerance: f64| {
            let seen = seen.unwrap();
            assert!((seen - expected).abs() <= tolerance, "{row}: {seen} for {expected} {figures:#?}");
        };
        close(figures.before_dbfs, before, 0.000_6);
        close(figures.after_dbfs, after, 0.000_6);
        // The tool bounds far sources by blocks of 64 bins, so it lies up to
        // 0.2 dB higher where they weigh, and never lower.
        for (seen, expected) in [(figures.before_floor_dbfs, before_floor), (figures.after_floor_dbfs, after_floor)] {
            close(seen, expected + 0.1, 0.100_6);
        }
        if to_hz - from_hz < 20.0 && figures.gain_min_db.is_some() {
            // A single sub-band.
            close(figures.gain_min_db, gain, 0.000_6);
            close(figures.gain_max_db, gain, 0.000_6);
            close(figures.gain_error_db, error, 0.000_6);
            rows += 1;
        }
    }
    assert!(rows >= 4, "{rows}");
}
