//! Chunks at the end of a file that the size of `data` does not leave room for.

use std::io::{Read, Seek};

use super::chunks::MAX_CHUNKS;
use super::ds64::Sizes;
use super::error::WaveError;
use super::padding::{KNOWN_IDS, is_id};
use super::source::Source;

/// How the end of a file is searched.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Search {
    /// Within how many bytes.
    window: u64,
    /// How many bytes may be left after the last chunk.
    left: usize,
    /// Within how many bytes chunks of other names than the known ones count, if they end with
    /// the file exactly. Within a chunk they may be parts of it.
    any_name: usize,
}

/// Where the size of `data` is known to be wrong: in more than most texts and pictures that
/// stand after samples take. Bytes of a cut frame are left out of the output, so that the
/// last chunk there may end closer to the end; what counts then must have counted before.
pub(crate) const DAMAGED: Search = Search { window: 1 << 24, left: SOUND.left + 64, any_name: 1 << 16 };

/// The same where the size of another chunk is wrong.
pub(crate) const DAMAGED_CHUNK: Search = Search { any_name: 0, ..DAMAGED };

/// Where nothing else is suspicious: one small read a recording. No chunk has room in what
/// may be left.
pub(crate) const SOUND: Search = Search { window: 1 << 12, left: 7, any_name: 0 };

/// Zeros that may be reserved behind the last chunk: a cluster of a large card (from memory).
const RESERVED_BYTES: usize = 1 << 17;

/// The first place from `from` on where chunks begin that follow one another to the end of
/// the file, or close enough to it, or to zeros that reach it, the first with a known id. One of
/// another name counts where they end with the file exactly.
///
/// Uniformly random samples look so in two of 10^9 searches: 36 ids of 32 bits and 72 places to
/// end at, of 2^32, at each of 2^24 places. With as many zeros at the end as may be reserved it
/// is four in 10^6, for other names (printable, exact, near the end) six in 10^7.
pub(crate) fn last_chunks<R: Read + Seek>(
    source: &mut Source<R>,
    sizes: &Sizes,
    from: u64,
    search: Search,
) -> Result<Option<u64>, WaveError> {
    let from = from.max(source.bytes().saturating_sub(search.window));
    let mut bytes = vec![0; source.bytes().saturating_sub(from) as usize];
    source.read_at(from, &mut bytes, "looking for chunks after the samples")?;
    Ok(first_chunk(&bytes, sizes, search).map(|k| from + k as u64))
}

/// What [`last_chunks`] would find in a file whose samples begin at `from` and end at
/// `end`, with the pad byte that is due.
pub(crate) fn chunks_before<R: Read + Seek>(
    source: &mut Source<R>,
    sizes: &Sizes,
    from: u64,
    end: u64,
) -> Result<Option<u64>, WaveError> {
    let odd = (end - from) % 2;
    let from = from.max((end + odd).saturating_sub(SOUND.window));
    let mut bytes = vec![0; (end + odd).saturating_sub(from) as usize];
    let present = bytes.len() - odd as usize;
    source.read_at(from, &mut bytes[..present], "looking for chunks after the samples")?;
    Ok(first_chunk(&bytes, sizes, SOUND).map(|k| from + k as u64))
}

/// The first place from which chunks follow one another to the end of `bytes`, see
/// [`last_chunks`].
fn first_chunk(bytes: &[u8], sizes: &Sizes, search: Search) -> Option<usize> {
    let zeros_from = bytes.iter().rposition(|&byte| byte != 0).map_or(0, |last| last + 1);
    let zeros_from = if bytes.len() - zeros_from > RESERVED_BYTES { bytes.len() } else { zeros_from };
    // How many chunks from a place on reach the end, 0 for "they do not", and whether they
    // end with it.
    let mut chunks = vec![(0u16, false); bytes.len() + 2];
    let onward = |chunks: &[(u16, bool)], end: usize| {
        let rest = bytes.len() - end;
        match chunks[end] {
            (0, _) if rest <= search.left || end >= zeros_from => Some((0, rest <= 1)),
            (0, _) => None,
            found => Some(found),
        }
    };
    let mut first = None;
    for k in (0..bytes.len().saturating_sub(7)).rev() {
        let (Some(id), Some(field)) = (bytes[k..].first_chunk::<4>(), bytes[k + 4..].first_chunk::<4>()) else {
            continue;
        };
        // After samples there is no second `data`, and the size of one may be that of the
        // first, in `ds64`.
        if !is_id(id) || id == b"data" {
            continue;
        }
        let Ok(size) = usize::try_from(sizes.of(*id, *field).bytes) else { continue };
        let Some(end) = size.checked_add(k + 8).filter(|&end| end <= bytes.len()) else { continue };
        // With its pad byte, or without one that is missing.
        let padded = if size % 2 == 1 && end < bytes.len() { onward(&chunks, end + 1) } else { None };
        if let Some((count, exact)) = padded.or_else(|| onward(&chunks, end)) {
            chunks[k] = (count.saturating_add(1), exact);
            let any_name = exact && bytes.len() - k <= search.any_name;
            if (any_name || KNOWN_IDS.contains(&id)) && usize::from(chunks[k].0) < MAX_CHUNKS {
                first = Some(k);
            }
        }
    }
    first
}
