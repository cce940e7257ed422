//! The same cascades run both ways by SciPy's `sosfiltfilt` (`tests/reference/both_ways_scipy.py`).

use crate::both_ways::{extended, reach, run_both_ways};
use crate::helpers::noise;
use crate::rounding::bound_both_ways;
use bandproof::cascade::both_ways::Reach;
use bandproof::cascade::plain;
use bandproof::section::Section;
use serde::Deserialize;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Case {
    name: String,
    seed: u64,
    frames: usize,
    stride: usize,
    sections: Vec<Section>,
    short_frames: usize,
    short: Vec<f64>,
    long: Vec<f64>,
}

impl Case {
    fn input(&self) -> Vec<f64> {
        let noise = noise(self.seed, self.frames);
        noise.iter().zip(0_u32..).map(|(x, n)| 0.25 * x + 0.5 + f64::from(n) / 16_384.0).collect()
    }
}

fn cases() -> Vec<Case> {
    serde_json::from_str(include_str!("../reference/both_ways_scipy.json")).expect("cases as the script writes them")
}

/// `expected` has every frame that is a multiple of the stride and the last one. Those from
/// `edge` on to as many before the end must agree within 1e-12 or 100 times the rounding
/// noise, whichever is larger. The noise is the standard deviation that independent errors of all
/// operations come to at the output: an eighth of [`bound_both_ways`].
#[track_caller]
fn compare(case: &Case, reach: Reach, expected: &[f64], edge: usize, what: &str) {
    let input = case.input();
    let forward = plain::filter(&case.sections, &extended(&input, reach.ring_frames));
    let noise = bound_both_ways(&case.sections, &input, &forward) / 8.0;
    let found = run_both_ways(&case.sections, reach, &input);
    let kept = (0..case.frames).step_by(case.stride).chain([case.frames - 1]);
    assert_eq!(kept.clone().count(), expected.len());
    let mut compared = 0;
    for (frame, expected) in kept.zip(expected) {
        if (edge..case.frames - edge).contains(&frame) {
            let off = (found[frame] - expected).abs();
            let name = &case.name;
            assert!(off <= (100.0 * noise).max(1e-12), "{name} {what}, frame {frame}: off by {off:e}, noise {noise:e}");
            compared += 1;
        }
    }
    assert!(compared > 20, "{} {what}: {compared} frames compared", case.name);
}

/// `sosfilt_zi` solves for the start state in f64; for the 10 Hz low-pass at 192 kHz that is
/// off by 4e-10 (see `cascade_scipy.py`), which an extension of 500 frames leaves in.
const LOW: &str = "Butterworth low-pass of order 2 at 10 Hz, 192 kHz";

#[test]
fn with_the_same_extension_everything_agrees_with_sosfiltfilt() {
    let cases = cases();
    assert_eq!(cases.len(), 6);
    for case in cases.iter().filter(|case| case.name != LOW) {
        let reach = Reach { ring_frames: case.short_frames, block_frames: 1 << 20 };
        compare(case, reach, &case.short, 0, "500 frames");
    }
}

#[test]
fn blocks_and_an_extension_as_long_as_the_ring_agree_with_sosfiltfilt_over_the_whole() {
    for case in cases().iter().filter(|case| case.name != LOW) {
        let reach = Reach { block_frames: 700, ..reach(&case.sections) };
        compare(case, reach, &case.long, 0, "all frames");
    }
}

/// 4e-10 of the start, carried through an extension of 7999 frames in which a ring of 10 Hz falls
/// by 1.2e-1 of a neper a hundred frames.
#[test]
fn a_filter_that_rings_for_longer_than_the_recording_agrees_too() {
    for case in cases().iter().filter(|case| case.name == LOW) {
        let reach = reach(&case.sections);
        assert!(reach.ring_frames > case.frames);
        compare(case, reach, &case.long, 0, "all frames");
    }
}
