//! How many bytes of samples there are: what is declared, held against the file.

use std::io::{Read, Seek};

use super::chunks::Span;
use super::ds64::{Ds64, Sizes};
use super::error::{WaveError, show_bytes};
use super::form::ELSEWHERE;
use super::padding::{Trust, next_chunk, only_chunks_follow};
use super::source::Source;
use super::tail::{DAMAGED, SOUND, last_chunks};

/// Declared and found.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct DataSize {
    /// What the size says, wherever it stands.
    pub(crate) declared: u64,
    /// Bytes in the file.
    pub(crate) found: u64,
    /// What ends the samples where that is not the declared size.
    end: Option<End>,
}

/// What else ends the samples.
#[derive(Clone, Debug, PartialEq, Eq)]
enum End {
    File,
    /// The end of the file, or the last chunks, to which both sizes point once 2^32
    /// is added as often as it takes.
    Wrapped,
    /// Chunks that reach from here exactly to the end of the file.
    Chunks {
        name: String,
        offset: u64,
    },
    /// The size in a `ds64` that a RIFF file should not have.
    Ds64,
}

impl DataSize {
    pub(crate) fn is_wrong(&self) -> bool {
        self.end.is_some()
    }

    /// Whether the samples were taken up to the end of the file.
    pub(crate) fn is_up_to_the_end(&self) -> bool {
        self.end == Some(End::File)
    }

    /// What there is to say about it.
    pub(crate) fn note(&self, data: &Span, frame_bytes: u64) -> Option<String> {
        let left = data.bytes % frame_bytes;
        let Some(end) = &self.end else {
            return (left > 0).then(|| {
                format!(
                    "`data` at byte {} holds {left} bytes after its last whole frame (byte {}): a pad counted in its size, or a cut frame; not filtered",
                    data.offset,
                    data.end() - left,
                )
            });
        };
        let up_to = match end {
            End::File => "up to the end of the file".into(),
            End::Wrapped => "up to where a size counted past 32 bits ends".into(),
            End::Chunks { name, offset } => {
                format!("up to {name} at byte {offset}, where chunks begin that end with the file")
            }
            End::Ds64 => "by the 64-bit size in `ds64`".into(),
        };
        let dropped = match left {
            0 => String::new(),
            _ => format!("; the last {left} bytes are no whole frame and left out"),
        };
        Some(format!(
            "`data` at byte {} declares {} bytes, found {} {up_to}: {} whole frames taken{dropped}; the output gets right sizes",
            data.offset,
            self.declared,
            data.bytes,
            data.bytes / frame_bytes,
        ))
    }
}

/// Finds the bytes of the `data` whose id stands at `at` and whose size field is
/// `field`. `spare` is a `ds64` that stands first in a file of 32-bit form.
pub(crate) fn find<R: Read + Seek>(
    source: &mut Source<R>,
    sizes: &Sizes,
    spare: Option<&Ds64>,
    riff_field: u32,
    at: u64,
    field: [u8; 4],
) -> Result<DataSize, WaveError> {
    let body = at + 8;
    let present = source.bytes() - body;
    let declared = sizes.of(*b"data", field).bytes;
    // Where only `ds64` has the size, `data` itself must say so: others take a 0 for none.
    let unsaid = (declared > 0 && sizes.form.read_u32(field) == 0).then_some(End::Ds64);
    let size = |found, end: Option<End>| Ok(DataSize { declared, found, end: end.or(unsaid.clone()) });
    if sizes.form.read_u32(field) == ELSEWHERE
        && let Some(found) = spare.map(|ds64| ds64.data_bytes).filter(|found| (1..=present).contains(found))
        && ends_well(source, sizes, body + found, found % 2 == 1)?
    {
        return size(found, Some(End::Ds64));
    }
    // Sizes that went past 32 bits and began again at 0, in a program that did not
    // look: that both are right but for that is no coincidence.
    let wrapped = |declared: u32, found: u64| found > u64::from(u32::MAX) && found as u32 == declared;
    if !sizes.form.is_wide() && wrapped(riff_field, source.bytes() - 8) {
        let field = sizes.form.read_u32(field);
        let end = last_chunks(source, sizes, body, DAMAGED)?.unwrap_or(source.bytes());
        if let Some(found) =
            [end - body, (end - body).saturating_sub(1)].into_iter().find(|&found| wrapped(field, found))
        {
            return size(found, Some(End::Wrapped));
        }
    }
    let chunks_at = |source: &mut Source<R>, offset: u64| -> Result<DataSize, WaveError> {
        let name = source.array_at::<4>(offset)?.map_or(String::new(), |id| show_bytes(&id));
        size(offset - body, Some(End::Chunks { name, offset }))
    };
    let unknown = !sizes.form.is_wide() && sizes.form.read_u32(field) == ELSEWHERE;
    let unwritten = unknown || (declared == 0 && present > 0 && !only_chunks_follow(source, sizes, body)?);
    if declared > present || unwritten {
        return match last_chunks(source, sizes, body, DAMAGED)? {
            Some(offset) => chunks_at(source, offset),
            None => size(present, Some(End::File)),
        };
    }
    let end = body + declared;
    let odd = declared % 2 == 1;
    let last = end + u64::from(odd) >= source.bytes();
    if !last && ends_well(source, sizes, end, odd)? {
        return size(declared, None);
    }
    // Letters that lead nowhere are no chunk: samples may look so.
    let no_chunk = next_chunk(source, sizes, end, odd)?.1 < Trust::Fits;
    match last_chunks(source, sizes, body, if last { SOUND } else { DAMAGED })? {
        Some(offset) if offset < end => chunks_at(source, offset),
        Some(offset) if no_chunk && !last => {
            let name = source.array_at::<4>(offset)?.map_or(String::new(), |id| show_bytes(&id));
            Err(WaveError::Gap {
                offset: end,
                bytes: offset - end,
                data: at,
                declared,
                next: format!("{name} (byte {offset})"),
                size_offset: at + 4,
                right: offset - body,
            })
        }
        _ => size(declared, None),
    }
}

/// Whether samples that end at `end` are followed by a chunk, or by nothing.
fn ends_well<R: Read + Seek>(source: &mut Source<R>, sizes: &Sizes, end: u64, odd: bool) -> Result<bool, WaveError> {
    Ok(end + u64::from(odd) >= source.bytes() || next_chunk(source, sizes, end, odd)?.1 >= Trust::Fits)
}
