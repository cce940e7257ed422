//! Forward and backward: against one pass over the whole file and another one back, and the
//! laws of zero phase.

use crate::helpers::{assert_same_bits, noise, random_sections, section};
use crate::rounding::{Errors, bound, bound_both_ways};
use bandproof::cascade::both_ways::{BothWays, Passes, RING_FALL_DB, Reach};
use bandproof::cascade::{Cascade, plain};
use bandproof::design::settling::settling_frames;
use bandproof::section::Section;
use proptest::prelude::*;
use std::sync::Arc;

/// As far as the ring goes, and the block that follows from it.
pub fn reach(sections: &[Section]) -> Reach {
    Reach::new(usize::try_from(settling_frames(sections, RING_FALL_DB)).expect("a short ring"))
}

/// The input with `ring_frames` (or as many as there are) before and after it.
pub fn extended(input: &[f64], ring_frames: usize) -> Vec<f64> {
    let [Some(first), Some(last)] = [input.first(), input.last()] else { return Vec::new() };
    let count = ring_frames.min(input.len() - 1);
    let before = input[1..=count].iter().rev().map(|x| 2.0 * first - x);
    let after = input[input.len() - 1 - count..input.len() - 1].iter().rev().map(|x| 2.0 * last - x);
    before.chain(input.iter().copied()).chain(after).collect()
}

/// Both passes over the whole, by the recurrence as the documentation states it.
fn plainly(sections: &[Section], ring_frames: usize, input: &[f64]) -> Vec<f64> {
    let count = ring_frames.min(input.len().saturating_sub(1));
    let mut samples = plain::filter(sections, &extended(input, ring_frames));
    samples.drain(..count);
    samples.reverse();
    let mut samples = plain::filter(sections, &samples);
    samples.drain(..count);
    samples.reverse();
    samples
}

/// Runs `channels` in blocks whose lengths repeat `cuts`, and out in pieces of at most `most`.
fn run(sections: &[Section], reach: Reach, channels: &[Vec<f64>], cuts: &[usize], most: usize) -> Vec<Vec<f64>> {
    let frames = channels[0].len();
    let mut filter = BothWays::new(Arc::new(Cascade::new(sections)), reach, channels.len(), frames as u64);
    run_on(&mut filter, reach, channels, cuts, most)
}

fn run_on(filter: &mut BothWays, reach: Reach, channels: &[Vec<f64>], cuts: &[usize], most: usize) -> Vec<Vec<f64>> {
    let frames = channels[0].len();
    let mut out = vec![Vec::new(); channels.len()];
    let (mut start, mut lengths) = (0, cuts.iter().cycle());
    while start < frames {
        let end = frames.min(start + lengths.next().copied().unwrap_or(frames));
        let block: Vec<Vec<f64>> = channels.iter().map(|plane| plane[start..end].to_vec()).collect();
        let before = out[0].len();
        filter.process(&block, &mut out);
        assert!(out[0].len() - before <= end - start, "more comes out than goes in: it would pile up");
        assert!(end - out[0].len() <= reach.lag_frames(), "{} frames wait", end - out[0].len());
        start = end;
    }
    loop {
        let before = out[0].len();
        let all = filter.finish(most, &mut out);
        assert!(out[0].len() - before <= most);
        if all {
            return out;
        }
    }
}

/// One channel in one go.
pub fn run_both_ways(sections: &[Section], reach: Reach, input: &[f64]) -> Vec<f64> {
    run(sections, reach, &[input.to_vec()], &[input.len().max(1)], usize::MAX).remove(0)
}

/// Stable sections whose ring is a few thousand frames at the most.
fn short_ringing(seed: u64, count: usize) -> Vec<Section> {
    let draws = noise(seed, 5 * count);
    let one = |&[r, w, b0, b1, b2]: &[f64; 5]| section(0.98 * libm::sqrt(r.abs()), w.abs(), [b0, b1, b2]);
    draws.as_chunks::<5>().0.iter().map(one).collect()
}

#[test]
fn in_one_block_it_is_two_passes_of_the_recurrence_bit_for_bit() {
    for (seed, count, frames) in [(1, 1, 5000), (2, 5, 3000), (3, 16, 5000), (4, 23, 2000), (5, 40, 7000)] {
        let sections = random_sections(seed, count);
        let input = noise(seed, frames);
        for ring_frames in [0, 1, 700, frames - 1, frames, 10 * frames] {
            let reach = Reach { ring_frames, block_frames: frames };
            let expected = plainly(&sections, ring_frames, &input);
            let what = format!("{count} sections, ring {ring_frames}");
            assert_same_bits(&run_both_ways(&sections, reach, &input), &expected, &what);
        }
    }
}

#[test]
fn recordings_of_any_length_come_out_as_long_as_they_went_in() {
    let sections = random_sections(9, 6);
    for frames in (0..12).chain([99, 100, 101, 149, 150, 151, 199, 200, 201, 250, 4095, 4096, 4097, 4350]) {
        let input = noise(17, frames);
        let reach = Reach { ring_frames: 100, block_frames: 50 };
        let found = run_both_ways(&sections, reach, &input);
        assert_eq!(found.len(), frames);
        if frames < 150 {
            assert_same_bits(&found, &plainly(&sections, 100, &input), &format!("{frames} frames"));
        }
    }
}

/// y = H(1)^2 x\[0\]: nothing is known but one sample.
#[test]
fn a_single_frame_is_taken_for_a_constant() {
    let sections = [section(0.9, 0.3, [0.5, 0.2, 0.1]), section(0.7, 0.8, [1.0, -0.3, 0.2])];
    let gain: f64 = sections.iter().map(|s| s.b.iter().sum::<f64>() / s.a.iter().sum::<f64>()).product();
    let found = run_both_ways(&sections, reach(&sections), &[0.7]);
    // A sum, a quotient and a product a section, of numbers near one, twice.
    assert!((found[0] - 0.7 * gain * gain).abs() < 40.0 * f64::EPSILON * gain * gain, "{found:?}");
}

#[test]
fn without_sections_samples_pass_bit_for_bit() {
    let input = noise(3, 10_000);
    for reach in [Reach { ring_frames: 0, block_frames: 64 }, Reach { ring_frames: 300, block_frames: 1000 }] {
        assert_same_bits(&run_both_ways(&[], reach, &input), &input, "no sections");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    /// The backward pass in blocks differs from one over the whole by rounding alone. Both
    /// round for themselves, as they begin at other frames: twice what one may be off, and what
    /// the ring leaves out, which is below the rounding of one sum of the largest samples.
    #[test]
    fn blocks_make_what_one_pass_over_the_whole_makes(
        seed in 0u64..1000, count in 1usize..20, block in 1usize..3000, more in 0usize..3000,
    ) {
        let sections = short_ringing(seed, count);
        let ring_frames = reach(&sections).ring_frames;
        let input = noise(seed + 1, ring_frames + 4 * block + more);
        let whole = plainly(&sections, ring_frames, &input);
        let found = run_both_ways(&sections, Reach { ring_frames, block_frames: block }, &input);
        let forward = plain::filter(&sections, &extended(&input, ring_frames));
        let largest = forward.iter().fold(0.0, |largest: f64, f| largest.max(f.abs()));
        let tolerance = 2.0 * bound(&sections, &forward, Errors::Independent) + f64::EPSILON * largest;
        for (frame, (found, whole)) in found.iter().zip(&whole).enumerate() {
            prop_assert!((found - whole).abs() <= tolerance, "frame {}: {:e} for {:e} +- {:e}", frame, found, whole, tolerance);
        }
    }

    /// However the input is cut, and however the rest is taken out.
    #[test]
    fn the_cuts_of_the_input_change_no_bit(
        cuts in prop::collection::vec(1usize..6000, 1..6), most in 1usize..5000, frames in 1usize..30_000,
        ring_frames in 0usize..3000, block_frames in 1usize..9000, count in 1usize..20,
    ) {
        let sections = short_ringing(5, count);
        let channels = [noise(1, frames), noise(2, frames)];
        let reach = Reach { ring_frames, block_frames };
        let found = run(&sections, reach, &channels, &cuts, most);
        for (found, input) in found.iter().zip(&channels) {
            let whole = run_both_ways(&sections, reach, input);
            prop_assert!(found.iter().zip(&whole).all(|(a, b)| a.to_bits() == b.to_bits()) && found.len() == whole.len());
        }
    }
}

/// What the law above would see: with a quarter of the reach blocks are off by more than rounding.
#[test]
fn a_reach_too_short_would_show() {
    let sections = short_ringing(12, 4);
    let ring_frames = reach(&sections).ring_frames;
    let input = noise(13, 8 * ring_frames);
    let whole = plainly(&sections, ring_frames, &input);
    let forward = plain::filter(&sections, &extended(&input, ring_frames));
    let tolerance = 2.0 * bound(&sections, &forward, Errors::Independent);
    let short = Reach { ring_frames: ring_frames / 4, block_frames: ring_frames };
    let off =
        run_both_ways(&sections, short, &input).iter().zip(&whole).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
    assert!(off > 100.0 * tolerance, "{off:e}, rounding {tolerance:e}");
}

/// The tone ring of a narrow stop, which is what field recordings have: 40 Hz wide at 50 Hz.
fn stop() -> Vec<Section> {
    let (radius, angle) = (0.9974, 0.002_083);
    let turn = |angle: f64| -2.0 * libm::cos(std::f64::consts::PI * angle);
    let one = |offset: f64| {
        let r = radius - 0.0005 * offset;
        Section { b: [0.998, 0.998 * turn(angle), 0.998], a: [1.0, r * turn(angle + 1e-5 * offset), r * r] }
    };
    vec![one(0.0), one(1.0), one(2.0)]
}

#[test]
fn an_offset_makes_no_transient() {
    let sections = stop();
    let reach = reach(&sections);
    let input = vec![0.75; 3 * reach.lag_frames() + 17];
    let found = run_both_ways(&sections, reach, &input);
    let gain: f64 = sections.iter().map(|s| s.b.iter().sum::<f64>() / s.a.iter().sum::<f64>()).product();
    // Under a constant errors can all go one way.
    let one_pass = bound(&sections, &input[..40_000], Errors::Alike);
    let tolerance = 2.0 * one_pass * gain.abs().max(1.0) + 1e-12;
    for (frame, y) in found.iter().enumerate() {
        assert!((y - 0.75 * gain * gain).abs() <= tolerance, "frame {frame}: {y} +- {tolerance:e}");
    }
}

/// y = H(1)^2 x for a line: the mirrored ends go on straight, and the delay of one pass is
/// taken back by the other.
#[test]
fn a_linear_trend_makes_no_transient() {
    let sections = stop();
    let reach = reach(&sections);
    let input: Vec<f64> = (0..reach.ring_frames + 5000).map(|n| 0.3 + n as f64 / 65_536.0).collect();
    let found = run_both_ways(&sections, reach, &input);
    let gain: f64 = sections.iter().map(|s| s.b.iter().sum::<f64>() / s.a.iter().sum::<f64>()).product();
    let largest = input.iter().fold(0.0, |largest: f64, x| largest.max(x.abs()));
    let tolerance = 2.0 * (bound(&sections, &input, Errors::Alike) + f64::EPSILON * largest);
    for (frame, (y, x)) in found.iter().zip(&input).enumerate() {
        assert!((y - gain * gain * x).abs() <= tolerance, "frame {frame}: {y} for {x} +- {tolerance:e}");
    }
}

/// The response to an impulse is the autocorrelation of that of one pass, the same to both sides.
#[test]
fn an_impulse_rings_alike_before_and_after() {
    let sections = short_ringing(21, 7);
    let ring_frames = reach(&sections).ring_frames;
    let place = 2 * ring_frames;
    let mut input = vec![0.0; 2 * place + 1];
    input[place] = 1.0;
    let found = run_both_ways(&sections, Reach { ring_frames, block_frames: place - 100 }, &input);
    let mut impulse = vec![0.0; ring_frames + 1];
    impulse[0] = 1.0;
    // From rest: the first frame would be taken for a constant.
    impulse.insert(0, 0.0);
    let h = plain::filter(&sections, &impulse).split_off(1);
    let forward = plain::filter(&sections, &input);
    // An impulse moves for too short a time to count on chance: all errors the same way.
    let gain: f64 = h.iter().map(|h| h.abs()).sum();
    let tolerance = bound(&sections, &input, Errors::Alike) * gain + bound(&sections, &forward, Errors::Alike);
    for lag in 0..ring_frames.min(500) {
        let expected: f64 = h.iter().zip(&h[lag..]).map(|(a, b)| a * b).sum();
        let (before, after) = (found[place - lag], found[place + lag]);
        let sum = f64::EPSILON * h.iter().map(|h| h * h).sum::<f64>() * 4.0;
        assert!((before - expected).abs() <= tolerance + sum, "lag -{lag}: {before:e} for {expected:e}");
        assert!((after - expected).abs() <= tolerance + sum, "lag {lag}: {after:e} for {expected:e}");
    }
}

/// Time may run the other way: that exchanges the passes, which commute.
#[test]
fn the_reversed_recording_comes_out_reversed() {
    let sections = short_ringing(31, 9);
    let reach = Reach { block_frames: 1500, ..reach(&sections) };
    let input = noise(31, 3 * reach.ring_frames + 5000);
    let mut reversed = input.clone();
    reversed.reverse();
    let found = run_both_ways(&sections, reach, &input);
    let mut back = run_both_ways(&sections, reach, &reversed);
    back.reverse();
    let forward = plain::filter(&sections, &input);
    let largest = forward.iter().fold(0.0, |largest: f64, f| largest.max(f.abs()));
    let gain: f64 = found.iter().fold(0.0, |largest: f64, f| largest.max(f.abs()));
    let tolerance = 2.0 * bound_both_ways(&sections, &input, &forward) + f64::EPSILON * (largest + gain);
    for (frame, (a, b)) in found.iter().zip(&back).enumerate() {
        assert!((a - b).abs() <= tolerance, "frame {frame}: {a:e} and {b:e} +- {tolerance:e}");
    }
}

#[test]
fn afterwards_it_is_as_new() {
    let sections = random_sections(8, 11);
    let reach = Reach { ring_frames: 400, block_frames: 900 };
    let mut filter = BothWays::new(Arc::new(Cascade::new(&sections)), reach, 1, 0);
    for (seed, frames) in [(1, 5000), (2, 0), (3, 30), (4, 9000)] {
        let input = noise(seed, frames);
        let found = run_on(&mut filter, reach, std::slice::from_ref(&input), &[777], 1000).remove(0);
        assert_same_bits(&found, &run_both_ways(&sections, reach, &input), &format!("{frames} frames"));
    }
}

#[test]
fn one_pass_or_two_have_the_same_face() {
    let (sections, input) = (random_sections(2, 5), noise(2, 4000));
    let cascade = Arc::new(Cascade::new(&sections));
    let reach = Reach { ring_frames: 300, block_frames: 800 };
    let run = |reach| {
        let mut passes = Passes::new(&cascade, reach, 1, 4000);
        let mut out = [Vec::new()];
        passes.process(std::slice::from_ref(&input), &mut out);
        while !passes.finish(100, &mut out) {}
        std::mem::take(&mut out[0])
    };
    assert_same_bits(&run(None), &plain::filter(&sections, &input), "one");
    assert_same_bits(&run(Some(reach)), &run_both_ways(&sections, reach, &input), "two");
}

#[test]
fn blocks_cost_a_quarter_more_or_little_memory() {
    for ring_frames in [0, 1, 100, 40_000, 1 << 20, 1 << 21, 1 << 22, 1 << 25, usize::MAX] {
        let reach = Reach::new(ring_frames);
        assert!(reach.block_frames >= ring_frames.max(1 << 16), "never more than half of the backward pass is lost");
        assert!(ring_frames > 1 << 21 || reach.block_frames >= 2 * ring_frames);
        assert!(reach.block_frames <= (1 << 22).max(ring_frames));
        // A minute at 48 kHz: never more than a few times its own length.
        assert!(reach.memory_bytes(2_880_000) <= 8 * (4 * 2_880_000 + 65_536));
    }
}
