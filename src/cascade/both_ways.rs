//! Two passes, forward and then backward, in bounded memory.
//!
//! With h the impulse response of one pass, the two together have its autocorrelation: the
//! gain is |H|^2 and the phase zero at every frequency.
//!
//! # Ends
//! A recording x of N frames is continued at both ends by its own beginning and end, turned
//! about the first and the last sample:
//!
//! ```text
//! x[-k]      = 2 x[0]   - x[k]            k = 1 ... R
//! x[N-1+k]   = 2 x[N-1] - x[N-1-k]        R = ring_frames, or N - 1 if that is less
//! ```
//!
//! and each pass starts in the steady state of the first sample it meets, the forward pass
//! of x\[-R\], the backward pass of what the forward pass made of x\[N-1+R\]. (SciPy's
//! `sosfiltfilt` does the same with `padtype="odd"` and `padlen` R.) So an offset makes no
//! transient, and a linear trend none as long as the recording is at least as long as the
//! filter rings. A tone is at its worst where a sample at its summit is the first one: it is
//! continued by its own negative on an offset of twice its height.
//!
//! One frame is taken for a constant. Two or three are continued by as many less one; however
//! short the recording, as many frames come out as went in.
//!
//! # Blocks
//! The forward pass runs as frames come. The backward pass makes `block_frames` at a time,
//! as soon as the forward pass is `ring_frames` beyond the block's end: it begins there, in the
//! steady state of the sample it finds, and what it does not know of the frames after that
//! has died away in the block, below the rounding of f64. The blocks are counted from the
//! recording's first frame, and from the last one that has so many frames after it on to the
//! end is one more: samples are the same bits however the input is cut.
//!
//! Each channel holds at most `block_frames` + 2 `ring_frames` and a few thousand frames on
//! their way and `ring_frames` + 1 of the input, however long the recording.

use super::group::Strand;
use super::kernel::Width;
use super::{Cascade, Filter};
use std::collections::VecDeque;
use std::sync::Arc;

/// How far the backward pass looks ahead, and how much it makes at a time.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Reach {
    /// Frames after which nothing of an impulse is left in one pass but what is below
    /// the rounding of f64: the tail has fallen by [`RING_FALL_DB`].
    pub ring_frames: usize,
    /// Frames of a block, at least 1.
    pub block_frames: usize,
}

/// Fall of the tail of one pass' impulse response from which on it is lost in the rounding of
/// f64, dB: 1e-17, an eleventh of the unit roundoff.
pub const RING_FALL_DB: f64 = 340.0;

/// Blocks are twice as long as the filter rings, so that three frames of the backward pass
/// give two and two passes take a quarter more than they must; but no shorter than this,
const SHORTEST_BLOCK: usize = 1 << 16;
/// and no longer than this or than the filter rings, whichever is more.
const LONGEST_BLOCK: usize = 1 << 22;

/// Frames that go through a pass before the next ones.
const CHUNK_FRAMES: usize = 4096;

impl Reach {
    /// For a filter that rings for `ring_frames`.
    pub fn new(ring_frames: usize) -> Self {
        let block_frames = ring_frames.saturating_mul(2).clamp(SHORTEST_BLOCK, LONGEST_BLOCK.max(ring_frames));
        Reach { ring_frames, block_frames }
    }

    /// Frames by which what comes out may lag behind what went in, but for the few that sections
    /// on their way hold.
    pub fn lag_frames(&self) -> usize {
        self.block_frames.saturating_add(self.ring_frames).saturating_add(CHUNK_FRAMES)
    }

    /// Bytes that a channel of a recording of `frames` frames takes at most.
    pub fn memory_bytes(&self, frames: u64) -> u64 {
        let at_most = |own: usize| (own as u64).min(frames);
        let extension = at_most(self.ring_frames);
        8 * (at_most(self.lag_frames()) + 2 * extension + 4 * at_most(CHUNK_FRAMES))
    }
}

/// The state of one recording's channels on their way through both passes.
#[derive(Debug)]
pub struct BothWays {
    cascade: Arc<Cascade>,
    reach: Reach,
    /// About how long the recording is, for the memory alone.
    frames: u64,
    tracks: Vec<Track>,
    /// The recording has ended, and what is left are final frames.
    ended: bool,
}

impl BothWays {
    /// Both passes for a recording of `channels` channels and about `frames` frames, which
    /// memory is taken for at once; if it is longer after all, more is taken on the way.
    pub fn new(cascade: Arc<Cascade>, reach: Reach, channels: usize, frames: u64) -> Self {
        let tracks = (0..channels).map(|_| Track::new(&cascade)).collect();
        BothWays { cascade, reach, frames, tracks, ended: false }
    }

    /// Filters a planar block of any length and appends what is ready to `out`: nothing
    /// for about the first [`Reach::lag_frames`] or less, then as many frames as came in. Planes
    /// are those of [`Filter::process`].
    pub fn process(&mut self, input: &[Vec<f64>], out: &mut [Vec<f64>]) {
        debug_assert_eq!(input.len(), self.tracks.len(), "one plane a channel");
        debug_assert_eq!(out.len(), self.tracks.len(), "one output a channel");
        for ((track, input), out) in self.tracks.iter_mut().zip(input).zip(out) {
            track.reserve(self.reach, self.frames);
            for chunk in input.chunks(CHUNK_FRAMES) {
                track.take(&self.cascade, self.reach, chunk);
                track.give(chunk.len(), out);
            }
        }
    }

    /// Appends the rest, at most `most` frames of it, and says whether that was all: then as
    /// many frames have come out as went in, and both passes are as new.
    pub fn finish(&mut self, most: usize, out: &mut [Vec<f64>]) -> bool {
        debug_assert_eq!(out.len(), self.tracks.len(), "one output a channel");
        if !self.ended {
            self.tracks.iter_mut().for_each(|track| track.end(&self.cascade, self.reach));
            self.ended = true;
        }
        for (track, out) in self.tracks.iter_mut().zip(out) {
            track.give(most, out);
        }
        let all = self.tracks.iter().all(|track| track.done == 0);
        if all {
            *self = BothWays::new(Arc::clone(&self.cascade), self.reach, self.tracks.len(), self.frames);
        }
        all
    }
}

/// One channel.
#[derive(Debug)]
struct Track {
    forward: Strand,
    backward: Strand,
    /// The forward pass has its extension behind it.
    begun: bool,
    /// The input's first frames until the forward pass begins, from then on its last ones:
    /// up to `ring_frames` + 1.
    recent: VecDeque<f64>,
    /// Frames of the extension that are still in the forward pass.
    before_first: usize,
    /// `done` final frames, then forward ones.
    frames: VecDeque<f64>,
    done: usize,
    /// What goes through a pass, and what comes out.
    chunk: Vec<f64>,
    passed: Vec<f64>,
}

impl Track {
    fn new(cascade: &Cascade) -> Self {
        let strand = || Strand::new(cascade.groups.len(), Width::Widest);
        Track {
            forward: strand(),
            backward: strand(),
            begun: false,
            recent: VecDeque::new(),
            before_first: 0,
            frames: VecDeque::new(),
            done: 0,
            chunk: Vec::new(),
            passed: Vec::new(),
        }
    }

    /// Takes all the memory that a recording of `frames` frames needs, once.
    fn reserve(&mut self, reach: Reach, frames: u64) {
        if self.recent.capacity() == 0 {
            let at_most = |own: usize| usize::try_from(frames).unwrap_or(usize::MAX).min(own);
            self.recent.reserve_exact(at_most(reach.ring_frames) + at_most(CHUNK_FRAMES));
            self.frames.reserve_exact(at_most(reach.lag_frames()) + at_most(reach.ring_frames) + at_most(CHUNK_FRAMES));
        }
    }

    /// Takes frames of the input and makes every block that can be made.
    fn take(&mut self, cascade: &Cascade, reach: Reach, mut input: &[f64]) {
        let kept = reach.ring_frames.saturating_add(1);
        if !self.begun {
            let (now, later) = input.split_at(input.len().min(kept - self.recent.len()));
            self.recent.extend(now);
            if self.recent.len() < kept {
                return;
            }
            self.begin(cascade);
            input = later;
        }
        self.pass_forward(cascade, input);
        self.recent.extend(input);
        self.recent.drain(..self.recent.len().saturating_sub(kept));
        let ahead = reach.block_frames.saturating_add(reach.ring_frames);
        while self.frames.len() - self.done >= ahead {
            self.pass_backward(cascade, reach.block_frames, ahead);
        }
    }

    /// Hands out final frames, at most `most`.
    fn give(&mut self, most: usize, out: &mut Vec<f64>) {
        let frames = self.done.min(most);
        out.extend(self.frames.drain(..frames));
        self.done -= frames;
    }

    /// The forward pass through the extension and the frames that it was made of.
    fn begin(&mut self, cascade: &Cascade) {
        self.begun = true;
        let Some(&first) = self.recent.front() else { return };
        let recent = std::mem::take(&mut self.recent);
        self.before_first = recent.len() - 1;
        let extension = recent.iter().skip(1).rev().map(|sample| 2.0 * first - sample);
        self.pass_forward_all(cascade, extension);
        self.pass_forward_all(cascade, recent.iter().copied());
        self.recent = recent;
    }

    /// Everything that is still to come of this channel becomes final.
    fn end(&mut self, cascade: &Cascade, reach: Reach) {
        if !self.begun {
            self.begin(cascade);
        }
        let Some(&last) = self.recent.back() else { return };
        let recent = std::mem::take(&mut self.recent);
        let extension = recent.len() - 1;
        self.pass_forward_all(cascade, recent.iter().rev().skip(1).map(|sample| 2.0 * last - sample));
        self.passed.clear();
        self.forward.finish(&cascade.groups, &mut self.passed);
        self.keep_forward();
        // The same blocks as if they had been made on the way: the extension does not count.
        let ahead = reach.block_frames.saturating_add(reach.ring_frames);
        let mut left = self.frames.len() - self.done - extension;
        while left >= ahead {
            self.pass_backward(cascade, reach.block_frames, ahead);
            left -= reach.block_frames;
        }
        self.pass_backward(cascade, left, left + extension);
        self.frames.truncate(self.done);
    }

    fn pass_forward_all(&mut self, cascade: &Cascade, samples: impl Iterator<Item = f64>) {
        let mut samples = samples.peekable();
        let mut chunk = std::mem::take(&mut self.chunk);
        while samples.peek().is_some() {
            chunk.clear();
            chunk.extend(samples.by_ref().take(CHUNK_FRAMES));
            self.pass_forward(cascade, &chunk);
        }
        self.chunk = chunk;
    }

    fn pass_forward(&mut self, cascade: &Cascade, samples: &[f64]) {
        self.passed.clear();
        self.forward.process(&cascade.groups, samples, &mut self.passed);
        self.keep_forward();
    }

    /// Keeps what came out of the forward pass, but for the extension before the first frame.
    fn keep_forward(&mut self) {
        let unneeded = self.before_first.min(self.passed.len());
        self.before_first -= unneeded;
        self.frames.extend(&self.passed[unneeded..]);
    }

    /// The backward pass through the next `ahead` forward frames, of which the first `block`
    /// become final.
    fn pass_backward(&mut self, cascade: &Cascade, block: usize, ahead: usize) {
        let first = self.done;
        self.done += block;
        let (mut read, mut written) = (first + ahead, first + ahead);
        while read > first {
            let from = read.saturating_sub(CHUNK_FRAMES).max(first);
            self.chunk.clear();
            self.chunk.extend(self.frames.range(from..read).rev());
            read = from;
            self.passed.clear();
            self.backward.process(&cascade.groups, &self.chunk, &mut self.passed);
            written = self.keep_backward(written);
        }
        self.passed.clear();
        self.backward.finish(&cascade.groups, &mut self.passed);
        self.keep_backward(written);
    }

    /// Puts what came out of the backward pass in the places before `to` that become final;
    /// the place of its last frame.
    fn keep_backward(&mut self, to: usize) -> usize {
        let from = to - self.passed.len();
        let end = to.min(self.done);
        if from < end {
            let places = self.frames.range_mut(from..end).rev();
            places.zip(&self.passed[to - end..]).for_each(|(place, &sample)| *place = sample);
        }
        from
    }
}

/// A recording's channels on their way through one pass or two.
#[derive(Debug)]
pub enum Passes {
    /// Forward.
    One(Filter),
    /// Forward and backward.
    Two(BothWays),
}

impl Passes {
    /// Two passes with a `reach`, one without, for a recording of `channels` channels and about
    /// `frames` frames.
    pub fn new(cascade: &Arc<Cascade>, reach: Option<Reach>, channels: usize, frames: u64) -> Self {
        match reach {
            Some(reach) => Passes::Two(BothWays::new(Arc::clone(cascade), reach, channels, frames)),
            None => Passes::One(Filter::new(Arc::clone(cascade), channels)),
        }
    }

    /// [`Filter::process`] or [`BothWays::process`].
    pub fn process(&mut self, input: &[Vec<f64>], out: &mut [Vec<f64>]) {
        match self {
            Passes::One(filter) => filter.process(input, out),
            Passes::Two(both) => both.process(input, out),
        }
    }

    /// Appends the rest, of two passes at most `most` frames of it, and says whether that was
    /// all.
    pub fn finish(&mut self, most: usize, out: &mut [Vec<f64>]) -> bool {
        match self {
            Passes::One(filter) => {
                filter.finish(out);
                true
            }
            Passes::Two(both) => both.finish(most, out),
        }
    }
}
