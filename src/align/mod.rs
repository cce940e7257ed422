//! How two recordings of the same sound lie against each other: delay, clock, polarity.
//!
//! [`Finder`] reads both once and says by how much the recording after lags, how its
//! clock differs and whether its sign is turned; [`Follower`] then brings it onto the
//! clock of the recording before.
//!
//! # Method
//! 1. From each of 24 stretches of the recording before the liveliest chunk is kept
//!    (about a sixth of a second).
//! 2. One of them is looked for at all delays: cross-correlation after both sides are
//!    whitened by short prediction filters, so that a line or a steep spectrum makes the
//!    peak neither periodic nor broad.
//! 3. The others are looked for where the lag is expected, which follows the clock.
//! 4. The averaged cross-spectrum of all chunks, each aligned, gives the delay: the
//!    extremum of largest magnitude of its transform, phases alone, weighted by coherence
//!    (C. H. Knapp and G. C. Carter, IEEE Trans. ASSP 24, 1976).
//! 5. Each chunk's cross-spectrum against the sum of the others' gives its lag beyond the
//!    line, without what a filter between both sides does to phases; a straight line
//!    through these is the clock, what is left is the scatter.
//!
//! # Conventions
//! Lags are frames, positive where the recording after is later. Channels are mixed with
//! fixed weights that are all different. Memory is bounded by the largest delay.
// Lags are figures, not samples: their last bits may differ between machines, as those of
// the transforms do anyway. What makes samples (`kernel`, `follower`) uses `libm` alone.
#![allow(clippy::disallowed_methods)]

mod climb;
mod correlator;
mod error;
mod finder;
mod follower;
mod kernel;
mod lags;
mod line;
mod mean;
mod measure;
mod mixer;
mod notes;
mod peaks;
mod ring;
mod slots;
mod spectra;
mod track;
mod whitening;

pub use error::AlignError;
pub use finder::Finder;
pub use follower::Follower;

use std::fmt;

/// How the note begins of a delay beside which another fits as well.
pub const AMBIGUOUS_DELAY: &str = "the delay is ambiguous";

/// What is looked for.
#[derive(Clone, Debug, PartialEq)]
pub struct Search {
    /// Sample rate of both, Hz.
    pub rate_hz: u32,
    /// Channels of both.
    pub channels: usize,
    /// Frames of the recording before.
    pub frames_before: u64,
    /// Frames of the recording after.
    pub frames_after: u64,
    /// Largest delay either way, seconds.
    pub max_delay_s: f64,
    /// The delay, where it is known, frames: then only polarity and clock are looked for.
    pub given_frames: Option<f64>,
}

/// How the recording after lies against the one before: frame n before belongs to frame
/// `delay_frames + n (1 + clock_ppm 1e-6)` after.
#[derive(Clone, Debug, PartialEq)]
pub struct Alignment {
    /// Frames by which the recording after lags at the first frame before; negative
    /// where it leads.
    pub delay_frames: f64,
    /// How many more frames the recording after has for the same time, parts in a
    /// million; exactly 0 where no difference stands out of its error by three standard
    /// errors, or where it moves the lag by less than a thousandth of a frame.
    pub clock_ppm: f64,
    /// One standard error of the clock difference, parts in a million; `None` where fewer
    /// than two lags were seen.
    pub clock_error_ppm: Option<f64>,
    /// Whether the sign is turned.
    pub inverted: bool,
    /// Root mean square of the lags about the straight line, seconds; `None` where fewer
    /// than three were seen.
    pub scatter_s: Option<f64>,
    /// Whether the delay was given, or borne out by most of the recordings and no other fits
    /// as well.
    pub certain: bool,
    /// Sentences for the report's notes (an ambiguous delay with the other candidate, ...).
    pub notes: Vec<String>,
}

/// One of the two recordings.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// The excitation.
    Before,
    /// What came out of the device.
    After,
}

impl fmt::Display for Side {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(match self {
            Side::Before => "BEFORE",
            Side::After => "AFTER",
        })
    }
}
