//! What `measure` found out about a pair of recordings.

use super::{Db, Finite, Hz, Seconds, schema};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// The recording after, and how it lies against the one before: frame n before belongs
/// to frame `delay_frames + n (1 + clock_ppm 1e-6)` after.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Pair {
    /// Relative to the root of the recordings after, written like `path`.
    #[schemars(schema_with = "schema::path")]
    pub path: String,
    /// SHA-256 of the file, lower-case hexadecimal; null where it was not read to its end.
    #[schemars(schema_with = "schema::sha256_or_null")]
    pub sha256: Option<String>,
    /// Length of the file, bytes.
    pub bytes: u64,
    /// `pcm8`, `pcm16`, `pcm24`, `pcm32`, `float32` or `float64`.
    #[schemars(schema_with = "schema::encoding")]
    pub encoding: String,
    /// Frames of the whole file.
    pub frames: u64,
    /// Runs of samples at full scale; null where it was not read to its end.
    pub full_scale_runs: Option<u64>,
    /// Frames by which the recording after lags at the first frame before; null where the
    /// pair failed. Filters delay, and so this holds their delay where most of
    /// the sound is.
    pub delay_frames: Option<Finite>,
    /// Whether the delay was found or given (`found`, `given`); null where the
    /// pair failed.
    pub delay_source: Option<DelaySource>,
    /// Largest delay that was looked for; null where the delay was given, and where the
    /// pair failed.
    pub max_delay_s: Option<Seconds>,
    /// How much more frames the recording after has for the same time, parts in a
    /// million; 0 where no difference stands out of its own error; null where the pair
    /// failed.
    pub clock_ppm: Option<Finite>,
    /// One standard error of that difference, parts in a million; null where fewer than two
    /// delays were seen.
    pub clock_error_ppm: Option<Finite>,
    /// How far the delays seen along the recording scatter about a straight line, root of
    /// the mean square, seconds; null where fewer than three were seen.
    #[schemars(extend("minimum" = 0))]
    pub delay_scatter_s: Option<Seconds>,
    /// Whether the sign is turned; null where the pair failed.
    pub inverted: Option<bool>,
    /// Frames before that have a partner after; null where the pair failed.
    pub overlap_frames: Option<u64>,
    /// SHA-256 of the recording of the idle device, whose spectrum counts as what the device
    /// adds; null where there was none.
    #[schemars(schema_with = "schema::sha256_or_null")]
    pub noise_sha256: Option<String>,
    /// Gain in the spec's reference band by channel, dB, which counts as 0 dB in all other
    /// figures; null where the spec names none.
    pub reference_gain_db: Option<Vec<Db>>,
    /// Largest deviation, over all channels and all keep and observed bands, of a gain seen
    /// from what the spec's stages would show there, dB, gain seen less gain of the design:
    /// the one that is largest once two standard errors are granted to each; null where the
    /// spec has no stages or no gain was seen.
    pub design_deviation_db: Option<Db>,
    /// One standard error of that gain, dB; null where `design_deviation_db` is.
    pub design_deviation_error_db: Option<Db>,
    /// Center of the sub-band in which that is, Hz; null where `design_deviation_db` is.
    pub design_deviation_at_hz: Option<Hz>,
}

/// Where a delay comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum DelaySource {
    /// Found from the recordings.
    Found,
    /// Given by `--delay`.
    Given,
}
