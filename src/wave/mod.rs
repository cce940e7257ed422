//! The WAV container: bytes to samples and back, the output as the input with the
//! samples of `data` replaced.
//!
//! [`Reader`] walks the chunks, decodes samples in blocks and hashes every byte of
//! the file in the same pass. [`Writer`] writes the same file with other samples:
//! every other chunk byte for byte and in order, `fmt ` included while the sample
//! format stays.
//!
//! Read and written back in the same form: RIFF, RIFX (big-endian), RF64 and BW64
//! (64-bit sizes in `ds64`); with 8-bit unsigned and 16, 24, 32-bit signed PCM, 32 and
//! 64-bit IEEE float, under their plain format tags or the extensible one, also with fewer
//! valid bits than the container has. Valid bits stand in the upper part of the
//! container; a recording that puts them into the lower part is refused. Decoding
//! takes the whole container, full scale 2^(bits - 1), so that decoding and encoding
//! alone give back the same bytes, bits below the valid ones included; rounding to
//! valid bits is [`crate::output`]'s matter.
//!
//! In memory a recording costs one block of bytes, whatever its length, and a damaged one
//! up to 3 MiB more while it is opened.
//!
//! # Sizes
//!
//! The file's length is the truth, and sizes written in it are claims. Where they disagree
//! and no guess is needed, the recording is read, the output gets right sizes, and
//! [`Header::notes`] gives both figures; else [`WaveError`] names the place.
//! - `data` that declares 0 or 0xffffffff bytes or more than there are (power loss): whole
//!   frames up to the end of the file.
//! - Chunks that follow one another from a known name to the end of the file show where
//!   what stands before them ends, whatever its size says: samples never swallow them.
//! - RIFF and `data` sizes that both went past 32 bits and began again at 0.
//! - Bytes after `data` that are no chunk may be samples or not: carried over, and the note
//!   gives the size they would ask for. With chunks after them the recording fails.
//! - Padding is taken as it comes and kept: a missing pad byte, one that is not zero, one
//!   that is counted in its chunk's size.
//! - `fmt ` after `data`; order stays.
//!
//! Refused by name: a second `data` or `fmt `, `wavl` and `slnt`, files joined in one.
//!
//! # Beyond 4 GiB
//!
//! A RIFF output longer than [`RIFF_LIMIT_BYTES`] becomes RF64. A `JUNK` of at least 28
//! bytes that stands first is turned into the `ds64`, so that nothing moves; without one a
//! `ds64` is put in. RF64 and BW64 stay what they are, however short they get. Their `ds64`
//! stays byte for byte while its sizes are right; its frame count is never trusted, and
//! set right only where `ds64` is written anew. RIFX has no 64-bit form: an output too long
//! for it fails. No source says in which byte order the GUID of an extensible RIFX stands:
//! both are read, and the one found is kept.
//!
//! # Metadata
//!
//! What a recording says of itself stays byte for byte, but for what [`History`] appends
//! where that is asked for; [`stale_chunks`] names what no longer tells the truth. A `guan`
//! chunk may say that the header's rate is not the one at which sound was sampled:
//! [`Reader::open_as`] settles which of them [`Header::rate_hz`] is.
//!
//! Sources: Multimedia Programming Interface and Data Specifications 1.0 (1991),
//! Multiple Channel Audio Data and WAVE Files (Microsoft), EBU Tech 3285 v2 (2011), EBU
//! Tech 3306 v1.1 (2009), ITU-R BS.2088.

mod chunks;
mod codec;
mod data_size;
mod ds64;
mod error;
mod figures;
mod form;
mod format;
mod guano;
mod history;
mod padding;
mod plan;
mod read_back;
mod reader;
mod sizes;
mod source;
mod stale;
mod tail;
mod walk;
mod writer;

use crate::files::digest::hexadecimal as hex;
pub use error::WaveError;
pub(crate) use figures::{UlpPower, rounding_power};
pub use guano::{BadField, Guano, RateMeaning};
pub use history::History;
pub use read_back::reads_back;
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

/// Longest file with 32-bit sizes: a size field holds at most `0xffff_fffe` (`0xffff_ffff`
/// is what unfinished files and 64-bit relatives write) and does not count its own chunk
/// header of 8 bytes.
pub const RIFF_LIMIT_BYTES: u64 = 0xffff_fffe + 8;

/// The form of a file: byte order and width of its sizes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    /// Little-endian, 32-bit sizes.
    Riff,
    /// Big-endian, 32-bit sizes.
    Rifx,
    /// Little-endian, 64-bit sizes in `ds64` (EBU Tech 3306).
    Rf64,
    /// The same under its later name (ITU-R BS.2088).
    Bw64,
}

/// What the output has that the input has not, besides its samples.
#[derive(Clone, Debug, PartialEq)]
pub struct Changes {
    /// How samples are stored.
    pub format: SampleFormat,
    /// A RIFF output longer than this, bytes after its last chunk not counted, becomes RF64,
    /// and a RIFX one fails; [`RIFF_LIMIT_BYTES`] but in tests.
    pub riff_limit_bytes: u64,
    /// What is to be appended to the recording's own metadata.
    pub history: Option<History>,
}

impl Changes {
    /// Other samples in `format`, nothing else.
    pub fn samples(format: SampleFormat) -> Self {
        Changes { format, riff_limit_bytes: RIFF_LIMIT_BYTES, history: None }
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
    /// Byte order and width of sizes.
    pub form: Form,
    /// Channels, at least 1.
    pub channels: u16,
    /// Sample rate that frequencies and times mean, at least 1 Hz: the header's, or that at
    /// which a time-expanded recording was sampled ([`Reader::open_as`]).
    pub rate_hz: u32,
    /// Sample rate that `fmt ` states and keeps, at least 1 Hz.
    pub header_rate_hz: u32,
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
    /// Chunks that describe the samples, by their place in [`Self::chunks`], and what they
    /// give of them.
    pub stale: Vec<(usize, &'static str)>,
    /// What a `guan` chunk says of the sample rate; `None` without one.
    pub guano: Option<Guano>,
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
    /// First byte of its samples.
    pub data_offset: u64,
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
