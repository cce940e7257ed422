//! What can't be aligned is refused with a reason, what is ambiguous says so.

use crate::signals::{Bells, RATE_HZ, add_noise, find, find_given, find_mono, find_with, noise, search, seconds};
use bandproof::align::{AlignError, Search, Side};
use proptest::prelude::*;

fn tone(frames: usize, period: f64, delay: f64, seed: u64) -> Vec<f64> {
    let mut samples: Vec<f64> =
        (0..frames).map(|n| 0.5 * (std::f64::consts::TAU * (n as f64 - delay) / period).sin()).collect();
    add_noise(&mut samples, seed, 1e-5);
    samples
}

#[test]
fn unrelated_noises_are_refused() {
    // With a bound of 7.5 one search in 10^7 is wrong, and 24 chunks would have to agree.
    let frames = seconds(12.0);
    let mut accepted = Vec::new();
    for seed in 0..30 {
        let smooth = |samples: Vec<f64>| -> Vec<f64> {
            let mut state = 0.0;
            samples
                .into_iter()
                .map(|x| {
                    state = 0.95 * state + x;
                    state
                })
                .collect()
        };
        let (before, after) = (noise(2 * seed, frames), noise(2 * seed + 1, frames));
        let (before, after) = if seed % 2 == 0 { (before, after) } else { (smooth(before), smooth(after)) };
        match find_mono(&before, &after) {
            Err(AlignError::NothingInCommon { peak, .. }) => assert!(peak < 7.5, "{peak}"),
            other => accepted.push((seed, other)),
        }
    }
    assert!(accepted.is_empty(), "{accepted:?}");
}

#[test]
fn unrelated_bursts_are_refused() {
    let frames = seconds(12.0);
    for seed in 0..20 {
        let share = if seed % 2 == 0 { 0.1 } else { 0.05 };
        let [before, after] = [2 * seed, 2 * seed + 1].map(|seed| {
            let mut samples = Bells { seed, share }.record(frames, 0.0, 0.0);
            add_noise(&mut samples, seed, 1e-4);
            samples
        });
        let found = find_mono(&before, &after);
        assert!(found.is_err(), "{seed}: {found:?}");
    }
}

/// Recorders far from each other hear the same mains.
#[test]
fn a_common_hum_is_no_evidence() {
    let frames = seconds(10.0);
    for seed in 0..6 {
        let [before, after] = [2 * seed, 2 * seed + 1].map(|seed| {
            let hum = |n: usize| {
                let phase = std::f64::consts::TAU * 50.0 * n as f64 / 48_000.0;
                (phase + seed as f64).sin() + 0.3 * (3.0 * phase + 2.0 * seed as f64).sin()
            };
            noise(seed, frames).iter().enumerate().map(|(n, x)| 0.1 * x + hum(n)).collect::<Vec<f64>>()
        });
        let found = find_mono(&before, &after);
        assert!(matches!(found, Err(AlignError::NothingInCommon { .. })), "{seed}: {found:?}");
    }
}

#[test]
fn silence_and_constants_are_named() {
    let frames = seconds(3.0);
    let (sound, silence, constant) = (noise(1, frames), vec![0.0; frames], vec![0.25; frames]);
    let frames = frames as u64;
    assert_eq!(find_mono(&silence, &sound), Err(AlignError::Silent { side: Side::Before, frames }));
    assert_eq!(find_mono(&sound, &silence), Err(AlignError::Silent { side: Side::After, frames }));
    assert_eq!(find_mono(&constant, &sound), Err(AlignError::Constant { side: Side::Before, frames }));
    assert_eq!(find_mono(&sound, &constant), Err(AlignError::Constant { side: Side::After, frames }));
    let message = AlignError::Silent { side: Side::After, frames }.to_string();
    assert!(message.starts_with("AFTER is silent") && message.contains("144000"), "{message}");
}

#[test]
fn what_is_too_short_is_named() {
    let refused = find_mono(&noise(1, 1000), &noise(1, 5000)).unwrap_err();
    assert_eq!(refused, AlignError::TooShort { side: Side::Before, frames: 1000, needed: 1024 });
    let refused = find_given(&noise(1, 50_000), &noise(1, 48_000), 47_990.0).unwrap_err();
    assert!(matches!(refused, AlignError::NoOverlap { side: Side::After, common: 10, .. }), "{refused}");
    let refused = find_given(&noise(1, 50_000), &noise(1, 48_000), -60_000.0).unwrap_err();
    assert!(matches!(refused, AlignError::NoOverlap { side: Side::Before, common: 0, .. }), "{refused}");
    let refused = find_given(&noise(1, 50_000), &noise(1, 48_000), f64::NAN).unwrap_err();
    assert!(matches!(refused, AlignError::NoOverlap { .. }), "{refused}");
}

#[test]
fn a_recording_shorter_than_promised_ends_with_a_block_without_frames() {
    let (before, after) = ([noise(1, seconds(5.0))], [noise(1, seconds(5.0))]);
    let promised = Search { frames_before: 400_000, frames_after: 400_000, ..search(&before, &after) };
    let found = find_with(promised, &before, &after, &[10_000]).unwrap();
    assert_eq!(found.delay_frames, 0.0);
}

#[test]
fn of_a_steady_tone_the_smallest_lag_is_taken_and_the_next_named() {
    // Period 48 frames: every 24 frames the tone fits, with either sign in turn.
    let frames = seconds(20.0);
    for (delay, expected, inverted, rival) in
        [(10.0, 10.0, false, "-14."), (30.0, 6.0, true, "-18."), (0.0, 0.0, false, "24.")]
    {
        let found = find_mono(&tone(frames, 48.0, 0.0, 1), &tone(frames, 48.0, delay, 2)).unwrap();
        assert!((found.delay_frames - expected).abs() < 0.01 && found.inverted == inverted, "{delay}: {found:?}");
        let note = found.notes.first().unwrap();
        assert!(note.contains("ambiguous") && note.contains("--delay"), "{delay}: {note}");
        assert!(note.contains(rival) || delay == 0.0, "{delay}: {note}");
        assert!(!found.certain, "{delay}: {found:?}");
    }
}

#[test]
fn a_repeated_sound_is_ambiguous_by_its_period() {
    let frames = seconds(20.0);
    let once = noise(5, 48_000);
    let repeated: Vec<f64> = (0..frames + 1000).map(|n| once[n % 48_000]).collect();
    let found = find_mono(&repeated[1000..], &repeated[..frames]).unwrap();
    assert_eq!(found.delay_frames, 1000.0, "{found:?}");
    assert!(found.notes.iter().any(|note| note.contains("-47000.00 frames")), "{found:?}");
}

#[test]
fn a_given_delay_finds_the_clock_behind_a_sweep() {
    // What whitens a sweep's first chunk, 50 Hz upwards in 3 s, would hide the noise after it.
    const SWEEP_S: f64 = 3.0;
    let (frames, ppm) = (seconds(60.0), 20.0);
    let record = |delay: f64, ppm: f64| -> Vec<f64> {
        let time = |m: usize| (m as f64 - delay) / (1.0 + ppm * 1e-6) / f64::from(RATE_HZ);
        let rise = (16_000.0_f64 / 50.0).ln() / SWEEP_S;
        let sweep = |t: f64| (std::f64::consts::TAU * 50.0 / rise * ((rise * t).exp() - 1.0)).sin();
        let bells = Bells::steady(7).record(frames, delay, ppm);
        let sound = |(m, bell): (usize, f64)| match time(m) {
            t if t < 0.0 => 0.0,
            t if t < SWEEP_S => sweep(t),
            _ => bell,
        };
        bells.into_iter().enumerate().map(sound).collect()
    };
    let mut after = record(5000.3, ppm);
    add_noise(&mut after, 8, 1e-3);
    let found = find_given(&record(0.0, 0.0), &after, 5000.3).unwrap();
    assert!((found.clock_ppm - ppm).abs() < 2e-3 && !found.inverted, "{found:?}");
}

#[test]
fn a_given_delay_is_taken_as_it_is() {
    let frames = seconds(20.0);
    for (ppm, sign) in [(0.0, 1.0), (0.0, -1.0), (40.0, -1.0)] {
        let before = Bells::steady(6).record(frames, 0.0, 0.0);
        let mut after = Bells::steady(6).record(frames, 5000.3, ppm);
        after.iter_mut().for_each(|x| *x *= sign);
        let found = find_given(&before, &after, 5000.3).unwrap();
        assert_eq!((found.delay_frames, found.inverted), (5000.3, sign < 0.0), "{found:?}");
        assert!((found.clock_ppm - ppm).abs() < 2e-3 && found.notes.is_empty(), "{found:?}");
    }
    // A tone: the sign is the one that the delay has.
    for (given, inverted) in [(30.0, false), (6.0, true)] {
        let found = find_given(&tone(frames, 48.0, 0.0, 1), &tone(frames, 48.0, 30.0, 2), given).unwrap();
        assert_eq!((found.delay_frames, found.inverted), (given, inverted), "{found:?}");
        assert!(found.notes.iter().any(|note| note.contains("polarity is ambiguous")), "{found:?}");
    }
    let unrelated = find_given(&noise(1, frames), &noise(2, frames), 0.0);
    assert!(matches!(unrelated, Err(AlignError::NotBorneOut { .. })), "{unrelated:?}");
}

#[test]
fn levels_and_offsets_do_not_matter() {
    let frames = seconds(10.0);
    let before = Bells::steady(7).record(frames, 0.0, 0.0);
    let after = Bells::steady(7).record(frames, 99.0, 0.0);
    for (gain, offset) in [(1e-12, 0.0), (1e12, 0.0), (1e-4, 0.5)] {
        let scaled = |samples: &[f64]| samples.iter().map(|x| gain * x + offset).collect::<Vec<f64>>();
        let found = find(&[scaled(&before)], &[scaled(&after)]).unwrap();
        assert!((found.delay_frames - 99.0).abs() < 1e-2 && found.clock_ppm == 0.0, "{gain}, {offset}: {found:?}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(12))]

    #[test]
    fn blocks_do_not_matter(
        blocks in prop::collection::vec(1_usize..90_000, 1..6),
        delay in -60_000.0..60_000.0_f64,
        given in any::<bool>(),
    ) {
        let frames = seconds(6.0);
        let before = [Bells::steady(8).record(frames, 0.0, 0.0)];
        let after = [Bells::steady(8).record(frames, delay, 10.0)];
        let search = Search {
            given_frames: given.then_some(delay), max_delay_s: 1.5, ..search(&before, &after)
        };
        let whole = find_with(search.clone(), &before, &after, &[frames]);
        prop_assert!(whole.is_ok(), "{whole:?}");
        prop_assert_eq!(find_with(search, &before, &after, &blocks), whole);
    }
}
