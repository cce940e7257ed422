//! Gathers samples before and after into segments while a recording streams past.
//!
//! Segments overlap, so a few are open at a time. One that is complete is handed out
//! and transformed while the next fills: one long recording keeps two cores busy.

use crate::spectrum::{Packed, SegmentPlan, Transform};
use std::collections::VecDeque;
use std::ops::Range;
use std::sync::Arc;

/// A segment, a buffer a channel.
pub type Segment = Vec<Packed>;

/// Segments of a plan that hold a sample at the same time, at most: they overlap by half
/// or, where a few are spread over little, by up to two thirds.
pub const OPEN_AT_ONCE: usize = 3;

/// Fills one segment after another.
#[derive(Debug)]
pub struct Collector {
    plan: SegmentPlan,
    transform: Arc<Transform>,
    /// Segments being filled; the first is number `done` of the plan.
    open: VecDeque<Segment>,
    done: usize,
    /// The next frame of which both sides will come.
    position: u64,
    /// Frames as read, from `position` on, of which what is written has not come yet.
    ahead: Vec<VecDeque<f64>>,
    /// The first of them, on their way to the segments.
    late: Vec<Vec<f64>>,
}

impl Collector {
    /// For a recording with `channels` channels whose first sample is about to come.
    pub fn new(plan: SegmentPlan, transform: Arc<Transform>, channels: usize) -> Self {
        let (ahead, late) = (vec![VecDeque::new(); channels], vec![Vec::new(); channels]);
        Collector { plan, transform, open: VecDeque::new(), done: 0, position: 0, ahead, late }
    }

    /// Takes the next frames as read and as written. The written ones may lag behind,
    /// never run ahead; frames that no segment holds are dropped.
    pub fn take(&mut self, before: &[Vec<f64>], after: &[Vec<f64>]) {
        let length = |planes: &[Vec<f64>]| planes.first().map_or(0, Vec::len);
        let late = self.ahead.first().map_or(0, VecDeque::len).min(length(after));
        let fresh = length(before).min(length(after) - late);
        let mut first = std::mem::take(&mut self.late);
        for (first, ahead) in first.iter_mut().zip(&mut self.ahead) {
            first.clear();
            first.extend(ahead.drain(..late));
        }
        self.pair(&first, 0..late, after, 0);
        self.pair(before, 0..fresh, after, late);
        self.late = first;
        for (ahead, before) in self.ahead.iter_mut().zip(before) {
            let more = &before[fresh..];
            // Where the filter runs both ways this is most of the memory: not twice as much.
            if ahead.capacity() < ahead.len() + more.len() {
                ahead.reserve_exact(more.len() + ahead.len() / 4);
            }
            ahead.extend(more);
        }
    }

    /// Takes the frames `range` of `before` with as many of `after` from `offset` on.
    fn pair(&mut self, before: &[Vec<f64>], range: Range<usize>, after: &[Vec<f64>], offset: usize) {
        let from = self.position;
        let to = from + range.len() as u64;
        self.position = to;
        while self.plan.starts.get(self.done + self.open.len()).is_some_and(|&start| start < to) {
            self.open.push_back(before.iter().map(|_| Packed::new(&self.transform)).collect());
        }
        for (segment, &start) in self.open.iter_mut().zip(&self.plan.starts[self.done..]) {
            let end = start + self.plan.segment_frames as u64;
            // Both differences are at most the length of the range.
            let first = (start.clamp(from, to) - from) as usize;
            let last = (end.clamp(from, to) - from) as usize;
            for ((packed, before), after) in segment.iter_mut().zip(before).zip(after) {
                let before = &before[range.start + first..range.start + last];
                packed.take(before, &after[offset + first..offset + last]);
            }
        }
    }

    /// Whether the next segment of the plan has all its frames on both sides.
    pub fn is_ready(&self) -> bool {
        self.open.front().is_some_and(|segment| segment.iter().all(Packed::is_full))
    }

    /// Hands out the next segment of the plan, if it is ready.
    pub fn next_ready(&mut self) -> Option<Segment> {
        if !self.is_ready() {
            return None;
        }
        self.done += 1;
        self.open.pop_front()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spectrum::window::blackman_harris;
    use num_complex::Complex64;
    use proptest::prelude::*;

    proptest! {
        /// Every segment holds the frames its plan names, whatever the block lengths
        /// and however far one side runs ahead.
        #[test]
        fn segments_hold_their_frames(
            blocks in prop::collection::vec(1usize..40, 20..60),
            lag in 0usize..20,
            first in 0u64..50,
            hop in 1u64..32,
        ) {
            let total: usize = blocks.iter().sum();
            let length = 32usize;
            let starts: Vec<u64> = (0..).map(|i| first + i * hop)
                .take_while(|start| start + length as u64 <= total as u64).collect();
            let window = blackman_harris(length);
            let expected: Vec<Vec<Complex64>> = starts.iter().map(|&start| {
                (0..length).map(|n| {
                    let sample = (start + n as u64) as f64;
                    Complex64::new(sample * window[n], -sample * window[n])
                }).collect()
            }).collect();
            let plan = SegmentPlan { segment_frames: length, starts };
            let mut collector = Collector::new(plan, Transform::new(length), 2);
            let ramp = |range: std::ops::Range<usize>, sign: f64| -> Vec<Vec<f64>> {
                (0..2).map(|_| range.clone().map(|n| sign * n as f64).collect()).collect()
            };
            let mut seen = Vec::new();
            let (mut before, mut after) = (0, 0);
            let mut drain = |collector: &mut Collector| {
                while let Some(segment) = collector.next_ready() {
                    let channels: Vec<_> = segment.into_iter().map(Packed::into_frames).collect();
                    assert_eq!(channels[0], channels[1]);
                    seen.push(channels[0].clone());
                }
            };
            for frames in blocks {
                let ready = (before + frames).saturating_sub(lag).max(after);
                collector.take(&ramp(before..before + frames, 1.0), &ramp(after..ready, -1.0));
                (before, after) = (before + frames, ready);
                drain(&mut collector);
            }
            collector.take(&ramp(0..0, 1.0), &ramp(after..total, -1.0));
            drain(&mut collector);
            prop_assert_eq!(seen, expected);
        }
    }
}
