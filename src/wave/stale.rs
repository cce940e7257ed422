//! Chunks that describe samples and no longer tell the truth once those change.

use std::io::{Read, Seek};

use super::chunks::Span;
use super::error::WaveError;
use super::source::Source;
use super::{Chunk, Header};

/// Whether a `bext` chunk is of version 2 or later with a loudness figure set (EBU
/// Tech 3285 v2: version at 346, five figures of 16 bits at 412, 0x7fff for none;
/// all zero bytes are left by writers that never measured).
pub(crate) fn has_loudness<R: Read + Seek>(source: &mut Source<R>, span: &Span) -> Result<bool, WaveError> {
    if span.id != *b"bext" || span.bytes < 422 {
        return Ok(false);
    }
    let version = source.array_at::<2>(span.body() + 346)?.map_or(0, u16::from_le_bytes);
    let Some(figures) = source.array_at::<10>(span.body() + 412)? else {
        return Ok(false);
    };
    let (figures, _) = figures.as_chunks::<2>();
    Ok(version >= 2 && figures.iter().any(|&f| !matches!(i16::from_le_bytes(f), 0 | 0x7fff)))
}

/// A sentence for each chunk that was kept as it is although it describes the
/// samples, for recordings whose samples changed. `fact` and everything that gives
/// positions (`cue `, `smpl`, time stamps) stays right, since the number of frames
/// and the sample rate do.
pub fn stale_chunks(header: &Header) -> Vec<String> {
    let sentence = |chunk: &Chunk, what: &str| {
        format!(
            "chunk `{}` at byte {} was kept and gives {what} of the samples before filtering",
            chunk.name(),
            chunk.offset
        )
    };
    let about = |chunk: &Chunk| match &chunk.id {
        b"PEAK" => Some("the peaks"),
        b"levl" => Some("the peak envelope"),
        b"MD5 " => Some("the checksum"),
        b"dbmd" => Some("the loudness"),
        b"bext" if header.bext_loudness => Some("the loudness"),
        _ => None,
    };
    header.chunks.iter().filter_map(|chunk| about(chunk).map(|what| sentence(chunk, what))).collect()
}
