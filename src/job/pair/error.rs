//! Why a pair can't be measured.

use super::super::Interrupted;
use super::super::noise::NoiseError;
use crate::align::AlignError;
use crate::wave::WaveError;

/// Why a pair can't be measured.
#[derive(Debug, thiserror::Error)]
pub enum PairError {
    /// The recording before can't be read.
    #[error("before: {0}")]
    Before(WaveError),
    /// The recording after can't be read.
    #[error("after: {0}")]
    After(WaveError),
    /// The recording after is none of the one before.
    #[error(
        "the recording before has {before}, the one after {after}: a pair must agree in {what}; \
         record or export one of them again"
    )]
    Unlike {
        /// `sample rate`, `number of channels` or `length`.
        what: &'static str,
        /// Figure with unit.
        before: String,
        /// Figure with unit.
        after: String,
    },
    /// They can't be laid against each other.
    #[error(transparent)]
    Align(#[from] AlignError),
    /// They share no time.
    #[error(
        "with a delay of {delay_frames} frames nothing of the recording after ({frames_after} frames) belongs to the \
         one before ({frames_before} frames): check --delay, or record until the device has played everything"
    )]
    NoOverlap {
        /// The delay.
        delay_frames: f64,
        /// Length before.
        frames_before: u64,
        /// Length after.
        frames_after: u64,
    },
    /// The gain that is to count as 0 dB can't be seen.
    #[error(
        "the reference band `{band}` holds nothing that stands out of its floor in channel {channel}, so there is no \
         gain to refer to: choose another reference_band, or a louder excitation"
    )]
    NoReference {
        /// Name of the band.
        band: String,
        /// 1 for the first.
        channel: usize,
    },
    /// The user asked for an end.
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
    /// The idle device's recording does not serve.
    #[error(transparent)]
    Noise(#[from] NoiseError),
}
