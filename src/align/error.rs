//! Why two recordings can't be laid against each other.

use super::Side;

/// Why recordings can't be laid against each other.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum AlignError {
    /// All samples of one side are 0.
    #[error(
        "{side} is silent: every one of its {frames} frames is 0, expected sound that both recordings hold; \
         check the levels and the channels of that recording"
    )]
    Silent {
        /// Which.
        side: Side,
        /// Its length.
        frames: u64,
    },
    /// All samples of each channel of one side are the same.
    #[error(
        "{side} is constant: none of its {frames} frames differs from the first, expected sound that both recordings \
         hold; check that the device was connected and running"
    )]
    Constant {
        /// Which.
        side: Side,
        /// Its length.
        frames: u64,
    },
    /// Too few frames for any lag.
    #[error(
        "{side} has {frames} frames, expected at least {needed} to find the delay; \
         give a longer recording"
    )]
    TooShort {
        /// Which.
        side: Side,
        /// Its length.
        frames: u64,
        /// The least that would do.
        needed: u64,
    },
    /// The delay that was given leaves no frames in common.
    #[error(
        "a delay of {delay} frames was given, but {side} has {frames} frames, so at most {common} are in common \
         where {needed} are needed; check --delay (positive where AFTER lags) and that the pair belongs together"
    )]
    NoOverlap {
        /// The side that is too short for it.
        side: Side,
        /// The delay, frames.
        delay: f64,
        /// Length of that side.
        frames: u64,
        /// Frames in common.
        common: u64,
        /// The least that would do.
        needed: u64,
    },
    /// No lag stands out.
    #[error(
        "BEFORE and AFTER have nothing in common at delays up to {max_delay_s} s either way: the highest peak of their \
         cross-correlation is {peak:.1} times its root mean square, expected at least {needed} times; \
         check that the pair belongs together, raise --max-delay, or give --delay"
    )]
    NothingInCommon {
        /// Largest delay that was looked at, seconds.
        max_delay_s: f64,
        /// The highest peak over the root mean square of the cross-correlation.
        peak: f64,
        /// What it would have to be.
        needed: f64,
    },
    /// A lag stood out in one place, but the rest of the recordings does not bear it out.
    #[error(
        "BEFORE and AFTER match in {matching} of {sounding} places only, at a delay of {delay:.0} frames, \
         expected at least {needed}; {}", repair(*given)
    )]
    NotBorneOut {
        /// Chunks that match.
        matching: usize,
        /// Chunks in which both sides sound.
        sounding: usize,
        /// How many would have to match.
        needed: usize,
        /// The delay, frames.
        delay: f64,
        /// Whether that was given, not found.
        given: bool,
    },
}

/// What to do where a delay is not borne out.
fn repair(given: bool) -> &'static str {
    if given {
        "check --delay (positive where AFTER lags), or leave it out to have the delay found"
    } else {
        "check that the pair belongs together, raise --max-delay, or give --delay"
    }
}
