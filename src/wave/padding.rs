//! Where the next chunk begins, in files whose padding does not follow the rules.

use std::io::{Read, Seek};

use super::chunks::MAX_CHUNKS;
use super::error::WaveError;
use super::source::Source;

/// Ids worth trusting where padding leaves two places for the next chunk: RIFF/WAVE
/// 1991, EBU Tech 3285 with supplements, EBU Tech 3306, ITU-R BS.2088, AES46, iXML,
/// GUANO, and fillers seen in the field (common practice, no source).
const KNOWN_IDS: [&[u8; 4]; 36] = [
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

pub(crate) fn trust<R: Read + Seek>(source: &mut Source<R>, at: u64) -> Result<Trust, WaveError> {
    let Some([a, b, c, d, s0, s1, s2, s3]) = source.array_at::<8>(at)? else {
        return Ok(Trust::No);
    };
    let id = [a, b, c, d];
    // A four-character code is printable and padded on the right only.
    if a == b' ' || !id.iter().all(|byte| (0x20..0x7f).contains(byte)) {
        return Ok(Trust::No);
    }
    if KNOWN_IDS.contains(&&id) {
        return Ok(Trust::Known);
    }
    let size = u64::from(u32::from_le_bytes([s0, s1, s2, s3]));
    Ok(if at + 8 + size <= source.bytes() { Trust::Fits } else { Trust::Printable })
}

/// Where the chunk after a body that ends at `end` begins, and how sure that is. An
/// odd size asks for a pad byte that may be missing; an even one for none, but some
/// writers pad after having counted the pad. The place the rules name wins a tie.
pub(crate) fn next_chunk<R: Read + Seek>(
    source: &mut Source<R>,
    end: u64,
    odd: bool,
) -> Result<(u64, Trust), WaveError> {
    let (ruled, other) = if odd { (end + 1, end) } else { (end, end + 1) };
    let by_rule = trust(source, ruled)?;
    // After an even size only a place that can't be a chunk is given up: a pad there
    // is rare, letters that happen to spell a known id one byte on are not rarer.
    // After an odd one such letters are what a missing pad byte looks like.
    if by_rule == Trust::Known || (!odd && by_rule == Trust::Fits) {
        return Ok((ruled, by_rule));
    }
    let by_other = trust(source, other)?;
    Ok(if by_other > by_rule { (other, by_other) } else { (ruled, by_rule) })
}

/// Whether chunks that fit follow one another from `at` to the end of the file.
pub(crate) fn only_chunks_follow<R: Read + Seek>(source: &mut Source<R>, at: u64) -> Result<bool, WaveError> {
    let mut end = at;
    let mut odd = false;
    for _ in 0..MAX_CHUNKS {
        if end + u64::from(odd) >= source.bytes() {
            return Ok(true);
        }
        let (next, sure) = next_chunk(source, end, odd)?;
        let Some([_, _, _, _, s0, s1, s2, s3]) = source.array_at::<8>(next)? else {
            return Ok(false);
        };
        let size = u64::from(u32::from_le_bytes([s0, s1, s2, s3]));
        if sure < Trust::Fits || next + 8 + size > source.bytes() {
            return Ok(false);
        }
        end = next + 8 + size;
        odd = size % 2 == 1;
    }
    Ok(false)
}
