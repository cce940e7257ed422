//! The WAV container: bytes to samples and back, the output as the input with the
//! samples of `data` replaced.
//!
//! [`Reader`] walks the chunks, decodes samples in blocks and hashes every byte of
//! the file in the same pass. [`Writer`] writes the same file with other samples:
//! every other chunk byte for byte and in order, `fmt ` included while the sample
//! format stays.
//!
//! Read: RIFF/WAVE with 8-bit unsigned and 16, 24, 32-bit signed PCM, 32 and 64-bit
//! IEEE float, under their plain format tags or the extensible one, also with fewer
//! valid bits than the container has. Valid bits stand in the upper part of the
//! container; a recording that puts them into the lower part is refused. Decoding
//! takes the whole container, full scale 2^(bits - 1), so that decoding and encoding
//! alone give back the same bytes, bits below the valid ones included; rounding to
//! valid bits is [`crate::output`]'s matter.
//!
//! In memory a recording costs one block of bytes, whatever its length.
//!
//! Damage that leaves whole frames is repaired in the output and noted in
//! [`Header::notes`]: sizes that are not those of the file (after a power loss `data`
//! often declares 0 or 0xffffffff bytes). Padding is taken as it comes: a missing
//! pad byte, one that is not zero, one that is counted in its chunk's size.
//!
//! Sources: Multimedia Programming Interface and Data Specifications 1.0 (1991),
//! Multiple Channel Audio Data and WAVE Files (Microsoft), EBU Tech 3285 v2 (2011).

mod chunks;
mod codec;
mod error;
mod figures;
mod format;
mod padding;
mod plan;
mod reader;
mod source;
mod stale;
mod writer;

use crate::files::digest::hexadecimal as hex;
pub use error::WaveError;
pub(crate) use figures::{UlpPower, rounding_power};
pub use reader::Reader;
pub use stale::stale_chunks;
pub use writer::Writer;

/// Bytes that pass at once: small enough for the inner caches, large enough that
/// system calls cost nothing.
pub(crate) const BLOCK_BYTES: usize = 1 << 16;

/// How one sample is stored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct SampleFormat {
    /// Type and container width.
    pub encoding: Encoding,
    /// Bits that carry signal, left-justified in the container; equal to the
    /// container's width for most files and for floats.
    pub valid_bits: u16,
}

/// Sample type and container width.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Encoding {
    /// Unsigned, middle at 128.
    Pcm8,
    Pcm16,
    Pcm24,
    Pcm32,
    Float32,
    Float64,
}

impl Encoding {
    /// The name in spec and report.
    pub fn name(self) -> &'static str {
        match self {
            Encoding::Pcm8 => "pcm8",
            Encoding::Pcm16 => "pcm16",
            Encoding::Pcm24 => "pcm24",
            Encoding::Pcm32 => "pcm32",
            Encoding::Float32 => "float32",
            Encoding::Float64 => "float64",
        }
    }
}

/// One chunk of the file other than the RIFF header, in file order.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Chunk {
    /// Four bytes, as in the file.
    pub id: [u8; 4],
    /// Where its id stands, bytes from the start of the file.
    pub offset: u64,
    /// Bytes of its body as found in the file, padding not counted.
    pub bytes: u64,
}

impl Chunk {
    /// The id as text: printable characters as they are, others as `\\x00`.
    pub fn name(&self) -> String {
        self.id.escape_ascii().to_string()
    }
}

/// What the header says about a recording.
#[derive(Clone, Debug, PartialEq)]
pub struct Header {
    /// Channels, at least 1.
    pub channels: u16,
    /// Sample rate, at least 1 Hz.
    pub rate_hz: u32,
    /// How samples are stored.
    pub format: SampleFormat,
    /// Frames in `data`.
    pub frames: u64,
    /// Every chunk in order, `fmt ` and `data` included.
    pub chunks: Vec<Chunk>,
    /// First byte of the samples.
    pub data_offset: u64,
    /// Bytes of whole frames.
    pub data_bytes: u64,
    /// Length of the file.
    pub file_bytes: u64,
    /// Whether a `bext` chunk of version 2 carries loudness figures.
    pub bext_loudness: bool,
    /// What was unusual, each a sentence for the report.
    pub notes: Vec<String>,
}

/// What [`Reader`] saw.
#[derive(Clone, Debug, PartialEq)]
pub struct InputFigures {
    /// SHA-256 of the file, lower-case hex.
    pub sha256: String,
    /// Length of the file.
    pub bytes: u64,
    /// Runs of two or more samples of a channel in a row at full scale (either sign):
    /// at least 1 - step for integers, at least 1.0 for floats.
    pub full_scale_runs: u64,
    /// Mean square of the rounding error the samples carry, per channel, full scale
    /// 1.0: step^2/12 (of the valid bits) for integers, for float32
    /// the mean of ulp^2/12 with ulp the spacing of `f32` at each sample, 0 for
    /// float64.
    pub rounding_power: Vec<f64>,
    /// What the samples themselves showed to be unusual, each a sentence for the report.
    pub notes: Vec<String>,
}

/// What [`Writer`] wrote.
#[derive(Clone, Debug, PartialEq)]
pub struct WrittenFigures {
    /// SHA-256 of the output, lower-case hex.
    pub sha256: String,
    /// Length of the output.
    pub bytes: u64,
    /// Every chunk of the input in order, with whether it stands in the output byte
    /// for byte (`data` never counts as kept unless the run is the identity).
    pub chunks: Vec<ChunkFate>,
    /// What was changed besides the samples, each a sentence for the report.
    pub notes: Vec<String>,
}

/// What became of one chunk.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ChunkFate {
    /// Four bytes, as in the file.
    pub id: [u8; 4],
    /// Bytes of its body in the input.
    pub bytes: u64,
    /// Whether it stands in the output byte for byte.
    pub kept: bool,
}
