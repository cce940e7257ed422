//! Soft starts and ends.

use core::f64::consts::PI;

/// A rise from 0 to 1 over the first frames of a part and its mirror image over the last:
/// `sin^2(pi/2 (n + 1/2)/F)`, n from 0 to F - 1 (a raised cosine, common practice, no
/// source). Neither it nor its slope jumps, so it makes no click.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Fade {
    /// F, frames.
    pub frames: u64,
}

/// Mean square of the rise: the mean of sin^4.
const MEAN_SQUARE: f64 = 3.0 / 8.0;

impl Fade {
    /// Longest, seconds.
    const LONGEST_S: f64 = 0.05;

    /// For parts of which the shortest has `part_frames`: an eighth of it at most.
    pub(super) fn new(rate_hz: u32, part_frames: u64) -> Self {
        let longest = libm::rint(f64::from(rate_hz) * Self::LONGEST_S) as u64;
        Fade { frames: longest.min(part_frames / 8) }
    }

    /// The factor at `frame` of a part of `part_frames`.
    pub(super) fn factor(self, frame: u64, part_frames: u64) -> f64 {
        let from_end = frame.min(part_frames.saturating_sub(1).saturating_sub(frame));
        if from_end >= self.frames {
            return 1.0;
        }
        let sine = libm::sin(0.5 * PI * (from_end as f64 + 0.5) / self.frames as f64);
        sine * sine
    }

    /// Share of a steady sound's energy that is left in a part of `part_frames`.
    pub(super) fn share(self, part_frames: u64) -> f64 {
        1.0 - 2.0 * self.frames as f64 * (1.0 - MEAN_SQUARE) / part_frames.max(1) as f64
    }
}
