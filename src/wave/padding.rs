//! Where the next chunk begins, in files whose padding does not follow the rules.

use std::io::{Read, Seek};

use super::chunks::MAX_CHUNKS;
use super::ds64::Sizes;
use super::error::WaveError;
use super::source::Source;

/// Ids worth trusting where padding leaves two places for the next chunk: RIFF/WAVE
/// 1991, EBU Tech 3285 with supplements, EBU Tech 3306, ITU-R BS.2088, AES46, iXML,
/// GUANO, and fillers seen in the field (common practice, no source).
pub(crate) const KNOWN_IDS: [&[u8; 4]; 36] = [
    b"fmt ", b"data", b"fact", b"LIST", b"list", b"cue ", b"plst", b"smpl", b"inst", b"wavl", b"slnt", b"DISP",
    b"PEAK", b"bext", b"mext", b"levl", b"link", b"qlty", b"axml", b"chna", b"umid", b"cart", b"ds64", b"r64m",
    b"iXML", b"guan", b"wamd", b"dbmd", b"JUNK", b"junk", b"PAD ", b"FLLR", b"MD5 ", b"ID3 ", b"id3 ", b"acid",
];

/// How sure a chunk begins at a place.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) enum Trust {
    /// No chunk id, or no room for a header.
    No,
    /// Printable, but its size passes the end of the file.
    Printable,
    /// Printable, and it ends within the file.
    Fits,
    /// An id from [`KNOWN_IDS`].
    Known,
}

/// Whether four bytes may be a chunk id: printable and padded on the right only.
pub(crate) fn is_id(id: &[u8; 4]) -> bool {
    id[0] != b' ' && id.iter().all(|byte| (0x20..0x7f).contains(byte))
}

pub(crate) fn trust<R: Read + Seek>(source: &mut Source<R>, sizes: &Sizes, at: u64) -> Result<Trust, WaveError> {
    let Some([a, b, c, d, s0, s1, s2, s3]) = source.array_at::<8>(at)? else {
        return Ok(Trust::No);
    };
    let id = [a, b, c, d];
    if !is_id(&id) {
        return Ok(Trust::No);
    }
    if KNOWN_IDS.contains(&&id) {
        return Ok(Trust::Known);
    }
    let size = sizes.of(id, [s0, s1, s2, s3]).bytes;
    // The header was read, so it ends within the file.
    Ok(if size <= source.bytes() - at - 8 { Trust::Fits } else { Trust::Printable })
}

/// Where the chunk after a body that ends at `end` begins, and how sure that is. An
/// odd size asks for a pad byte that may be missing; an even one for none, but some
/// writers pad after having counted the pad. The place the rules name wins a tie.
///
/// The output must be read as the input was. Its samples may have a length of the other
/// parity, and what follows them is carried over from the place found here, so a
/// chunk must be found there, or not be found, with the rules' padding before it: hence the
/// place after two pad bytes, and hence an even size gives up no place that can be a chunk.
/// And a wrong size may be set right, which must not turn the last letters of an unknown
/// id and that size into an id at the next byte: hence the size that leads on.
pub(crate) fn next_chunk<R: Read + Seek>(
    source: &mut Source<R>,
    sizes: &Sizes,
    end: u64,
    odd: bool,
) -> Result<(u64, Trust), WaveError> {
    let ruled = end + u64::from(odd);
    let by_rule = trust(source, sizes, ruled)?;
    // Letters that happen to spell a known id one byte on are no rarer than a pad byte
    // after an even size. After an odd one they are what a missing pad byte looks like.
    if by_rule == Trust::Known || (!odd && by_rule > Trust::No) {
        return Ok((ruled, by_rule));
    }
    if odd {
        let unpadded = trust(source, sizes, end)?;
        if unpadded > by_rule
            && (unpadded == Trust::Known || (unpadded == Trust::Fits && leads_on(source, sizes, end)?))
        {
            return Ok((end, unpadded));
        }
    }
    if by_rule == Trust::No {
        let padded = trust(source, sizes, ruled + 1)?;
        // Letters alone are no reason to leave the rules.
        if padded >= Trust::Fits {
            return Ok((ruled + 1, padded));
        }
    }
    Ok((ruled, by_rule))
}

/// Whether the chunk at `at`, which fits, ends with the file or before another that does.
fn leads_on<R: Read + Seek>(source: &mut Source<R>, sizes: &Sizes, at: u64) -> Result<bool, WaveError> {
    let Some([a, b, c, d, field @ ..]) = source.array_at::<8>(at)? else { return Ok(false) };
    let size = sizes.of([a, b, c, d], field).bytes;
    let (end, padded) = (at + 8 + size, at + 8 + size + size % 2);
    Ok(padded >= source.bytes()
        || trust(source, sizes, end)? >= Trust::Fits
        || trust(source, sizes, padded)? >= Trust::Fits)
}

/// Whether chunks that fit follow one another from `at` to the end of the file.
pub(crate) fn only_chunks_follow<R: Read + Seek>(
    source: &mut Source<R>,
    sizes: &Sizes,
    at: u64,
) -> Result<bool, WaveError> {
    let mut end = at;
    let mut odd = false;
    for _ in 0..MAX_CHUNKS {
        if end + u64::from(odd) >= source.bytes() {
            return Ok(true);
        }
        let (next, sure) = next_chunk(source, sizes, end, odd)?;
        let Some([a, b, c, d, s0, s1, s2, s3]) = source.array_at::<8>(next)? else {
            return Ok(false);
        };
        let size = sizes.of([a, b, c, d], [s0, s1, s2, s3]).bytes;
        if sure < Trust::Fits || size > source.bytes() - next - 8 {
            return Ok(false);
        }
        end = next + 8 + size;
        odd = size % 2 == 1;
    }
    Ok(false)
}
