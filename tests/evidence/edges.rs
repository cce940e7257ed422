//! Bands with few bins or none, and recordings with nothing settled.

use crate::support::{Biquad, Noise, RATE, Take, add_line, band, expect, frames, keep, reduce, residual};
use bandproof::evidence::{ReasonCode, Verdict, cross_ranges, cross_slice, unsettled};
use bandproof::spec::Requirement;

/// A line of -30 dBFS, notched by 30.46 dB, in bins of 1 Hz.
fn take() -> Take {
    let mut x = vec![0.0; frames(8.0)];
    add_line(&mut x, RATE, 500.02, -30.0);
    Take::pcm16(&x, &[Biquad::notch(RATE, 500.0, 1.333)], 1)
}

#[test]
fn four_to_nine_bins_may_be_met_but_never_missed() {
    let take = take();
    for half_hz in [2.0, 3.0, 4.0, 4.5] {
        let (from_hz, to_hz) = (500.0 - half_hz, 500.0 + half_hz);
        let requirements =
            [reduce(from_hz, to_hz, 20.0), reduce(from_hz, to_hz, 40.0), residual(from_hz, to_hz, -80.0)];
        let spectra = take.spectra_of(&requirements, RATE as usize);
        let figures: Vec<_> = requirements.iter().map(|task| take.judge_with(&spectra, task)).collect();
        // A band of 4 bins holds half of the main lobe's skirts only: whether it is met
        // is open, but it is not missed.
        if half_hz > 2.0 {
            expect(&figures[0], Verdict::Met, None);
        }
        expect(&figures[1], Verdict::Unproven, Some(ReasonCode::TooShort));
        expect(&figures[2], Verdict::Unproven, Some(ReasonCode::TooShort));
        assert!(figures[1].reason.as_deref().unwrap().contains("10 are needed"), "{figures:#?}");
    }
    let tenth = reduce(495.0, 505.0, 40.0);
    expect(&take.judge_with(&take.spectra_of(&[], RATE as usize), &tenth), Verdict::Missed, None);
}

#[test]
fn under_four_bins_nothing_is_proven() {
    let take = take();
    let spectra = take.spectra_of(&[keep(499.0, 502.0, 1.0)], RATE as usize);
    for (from_hz, to_hz) in [(499.0, 502.0), (500.0, 501.0), (500.2, 500.7)] {
        for task in [reduce(from_hz, to_hz, 1.0), residual(from_hz, to_hz, -1.0), keep(from_hz, to_hz, 100.0)] {
            let figures = take.judge_with(&spectra, &task);
            expect(&figures, Verdict::Unproven, Some(ReasonCode::TooShort));
        }
    }
}

#[test]
fn a_keep_band_of_few_bins_is_met_or_unproven() {
    let x = Noise::new(2).white(frames(30.0), -30.0);
    let take = Take::pcm16(&x, &[Biquad::scale(0.794_328)], 2);
    let bands = [keep(500.0, 506.0, 3.0), keep(500.0, 506.0, 1.0), keep(500.0, 510.0, 1.0)];
    let spectra = take.spectra_of(&bands, RATE as usize);
    expect(&take.judge_with(&spectra, &bands[0]), Verdict::Met, None);
    expect(&take.judge_with(&spectra, &bands[1]), Verdict::Unproven, Some(ReasonCode::TooShort));
    expect(&take.judge_with(&spectra, &bands[2]), Verdict::Missed, None);
}

#[test]
fn bands_out_of_reach_say_so() {
    let take = take();
    let spectra = take.spectra_of(&[], RATE as usize);
    let figures = take.judge_with(&spectra, &reduce(5000.0, 6000.0, 10.0));
    expect(&figures, Verdict::Unproven, Some(ReasonCode::OutOfRange));
    // Bins 0 to 4 belong to no band.
    let figures = take.judge_with(&spectra, &residual(0.0, 4.5, -10.0));
    expect(&figures, Verdict::Unproven, Some(ReasonCode::TooShort));
    assert_eq!(figures.before_dbfs, None);
    // What they hide counts as not resolved: 5 of 20 bins.
    let low = Take::exact(Noise::new(3).white(frames(10.0), -30.0), &[]);
    let task = keep(0.0, 20.0, 0.1);
    let spectra = low.spectra_of(std::slice::from_ref(&task), RATE as usize);
    assert_eq!(low.judge_with(&spectra, &task).resolved, Some(0.75));
}

#[test]
fn nothing_settled_names_the_length_that_would_do() {
    let mut task = reduce(49.5, 50.5, 30.0);
    task.shortest_s = Some(12.2);
    let figures = unsettled(1.5, &task);
    expect(&figures, Verdict::Unproven, Some(ReasonCode::Unsettled));
    assert!(figures.reason.unwrap().contains("at least 12.2 s, this one has 1.5 s"));
    let observed = unsettled(1.5, &band(10.0, 20.0, Requirement::Observe));
    assert_eq!((observed.verdict, observed.reason_code), (None, Some(ReasonCode::Unsettled)));
    assert!(observed.reason.is_some());
}

#[test]
fn silence_holds_no_line_and_says_so() {
    // Dither is all that comes out; before there is only arithmetic, whose largest bin
    // is no line and stands elsewhere on every machine.
    let take = Take::silence16(8.0, 5);
    let spectra = take.spectra_of(&[], RATE as usize);
    for task in [residual(490.0, 510.0, -90.0), reduce(490.0, 510.0, 10.0)] {
        let figures = take.judge_with(&spectra, &task);
        let line = (figures.line_hz, figures.line_before_dbfs, figures.line_after_dbfs);
        assert_eq!(line, (None, None, None), "{figures:#?}");
        assert!(figures.after_dbfs.is_some(), "{figures:#?}");
    }
    // A verdict that needs no reason still tells why figures are missing.
    let figures = take.judge_with(&spectra, &residual(490.0, 510.0, -90.0));
    expect(&figures, Verdict::Met, None);
    let reason = figures.reason.unwrap();
    assert!(reason.contains("the level before") && reason.contains("the line before"), "{reason}");
}

#[test]
fn cross_spectra_are_kept_for_keep_and_observed_bands_only() {
    let bands = [
        keep(900.0, 1000.0, 1.0),
        reduce(100.0, 200.0, 10.0),
        keep(300.0, 500.0, 1.0),
        band(400.0, 600.0, Requirement::Observe),
        residual(2000.0, 2100.0, -90.0),
        keep(600.0, 610.0, 1.0),
        keep(0.0, 3.0, 1.0),
    ];
    let ranges = cross_ranges(RATE, RATE as usize, &bands);
    assert_eq!(ranges, [300..610, 900..1000]);
    let take = take();
    let spectra = take.spectra_of(&bands, RATE as usize);
    let all = cross_slice(&spectra, 900..1000).unwrap();
    assert_eq!(cross_slice(&spectra, 950..1000).unwrap(), &all[50..]);
    assert_eq!(cross_slice(&spectra, 605..615), None);
    assert_eq!(cross_slice(&spectra, 100..110), None);
}

#[test]
fn excepted_ranges_are_taken_out() {
    // A notch inside the keep band: an exception makes the difference.
    let x = Noise::new(4).white(frames(30.0), -30.0);
    let take = Take::pcm16(&x, &[Biquad::notch(RATE, 500.0, 4.0)], 4);
    let mut task = keep(400.0, 600.0, 0.5);
    let spectra = take.spectra_of(std::slice::from_ref(&task), 10 * RATE as usize);
    expect(&take.judge_with(&spectra, &task), Verdict::Missed, None);
    task.excepted_hz = vec![(494.0, 506.0)];
    let figures = take.judge_with(&spectra, &task);
    expect(&figures, Verdict::Met, None);
    assert_eq!(figures.resolved, Some(1.0));
    // All of it excepted: nothing to judge, and no pass.
    task.excepted_hz = vec![(300.0, 700.0)];
    expect(&take.judge_with(&spectra, &task), Verdict::Unproven, Some(ReasonCode::OutOfRange));
}

/// Found by the property test below: what came out had nothing to do with what went in,
/// and the error of a gain came out infinite.
#[test]
fn an_incoherent_sub_band_has_no_gain_and_no_infinite_error() {
    use bandproof::evidence::{Measured, judge};
    use bandproof::spectrum::Spectra;
    use num_complex::Complex64;
    for tiny in [0.0, 1e-300, 1e-160] {
        let task = keep(0.0, 4000.0, 1.0);
        let cross_bins = cross_ranges(RATE, 48, std::slice::from_ref(&task));
        let bins: usize = cross_bins.iter().map(ExactSizeIterator::len).sum();
        let spectra = Spectra {
            segment_frames: 48,
            segments: 1,
            sxx: vec![1e200; 25],
            syy: vec![1e200; 25],
            sxy: vec![Complex64::new(tiny, 0.0); bins],
            cross_bins,
        };
        let measured = Measured {
            pair: None,
            rate_hz: RATE,
            seconds: 1.0,
            spectra: &spectra,
            independent_segments: 1,
            rounding_power_before: 0.0,
            rounding_power_after: 0.0,
            gain: 1.0,
        };
        let figures = judge(&measured, &task);
        assert_eq!((figures.gain_min_db, figures.gain_error_db), (None, None), "{figures:?}");
        expect(&figures, Verdict::Unproven, Some(ReasonCode::TooQuiet));
    }
}

proptest::proptest! {
    #![proptest_config(proptest::prelude::ProptestConfig::with_cases(400))]

    #[test]
    fn no_spectra_and_no_band_break_it(
        half in 0usize..400,
        values in proptest::collection::vec(proptest::num::f64::ANY, 0..30),
        (from_hz, to_hz) in (proptest::num::f64::ANY, proptest::num::f64::ANY),
        edges in proptest::collection::vec(-100.0f64..9000.0, 0..6),
        limit in proptest::num::f64::ANY,
        gain in proptest::num::f64::ANY,
        segments in 0usize..3,
        whole in proptest::bool::ANY,
    ) {
        use bandproof::evidence::{Measured, judge};
        use bandproof::spectrum::Spectra;
        use num_complex::Complex64;
        let value = |k: usize| values.get(k % values.len().max(1)).copied().unwrap_or(0.0);
        let excepted: Vec<(f64, f64)> = edges.chunks(2).map(|e| (e[0], *e.last().unwrap())).collect();
        for requirement in [
            Requirement::Reduce { reduce_db: limit },
            Requirement::Keep { keep_db: limit, except: Vec::new() },
            Requirement::Residual { residual_dbfs: limit },
            Requirement::Observe,
        ] {
            let mut task = if whole { band(0.0, 4000.0, requirement) } else { band(from_hz, to_hz, requirement) };
            task.excepted_hz.clone_from(&excepted);
            let cross_bins = cross_ranges(RATE, 2 * half, std::slice::from_ref(&task));
            let spectra = Spectra {
                segment_frames: 2 * half,
                segments,
                sxx: (0..=half).map(value).collect(),
                syy: (0..=half).map(|k| value(k + 3)).collect(),
                sxy: cross_bins.iter().cloned().flatten().map(|k| Complex64::new(value(k), value(k + 1))).collect(),
                cross_bins,
            };
            let measured = Measured {
                pair: None,
                rate_hz: RATE,
                seconds: 1.0,
                spectra: &spectra,
                independent_segments: segments,
                rounding_power_before: value(0),
                rounding_power_after: value(1),
                gain,
            };
            let figures = judge(&measured, &task);
            // Whatever came in, no figure is other than finite, and no open verdict
            // without its reason.
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
        }
    }
}
