//! Pairs of chunks, the one after cut where the lag is expected.

use super::correlator::{Correlator, Found};
use super::line::steady_slope;
use super::ring::Ring;
use super::slots::Chunk;

/// Clock differences that are looked for before any is known: two cheap recorders differ
/// by at most 200 parts in a million (crystals of 100 each: common practice, no source).
const SLOPE_RANGE: f64 = 400e-6;

/// What is left of that once lags far enough apart are known.
const KNOWN_SLOPE_RANGE: f64 = 40e-6;

/// A chunk of the recording before and what surrounds its place in the one after.
#[derive(Clone, Debug)]
pub(super) struct Piece {
    /// Index of the first frame before.
    pub(super) start: u64,
    /// Frames before.
    pub(super) before: Vec<f32>,
    /// Index of the first frame after; may be negative.
    pub(super) after_start: i64,
    /// Frames after, half a chunk more than before on both sides; zero outside the recording.
    pub(super) after: Vec<f32>,
    /// Its own lag, frames, where that is distinct.
    pub(super) lag: Option<f64>,
    /// Its own lag all the same, and what that may be off by.
    pub(super) rough: Option<(f64, f64)>,
}

impl Piece {
    /// The middle of the chunk before, frames.
    pub(super) fn middle(&self) -> f64 {
        self.start as f64 + 0.5 * self.before.len() as f64
    }
}

/// Follows the lag from chunk to chunk.
#[derive(Debug)]
pub(super) struct Tracker {
    // Middle of the chunk and lag, frames; the first is the one it started from.
    points: Vec<(f64, f64)>,
    // Index of the first frame after that may be looked at: what the ring holds before
    // depends on the blocks that came.
    floor: i64,
}

impl Tracker {
    /// From a lag at a place in the recording before, both frames. No frame after before
    /// `floor` is looked at.
    pub(super) fn new(place: f64, lag: f64, floor: i64) -> Self {
        Self { points: vec![(place, lag)], floor: floor.max(0) }
    }

    /// The lag and place it started from.
    pub(super) fn origin(&self) -> (f64, f64) {
        self.points.first().copied().unwrap_or_default()
    }

    /// Index after the last frame after that `chunk` needs.
    pub(super) fn needs(&self, chunk: &Chunk) -> i64 {
        let (lag, reach) = self.expected(chunk);
        chunk.start as i64 + lag + reach + 2 * chunk.samples.len() as i64
    }

    /// The lag where it is expected, and how far off it may be.
    fn expected(&self, chunk: &Chunk) -> (i64, i64) {
        let length = chunk.samples.len() as f64;
        let place = chunk.start as f64 + 0.5 * length;
        let distance = |point: &&(f64, f64)| (point.0 - place).abs();
        let nearest = self.points.iter().min_by(|a, b| distance(a).total_cmp(&distance(b)));
        let (near, lag) = nearest.copied().unwrap_or_default();
        let known = steady_slope(&self.points).filter(|_| self.points.len() > 3);
        let range = if known.is_some() { KNOWN_SLOPE_RANGE } else { SLOPE_RANGE };
        let lag = lag + known.unwrap_or(0.0) * (place - near);
        // One transform looks this far either way, so less would save nothing.
        let least = length - 2.0 * super::whitening::ORDER as f64 - 2.0;
        let reach = (0.25 * length + range * (place - near).abs()).max(least);
        (lag.round() as i64, reach as i64)
    }

    /// The pair for `chunk`; `None` where the recording after has no frames there.
    pub(super) fn collect(&mut self, chunk: Chunk, after: &Ring, correlator: &mut Correlator) -> Option<Piece> {
        let (expected, reach) = self.expected(&chunk);
        if self.floor > 0 && chunk.start as i64 + expected - reach - (chunk.samples.len() as i64) < self.floor {
            return None;
        }
        let found: Option<Found> = correlator.search(&chunk, after, expected - reach..=expected + reach);
        let length = chunk.samples.len();
        let own = found.filter(|found| found.distinct).map(|found| found.lag);
        let lag = own.map_or(expected, |lag| lag.round() as i64);
        let from = chunk.start as i64 + lag;
        // A quarter of a chunk may be missing at an end: the window hides half of that.
        let quarter = length as i64 / 4;
        if from + quarter < 0 || from + length as i64 - quarter > after.end() {
            return None;
        }
        let after_start = from - length as i64 / 2;
        let piece = Piece {
            start: chunk.start,
            before: chunk.samples,
            after_start,
            after: after.copy(after_start, 2 * length),
            lag: own,
            rough: found.filter(|found| found.stands_out).map(|found| (found.lag, found.spread)),
        };
        if let Some(lag) = own {
            self.points.push((piece.middle(), lag));
        }
        Some(piece)
    }
}
