//! Verdicts of pairs whose truth is known, the limit 1 dB on either side of it.

use crate::pair_support::{Pair, in_band_dbfs, lines};
use crate::support::{Biquad, Noise, RATE, add_line, expect, frames, keep, reduce, residual};
use bandproof::evidence::{BandFigures, ReasonCode, Verdict};

const LENGTH: usize = 80_000;

/// A notch that takes 30.46 dB out of a line 0.02 Hz off its center.
fn notch() -> Biquad {
    Biquad::notch(RATE, 50.0, 1.333)
}

/// Never the wrong verdict: the limits of the first and third lie on the safe side of the
/// truth, those of the second and fourth beyond it.
#[track_caller]
fn none_wrong(figures: &[BandFigures]) {
    for (index, figures) in figures.iter().enumerate() {
        let wrong = if index % 2 == 0 { Verdict::Missed } else { Verdict::Met };
        assert_ne!(figures.verdict, Some(wrong), "{index} {figures:#?}");
    }
}

#[test]
fn reduce_and_residual_of_a_line_through_a_noisy_device() {
    let truth_db = notch().attenuation_db(RATE, 50.02);
    let line_dbfs = -26.0;
    for (seed, seconds) in (1..).zip([12.0, 60.0, 120.0]) {
        let mut x = vec![0.0; frames(seconds)];
        add_line(&mut x, RATE, 50.02, line_dbfs);
        let settled = |v: &[f64]| v[frames(2.0)..].to_vec();
        let clean = settled(&notch().run(&x));
        let bands = [
            reduce(49.5, 50.5, truth_db - 1.0),
            reduce(49.5, 50.5, truth_db + 1.0),
            residual(49.5, 50.5, line_dbfs - truth_db + 1.0),
            residual(49.5, 50.5, line_dbfs - truth_db - 1.0),
        ];
        // Noise in the band, dB under what remains of the line. The line's own phase
        // against 10 bins of noise takes 2 errors of 2 * 10^(-below/20) / sqrt(2 n),
        // n = 3.6 a segment: 1 dB less is left from 30 dB down in the shorter ones.
        for below_db in [50.0, 40.0, 30.0, 20.0, 10.0, 0.0, -10.0] {
            let wide_db = -in_band_dbfs(0.0, 1.0);
            let noise = Noise::new(seed).white(clean.len(), line_dbfs - truth_db - below_db + wide_db);
            let pair = Pair::noisy(settled(&x), &clean, &noise, LENGTH);
            let segments = pair.plan().independent_segments();
            let figures = pair.judge(&bands);
            none_wrong(&figures);
            if below_db >= 20.0 {
                expect(&figures[0], Verdict::Met, None);
                expect(&figures[2], Verdict::Met, None);
            }
            if below_db >= if segments >= 8 { 20.0 } else { 40.0 } {
                expect(&figures[1], Verdict::Missed, None);
                expect(&figures[3], Verdict::Missed, None);
            }
            if below_db <= -10.0 {
                for figures in &figures[..2] {
                    expect(figures, Verdict::Unproven, Some(ReasonCode::DeviceNoise));
                    assert!(figures.reason.as_deref().unwrap().contains("--noise"), "{figures:#?}");
                }
            }
        }
    }
}

#[test]
fn reduce_of_noise_through_a_noisy_device() {
    // A broad excitation through a wide notch; what it leaves in the band is known from
    // the recording without the device's noise. 100 bins: their edges leak 0.1 dB.
    let wide = Biquad::notch(RATE, 50.0, 80.0);
    let (from_hz, to_hz) = (45.0, 55.0);
    for (seed, seconds) in (11..).zip([12.0, 62.0, 122.0]) {
        let x = Noise::new(seed).white(frames(seconds), -20.0);
        let settled = |v: &[f64]| v[frames(2.0)..].to_vec();
        let clean = settled(&wide.run(&x));
        let truth_db = Pair::new(settled(&x), clean.clone(), LENGTH)
            .judge_one(&reduce(from_hz, to_hz, 0.0))
            .measured_attenuation_db
            .unwrap();
        let left_dbfs = in_band_dbfs(-20.0, 10.0) - truth_db;
        let bands = [reduce(from_hz, to_hz, truth_db - 1.0), reduce(from_hz, to_hz, truth_db + 1.0)];
        for below_db in [60.0, 40.0, 25.0, 10.0, 0.0, -10.0, -20.0] {
            let noise = Noise::new(seed ^ 0xd0_0d).white(clean.len(), left_dbfs - below_db - in_band_dbfs(0.0, 10.0));
            let pair = Pair::noisy(settled(&x), &clean, &noise, LENGTH);
            let figures = pair.judge(&bands);
            none_wrong(&figures);
            if below_db >= 25.0 {
                expect(&figures[0], Verdict::Met, None);
                if pair.plan().independent_segments() >= 8 {
                    expect(&figures[1], Verdict::Missed, None);
                }
            }
            if below_db <= -10.0 {
                expect(&figures[1], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
            }
        }
    }
}

#[test]
fn keep_of_noise_through_a_noisy_device() {
    // Gains of 2 dB either way against limits of 3 and 1 dB.
    for (seed, seconds) in (21..).zip([10.0, 30.0, 60.0]) {
        for gain_db in [2.0, -2.0] {
            let x = Noise::new(seed).white(frames(seconds), -20.0);
            let y = Biquad::scale(libm::pow(10.0, gain_db / 20.0)).run(&x);
            for below_db in [60.0, 40.0, 20.0, 5.0] {
                let noise = Noise::new(seed ^ 0xd0_0d).white(x.len(), -20.0 + gain_db - below_db);
                let pair = Pair::noisy(x.clone(), &y, &noise, LENGTH);
                let figures = pair.judge(&[keep(90.0, 3000.0, 3.0), keep(90.0, 3000.0, 1.0)]);
                none_wrong(&figures);
                if below_db >= 40.0 {
                    expect(&figures[0], Verdict::Met, None);
                    assert_eq!(figures[0].resolved, Some(1.0));
                    assert!(figures[0].resolution_hz.unwrap() <= 2.9, "{figures:#?}");
                }
                if below_db >= 20.0 {
                    expect(&figures[1], Verdict::Missed, None);
                }
                if below_db <= 5.0 {
                    expect(&figures[0], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
                }
            }
        }
    }
}

#[test]
fn a_hum_of_the_device_over_what_a_notch_leaves_is_found_by_coherence() {
    // The notch takes the excitation down by 40 dB and more; a hum of the device at a
    // frequency of its own stands 20 dB above what is left.
    let x = Noise::new(31).white(frames(62.0), -20.0);
    let chain = [Biquad::notch(RATE, 50.0, 20.0), Biquad::notch(RATE, 50.0, 20.0)];
    let mut y = crate::support::filter(&chain, &x);
    add_line(&mut y, RATE, 50.07, in_band_dbfs(-20.0, 1.0) - 30.0);
    let pair = Pair::new(x[frames(2.0)..].to_vec(), y[frames(2.0)..].to_vec(), LENGTH);
    let figures = pair.judge(&[reduce(49.5, 50.5, 25.0), reduce(49.5, 50.5, 45.0), residual(49.5, 50.5, -100.0)]);
    expect(&figures[0], Verdict::Met, None);
    for figures in &figures[1..] {
        expect(figures, Verdict::Unproven, Some(ReasonCode::DeviceNoise));
        let reason = figures.reason.as_deref().unwrap();
        assert!(reason.contains("noise of the device") && reason.contains("louder or longer"), "{reason}");
    }
}

#[test]
fn only_the_idle_device_tells_its_hum_from_a_line_of_the_same_frequency() {
    // Line and hum at 50.02 Hz keep their phase, whatever it is: coherent by chance. The
    // notch leaves -56.5 dBFS of the line, the hum has -50.
    let mut x = vec![0.0; frames(92.0)];
    add_line(&mut x, RATE, 50.02, -26.0);
    let mut y = notch().run(&x);
    let mut hum = vec![0.0; y.len()];
    add_line(&mut hum, RATE, 50.02, -50.0);
    y.iter_mut().zip(&hum).for_each(|(y, hum)| *y += hum);
    let settled = |v: &[f64]| v[frames(2.0)..].to_vec();
    let mut pair = Pair::new(settled(&x), settled(&y), LENGTH);
    let bands = [reduce(49.5, 50.5, 10.0), reduce(49.5, 50.5, 29.46)];
    expect(&pair.judge(&bands)[1], Verdict::Missed, None);
    pair.idle = Some(hum[..frames(20.0)].to_vec());
    let figures = pair.judge(&bands);
    expect(&figures[0], Verdict::Met, None);
    expect(&figures[1], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
    assert!(!figures[1].reason.as_deref().unwrap().contains("--noise"), "{figures:#?}");
}

#[test]
fn a_hum_in_any_phase_makes_no_verdict_false_where_the_idle_device_is_known() {
    // From as loud as what remains of the line to 40 dB below, in eight phases: the sum
    // of both says up to 6 dB more, or nothing at all.
    let x: Vec<f64> = {
        let mut x = vec![0.0; frames(20.0)];
        add_line(&mut x, RATE, 50.0, -20.0);
        x
    };
    let (mut met, mut missed) = (0, 0);
    for below_db in [-6.0, 0.0, 3.0, 6.0, 20.0, 40.0] {
        for phase in 0..8 {
            let hum: Vec<f64> = (0..x.len() + RATE as usize)
                .map(|n| {
                    let turns = 50.0 * n as f64 / f64::from(RATE) + f64::from(phase) / 8.0;
                    let amplitude = libm::pow(10.0, (-60.0 - below_db) / 20.0);
                    amplitude * libm::sin(std::f64::consts::TAU * turns + 0.3)
                })
                .collect();
            let y: Vec<f64> = x.iter().zip(&hum).map(|(x, hum)| 0.01 * x + hum).collect();
            let mut pair = Pair::new(x.clone(), y, LENGTH);
            pair.idle = Some(hum);
            let figures = pair.judge(&[reduce(49.5, 50.5, 39.0), reduce(49.5, 50.5, 41.0)]);
            none_wrong(&figures);
            met += u32::from(figures[0].verdict == Some(Verdict::Met));
            missed += u32::from(figures[1].verdict == Some(Verdict::Missed));
        }
    }
    assert!(met >= 8 && missed >= 8, "{met} {missed}");
}

#[test]
fn noise_of_the_idle_device_stands_in_place_of_coherence() {
    // One segment, where coherence tells nothing bin by bin: broad noise of the device
    // known from a recording of its own.
    let x = Noise::new(41).white(frames(10.0), -20.0);
    let y = Biquad::scale(1e-3).run(&x);
    for (below_db, asked_db, verdict) in
        [(30.0, 61.0, Verdict::Missed), (30.0, 59.0, Verdict::Met), (-15.0, 59.0, Verdict::Unproven)]
    {
        let noise = Noise::new(42).white(x.len(), -80.0 - below_db);
        let mut pair = Pair::noisy(x.clone(), &y, &noise, LENGTH);
        pair.idle = Some(Noise::new(43).white(frames(30.0), -80.0 - below_db));
        let figures = pair.judge_one(&reduce(400.0, 420.0, asked_db));
        let code = (verdict == Verdict::Unproven).then_some(ReasonCode::DeviceNoise);
        expect(&figures, verdict, code);
        if below_db < 0.0 {
            let over_db = figures.after_floor_dbfs.unwrap() - in_band_dbfs(-65.0, 20.0);
            // 200 bins, five segments: 0.23 dB, and what leaks in.
            assert!(over_db.abs() < 0.9, "{figures:#?}");
        }
    }
}

#[test]
fn a_clock_that_wanders_leaves_keep_bands_open_and_no_others() {
    let x = Noise::new(51).white(frames(20.0), -20.0);
    let mut pair = Pair::new(x.clone(), x, LENGTH);
    let bands = [keep(90.0, 3000.0, 0.5), keep(90.0, 200.0, 0.5), reduce(400.0, 500.0, 10.0)];
    // 0.02/3000 s = 6.67 microseconds.
    pair.scatter_s = 6.6e-6;
    expect(&pair.judge(&bands)[0], Verdict::Met, None);
    pair.scatter_s = 6.8e-6;
    let figures = pair.judge(&bands);
    expect(&figures[0], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
    let reason = figures[0].reason.as_deref().unwrap();
    assert!(reason.contains("6.80 microseconds") && reason.contains("6.67 microseconds"), "{reason}");
    assert_eq!(figures[0].gain_min_db, Some(0.0));
    expect(&figures[1], Verdict::Met, None);
    expect(&figures[2], Verdict::Missed, None);
    // Not missed either.
    pair.after.iter_mut().for_each(|y| *y *= 0.5);
    expect(&pair.judge(&bands)[0], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
}

#[test]
fn under_a_delay_that_is_not_certain_no_keep_band_is_missed() {
    let x = Noise::new(53).white(frames(20.0), -20.0);
    let halved = x.iter().map(|x| 0.5 * x).collect();
    let mut pair = Pair::new(x, halved, LENGTH);
    let bands = [keep(90.0, 3000.0, 0.5), keep(90.0, 3000.0, 7.0)];
    expect(&pair.judge(&bands)[0], Verdict::Missed, None);
    pair.certain = false;
    let figures = pair.judge(&bands);
    expect(&figures[0], Verdict::Unproven, Some(ReasonCode::DeviceNoise));
    let reason = figures[0].reason.as_deref().unwrap();
    assert!(reason.contains("-6.0") && reason.contains("--delay"), "{reason}");
    // What is inside all the same is met.
    expect(&figures[1], Verdict::Met, None);
}

/// Sound that comes and goes, held against another of its kind: the level has fallen in
/// each sub-band, and nothing says that it is the device's doing.
#[test]
fn where_nothing_is_coherent_a_lower_level_is_no_miss() {
    let (x, other) = (Noise::new(54).white(frames(60.0), -20.0), Noise::new(55).white(frames(60.0), -23.0));
    expect(
        &Pair::new(x.clone(), other, LENGTH).judge_one(&keep(90.0, 3000.0, 0.5)),
        Verdict::Unproven,
        Some(ReasonCode::DeviceNoise),
    );
    let faint = Noise::new(56).white(frames(60.0), -40.0);
    expect(&Pair::new(x, faint, LENGTH).judge_one(&keep(90.0, 3000.0, 0.5)), Verdict::Missed, None);
}

#[test]
fn what_interpolation_changes_is_not_judged() {
    let x = Noise::new(52).white(frames(20.0), -20.0);
    let mut pair = Pair::new(x.clone(), x, LENGTH);
    pair.reaches_hz = 3000.0;
    let bands = [
        keep(90.0, 3000.0, 0.5),
        keep(90.0, 3200.0, 0.5),
        keep(90.0, 3800.0, 0.5),
        keep(3100.0, 3800.0, 0.5),
        reduce(2900.0, 3010.0, 10.0),
        reduce(2900.0, 3000.0, 10.0),
        crate::support::band(2000.0, 3500.0, bandproof::spec::Requirement::Observe),
    ];
    let figures = pair.judge(&bands);
    expect(&figures[0], Verdict::Met, None);
    assert_eq!(figures[0].resolved, Some(1.0));
    // 2910 of 3110 Hz.
    expect(&figures[1], Verdict::Met, None);
    assert!((figures[1].resolved.unwrap() - 0.936).abs() < 0.001, "{figures:#?}");
    for figures in &figures[2..5] {
        expect(figures, Verdict::Unproven, Some(ReasonCode::OutOfRange));
        assert!(figures.reason.as_deref().unwrap().contains("only up to 3000 Hz"), "{figures:#?}");
    }
    expect(&figures[5], Verdict::Missed, None);
    assert_eq!((figures[6].gain_min_db, figures[6].reason_code), (Some(0.0), None));
    assert!((figures[6].resolved.unwrap() - 0.667).abs() < 0.001, "{figures:#?}");
}

#[test]
fn a_gap_in_a_keep_band_is_seen_though_nothing_of_it_counts() {
    // Of 3000 Hz 60 do not come out at all. The device's noise lies 14 dB under the rest,
    // so that neither the gap nor its edges count: resolved to 0.98, and every gain that
    // counts above -4 dB.
    let x = lines(80..3900, -48.0, 40);
    let y = lines((80..3900).filter(|hz| !(1000..1060).contains(hz)), -48.0, 40);
    let judge = |below_db: f64, keep_db: f64| {
        let noise = Noise::new(62).white(x.len(), -48.0 - below_db + 10.0 * libm::log10(4000.0));
        Pair::noisy(x.clone(), &y, &noise, RATE as usize).judge_one(&keep(500.0, 3500.0, keep_db))
    };
    // At most 14 dB down, outside 6 dB by far.
    let figures = judge(14.0, 6.0);
    expect(&figures, Verdict::Missed, None);
    assert!(figures.resolved.unwrap() > 0.97 && figures.gain_min_db.unwrap() > -5.0, "{figures:#?}");
    let reason = figures.reason.as_deref().unwrap();
    assert!(reason.contains("Hz no more than -1") && reason.contains("outside +-6 dB"), "{reason}");
    // Within the scatter of the noise of the limit: neither.
    let figures = judge(14.0, 13.9);
    expect(&figures, Verdict::Unproven, Some(ReasonCode::DeviceNoise));
    assert!(figures.reason.as_deref().unwrap().contains("too little of it to tell a dip"), "{figures:#?}");
    // So little is allowed for that the noise alone could be as loud: kept, for what is seen.
    expect(&judge(14.0, 20.0), Verdict::Met, None);
}

#[test]
fn dips_as_wide_as_a_sub_band_are_missed_where_they_are() {
    let x = Noise::new(61).white(frames(40.0), -20.0);
    let y = Biquad::notch(RATE, 1000.0, 30.0).run(&x);
    let noise = Noise::new(62).white(x.len(), -50.0);
    let figures = Pair::noisy(x, &y, &noise, LENGTH).judge_one(&keep(90.0, 3900.0, 1.0));
    expect(&figures, Verdict::Missed, None);
    let reason = figures.reason.unwrap();
    assert!(reason.contains("from 99") || reason.contains("from 100"), "{reason}");
}

#[test]
fn a_dip_narrower_than_a_sub_band_of_a_short_recording_is_no_noise_to_be_left_out() {
    // One segment: sub-bands of 28 bins, 2.8 Hz. A notch of 1 Hz takes a third out of one of
    // them, less than the limit; the phase turns over within, so that it looks like noise.
    let x = Noise::new(71).white(frames(12.0), -20.0);
    let settled = |v: &[f64]| v[frames(2.0)..].to_vec();
    for hz in [1000.0, 1000.7, 1001.4, 1002.1] {
        let y = Biquad::notch(RATE, hz, 1.0).run(&x);
        let pair = Pair::new(settled(&x), settled(&y), LENGTH);
        let figures = pair.judge_one(&keep(500.0, 3000.0, 6.0));
        assert_ne!(figures.verdict, Some(Verdict::Met), "{hz} {figures:#?}");
    }
}
