//! Spectra of what streams past: filled by one task while another transforms.

use super::collector::{Collector, Segment};
use crate::spectrum::{Accumulator, SegmentPlan, Spectra, TransformCache};
use std::ops::Range;
use std::sync::Arc;

/// Frames handled at a time: a block of every plane stays in the second-level cache.
const BLOCK_FRAMES: usize = 16_384;
/// Samples of all channels in a block at most: 32 MB on each side, whatever number of
/// channels a header claims.
const BLOCK_SAMPLES: usize = 1 << 22;

/// Frames of a block for recordings with so many channels.
pub fn block_frames(channels: usize) -> usize {
    BLOCK_FRAMES.min(BLOCK_SAMPLES / channels.max(1)).max(1)
}

/// Two sides of a recording that stream past together.
pub trait Passing: Send {
    /// Why it may stop.
    type Error: Send;

    /// Lets one block pass; `collector` takes what is to be measured of it.
    fn step(&mut self, collector: Option<&mut Collector>) -> Result<(), Self::Error>;

    /// Whether everything has passed.
    fn has_ended(&self) -> bool;

    /// Lets the rest pass without measuring.
    fn run_out(&mut self) -> Result<(), Self::Error> {
        while !self.has_ended() {
            self.step(None)?;
        }
        Ok(())
    }
}

/// Streams `passing` until the last segment of `plan` is transformed; the spectra by
/// channel. `cross_bins` are those for which the cross-spectrum is kept.
pub fn spectra<P: Passing>(
    passing: &mut P,
    plan: &SegmentPlan,
    channels: usize,
    cross_bins: &[Range<usize>],
    transforms: &TransformCache,
) -> Result<Vec<Spectra>, P::Error> {
    let transform = transforms.get(plan.segment_frames);
    let accumulator = |_| Accumulator::new(Arc::clone(&transform), cross_bins.to_vec());
    let mut sums: Vec<Accumulator> = (0..channels).map(accumulator).collect();
    let mut collector = Collector::new(plan.clone(), Arc::clone(&transform), channels);
    let mut full: Option<Segment> = None;
    for _ in 0..plan.starts.len() {
        let (filled, ()) = rayon::join(|| fill(passing, &mut collector), || add_segment(&mut sums, full.take()));
        filled?;
        full = collector.next_ready();
    }
    add_segment(&mut sums, full);
    Ok(sums.into_iter().map(Accumulator::finish).collect())
}

/// Streams until the next segment is complete.
fn fill<P: Passing>(passing: &mut P, collector: &mut Collector) -> Result<(), P::Error> {
    while !passing.has_ended() && !collector.is_ready() {
        passing.step(Some(collector))?;
    }
    Ok(())
}

fn add_segment(sums: &mut [Accumulator], segment: Option<Segment>) {
    for (sum, packed) in sums.iter_mut().zip(segment.into_iter().flatten()) {
        sum.add_packed(packed);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn blocks_of_any_number_of_channels_are_bounded() {
        for channels in [0, 1, 2, 256, 257, 65_535] {
            let frames = block_frames(channels);
            assert!(frames >= 1 && frames * channels <= BLOCK_SAMPLES, "{channels} channels: {frames} frames");
        }
        assert_eq!((block_frames(2), block_frames(65_535)), (BLOCK_FRAMES, 64));
    }
}
