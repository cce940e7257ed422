//! Signals and helpers for the tests.

use bandproof::spectrum::{Accumulator, SegmentPlan, Spectra, Transform};
use std::ops::Range;

/// Spectra of a whole pair of signals; the cross-spectrum over all bins.
pub fn spectra(segment_frames: usize, before: &[f64], after: &[f64]) -> Spectra {
    let plan = SegmentPlan::spread(segment_frames, 0..before.len() as u64);
    let all = std::iter::once(0..segment_frames / 2 + 1).collect();
    let mut sums = Accumulator::new(Transform::new(segment_frames), all);
    assert!(!plan.starts.is_empty());
    for start in plan.starts {
        let at = start as usize..start as usize + segment_frames;
        sums.add(&before[at.clone()], &after[at]);
    }
    sums.finish()
}

/// Level of a sum of bins, dBFS.
pub fn level_dbfs(power: &[f64], bins: Range<usize>) -> f64 {
    10.0 * (2.0 * power[bins].iter().sum::<f64>()).log10()
}

/// A sine of this level.
pub fn sine(level_dbfs: f64, hz: f64, rate_hz: f64, phase: f64, frames: usize) -> Vec<f64> {
    let amplitude = 10f64.powf(level_dbfs / 20.0);
    (0..frames).map(|n| amplitude * (std::f64::consts::TAU * hz / rate_hz * n as f64 + phase).sin()).collect()
}

/// Gaussian white noise of unit variance, from a counter-based hash (splitmix64) by the
/// method of G. E. P. Box and M. E. Muller, Ann. Math. Statist. 29, 1958.
pub fn white(seed: u64, frames: usize) -> Vec<f64> {
    // In (0, 1], so that the logarithm exists.
    let uniform = |i: u64| {
        let mut z = seed.wrapping_add(i.wrapping_add(1).wrapping_mul(0x9e37_79b9_7f4a_7c15));
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        (((z ^ (z >> 31)) >> 11) + 1) as f64 / (1u64 << 53) as f64
    };
    let normal = |i| (-2.0 * uniform(2 * i).ln()).sqrt() * (std::f64::consts::TAU * uniform(2 * i + 1)).cos();
    (0..frames as u64).map(normal).collect()
}
