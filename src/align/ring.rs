//! The last frames of a signal.

use std::collections::VecDeque;

/// The last frames of a signal: a fixed number of them and the last block.
#[derive(Debug)]
pub(super) struct Ring {
    kept: usize,
    samples: VecDeque<f32>,
    end: u64,
}

impl Ring {
    /// Keeps at least `kept` frames before the last block; memory grows as they come.
    pub(super) fn new(kept: usize) -> Self {
        Self { kept, samples: VecDeque::new(), end: 0 }
    }

    /// Appends a block and forgets frames that are no longer kept.
    pub(super) fn push(&mut self, block: &[f32]) {
        // Before the block, so that memory holds one at a time.
        let spare = self.samples.len().saturating_sub(self.kept);
        self.samples.drain(..spare);
        self.samples.extend(block);
        self.end += block.len() as u64;
    }

    /// Frames that are kept before the last block.
    pub(super) fn kept(&self) -> usize {
        self.kept
    }

    /// Index of the first frame that is still here.
    pub(super) fn start(&self) -> i64 {
        self.end as i64 - self.samples.len() as i64
    }

    /// Index after the last frame.
    pub(super) fn end(&self) -> i64 {
        self.end as i64
    }

    /// A copy of `count` frames from `from` on; zero where there are none.
    pub(super) fn copy(&self, from: i64, count: usize) -> Vec<f32> {
        let first = from.clamp(self.start(), self.end());
        let last = from.saturating_add(count as i64).clamp(first, self.end());
        let [skipped, to] = [first, last].map(|frame| (frame - self.start()) as usize);
        let mut copy = Vec::with_capacity(count);
        copy.resize(((first - from).max(0) as usize).min(count), 0.0);
        let (one, two) = self.samples.as_slices();
        let part = |slice: &[f32], offset: usize| {
            let [from, to] = [skipped, to].map(|place| place.saturating_sub(offset).min(slice.len()));
            from..to
        };
        copy.extend_from_slice(&one[part(one, 0)]);
        copy.extend_from_slice(&two[part(two, one.len())]);
        copy.resize(count, 0.0);
        copy
    }
}
