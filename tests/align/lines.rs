//! Delay, clock and polarity of recordings whose truth is exact.

use crate::signals::{Bells, add_noise, find, find_mono, find_with, least_error, noise, power, search, seconds};
use bandproof::align::Alignment;

/// Without noise what is left is the content near half the rate, which frames taken at
/// other times hold aliased (15 dB down at 0.48 of the rate): it moves single lags by some
/// 1e-4 frames.
const ALIASED: f64 = 5e-4;

/// A clock difference moves the lag within a chunk of 8192 frames; what a chunk says is the
/// lag where its energy lies. Under a Hann window, 0.14 of the chunk wide (root mean
/// square), with one independent value in 4 frames, that place varies by
/// 0.14 sqrt(1.944 * 4 / 8192) = 0.0043 of the chunk.
fn drift_error(ppm: f64) -> f64 {
    0.0043 * 8192.0 * ppm.abs() * 1e-6
}

#[track_caller]
fn assert_line(what: &str, found: &Alignment, delay: f64, ppm: f64, inverted: bool, frames: f64, error: f64) {
    let errors = 5.0 * (error + ALIASED / 5.0);
    assert!((found.delay_frames - delay).abs() < errors, "{what}: {found:?}, within {errors}");
    // The clock moves the lag over the overlap by as much as the ends of a line may be off.
    assert!((found.clock_ppm - ppm).abs() * 1e-6 * frames < 2.0 * errors, "{what}: {found:?}, within {errors}");
    assert_eq!(found.inverted, inverted, "{what}: {found:?}");
}

#[test]
fn delays_clocks_and_polarities_are_found() {
    let cases = [
        (0.0, 0.0, 1.0),
        (1.0, 0.5, 1.0),
        (0.3, -0.5, -1.0),
        (-7.25, 3.0, 1.0),
        (4801.5, -50.0, -1.0),
        (456_000.0, 150.0, 1.0),
        (-456_000.0, 0.0, -1.0),
        (77.7, -200.0, 1.0),
    ];
    let frames = seconds(60.0);
    for (seed, (delay, ppm, sign)) in (0..).zip(cases) {
        let bells = Bells::steady(seed);
        let before = bells.record(frames, 0.0, 0.0);
        let mut after = bells.record(frames, delay, ppm);
        after.iter_mut().for_each(|x| *x *= 0.7 * sign);
        let found = find_mono(&before, &after).unwrap();
        let what = format!("{delay} frames, {ppm} ppm");
        let chunk = drift_error(ppm);
        assert_line(&what, &found, delay, ppm, sign < 0.0, frames as f64, chunk * 2.0 / 24.0_f64.sqrt());
        assert!(found.scatter_s.unwrap() < (ALIASED + 2.0 * chunk) / 48_000.0, "{what}: {found:?}");
        assert!(found.notes.is_empty(), "{what}: {found:?}");
        assert_eq!(found.clock_ppm == 0.0, ppm == 0.0, "{what}: {found:?}");
    }
}

#[test]
fn noise_costs_what_the_bound_allows() {
    let frames = seconds(60.0);
    for (seed, level) in [(1, 0.03), (2, 0.1), (3, 0.5)] {
        let bells = Bells::steady(seed);
        let before = bells.record(frames, 0.0, 0.0);
        let mut after = bells.record(frames, 812.4, 20.0);
        let noise = level * power(&before).sqrt();
        add_noise(&mut after, seed + 100, noise);
        let found = find_mono(&before, &after).unwrap();
        // A line through 24 lags is as sure at its end as 2/sqrt(24) of one lag; chunks are
        // not alike, and content near half the rate is lost in the noise: twice that.
        let chunk = least_error(power(&before), noise * noise);
        assert_line(
            &format!("noise {level}"),
            &found,
            812.4,
            20.0,
            false,
            frames as f64,
            2.0 * chunk * 2.0 / 24.0_f64.sqrt(),
        );
        let scatter = found.scatter_s.unwrap() * 48_000.0;
        assert!(scatter < 1.8 * chunk && scatter > 0.5 * chunk, "noise {level}: {scatter} frames, bound {chunk}");
        let error = found.clock_error_ppm.unwrap();
        assert!((found.clock_ppm - 20.0).abs() < 5.0 * error, "noise {level}: {found:?}");
    }
}

#[test]
fn noise_twenty_decibels_down_and_16_bits_scatter_far_less_than_a_microsecond() {
    let frames = seconds(60.0);
    let before = Bells::steady(4).record(frames, 0.0, 0.0);
    let mut after = Bells::steady(4).record(frames, -31.0, 0.0);
    add_noise(&mut after, 5, 0.1 * power(&before).sqrt());
    let found = find_mono(&before, &after).unwrap();
    assert!(found.scatter_s.unwrap() < 2e-7 && found.clock_ppm == 0.0, "{found:?}");
    let full_scale = 30.0;
    let [before, after] = [(0.0, 6), (-31.0, 7)]
        .map(|(delay, seed)| crate::signals::dithered(&Bells::steady(4).record(frames, delay, 0.0), seed, full_scale));
    let found = find_mono(&before, &after).unwrap();
    assert!(found.scatter_s.unwrap() < 5e-8 && found.clock_ppm == 0.0, "{found:?}");
}

#[test]
fn a_recording_against_itself_is_exact() {
    for (frames, seed) in [(seconds(0.5), 1), (seconds(3.3), 2), (seconds(25.0), 3)] {
        for samples in [noise(seed, frames), Bells::steady(seed).record(frames, 0.0, 0.0)] {
            let found = find_mono(&samples, &samples).unwrap();
            assert_eq!((found.delay_frames, found.clock_ppm, found.inverted), (0.0, 0.0, false), "{found:?}");
            assert!(found.scatter_s.unwrap() < 1e-15 && found.notes.is_empty(), "{found:?}");
        }
    }
}

#[test]
fn half_a_second_to_ten_minutes() {
    for (length, ppm) in [(0.5, 0.0), (2.0, 0.0), (10.0, 100.0), (600.0, -100.0)] {
        let frames = seconds(length);
        let before = Bells::steady(8).record(frames, 0.0, 0.0);
        let after = Bells::steady(8).record(frames, 1234.5, ppm);
        let found = find_mono(&before, &after).unwrap();
        // Shorter chunks see the edges of their windows more: ten times as much at 2048 frames.
        let edges = if length < 5.0 { 1e-3 } else { 0.0 };
        assert_line(&format!("{length} s"), &found, 1234.5, ppm, false, frames as f64, edges + drift_error(ppm));
    }
}

#[test]
fn lengths_may_differ() {
    for (before, after, delay) in [(60.0, 8.0, -100_000.0), (8.0, 60.0, 100_000.0), (30.0, 8.0, 24_000.0)] {
        let x = Bells::steady(9).record(seconds(before), 0.0, 0.0);
        let y = Bells::steady(9).record(seconds(after), delay, 0.0);
        let found = find_mono(&x, &y).unwrap();
        assert_line(&format!("{before} s and {after} s"), &found, delay, 0.0, false, 1.0, 0.0);
    }
}

#[test]
fn a_silent_channel_and_an_opposite_one_do_no_harm() {
    let frames = seconds(20.0);
    let before = Bells::steady(10).record(frames, 0.0, 0.0);
    let after = Bells::steady(10).record(frames, 50.25, 0.0);
    let silence = vec![0.0; frames];
    let opposite = |samples: &[f64]| samples.iter().map(|x| -x).collect::<Vec<f64>>();
    let found = find(&[before.clone(), silence.clone()], &[after.clone(), silence.clone()]).unwrap();
    assert_line("second channel silent", &found, 50.25, 0.0, false, 1.0, 0.0);
    let found = find(&[silence.clone(), before.clone()], &[silence, after.clone()]).unwrap();
    assert_line("first channel silent", &found, 50.25, 0.0, false, 1.0, 0.0);
    let found = find(&[before.clone(), opposite(&before)], &[after.clone(), opposite(&after)]).unwrap();
    assert_line("opposite channels", &found, 50.25, 0.0, false, 1.0, 0.0);
}

#[test]
fn bursts_with_silence_between_are_enough() {
    let frames = seconds(30.0);
    for share in [0.02, 0.1, 0.5] {
        let bells = Bells { seed: 11, share };
        let mut before = bells.record(frames, 0.0, 0.0);
        let mut after = bells.record(frames, -2222.2, 30.0);
        add_noise(&mut before, 1, 1e-5);
        add_noise(&mut after, 2, 1e-4);
        let found = find_mono(&before, &after).unwrap();
        // The fewer frames sound, the less they say: by the finder's own error of the clock,
        // which for the other end of the line is as many frames.
        let error = found.clock_error_ppm.unwrap() * 1e-6 * frames as f64;
        assert!(error < 0.2, "{share}: {found:?}");
        assert_line(&format!("{share}"), &found, -2222.2, 30.0, false, frames as f64, error);
    }
    // One burst alone.
    let mut before = vec![0.0; frames];
    before[700_000..701_000].copy_from_slice(&noise(3, 1000));
    let mut after = vec![0.0; frames];
    after[700_100..701_100].copy_from_slice(&noise(3, 1000));
    let found = find_mono(&before, &after).unwrap();
    assert_eq!((found.delay_frames, found.clock_ppm, found.scatter_s), (100.0, 0.0, None), "{found:?}");
}

#[test]
fn a_clock_that_wanders_scatters() {
    // 0.2 frames either way, five times a minute: a root mean square of 0.14 frames.
    let frames = seconds(60.0);
    let before = Bells::steady(12).record(frames, 0.0, 0.0);
    let pieces = 600;
    let mut after = Vec::new();
    for piece in 0..pieces {
        let lag = 0.2 * (std::f64::consts::TAU * 5.0 * f64::from(piece) / f64::from(pieces)).sin();
        let from = after.len();
        let whole = Bells::steady(12).record(frames / 600, lag - from as f64, 0.0);
        after.extend(whole);
    }
    let found = find_mono(&before, &after).unwrap();
    let scatter = found.scatter_s.unwrap() * 48_000.0;
    assert!((0.08..0.2).contains(&scatter), "{scatter} frames: {found:?}");
}

#[test]
fn a_gap_is_not_hidden() {
    let frames = seconds(30.0);
    let before = Bells::steady(13).record(frames, 0.0, 0.0);
    let mut after = before.clone();
    after.drain(frames / 2..frames / 2 + 480);
    let found = find_mono(&before, &after).unwrap();
    assert!(found.scatter_s.unwrap() > 1e-4, "{found:?}");
}

#[test]
fn a_sweep_is_enough() {
    // A logarithmic sweep, 50 Hz to 16 kHz in 20 s, at any time.
    let sweep = |frames: usize, delay: f64| -> Vec<f64> {
        let (length, octaves) = (20.0, (16_000.0_f64 / 50.0).ln());
        let at =
            |t: f64| (std::f64::consts::TAU * 50.0 * length / octaves * ((t / length * octaves).exp() - 1.0)).sin();
        let times = (0..frames).map(|m| (m as f64 - delay) / 48_000.0);
        times.map(|t| if (0.0..length).contains(&t) { 0.5 * at(t) } else { 0.0 }).collect()
    };
    let frames = seconds(22.0);
    let mut after = sweep(frames, 3456.75);
    add_noise(&mut after, 3, 1e-3);
    let found = find_mono(&sweep(frames, 0.0), &after).unwrap();
    assert!((found.delay_frames - 3456.75).abs() < 0.01 && !found.inverted, "{found:?}");
    assert_eq!(found.clock_ppm, 0.0, "{found:?}");
}

#[test]
fn max_delay_bounds_the_search() {
    let frames = seconds(20.0);
    let before = [Bells::steady(14).record(frames, 0.0, 0.0)];
    let after = [Bells::steady(14).record(frames, 48_000.0, 0.0)];
    let narrow = bandproof::align::Search { max_delay_s: 0.5, ..search(&before, &after) };
    let refused = find_with(narrow, &before, &after, &[65_536]).unwrap_err();
    assert!(refused.to_string().contains("--max-delay"), "{refused}");
    let wide = bandproof::align::Search { max_delay_s: 1.5, ..search(&before, &after) };
    let found = find_with(wide, &before, &after, &[65_536]).unwrap();
    assert_line("1 s", &found, 48_000.0, 0.0, false, 1.0, 0.0);
}
