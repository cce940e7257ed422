//! The recording after on the clock of the one before.

use crate::signals::{noise, random};
use bandproof::align::{Alignment, Follower};
use proptest::prelude::*;
use std::f64::consts::TAU;

fn alignment(delay_frames: f64, clock_ppm: f64) -> Alignment {
    Alignment {
        delay_frames,
        clock_ppm,
        clock_error_ppm: None,
        inverted: false,
        scatter_s: None,
        certain: true,
        notes: Vec::new(),
    }
}

/// Runs a follower over `after` in blocks; what it made and which frames before that is.
fn follow(
    alignment: &Alignment,
    frames_before: usize,
    after: &[Vec<f64>],
    blocks: &[usize],
) -> (Vec<Vec<f64>>, std::ops::Range<u64>) {
    let frames = after[0].len();
    let mut follower = Follower::new(alignment, frames_before as u64, frames as u64, after.len());
    let mut out = vec![Vec::new(); after.len()];
    let (mut from, mut lengths) = (0, blocks.iter().cycle());
    while from < frames {
        let to = (from + lengths.next().unwrap_or(&frames)).min(frames);
        follower.process(&after.iter().map(|plane| plane[from..to].to_vec()).collect::<Vec<_>>(), &mut out);
        from = to;
    }
    follower.finish(&mut out);
    (out, follower.overlap())
}

#[test]
fn without_a_clock_difference_samples_stay_bit_for_bit() {
    let after = [noise(1, 5000), noise(2, 5000)];
    for (delay, frames_before) in [(0.0, 5000), (3.4, 5000), (-700.6, 5000), (10.0, 200), (4000.0, 9000), (-100.0, 50)]
    {
        let (out, overlap) = follow(&alignment(delay, 0.0), frames_before, &after, &[777]);
        let shift = delay.round() as i64;
        let start = (-shift).max(0);
        let end = (frames_before as i64).min(5000 - shift);
        let expected = if start < end { start as u64..end as u64 } else { 0..0 };
        assert_eq!(overlap, expected, "{delay}");
        for (out, after) in out.iter().zip(&after) {
            let partners: Vec<f64> = overlap.clone().map(|n| after[(n as i64 + shift) as usize]).collect();
            assert!(out.iter().map(|x| x.to_bits()).eq(partners.iter().map(|x| x.to_bits())), "{delay}");
        }
        assert_eq!(Follower::new(&alignment(delay, 0.0), 9, 9, 1).reaches_share(), 0.5);
    }
}

/// Ripple and images of a Kaiser window for 120 dB, 1e-6 each, and 1e-6 for the linear
/// step between tabulated kernels: 3e-6, -110.5 dB.
#[test]
fn interpolated_sines_are_right_to_110_decibels() {
    let frames = 40_000;
    for (delay, ppm) in [(0.3, 0.5), (-7.25, 3.0), (1001.75, -50.0), (-3.0, 150.0), (5.0, -200.0)] {
        let line = alignment(delay, ppm);
        let reach = Follower::new(&line, 9000, 9000, 1).reaches_share();
        assert!((0.4535..0.5).contains(&reach), "20 kHz at 44.1 kHz must be reached: {reach}");
        for share in [0.0005, 0.01, 0.11, 0.25, 0.37, 0.44, reach] {
            let wave = |t: f64| (TAU * share * t + 0.4).sin();
            let after: Vec<f64> = (0..frames).map(|m| wave((f64::from(m) - delay) / (1.0 + ppm * 1e-6))).collect();
            let (out, overlap) = follow(&line, frames as usize, &[after], &[1000, 1, 4000]);
            assert_eq!(out[0].len() as u64, overlap.end - overlap.start);
            assert!(overlap.end - overlap.start > 38_000, "{overlap:?}");
            let error = out[0].iter().zip(overlap).map(|(y, n)| (y - wave(n as f64)).abs()).fold(0.0, f64::max);
            assert!(error < 3e-6, "{delay} frames, {ppm} ppm, {share} of the rate: {error:e}");
        }
    }
}

/// 1e-4 dB are 1.15e-5 of the amplitude.
#[test]
fn levels_stay_up_to_where_the_kernel_reaches() {
    let line = alignment(0.1, 100.0);
    let reach = Follower::new(&line, 9, 9, 1).reaches_share();
    for step in 1..=40 {
        let share = reach * f64::from(step) / 40.0;
        let after: Vec<f64> = (0..20_000).map(|m| (TAU * share * f64::from(m)).sin()).collect();
        let (out, _) = follow(&line, 20_000, &[after], &[20_000]);
        let (mut re, mut im) = (0.0, 0.0);
        for (y, n) in out[0].iter().zip(48_u32..) {
            let angle = TAU * share * (f64::from(n) * (1.0 + 1e-4) + 0.1);
            let window = 1.0 - (TAU * f64::from(n - 48) / out[0].len() as f64).cos();
            re += y * angle.sin() * window;
            im += y * angle.cos() * window;
        }
        let level = 2.0 * f64::hypot(re, im) / out[0].len() as f64;
        assert!((20.0 * level.log10()).abs() < 1e-4, "{share}: {level}");
    }
}

#[test]
fn an_offset_stays() {
    let (out, _) = follow(&alignment(0.25, 17.0), 5000, &[vec![0.5; 5000]], &[5000]);
    // One rounding a tap.
    assert!(out[0].iter().all(|y| (y - 0.5).abs() < 1e-14));
}

#[test]
fn nothing_in_common_gives_nothing() {
    for line in [alignment(6000.0, 0.0), alignment(6000.0, 5.0), alignment(-6000.0, 0.0), alignment(-6000.0, 5.0)] {
        let (out, overlap) = follow(&line, 5000, &[vec![1.0; 5000]], &[512]);
        assert!(overlap.is_empty() && out[0].is_empty(), "{line:?}");
    }
    let (out, overlap) = follow(&alignment(0.0, 5.0), 5000, &[vec![1.0; 60]], &[60]);
    assert!(overlap.is_empty() && out[0].is_empty());
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(60))]

    #[test]
    fn blocks_do_not_matter(
        blocks in prop::collection::vec(1_usize..700, 1..5),
        delay in -900.0..900.0_f64,
        ppm in prop_oneof![Just(0.0), -300.0..300.0_f64],
        frames_before in 1_usize..4000,
        seed in any::<u64>(),
    ) {
        let after: Vec<Vec<f64>> =
            (0..2).map(|channel| (0..3000).map(|n| random(seed ^ channel, n)).collect()).collect();
        let line = alignment(delay, ppm);
        let (whole, overlap) = follow(&line, frames_before, &after, &[3000]);
        prop_assert_eq!(whole[0].len() as u64, overlap.end - overlap.start);
        let (parts, _) = follow(&line, frames_before, &after, &blocks);
        prop_assert_eq!(whole, parts);
    }
}
