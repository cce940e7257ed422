//! Every verdict against the truth, with the limit 1 dB on either side of it: a line at
//! -26 or -66 dBFS or none, in recordings of 12, 60 and 300 s, 16-bit with dither.

use crate::support::{Biquad, Noise, RATE, Take, add_line, expect, frames, keep, reduce, residual};
use bandproof::evidence::{ReasonCode, Verdict};

const LINE_HZ: f64 = 50.02;
const SECONDS: [f64; 3] = [12.0, 60.0, 300.0];

/// A notch that takes 30.46 dB out of the line: it is 0.02 Hz off the center.
fn notch() -> Biquad {
    Biquad::notch(RATE, 50.0, 1.333)
}

#[test]
fn reduce_and_residual_meet_below_and_miss_above_the_truth() {
    let truth_db = notch().attenuation_db(RATE, LINE_HZ);
    assert!((truth_db - 30.46).abs() < 0.01, "{truth_db}");
    for (seed, seconds) in (1..).zip(SECONDS) {
        for line_dbfs in [-26.0, -66.0] {
            let mut x = vec![0.0; frames(seconds)];
            add_line(&mut x, RATE, LINE_HZ, line_dbfs);
            let bands = [
                reduce(49.5, 50.5, truth_db - 1.0),
                reduce(49.5, 50.5, truth_db + 1.0),
                residual(49.5, 50.5, line_dbfs - truth_db + 1.0),
                residual(49.5, 50.5, line_dbfs - truth_db - 1.0),
            ];
            let figures = Take::pcm16(&x, &[notch()], seed).judge(&bands);
            expect(&figures[0], Verdict::Met, None);
            expect(&figures[1], Verdict::Missed, None);
            expect(&figures[2], Verdict::Met, None);
            expect(&figures[3], Verdict::Missed, None);

            // 0.01 dB for the level of a line (the noise beside it is 60 dB down);
            // at -66 dBFS the dither, 38 dB under what remains, moves it by 0.1 dB
            // at most (two standard errors of 2 * 10^(-38/20) * sqrt(2.76/20)).
            let seen = figures[0].measured_attenuation_db.unwrap();
            let tolerance = if line_dbfs == -26.0 { 0.01 } else { 0.1 };
            assert!((seen - truth_db).abs() < tolerance, "{seconds} s, {line_dbfs}: {seen}");
            assert!((figures[0].line_hz.unwrap() - LINE_HZ).abs() < 0.002, "{:?}", figures[0]);
            assert!((figures[0].line_before_dbfs.unwrap() - line_dbfs).abs() < 0.01, "{:?}", figures[0]);
            let reason = figures[1].reason.as_deref().unwrap();
            assert!(reason.contains("a line at 50.02 Hz remains"), "{reason}");
        }
    }
}

#[test]
fn without_a_line_there_is_nothing_to_reduce_and_silence_is_no_pass() {
    for (seed, seconds) in (10..).zip(SECONDS) {
        let x = vec![0.0; frames(seconds)];
        let bands = [reduce(49.5, 50.5, 0.1), reduce(49.5, 50.5, 30.0), reduce(49.5, 50.5, 90.0)];
        for figures in Take::pcm16(&x, &[notch()], seed).judge(&bands) {
            assert_eq!(figures.verdict, Some(Verdict::Unproven), "{figures:#?}");
        }
        // Digital silence has no level at all.
        let silent = Take::exact(x, &[notch()]);
        for figures in silent.judge(&bands) {
            expect(&figures, Verdict::Unproven, Some(ReasonCode::NothingThere));
            assert_eq!(figures.before_dbfs, None);
        }
    }
}

#[test]
fn a_residual_limit_works_without_a_line() {
    // The dither's floor in 1 Hz: -93.3 dBFS less 10 log10(4000).
    for (seed, seconds) in (20..).zip(SECONDS) {
        let take = Take::pcm16(&vec![0.0; frames(seconds)], &[notch()], seed);
        let figures = take.judge(&[residual(49.5, 50.5, -120.0), residual(49.5, 50.5, -140.0)]);
        expect(&figures[0], Verdict::Met, None);
        expect(&figures[1], Verdict::Unproven, Some(ReasonCode::TooQuiet));
    }
}

#[test]
fn keep_meets_above_and_misses_below_the_truth() {
    // Gains of +2 and -2 dB everywhere, held against limits of 3 and 1 dB.
    for (seed, seconds) in (30..).zip(SECONDS) {
        for noise_dbfs in [-26.0, -66.0] {
            for gain_db in [2.0, -2.0] {
                let x = Noise::new(seed).white(frames(seconds), noise_dbfs);
                let gain = Biquad::scale(libm::pow(10.0, gain_db / 20.0));
                let figures = Take::pcm16(&x, &[gain], seed).judge(&[keep(90.0, 3000.0, 3.0), keep(90.0, 3000.0, 1.0)]);
                expect(&figures[0], Verdict::Met, None);
                expect(&figures[1], Verdict::Missed, None);
                assert_eq!(figures[0].resolved, Some(1.0));
            }
        }
        let silence = vec![0.0; frames(seconds)];
        let figures = Take::pcm16(&silence, &[], seed).judge_one(&keep(90.0, 3000.0, 1.0));
        expect(&figures, Verdict::Unproven, Some(ReasonCode::TooQuiet));
    }
}
