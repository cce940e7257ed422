//! Chunks that describe samples and no longer tell the truth once those change.

use std::io::{Read, Seek};

use super::chunks::Span;
use super::error::WaveError;
use super::source::Source;
use super::{Chunk, Form, Header};

/// Bytes looked at for a word in a chunk of text.
const SCANNED_BYTES: u64 = 1 << 18;

/// Whether a `bext` chunk is of version 2 or later with a loudness figure set (EBU
/// Tech 3285 v2: version at 346, five figures of 16 bits at 412, 0x7fff for none;
/// all zero bytes are left by writers that never measured).
fn has_loudness<R: Read + Seek>(source: &mut Source<R>, span: &Span, form: Form) -> Result<bool, WaveError> {
    if span.bytes < 422 {
        return Ok(false);
    }
    let number = if form.is_big_endian() { u16::from_be_bytes } else { u16::from_le_bytes };
    let version = source.array_at::<2>(span.body() + 346)?.map_or(0, number);
    let Some(figures) = source.array_at::<10>(span.body() + 412)? else {
        return Ok(false);
    };
    let (figures, _) = figures.as_chunks::<2>();
    Ok(version >= 2 && figures.iter().any(|&figure| !matches!(number(figure), 0 | 0x7fff)))
}

/// Whether a chunk of text holds `word` (lower case) in any case, in bytes or in UTF-16.
fn speaks_of<R: Read + Seek>(source: &mut Source<R>, span: &Span, word: &[u8]) -> Result<bool, WaveError> {
    let mut text = vec![0; span.bytes.min(SCANNED_BYTES) as usize];
    source.read_at(span.body(), &mut text, "reading a chunk of text")?;
    text.retain(|&byte| byte != 0);
    Ok(text.windows(word.len()).any(|part| part.eq_ignore_ascii_case(word)))
}

/// What a chunk gives of the samples and will give of samples that are gone; `None` for
/// one that stays right whatever becomes of them.
///
/// `fact` and everything that gives positions (`cue `, `smpl`, markers, time stamps)
/// stays right, since the number of frames and the sample rate do. Sources: EBU Tech 3285
/// with supplements 2 (`qlty`) and 3 (`levl`), ITU-R BS.2076 (`axml`); the others are
/// common practice, no source.
pub(crate) fn gives<R: Read + Seek>(
    source: &mut Source<R>,
    span: &Span,
    form: Form,
) -> Result<Option<&'static str>, WaveError> {
    let when = |holds: bool, what| holds.then_some(what);
    Ok(match &span.id {
        b"PEAK" => Some("the peaks"),
        b"levl" => Some("the peak envelope"),
        b"qlty" => Some("the quality report"),
        b"MD5 " => Some("the checksum"),
        b"C2PA" => Some("the signed checksum"),
        b"dbmd" => Some("the loudness"),
        b"bext" => when(has_loudness(source, span, form)?, "the loudness"),
        b"iXML" | b"axml" => when(speaks_of(source, span, b"loudness")?, "the loudness"),
        b"ID3 " | b"id3 " => when(speaks_of(source, span, b"replaygain")?, "the loudness"),
        _ => None,
    })
}

/// A sentence for each chunk that was kept as it is although it describes the samples,
/// for recordings whose samples changed.
pub fn stale_chunks(header: &Header) -> Vec<String> {
    let sentence = |&(index, what): &(usize, &'static str)| {
        let chunk: &Chunk = header.chunks.get(index)?;
        Some(format!(
            "chunk `{}` at byte {} was kept and gives {what} of the samples before filtering",
            chunk.name(),
            chunk.offset
        ))
    };
    header.stale.iter().filter_map(sentence).collect()
}
