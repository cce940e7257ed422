//! What holds for every pair.

use crate::pair_support::Pair;
use crate::support::{Biquad, Noise, RATE, add_line, band, expect, frames, keep, reduce, residual};
use bandproof::evidence::{BandTask, Idle, Measured, Pairing, Verdict, judge, pair_ranges};
use bandproof::spec::Requirement;
use bandproof::spectrum::Spectra;
use num_complex::Complex64;

fn sound(seed: u64, seconds: f64) -> Vec<f64> {
    let mut x = Noise::new(seed).white(frames(seconds), -40.0);
    add_line(&mut x, RATE, 443.21, -12.0);
    crate::support::rounded(&x, 16, None)
}

#[test]
fn a_recording_against_itself_reads_0_db_in_one_segment_and_many() {
    for (seed, seconds) in (0..).zip([1.0, 1.5, 3.0, 8.0]) {
        let x = sound(seed, seconds);
        let mut pair = Pair::new(x.clone(), x, RATE as usize);
        pair.rounding = crate::support::rounding_power(16);
        let bands = [
            keep(6.0, 4000.0, 0.001),
            keep(90.0, 3000.0, 0.001),
            keep(490.0, 505.0, 0.001),
            keep(3989.0, 4000.0, 0.001),
            band(100.0, 900.0, Requirement::Observe),
            reduce(430.0, 456.0, 0.0),
            residual(430.0, 456.0, 0.0),
        ];
        for (figures, task) in pair.judge(&bands).iter().zip(&bands) {
            assert_eq!(figures.measured_attenuation_db, Some(0.0), "{seconds} {figures:#?}");
            if matches!(task.requirement, Requirement::Keep { .. }) {
                expect(figures, Verdict::Met, None);
                let shown = (figures.gain_min_db, figures.gain_max_db, figures.gain_error_db, figures.resolved);
                assert_eq!(shown, (Some(0.0), Some(0.0), Some(0.0), Some(1.0)), "{seconds} {figures:#?}");
            }
        }
    }
}

#[test]
fn swapping_before_and_after_changes_the_sign_of_every_attenuation() {
    let x = sound(5, 12.0);
    let y = Biquad::notch(RATE, 440.0, 20.0).run(&x);
    let bands = [
        reduce(430.0, 456.0, 3.0),
        keep(90.0, 3000.0, 1.0),
        residual(600.0, 700.0, -60.0),
        band(20.0, 60.0, Requirement::Observe),
    ];
    let there = Pair::new(x.clone(), y.clone(), RATE as usize).judge(&bands);
    let back = Pair::new(y, x, RATE as usize).judge(&bands);
    for (there, back) in there.iter().zip(&back) {
        let (there_db, back_db) = (there.measured_attenuation_db.unwrap(), back.measured_attenuation_db.unwrap());
        assert!((there_db + back_db).abs() < 1e-9, "{there:#?} {back:#?}");
    }
    assert!(there[0].measured_attenuation_db.unwrap() > 3.0, "{there:#?}");
}

#[test]
fn more_noise_never_lowers_the_floor_and_a_floor_stays_under_its_level() {
    let x = Noise::new(6).white(frames(20.0), -20.0);
    let y = Biquad::notch(RATE, 440.0, 100.0).run(&x);
    let mut last = f64::NEG_INFINITY;
    for noise_dbfs in [-140.0, -100.0, -80.0, -60.0, -40.0, -20.0] {
        let noise = Noise::new(7).white(x.len(), noise_dbfs);
        let figures = Pair::noisy(x.clone(), &y, &noise, RATE as usize).judge_one(&reduce(436.0, 446.0, 20.0));
        let (level, floor) = (figures.after_dbfs.unwrap(), figures.after_floor_dbfs.unwrap());
        assert!(floor <= level && floor > last - 0.2, "{noise_dbfs} {last} {figures:#?}");
        last = floor;
    }
    // Of noise alone the floor is the level.
    assert!(last > crate::pair_support::in_band_dbfs(-20.0, 10.0) - 2.0, "{last}");
}

#[test]
fn rounding_that_is_incoherent_is_counted_once() {
    // An exact excitation and a device that takes it down by 26 dB and rounds, with dither:
    // what is not coherent is that rounding. The sum of both would be 3 dB higher.
    let x = Noise::new(8).white(frames(60.0), -60.0);
    let y = crate::support::rounded(&Biquad::scale(0.05).run(&x), 16, Some(Noise::new(9)));
    let mut pair = Pair::new(x, y, RATE as usize);
    pair.rounding = 3.0 * crate::support::rounding_power(16);
    let figures = pair.judge_one(&reduce(400.0, 480.0, 20.0));
    let rounding_dbfs = crate::support::db(2.0 * pair.rounding * 80.0 / 4000.0);
    // 119 segments of 80 bins: 0.07 dB of scatter, of which only what exceeds counts. At
    // the edges 0.6 bins of what remains, 7 dB above the rounding, leak in once or twice.
    let over_db = figures.after_floor_dbfs.unwrap() - rounding_dbfs;
    assert!(over_db > 0.0 && over_db < 0.6, "{rounding_dbfs} {figures:#?}");
    assert!(figures.after_dbfs.unwrap() > rounding_dbfs + 6.0, "{figures:#?}");
}

#[test]
fn a_delay_costs_coherence_by_the_square_of_the_window_s_slope() {
    // (4.94 d/L)^2 of the level: 0.976 % at a fiftieth of the segment, 0.25 % at half of
    // that; 400 bins, into which 0.6 bins' worth leaks at either edge once or twice. With
    // 119 segments the estimate scatters by 2 %, the next term of the series takes 3 % of it.
    for late in [10, 20] {
        let x = Noise::new(12).white(frames(7.5), -20.0);
        let mut y = x.clone();
        y.rotate_right(late);
        let pair = Pair::new(x, y, 1000);
        let figures = pair.judge_one(&reduce(400.0, 3600.0, 20.0));
        let share = crate::support::power(figures.after_floor_dbfs.unwrap() - figures.after_dbfs.unwrap());
        let expected = libm::pow(4.94 * late as f64 / 1000.0, 2.0);
        let leaks = 2.4 / 400.0;
        assert!(share > 0.93 * expected && share < 1.07 * expected + leaks, "{late} {share} {expected}");
    }
}

#[test]
fn a_pair_without_noise_has_the_levels_and_lines_of_a_filtered_recording() {
    let x = sound(10, 10.0);
    let y = Biquad::notch(RATE, 440.0, 20.0).run(&x);
    let pair = Pair::new(x, y, RATE as usize);
    let filtered = pair.as_filtered();
    for task in [reduce(430.0, 456.0, 3.0), keep(90.0, 3000.0, 1.0)] {
        let seen = pair.judge_one(&task);
        let spectra = filtered.spectra_of(std::slice::from_ref(&task), RATE as usize);
        let expected = filtered.judge_with(&spectra, &task);
        assert_eq!((seen.before_dbfs, seen.after_dbfs), (expected.before_dbfs, expected.after_dbfs));
        assert_eq!((seen.line_hz, seen.line_after_dbfs), (expected.line_hz, expected.line_after_dbfs));
        assert_eq!(seen.before_floor_dbfs, expected.before_floor_dbfs);
    }
}

#[test]
fn cross_spectra_of_a_pair_are_kept_for_all_bands() {
    let bands =
        [keep(900.0, 1000.0, 1.0), reduce(100.0, 200.0, 10.0), residual(150.0, 300.0, -90.0), keep(0.0, 3.0, 1.0)];
    assert_eq!(pair_ranges(RATE, RATE as usize, &bands), [100..300, 900..1000]);
    assert!(pair_ranges(RATE, RATE as usize, &[]).is_empty());
}

proptest::proptest! {
    #![proptest_config(proptest::prelude::ProptestConfig::with_cases(400))]

    #[test]
    fn no_spectra_break_a_pair(
        half in 0usize..400,
        values in proptest::collection::vec(proptest::num::f64::ANY, 0..30),
        known in proptest::collection::vec(proptest::num::f64::ANY, 5),
        (from_hz, to_hz) in (proptest::num::f64::ANY, proptest::num::f64::ANY),
        edges in proptest::collection::vec(-100.0f64..9000.0, 0..6),
        segments in 0usize..12,
        (whole, idle) in (proptest::bool::ANY, proptest::bool::ANY),
    ) {
        let value = |k: usize| values.get(k % values.len().max(1)).copied().unwrap_or(0.0);
        let noise: Vec<f64> = (0..half).map(|k| value(k + 5)).collect();
        for requirement in [
            Requirement::Reduce { reduce_db: known[0] },
            Requirement::Keep { keep_db: known[0], except: Vec::new() },
            Requirement::Residual { residual_dbfs: known[0] },
            Requirement::Observe,
        ] {
            let mut task: BandTask = if whole { band(0.0, 4000.0, requirement) } else { band(from_hz, to_hz, requirement) };
            task.excepted_hz = edges.chunks(2).map(|e| (e[0], *e.last().unwrap())).collect();
            let cross_bins = pair_ranges(RATE, 2 * half, std::slice::from_ref(&task));
            let spectra = Spectra {
                segment_frames: 2 * half,
                segments,
                sxx: (0..=half).map(value).collect(),
                syy: (0..=half).map(|k| value(k + 3)).collect(),
                sxy: cross_bins.iter().cloned().flatten().map(|k| Complex64::new(value(k), value(k + 1))).collect(),
                cross_bins,
            };
            let noise = idle.then_some(Idle { spectrum: &noise, independent_segments: segments, rounding_power: known[4] });
            let measured = Measured {
                rate_hz: RATE,
                seconds: 1.0,
                spectra: &spectra,
                independent_segments: segments,
                rounding_power_before: value(0),
                rounding_power_after: value(1),
                gain: known[1],
                pair: Some(Pairing { noise, delay_scatter_s: known[2], delay_certain: true, reaches_hz: known[3] }),
            };
            let figures = judge(&measured, &task);
            let shown = [
                figures.before_dbfs, figures.before_floor_dbfs, figures.after_dbfs, figures.after_floor_dbfs,
                figures.measured_attenuation_db, figures.demonstrable_attenuation_db, figures.line_hz,
                figures.line_before_dbfs, figures.line_after_dbfs, figures.gain_min_db, figures.gain_max_db,
                figures.gain_error_db, figures.resolved, figures.resolution_hz,
            ];
            proptest::prop_assert!(shown.iter().flatten().all(|figure| figure.is_finite()), "{:?}", figures);
            if figures.verdict == Some(Verdict::Unproven) {
                proptest::prop_assert!(figures.reason.is_some() && figures.reason_code.is_some(), "{:?}", figures);
            }
            let gain = bandproof::evidence::reference_gain(&measured, &task);
            proptest::prop_assert!(gain.is_none_or(|gain| gain.is_finite() && gain > 0.0), "{:?}", gain);
            let off = bandproof::evidence::deviation(&measured, std::slice::from_ref(&task), &|hz| Complex64::new(hz, value(2)));
            proptest::prop_assert!(off.is_none_or(|off| off.db.is_finite() && off.at_hz.is_finite()), "{:?}", off);
        }
    }
}
