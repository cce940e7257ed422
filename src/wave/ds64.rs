//! The `ds64` chunk, which holds the sizes of RF64 and BW64 files (EBU Tech 3306,
//! ITU-R BS.2088): RIFF size, size of `data`, sample count, 64 bits each, then a table
//! of other chunks too long for 32 bits.

use std::io::{Read, Seek};

use super::Form;
use super::chunks::MAX_CHUNKS;
use super::error::{WaveError, show_bytes};
use super::form::ELSEWHERE;
use super::source::Source;

/// Bytes of a `ds64` without table entries.
pub(crate) const LEAST_BYTES: usize = 28;

/// Where its id stands: right after `WAVE`.
pub(crate) const OFFSET: u64 = 12;

/// Bytes of a table entry: id and 64-bit size.
const ENTRY_BYTES: u64 = 12;

/// What `ds64` says.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Ds64 {
    /// Length of the file less 8.
    pub(crate) riff_bytes: u64,
    /// Bytes in the body of `data`.
    pub(crate) data_bytes: u64,
    /// Frames, as `fact` counts them. BS.2088 calls it a dummy, and writers get it
    /// wrong: never trusted.
    pub(crate) frames: u64,
    /// Table entries it claims.
    pub(crate) declared_entries: u32,
    /// Those of them that it has room for.
    pub(crate) present_entries: u32,
    /// The first of those; a file has no more chunks than are read here.
    pub(crate) entries: Vec<Entry>,
}

/// One chunk of the table.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Entry {
    pub(crate) id: [u8; 4],
    pub(crate) bytes: u64,
    /// Where its size stands.
    pub(crate) offset: u64,
}

impl Ds64 {
    /// The first 28 bytes of the body.
    pub(crate) fn figures(&self) -> [u8; LEAST_BYTES] {
        let mut bytes = [0; LEAST_BYTES];
        bytes[..8].copy_from_slice(&self.riff_bytes.to_le_bytes());
        bytes[8..16].copy_from_slice(&self.data_bytes.to_le_bytes());
        bytes[16..24].copy_from_slice(&self.frames.to_le_bytes());
        bytes[24..].copy_from_slice(&self.declared_entries.to_le_bytes());
        bytes
    }

    /// Reads the chunk at [`OFFSET`]; `None` if what stands there is no `ds64` of at
    /// least 28 bytes.
    pub(crate) fn read<R: Read + Seek>(source: &mut Source<R>) -> Result<Option<Self>, WaveError> {
        let Some([b'd', b's', b'6', b'4', s0, s1, s2, s3]) = source.array_at::<8>(OFFSET)? else {
            return Ok(None);
        };
        let body = OFFSET + 8;
        let bytes = u64::from(u32::from_le_bytes([s0, s1, s2, s3]));
        let room = bytes.min(source.bytes().saturating_sub(body));
        let (true, Some(figures)) = (room >= LEAST_BYTES as u64, source.array_at::<LEAST_BYTES>(body)?) else {
            return Ok(None);
        };
        let (wide, _) = figures.as_chunks::<8>();
        let wide = |k: usize| wide.get(k).map_or(0, |&bytes| u64::from_le_bytes(bytes));
        let declared_entries = u32::from_le_bytes([figures[24], figures[25], figures[26], figures[27]]);
        let fit = u32::try_from((room - LEAST_BYTES as u64) / ENTRY_BYTES).unwrap_or(u32::MAX);
        let present_entries = declared_entries.min(fit);
        let mut entries = Vec::new();
        for k in 0..present_entries.min(MAX_CHUNKS as u32) {
            let offset = body + LEAST_BYTES as u64 + u64::from(k) * ENTRY_BYTES;
            let Some([a, b, c, d, size @ ..]) = source.array_at::<{ ENTRY_BYTES as usize }>(offset)? else { break };
            entries.push(Entry { id: [a, b, c, d], bytes: u64::from_le_bytes(size), offset: offset + 4 });
        }
        let (riff_bytes, data_bytes, frames) = (wide(0), wide(1), wide(2));
        Ok(Some(Ds64 { riff_bytes, data_bytes, frames, declared_entries, present_entries, entries }))
    }
}

/// Why a file of 64-bit form has no `ds64` to go by.
pub(crate) fn missing<R: Read + Seek>(source: &mut Source<R>, form: Form) -> Result<WaveError, WaveError> {
    let error = |offset, found| WaveError::Ds64 { offset, found, form: form.name() };
    let mut at = OFFSET;
    for _ in 0..MAX_CHUNKS {
        let Some([a, b, c, d, s0, s1, s2, s3]) = source.array_at::<8>(at)? else { break };
        let (id, bytes) = ([a, b, c, d], u64::from(u32::from_le_bytes([s0, s1, s2, s3])));
        if id == *b"ds64" {
            let held = bytes.min(source.bytes() - at - 8);
            let found = if at > OFFSET {
                format!("`ds64` stands after other chunks (found at byte {at})")
            } else {
                format!("`ds64` holds {held} bytes")
            };
            return Ok(error(at, found));
        }
        let next = at + 8 + bytes + bytes % 2;
        if id == *b"data" || next > source.bytes() {
            break;
        }
        at = next;
    }
    Ok(error(
        OFFSET,
        match source.array_at::<4>(OFFSET)? {
            Some(id) => format!("found {} and no `ds64` before the samples", show_bytes(&id)),
            None => "the file ends".into(),
        },
    ))
}

/// Sizes as a file declares them, wherever it does.
#[derive(Clone, Debug)]
pub(crate) struct Sizes {
    pub(crate) form: Form,
    pub(crate) ds64: Option<Ds64>,
    /// Which table entries a chunk was found for.
    used: Vec<bool>,
}

/// The size of one chunk.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Declared {
    /// What counts.
    pub(crate) bytes: u64,
    /// The table entry it is from.
    pub(crate) entry: Option<usize>,
}

impl Sizes {
    /// `ds64` is `None` in the forms of 32 bits.
    pub(crate) fn new(form: Form, ds64: Option<Ds64>) -> Self {
        let used = vec![false; ds64.as_ref().map_or(0, |ds64| ds64.entries.len())];
        Sizes { form, ds64, used }
    }

    /// What the size field `field` of a chunk `id` comes to. Of several chunks of a
    /// name, each takes the next entry of the table.
    pub(crate) fn of(&self, id: [u8; 4], field: [u8; 4]) -> Declared {
        let field = self.form.read_u32(field);
        let plain = Declared { bytes: u64::from(field), entry: None };
        let Some(ds64) = &self.ds64 else { return plain };
        // A `data` size never written may still stand in `ds64`.
        if id == *b"data" && (field == ELSEWHERE || (field == 0 && ds64.data_bytes != 0)) {
            return Declared { bytes: ds64.data_bytes, entry: None };
        }
        if field != ELSEWHERE {
            return plain;
        }
        let free = |&(k, entry): &(usize, &Entry)| entry.id == id && self.used.get(k) == Some(&false);
        match ds64.entries.iter().enumerate().find(free) {
            Some((k, entry)) => Declared { bytes: entry.bytes, entry: Some(k) },
            None => plain,
        }
    }

    /// Takes an entry out of the table.
    pub(crate) fn used(&mut self, declared: Declared) {
        if let Some(used) = declared.entry.and_then(|k| self.used.get_mut(k)) {
            *used = true;
        }
    }
}
