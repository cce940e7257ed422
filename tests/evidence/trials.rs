//! Statements about chance, checked by seeded trials.

use crate::support::{Biquad, Noise, RATE, Take, add_line, db, expect, frames, keep, reduce, residual, rounding_power};
use bandproof::evidence::Verdict;

#[test]
fn two_errors_cover_the_true_gain_in_95_of_100_sub_bands() {
    // Independent noise after, 20 dB below: coherence 0.99. One band of 20 bins is one
    // sub-band, so every judgement is one gain with its error.
    let (mut covered, mut tried) = (0, 0);
    for seed in 0..12 {
        let x = Noise::new(seed).white(frames(6.0), -30.0);
        let noise = Noise::new(seed + 1000).white(frames(6.0), -50.0);
        let mut take = Take::exact(x, &[]);
        take.after.iter_mut().zip(noise).for_each(|(y, n)| *y += n);
        let bands: Vec<_> = (0..80).map(|i| 100.0 + 45.0 * f64::from(i)).map(|hz| keep(hz, hz + 19.0, 9.0)).collect();
        let spectra = take.spectra_of(&bands, RATE as usize);
        for task in &bands {
            let figures = take.judge_with(&spectra, task);
            tried += 1;
            if figures.gain_min_db.unwrap().abs() <= 2.0 * figures.gain_error_db.unwrap() {
                covered += 1;
            }
        }
    }
    let share = f64::from(covered) / f64::from(tried);
    // 95.4 % expected; two errors of 960 trials are 1.4 %, and the error's own estimate
    // takes a little more.
    assert!((0.93..=0.975).contains(&share), "{covered} of {tried}");
}

#[test]
fn keep_bands_at_the_dither_floor_are_never_missed() {
    let (mut met, mut tried) = (0, 0);
    for seed in 0..120u32 {
        // Content from 20 dB below the dither of a 16-bit file to 30 dB above it.
        let content_dbfs = -115.0 + f64::from(seed % 6) * 10.0;
        let x = Noise::new(u64::from(seed)).white(frames(12.0), content_dbfs);
        let take = Take::pcm16(&x, &[], u64::from(seed));
        let bands = [keep(90.0, 3000.0, 0.3), keep(500.0, 520.0, 0.3), keep(100.0, 200.0, 0.3)];
        let spectra = take.spectra_of(&bands, 2 * RATE as usize);
        for task in &bands {
            let figures = take.judge_with(&spectra, task);
            assert_ne!(figures.verdict, Some(Verdict::Missed), "{seed}: {figures:#?}");
            met += u32::from(figures.verdict == Some(Verdict::Met));
            tried += 1;
        }
    }
    assert!(met > 0 && tried == 360, "{met} of {tried}");
}

#[test]
fn no_reduction_is_missed_for_the_noise_of_its_output() {
    // The line goes wholly; what remains in the band is dither that scatters around its
    // floor by half its power. Whatever is asked for, that is no residue.
    let chain = [Biquad::notch(RATE, 50.0, 1.0)];
    let mut above = 0;
    for seed in 0..100 {
        let mut x = vec![0.0; frames(13.0)];
        add_line(&mut x, RATE, 50.0, -66.0);
        // No dither before: the filter would leave some of it, and that is a residue.
        let take = Take::output16(x, &chain, seed);
        let asked: Vec<_> = (50..=100).step_by(2).map(|r| reduce(49.5, 50.5, f64::from(r))).collect();
        let mut bands = asked;
        bands.extend((0..20).map(|i| residual(49.5, 50.5, -120.0 - 2.0 * f64::from(i))));
        for figures in take.judge(&bands) {
            assert_ne!(figures.verdict, Some(Verdict::Missed), "{seed}: {figures:#?}");
            above += u32::from(figures.after_dbfs > figures.after_floor_dbfs);
        }
    }
    assert!(above > 1000, "the output never stood above its floor: {above}");
}

#[test]
fn no_reduction_1_db_over_the_truth_is_met() {
    // Bands of 4 bins and more, lines at random places in them, limits 1 dB above the
    // attenuation that the line truly had.
    let mut tried = 0;
    for seed in 0..150u64 {
        let mut draw = Noise::new(seed);
        let bins = 4.0 + (seed % 9) as f64;
        let line_hz = 500.0 + (draw.uniform() - 0.5) * (bins - 2.0);
        let notch = Biquad::notch(RATE, line_hz + 0.05 + 0.3 * draw.uniform(), 1.0 + 3.0 * draw.uniform());
        let mut x = vec![0.0; frames(5.0)];
        add_line(&mut x, RATE, line_hz, -20.0 - 20.0 * draw.uniform());
        let take = Take::pcm16(&x, &[notch], seed);
        let truth_db = notch.attenuation_db(RATE, line_hz);
        let task = reduce(500.0 - bins / 2.0, 500.0 + bins / 2.0, truth_db + 1.0);
        let figures = take.judge_with(&take.spectra_of(&[], RATE as usize), &task);
        assert_ne!(figures.verdict, Some(Verdict::Met), "{seed} {bins}: {truth_db} {figures:#?}");
        tried += 1;
    }
    assert_eq!(tried, 150);
}

#[test]
fn a_reader_reaches_the_same_verdict_from_the_shown_figures() {
    let (mut met, mut missed) = (0, 0);
    for seed in 0..60u64 {
        let mut draw = Noise::new(seed);
        let ambient_dbfs = -75.0 - 20.0 * draw.uniform();
        let mut x = draw.white(frames(12.5), ambient_dbfs);
        add_line(&mut x, RATE, 49.8 + 0.4 * draw.uniform(), -30.0 - 40.0 * draw.uniform());
        let take = Take::pcm16(&x, &[Biquad::notch(RATE, 50.0, 2.0)], seed);
        let asked = 15.0 + 30.0 * draw.uniform();
        let figures = take.judge_one(&reduce(49.5, 50.5, asked));
        let power = |dbfs: Option<f64>| dbfs.map_or(0.0, crate::support::power);
        let (b, fb) = (power(figures.before_dbfs), power(figures.before_floor_dbfs));
        let (a, fa) = (power(figures.after_dbfs), power(figures.after_floor_dbfs));
        let there = figures.before_dbfs.unwrap() - figures.before_floor_dbfs.unwrap() >= 6.0;
        let shown_db = (db((b - fb) / a) * 1000.0).round() / 1000.0;
        assert_eq!(figures.verdict == Some(Verdict::Met), there && shown_db >= asked, "{asked} {figures:#?}");
        if figures.verdict == Some(Verdict::Missed) {
            assert!(db(b / (a - fa)) < asked + 0.001, "{asked} {figures:#?}");
            missed += 1;
        }
        met += u32::from(figures.verdict == Some(Verdict::Met));
    }
    assert!(met >= 10 && missed >= 10, "{met} {missed}");
}

#[test]
fn the_dither_floor_is_the_expected_one() {
    // What the trials above rest on: dither reads its floor within its own scatter.
    let take = Take::silence16(60.0, 77);
    let figures = take.judge_one(&residual(1000.0, 2000.0, 0.0));
    expect(&figures, Verdict::Met, None);
    let expected = db(2.0 * 3.0 * rounding_power(16) / 4.0);
    assert!((figures.after_dbfs.unwrap() - expected).abs() < 0.1, "{expected} {figures:#?}");
}

#[test]
fn near_the_floor_no_reduction_1_db_under_the_truth_is_missed() {
    // What remains of the line stands -5 to 35 dB above the dither of ten bins; in one
    // segment its level scatters by up to several dB. From 25 dB up, 2 dB over the truth
    // must be missed all the same.
    let (mut met, mut missed, mut clear) = (0, 0, 0);
    for seed in 0..160u64 {
        let above_db = -5.0 + 0.25 * seed as f64;
        let offset_hz = 0.02;
        let notch = Biquad::notch(RATE, 50.0, 1.333);
        let truth_db = notch.attenuation_db(RATE, 50.0 + offset_hz);
        let floor_dbfs = db(2.0 * 3.0 * rounding_power(16) / 4000.0);
        let mut x = vec![0.0; frames(12.0)];
        add_line(&mut x, RATE, 50.0 + offset_hz, floor_dbfs + above_db + truth_db);
        // No dither before, so that only the output's noise is at play.
        let take = Take::output16(x, &[notch], seed);
        let figures = take.judge(&[reduce(49.5, 50.5, truth_db - 1.0), reduce(49.5, 50.5, truth_db + 2.0)]);
        assert_ne!(figures[0].verdict, Some(Verdict::Missed), "{seed}: {figures:#?}");
        met += u32::from(figures[0].verdict == Some(Verdict::Met));
        if above_db >= 25.0 {
            clear += 1;
            missed += u32::from(figures[1].verdict == Some(Verdict::Missed));
        }
    }
    assert!(met > 60, "{met}");
    assert_eq!((missed, clear), (40, 40));
}

#[test]
fn loud_lines_beside_a_keep_band_never_make_it_missed() {
    // Hum that the notches remove, anywhere in the excepted ranges up to their very
    // edges, up to 23 dB over all of the ambient; ambient that falls with
    // frequency. The response keeps within 0.5 dB outside the exceptions.
    let (mut met, mut tried) = (0, 0);
    for seed in 0..80u64 {
        let mut draw = Noise::new(seed);
        let width_hz = 1.0 + 2.0 * draw.uniform();
        // |H|^2 = 1/(1 + (w/(2 d))^2) or so d off the center: -0.25 dB at 2.06 widths,
        // and the neighbors take less than the other 0.25 dB.
        let half_hz = 2.06 * width_hz;
        let centers: Vec<f64> = (1..=5).map(|k| 50.0 * f64::from(k)).collect();
        let chain: Vec<Biquad> = centers.iter().map(|hz| Biquad::notch(RATE, *hz, width_hz)).collect();
        let seconds = 6.0 + 14.0 * draw.uniform();
        let slope = Biquad { b: [0.05, 0.0, 0.0], a: [1.0, -0.95, 0.0] };
        let mut x = slope.run(&draw.white(frames(seconds), -40.0));
        // Six of -17 dBFS stay below full scale.
        let loud_dbfs = -77.0 + 60.0 * draw.uniform();
        for hz in &centers {
            add_line(&mut x, RATE, hz + half_hz * (2.0 * draw.uniform() - 1.0), loud_dbfs);
        }
        // One just below the band, which stays.
        add_line(&mut x, RATE, 29.9 - 2.0 * draw.uniform(), loud_dbfs);
        let mut task = keep(30.0, 3000.0, 0.5);
        task.excepted_hz = centers.iter().map(|hz| (hz - half_hz, hz + half_hz)).collect();
        let take = Take::pcm16(&x, &chain, seed);
        let figures = take.judge(&[task, reduce(49.5, 50.5, 10.0)]).remove(0);
        assert_ne!(figures.verdict, Some(Verdict::Missed), "{seed} {width_hz} {loud_dbfs} {figures:#?}");
        met += u32::from(figures.verdict == Some(Verdict::Met));
        tried += 1;
    }
    assert!(met >= 60, "{met} of {tried}");
}

#[test]
fn lines_that_stay_outside_a_band_do_not_make_it_missed() {
    // One line in the middle of the band falls by a known amount; up to four loud ones
    // outside, one bin and more from its edges and at any place within a bin, stay. What
    // they leak may hide the reduction, never disprove it. The last six seeds are those
    // of 20000 in which lines close together leak more than the floor holds
    // and leakage granted once did not do; with it granted twice one of 20000 is left.
    let (mut met, mut hidden) = (0, 0);
    for seed in (0..400u64).chain([1926, 8122, 8565, 9667, 11_853, 19_342]) {
        let mut draw = Noise::new(seed);
        let (from_hz, bins) = (400.0, (10.0 + 40.0 * draw.uniform()).floor());
        let fallen_db = 20.0 + 80.0 * draw.uniform();
        let in_band_hz = from_hz + bins / 2.0 + draw.uniform() - 0.5;
        let mut take = Take::exact(vec![0.0; RATE as usize], &[]);
        take.skipped = 0;
        add_line(&mut take.before, RATE, in_band_hz, -50.0);
        add_line(&mut take.after, RATE, in_band_hz, -50.0 - fallen_db);
        for _ in 0..1 + seed % 4 {
            let away = 1.0 + 300.0 * draw.uniform() * draw.uniform() * draw.uniform();
            let outside_hz = if draw.uniform() < 0.5 { from_hz - 0.5 - away } else { from_hz + bins - 0.5 + away };
            let loud_dbfs = -60.0 * draw.uniform();
            add_line(&mut take.before, RATE, outside_hz, loud_dbfs);
            add_line(&mut take.after, RATE, outside_hz, loud_dbfs);
        }
        let task = reduce(from_hz, from_hz + bins, fallen_db - 0.5);
        let figures = take.judge_with(&take.spectra_of(&[], RATE as usize), &task);
        assert_ne!(figures.verdict, Some(Verdict::Missed), "{seed} {fallen_db} {figures:#?}");
        met += u32::from(figures.verdict == Some(Verdict::Met));
        hidden += u32::from(figures.verdict == Some(Verdict::Unproven));
    }
    assert!(met >= 50 && hidden >= 50, "{met} {hidden}");
}
