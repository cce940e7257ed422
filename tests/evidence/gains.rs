//! The response seen in keep and observed bands.

use crate::support::{Biquad, Noise, RATE, Take, add_line, band, expect, filter, frames, keep};
use bandproof::evidence::Verdict;
use bandproof::spec::Requirement;

#[test]
fn identity_reads_exactly_0_db_in_every_keep_band() {
    for seed in 0..4 {
        let mut x = Noise::new(seed).white(frames(14.0), -40.0);
        add_line(&mut x, RATE, 443.21, -12.0);
        let mut take = Take::pcm16(&x, &[], seed);
        take.after = take.before.clone();
        take.rounding_after = take.rounding_before;
        for (from_hz, to_hz) in [(6.0, 4000.0), (90.0, 3000.0), (49.5, 50.5), (3999.0, 4000.0)] {
            let figures = take.judge_one(&keep(from_hz, to_hz, 0.001));
            expect(&figures, Verdict::Met, None);
            let shown = (figures.gain_min_db, figures.gain_max_db, figures.gain_error_db, figures.resolved);
            assert_eq!(shown, (Some(0.0), Some(0.0), Some(0.0), Some(1.0)), "{figures:#?}");
            assert_eq!(figures.measured_attenuation_db, Some(0.0));
        }
    }
}

#[test]
fn a_delay_and_a_turned_phase_leave_the_gain_alone() {
    // 2 and 10 ms late, and inverted: a segment of 1 s still sees the gain, less the
    // share of the window that has no counterpart: for a delay of d segments (4.94 d)^2/2,
    // 0.0004 and 0.011 dB. What chance adds has a standard error of 4.94 d/sqrt(2 n) with
    // n = 214 independent values in the narrowest sub-band, 0.004 and 0.021 dB; 3.5 of
    // them are allowed.
    let x = Noise::new(5).white(frames(30.0), -30.0);
    for (late, tolerance_db) in [(16, 0.015), (80, 0.084)] {
        let mut take = Take::exact(x.clone(), &[]);
        take.after = x.iter().map(|x| -x).collect();
        take.after.rotate_right(late);
        let figures = take.judge_one(&keep(90.0, 3000.0, 0.5));
        expect(&figures, Verdict::Met, None);
        assert!(figures.gain_min_db.unwrap() > -tolerance_db, "{figures:#?}");
        assert!(figures.gain_max_db.unwrap() < tolerance_db, "{figures:#?}");
    }
}

#[test]
fn gains_follow_the_response_where_the_phase_moves_quickly() {
    // Four notches a row; the keep band without what lies within 0.5 dB of them.
    let centers = [50.0, 100.0, 150.0, 200.0];
    let chain: Vec<Biquad> = centers.iter().map(|hz| Biquad::notch(RATE, *hz, 2.0)).collect();
    let response = |hz: f64| chain.iter().map(|section| section.attenuation_db(RATE, hz)).sum::<f64>();
    let mut x = Noise::new(6).white(frames(60.0), -40.0);
    for hz in centers {
        add_line(&mut x, RATE, hz, -10.0);
    }
    let mut task = keep(30.0, 3000.0, 0.5);
    // The -0.5 dB points: 1 Hz / sqrt(10^0.05 - 1) = 2.86 Hz off the center.
    task.excepted_hz = centers.iter().map(|hz| (hz - 2.95, hz + 2.95)).collect();
    let narrow = crate::support::reduce(49.5, 50.5, 20.0);
    let figures = Take::pcm16(&x, &chain, 6).judge(&[task.clone(), narrow]).remove(0);
    expect(&figures, Verdict::Met, None);
    assert_eq!(figures.resolved, Some(1.0));
    // No sub-band can read outside what the response spans in the band, by more than
    // four of its standard errors.
    let inside = (0..29_700).map(|i| 30.0 + f64::from(i) * 0.1);
    let seen = inside.filter(|hz| !task.excepted_hz.iter().any(|(from, to)| from <= hz && hz <= to));
    let lowest = seen.map(|hz| -response(hz)).min_by(f64::total_cmp).unwrap();
    let slack = 4.0 * figures.gain_error_db.unwrap() + 0.005;
    assert!(figures.gain_min_db.unwrap() >= lowest - slack, "{lowest} {figures:#?}");
    assert!(figures.gain_max_db.unwrap() <= slack, "{figures:#?}");
}

#[test]
fn a_gain_in_force_is_taken_back() {
    let mut x = Noise::new(7).white(frames(20.0), -50.0);
    add_line(&mut x, RATE, 50.02, -40.0);
    let plain = Take::exact(x, &[Biquad::notch(RATE, 50.0, 1.333)]);
    let bands =
        [keep(90.0, 3000.0, 0.5), crate::support::reduce(49.5, 50.5, 25.0), band(60.0, 80.0, Requirement::Observe)];
    let expected = plain.judge(&bands);
    for gain in [0.25, -2.0] {
        let mut louder = Take { after: plain.after.iter().map(|y| gain * y).collect(), ..plain_copy(&plain) };
        louder.gain = gain;
        for (seen, expected) in louder.judge(&bands).iter().zip(&expected) {
            assert_eq!(seen.verdict, expected.verdict);
            let pairs = [
                (seen.after_dbfs, expected.after_dbfs),
                (seen.gain_min_db, expected.gain_min_db),
                (seen.gain_max_db, expected.gain_max_db),
                (seen.line_after_dbfs, expected.line_after_dbfs),
                (seen.measured_attenuation_db, expected.measured_attenuation_db),
            ];
            for (seen, expected) in pairs {
                let difference = seen.zip(expected).map_or(0.0, |(a, b)| (a - b).abs());
                // One step of the rounding to 0.001 dB.
                assert!(difference < 0.0011 && seen.is_some() == expected.is_some(), "{seen:?} {expected:?}");
            }
        }
    }
}

fn plain_copy(take: &Take) -> Take {
    Take { before: take.before.clone(), after: Vec::new(), ..*take }
}

#[test]
fn an_observed_band_shows_gains_and_no_verdict() {
    let x = Noise::new(8).white(frames(12.0), -40.0);
    let take = Take::exact(x, &[Biquad::scale(0.5)]);
    let figures = take.judge_one(&band(100.0, 200.0, Requirement::Observe));
    assert_eq!((figures.verdict, figures.reason_code), (None, None));
    assert_eq!((figures.gain_min_db, figures.gain_max_db), (Some(-6.021), Some(-6.021)));
    assert_eq!((figures.line_hz, figures.line_before_dbfs), (None, None));
    assert!(figures.resolution_hz.unwrap() >= 10.0);
}

#[test]
fn a_dip_is_seen_where_it_is() {
    let x = Noise::new(9).white(frames(60.0), -40.0);
    let dip = [Biquad::notch(RATE, 1000.0, 200.0)];
    assert!(filter(&dip, &x).len() == x.len());
    let figures = Take::pcm16(&x, &dip, 9).judge_one(&keep(90.0, 3000.0, 0.5));
    expect(&figures, Verdict::Missed, None);
    let reason = figures.reason.unwrap();
    assert!(reason.contains("the gain from 9") || reason.contains("the gain from 10"), "{reason}");
}

#[test]
fn a_second_segment_of_the_same_frames_makes_no_gain_more_certain() {
    // 2 frames more than a segment: two segments 2 frames apart. A dithered output
    // 20 dB under the sound; a standard error of sqrt(1/2) of the true one made noise
    // a false `missed`.
    let x = Noise::new(11).white(frames(3.0) + 2, -70.0);
    let task = keep(500.0, 600.0, 0.1);
    let long = Take::pcm16(&x, &[], 11);
    let mut short = Take::pcm16(&x[2..], &[], 11);
    (short.before, short.after) = (long.before[2..].to_vec(), long.after[2..].to_vec());
    let error_db = |take: &Take| {
        let spectra = take.spectra_of(std::slice::from_ref(&task), RATE as usize);
        take.judge_with(&spectra, &task).gain_error_db.unwrap()
    };
    let (one, two) = (error_db(&short), error_db(&long));
    assert!((two / one - 1.0).abs() < 0.02, "{one} {two}");
}
