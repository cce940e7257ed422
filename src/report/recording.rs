//! `recordings`: one entry a recording.

use super::{BandEntry, Db, Finite, Hz, Pair, Seconds, schema};
use crate::wave::ChunkFate;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// One recording.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Recording {
    /// Relative to the input root (in a report of `measure` that of the recordings before), `/`
    /// between components, percent-escaped where not UTF-8.
    #[schemars(schema_with = "schema::path")]
    pub path: String,
    /// Whether it was processed.
    pub status: Status,
    /// Why it failed, a sentence; null for a recording that is done.
    pub error: Option<String>,
    /// What was unusual, each a sentence.
    pub notes: Vec<String>,
    /// The input; null where its header could not be read, or does not tell which sample rate
    /// the spec's frequencies mean.
    pub input: Option<Input>,
    /// The output; null for a failed recording and in a report of `measure`, where nothing
    /// is written (the recording after stands in `pair`).
    pub output: Option<OutputFile>,
    /// Chunks of the input in order.
    pub chunks: Vec<ChunkEntry>,
    /// How spectra were taken; null where none was.
    pub spectrum: Option<SpectrumEntry>,
    /// The recording after in a report of `measure`; null in one of `filter`, and where it
    /// could not be looked at.
    pub pair: Option<Pair>,
    /// Figures and verdicts by channel; empty for a failed recording.
    pub channels: Vec<ChannelEntry>,
}

/// Whether a recording was processed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum Status {
    /// Filtered, measured and written; in a report of `measure` measured with its partner.
    Done,
    /// Not written, or not measured; the error says why.
    Failed,
}

/// The input of a recording; in a report of `measure` the recording before.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Input {
    /// SHA-256 of the file, lower-case hexadecimal; null where it was not read to its end.
    #[schemars(schema_with = "schema::sha256_or_null")]
    pub sha256: Option<String>,
    /// Length of the file, bytes.
    pub bytes: u64,
    /// Sample rate that the spec's frequencies mean, Hz: the header's, unless the recording
    /// is time-expanded and the spec says `rate = "acoustic"`.
    pub rate_hz: u32,
    /// Channels.
    pub channels: u16,
    /// Sample encoding.
    #[schemars(schema_with = "schema::encoding")]
    pub encoding: String,
    /// Frames.
    pub frames: u64,
    /// Length in seconds: frames over `rate_hz`, so that of the sound itself where that is the
    /// acoustic rate.
    #[schemars(extend("minimum" = 0))]
    pub seconds: Seconds,
    /// Runs of samples at full scale; null where it was not read to its end.
    pub full_scale_runs: Option<u64>,
    /// How many times the header's sample rate goes into `rate_hz`: 1 unless the recording is
    /// time-expanded and the spec says `rate = "acoustic"`.
    #[schemars(extend("exclusiveMinimum" = 0))]
    pub time_expansion: Finite,
}

/// The output of a recording.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct OutputFile {
    /// Relative to the output root, written like the recording's `path`.
    #[schemars(schema_with = "schema::path")]
    pub path: String,
    /// SHA-256 of the file, lower-case hexadecimal.
    #[schemars(schema_with = "schema::sha256")]
    pub sha256: String,
    /// Length of the file, bytes.
    pub bytes: u64,
    /// Sample encoding.
    #[schemars(schema_with = "schema::encoding")]
    pub encoding: String,
    /// Largest absolute sample as written, dB relative to full scale (1.0, so a
    /// full-scale sine peaks at 0); null for silence.
    pub peak_dbfs: Option<Db>,
    /// Samples that were saturated.
    pub clipped_samples: u64,
    /// Gain in force, dB: `output.gain_db`, or what `overload = "scale"` came to. In full,
    /// not rounded, so that the output can be made again from it.
    pub gain_db: Finite,
}

/// A chunk of the input.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ChunkEntry {
    /// Four bytes as characters; `%` and bytes outside printable ASCII as `%XX`.
    #[schemars(schema_with = "schema::chunk_id")]
    pub id: String,
    /// Bytes of its body.
    pub bytes: u64,
    /// Whether it stands in the output byte for byte.
    pub kept: bool,
}

/// How a recording's spectra were taken.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct SpectrumEntry {
    /// Window function: the 4-term Blackman-Harris window.
    #[schemars(extend("const" = "blackman-harris-4"))]
    pub window: String,
    /// Length of a segment, frames.
    #[schemars(range(min = 1))]
    pub segment_frames: usize,
    /// Segments averaged.
    pub segments: usize,
    /// Distance of two bins, Hz.
    pub bin_hz: Hz,
    /// Seconds left out at the start. Where the design has two passes, its `settling_s` is left
    /// out at the end as well.
    #[schemars(extend("minimum" = 0))]
    pub skipped_s: Seconds,
}

/// Figures of one channel.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ChannelEntry {
    /// Number of the channel, 1 for the first.
    #[schemars(range(min = 1))]
    pub channel: u16,
    /// The bands in the spec's order.
    pub bands: Vec<BandEntry>,
}

impl Recording {
    /// A recording that could not be processed: no output, no figures.
    pub fn failed(path: impl Into<String>, error: impl Into<String>) -> Self {
        Recording {
            path: path.into(),
            status: Status::Failed,
            error: Some(error.into()),
            notes: Vec::new(),
            input: None,
            output: None,
            chunks: Vec::new(),
            spectrum: None,
            pair: None,
            channels: Vec::new(),
        }
    }
}

impl ChunkEntry {
    /// The entry for the chunk named by `id`.
    pub fn new(id: [u8; 4], bytes: u64, kept: bool) -> Self {
        let printable = |byte: &u8| (b' '..=b'~').contains(byte) && *byte != b'%';
        let id = id
            .iter()
            .map(|byte| if printable(byte) { char::from(*byte).to_string() } else { format!("%{byte:02X}") })
            .collect();
        ChunkEntry { id, bytes, kept }
    }
}

impl From<&ChunkFate> for ChunkEntry {
    fn from(fate: &ChunkFate) -> Self {
        ChunkEntry::new(fate.id, fate.bytes, fate.kept)
    }
}

impl SpectrumEntry {
    /// Spectra of `segments` segments of `segment_frames` frames, the first
    /// `skipped_frames` left out; `None` for segments of no frames.
    pub fn new(rate_hz: u32, segment_frames: usize, segments: usize, skipped_frames: u64) -> Option<Self> {
        Some(SpectrumEntry {
            window: "blackman-harris-4".to_owned(),
            segment_frames,
            segments,
            bin_hz: Hz::new(f64::from(rate_hz) / segment_frames as f64)?,
            skipped_s: Seconds::of_frames(skipped_frames, rate_hz),
        })
    }
}
