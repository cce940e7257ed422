//! Recordings that lead a careless measurement to a wrong verdict.

use crate::support::{Biquad, Noise, RATE, Take, add_line, expect, frames, keep, reduce, residual};
use bandproof::evidence::{ReasonCode, Verdict};

#[test]
fn an_empty_band_beside_a_line_the_filter_removes_proves_nothing() {
    // 0.25 Hz outside: 2.5 bins, so the line's main lobe reaches into the band and
    // falls with it by 50 dB and more.
    for (outside_hz, seconds) in [(49.25, 12.0), (50.75, 12.0), (49.25, 60.0), (50.75, 300.0)] {
        for line_dbfs in [-6.0, -26.0, -66.0] {
            let mut x = vec![0.0; frames(seconds)];
            add_line(&mut x, RATE, outside_hz, line_dbfs);
            let take = Take::pcm16(&x, &[Biquad::notch(RATE, outside_hz, 1.0)], 1);
            let figures = take.judge_one(&reduce(49.5, 50.5, 20.0));
            expect(&figures, Verdict::Unproven, Some(ReasonCode::NothingThere));
            if line_dbfs > -30.0 {
                assert!(figures.measured_attenuation_db.unwrap() > 20.0, "no trap: {figures:#?}");
            }
        }
    }
}

#[test]
fn a_loud_line_below_a_band_is_no_residue_in_it() {
    // The band's own content, -60 dBFS around 350 Hz, is taken down by more than 80 dB;
    // the line at 123.46 Hz stays and its side lobes are all that is left.
    let notches = [Biquad::notch(RATE, 350.0, 1000.0); 4];
    for (seed, seconds) in [(1, 12.0), (2, 60.0)] {
        let noise = Noise::new(seed).white(frames(seconds), -32.0);
        // A resonance at 350 Hz, 2.5 Hz wide.
        let turn = std::f64::consts::TAU * 350.0 / f64::from(RATE);
        let resonance = Biquad { b: [1e-3, 0.0, -1e-3], a: [1.0, -2.0 * 0.999 * libm::cos(turn), 0.998] };
        let mut take = Take::pcm(&resonance.run(&noise), &notches, seed, 24);
        add_line(&mut take.before, RATE, 123.46, -3.0);
        add_line(&mut take.after, RATE, 123.46, -3.0);
        for asked_db in [60.0, 80.0] {
            let figures = take.judge_one(&reduce(200.0, 500.0, asked_db));
            expect(&figures, Verdict::Unproven, Some(ReasonCode::LoudNeighbor));
        }
        expect(&take.judge_one(&reduce(200.0, 500.0, 25.0)), Verdict::Met, None);
    }
}

#[test]
fn hum_that_drifted_out_of_the_stop_is_missed() {
    let mut x = Noise::new(3).white(frames(60.0), -80.0);
    add_line(&mut x, RATE, 51.85, -38.0);
    let take = Take::pcm16(&x, &[Biquad::notch(RATE, 50.0, 1.0)], 3);
    let figures = take.judge_one(&reduce(48.0, 52.0, 30.0));
    expect(&figures, Verdict::Missed, None);
    assert!((figures.line_hz.unwrap() - 51.85).abs() < 0.002);
    let reason = figures.reason.unwrap();
    assert!(reason.contains("a line at 51.85 Hz remains at -38."), "{reason}");
}

#[test]
fn hum_that_drifts_during_the_recording_is_missed() {
    // 50.0 to 50.8 Hz within a minute, the notch holds 50 +- 0.1 Hz.
    let count = frames(60.0);
    let mut turns = 0.0;
    let x: Vec<f64> = (0..count)
        .map(|n| {
            turns += (50.0 + 0.8 * n as f64 / count as f64) / f64::from(RATE);
            0.05 * libm::sin(std::f64::consts::TAU * turns)
        })
        .collect();
    let figures = Take::pcm16(&x, &[Biquad::notch(RATE, 50.0, 0.5)], 4).judge_one(&reduce(49.0, 51.0, 30.0));
    expect(&figures, Verdict::Missed, None);
}

#[test]
fn a_line_in_the_notch_leaves_ambient_and_the_reason_says_so() {
    // Ambient of -73 dBFS in the band's 1 Hz, the line 15 dB above it: it goes wholly,
    // the ambient beside the notch stays.
    for (seed, seconds) in [(5, 12.0), (6, 60.0), (7, 300.0)] {
        let mut x = Noise::new(seed).white(frames(seconds), -73.0 + 10.0 * libm::log10(4000.0));
        add_line(&mut x, RATE, 50.0, -58.0);
        let figures = Take::pcm16(&x, &[Biquad::notch(RATE, 50.0, 0.3)], seed).judge_one(&reduce(49.5, 50.5, 30.0));
        expect(&figures, Verdict::Missed, None);
        assert!(figures.reason.as_deref().unwrap().contains("ambient, no line"), "{figures:#?}");
        assert!(figures.line_after_dbfs.unwrap() < -70.0, "{figures:#?}");
    }
}

#[test]
fn a_5_s_clip_is_too_short_for_a_narrow_band_and_long_enough_for_a_wide_one() {
    let mut x = Noise::new(8).white(frames(5.0), -40.0);
    add_line(&mut x, RATE, 50.0, -26.0);
    let take = Take::pcm16(&x, &[Biquad::notch(RATE, 50.0, 1.0)], 8);
    let mut wide = keep(90.0, 3000.0, 0.5);
    wide.shortest_s = Some(2.2);
    let figures = take.judge(&[reduce(49.5, 50.5, 30.0), wide]);
    expect(&figures[0], Verdict::Unproven, Some(ReasonCode::TooShort));
    let reason = figures[0].reason.as_deref().unwrap();
    assert!(reason.contains("at least 12.0 s, this one has 5.0 s"), "{reason}");
    expect(&figures[1], Verdict::Met, None);
}

#[test]
fn an_offset_of_half_full_scale_disturbs_no_band() {
    for high_pass in [true, false] {
        let mut x = Noise::new(9).white(frames(60.0), -50.0);
        add_line(&mut x, RATE, 50.02, -40.0);
        let plain = x.clone();
        x.iter_mut().for_each(|sample| *sample += 0.5);
        let mut chain = vec![Biquad::notch(RATE, 50.0, 1.333)];
        if high_pass {
            chain.push(Biquad::highpass(RATE, 2.0));
        }
        let bands = [reduce(49.5, 50.5, 25.0), keep(90.0, 3000.0, 0.5), residual(3000.0, 4000.0, -50.0)];
        let offset = Take::pcm16(&x, &chain, 9).judge(&bands);
        let none = Take::pcm16(&plain, &chain, 9).judge(&bands);
        for (offset, none) in offset.iter().zip(&none) {
            expect(offset, Verdict::Met, None);
            // The offset's side lobes vanish at whole bins: what differs is rounding.
            assert!((offset.after_dbfs.unwrap() - none.after_dbfs.unwrap()).abs() < 0.02, "{offset:#?} {none:#?}");
        }
        assert!((offset[1].gain_min_db.unwrap() - none[1].gain_min_db.unwrap()).abs() < 0.002);
    }
}
