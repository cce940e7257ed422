//! Signals, sections and runs that several tests share.

use bandproof::cascade::{Cascade, Filter, Width};
use bandproof::section::Section;
use std::sync::Arc;

pub const WIDTHS: [Width; 2] = [Width::Portable, Width::Widest];

/// White noise in -1..1 from a counter hash (splitmix64 by S. Vigna, public domain, from memory).
pub fn noise(seed: u64, frames: usize) -> Vec<f64> {
    (0..frames as u64)
        .map(|i| {
            let mut z = seed.wrapping_mul(0x9E37_79B9_7F4A_7C15).wrapping_add(i.wrapping_mul(0xD1B5_4A32_D192_ED03));
            z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
            z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
            z ^= z >> 31;
            (z >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
        })
        .collect()
}

/// A stable section from two numbers in 0..1 for its poles and three in -1..1 for its zeros.
pub fn section(radius: f64, angle: f64, b: [f64; 3]) -> Section {
    let r = 0.9999 * radius;
    Section { b, a: [1.0, -2.0 * r * libm::cos(std::f64::consts::PI * angle), r * r] }
}

/// `count` stable sections with gains of about one.
pub fn random_sections(seed: u64, count: usize) -> Vec<Section> {
    noise(seed, 5 * count)
        .as_chunks::<5>()
        .0
        .iter()
        .map(|&[r, w, b0, b1, b2]| section(libm::sqrt(r.abs()), w.abs(), [b0, b1, b2]))
        .collect()
}

/// Runs `channels` through `sections` in blocks whose lengths repeat `blocks`.
pub fn run(sections: &[Section], width: Width, channels: &[Vec<f64>], blocks: &[usize]) -> Vec<Vec<f64>> {
    let mut filter = Filter::with_width(Arc::new(Cascade::new(sections)), channels.len(), width);
    let mut out = vec![Vec::new(); channels.len()];
    run_on(&mut filter, channels, blocks, &mut out);
    out
}

/// The same with a filter at hand.
pub fn run_on(filter: &mut Filter, channels: &[Vec<f64>], blocks: &[usize], out: &mut [Vec<f64>]) {
    let frames = channels.first().map_or(0, Vec::len);
    let mut start = 0;
    let mut lengths = blocks.iter().cycle();
    while start < frames {
        let end = frames.min(start + lengths.next().copied().unwrap_or(frames));
        let block: Vec<Vec<f64>> = channels.iter().map(|plane| plane[start..end].to_vec()).collect();
        filter.process(&block, out);
        start = end;
    }
    filter.finish(out);
}

/// One channel in one block at the width the program uses.
pub fn run_one(sections: &[Section], input: &[f64]) -> Vec<f64> {
    run(sections, Width::Widest, &[input.to_vec()], &[input.len().max(1)]).remove(0)
}

/// Fails at the first sample whose bits differ.
#[track_caller]
pub fn assert_same_bits(found: &[f64], expected: &[f64], what: &str) {
    assert_eq!(found.len(), expected.len(), "{what}: frames");
    for (frame, (found, expected)) in found.iter().zip(expected).enumerate() {
        assert!(found.to_bits() == expected.to_bits(), "{what}: frame {frame}: {found:e}, expected {expected:e}");
    }
}
