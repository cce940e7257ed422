//! The recording after on the clock of the one before.

use super::Alignment;
use super::kernel::{self, AHEAD, BEHIND, Places, Table};
use std::ops::Range;

/// Brings the recording after onto the clock of the one before, block by block.
///
/// Without a clock difference frames are only moved, by the delay rounded to whole
/// frames (what is left is less than half a frame and constant): samples stay bit for
/// bit. With one they are interpolated, with errors below -110 dB of full scale up to
/// [`reaches_share`](Self::reaches_share) of the rate.
#[derive(Debug)]
pub struct Follower {
    overlap: Range<u64>,
    kind: Kind,
    /// The next frame before that is due.
    next: u64,
    /// Index of the next frame after that comes in.
    taken: u64,
    held: Vec<Vec<f64>>,
    /// Index of the first frame held.
    held_start: u64,
}

#[derive(Clone, Copy, Debug)]
enum Kind {
    /// Frame n before is frame n + shift after.
    Moved {
        shift: i64,
    },
    Interpolated {
        places: Places,
    },
}

impl Follower {
    /// For recordings of these lengths.
    pub fn new(alignment: &Alignment, frames_before: u64, frames_after: u64, channels: usize) -> Self {
        let delay = alignment.delay_frames;
        let slope = alignment.clock_ppm * 1e-6;
        let kind = if slope == 0.0 {
            Kind::Moved { shift: delay.round() as i64 }
        } else {
            Kind::Interpolated { places: Places { delay, slope } }
        };
        let overlap = overlap(kind, frames_before, frames_after);
        let held_start = match kind {
            Kind::Moved { shift } => overlap.start.saturating_add_signed(shift),
            Kind::Interpolated { places } => (places.of(overlap.start).0 - BEHIND as i64).max(0) as u64,
        };
        Self { next: overlap.start, overlap, kind, taken: 0, held: vec![Vec::new(); channels], held_start }
    }

    /// Frames before that have a partner after; empty where the recordings do not overlap.
    /// When interpolated: those of which every sample that makes the partner exists.
    pub fn overlap(&self) -> Range<u64> {
        self.overlap.clone()
    }

    /// Highest share of the sample rate up to which interpolation leaves levels alone,
    /// within 1e-4 dB; 0.5 where samples stay as they are.
    pub fn reaches_share(&self) -> f64 {
        match self.kind {
            Kind::Moved { .. } => 0.5,
            Kind::Interpolated { .. } => kernel::reaches_share(),
        }
    }

    /// Takes the next frames after, from the file's first on, and appends the partners of
    /// the next frames before (from the overlap's first on) to `out`.
    pub fn process(&mut self, after: &[Vec<f64>], out: &mut [Vec<f64>]) {
        let frames = after.iter().map(Vec::len).min().unwrap_or(0) as u64;
        let skipped = self.held_start.saturating_sub(self.taken).min(frames) as usize;
        self.taken += frames;
        match self.kind {
            Kind::Moved { .. } => self.pass_on(after, skipped, frames as usize, out),
            Kind::Interpolated { places } => {
                self.held.iter_mut().zip(after).for_each(|(held, plane)| {
                    held.extend_from_slice(&plane[skipped..frames as usize]);
                });
                self.interpolate(places, out);
            }
        }
    }

    /// Appends the last partners: nothing more comes. Where the recording after was
    /// shorter than promised there are fewer of them than the overlap has frames.
    pub fn finish(&mut self, out: &mut [Vec<f64>]) {
        // Partners leave as soon as their last sample is there, so none is left.
        if let Kind::Interpolated { places } = self.kind {
            self.interpolate(places, out);
        }
    }

    fn pass_on(&mut self, after: &[Vec<f64>], from: usize, to: usize, out: &mut [Vec<f64>]) {
        let due = usize::try_from(self.overlap.end - self.next).unwrap_or(usize::MAX);
        let count = (to - from).min(due);
        for (out, plane) in out.iter_mut().zip(after) {
            out.extend_from_slice(&plane[from..from + count]);
        }
        self.next += count as u64;
    }

    fn interpolate(&mut self, places: Places, out: &mut [Vec<f64>]) {
        let table = Table::get();
        let mut made = 0;
        for (held, out) in self.held.iter().zip(out) {
            let had = out.len();
            kernel::run(table, places, self.next, self.overlap.end, held, self.held_start, out);
            made = (out.len() - had) as u64;
        }
        self.next += made;
        let needed = (places.of(self.next).0 - BEHIND as i64).max(0) as u64;
        let held = self.held.first().map_or(0, Vec::len);
        let done = (needed.saturating_sub(self.held_start) as usize).min(held);
        self.held.iter_mut().for_each(|held| {
            held.drain(..done);
        });
        self.held_start += done as u64;
    }
}

fn overlap(kind: Kind, frames_before: u64, frames_after: u64) -> Range<u64> {
    let after = frames_after as i64;
    // Places never decrease with n, so both ends are where a condition turns.
    let (start, end) = match kind {
        Kind::Moved { shift } => {
            let end = after.saturating_sub(shift).max(0) as u64;
            (shift.min(0).unsigned_abs(), end.min(frames_before))
        }
        Kind::Interpolated { places } => (
            first_where(frames_before, |n| places.of(n).0 >= BEHIND as i64),
            first_where(frames_before, |n| places.of(n).0 + AHEAD as i64 >= after),
        ),
    };
    if start < end { start..end } else { 0..0 }
}

/// The least n below `count` for which `holds`, which from there on holds for ever; else
/// `count`.
fn first_where(count: u64, holds: impl Fn(u64) -> bool) -> u64 {
    let (mut low, mut high) = (0, count);
    while low < high {
        let middle = low + (high - low) / 2;
        if holds(middle) { high = middle } else { low = middle + 1 }
    }
    low
}
