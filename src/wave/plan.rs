//! What the output holds outside the samples, decided before its first byte.

use std::io::{Read, Seek};

use super::chunks::{Layout, Span};
use super::error::WaveError;
use super::form::ELSEWHERE;
use super::reader::Reader;
use super::sizes::{self, Lengths};
use super::{Changes, Header, format, history};

/// A chunk of the input that gets another body. Its id stays, its size and padding
/// follow, and it no longer counts as kept.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Edit {
    /// Which chunk, in file order; never `data`.
    pub index: usize,
    /// The new body, without padding.
    pub body: Vec<u8>,
}

/// One piece of the output outside the samples.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) enum Piece {
    /// Bytes of the input.
    Copy { from: u64, to: u64 },
    /// Bytes of our own.
    Bytes(Vec<u8>),
}

/// Bytes of the input, `from..to`, that others take the place of.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Splice {
    from: u64,
    to: u64,
    bytes: Vec<u8>,
}

/// What stands before and after the samples.
#[derive(Clone, Debug)]
pub(crate) struct Plan {
    pub(crate) head: Vec<Piece>,
    pub(crate) tail: Vec<Piece>,
    /// Whether `data` as a whole (its size, and what is left after its last frame)
    /// would be the input's if the samples were.
    pub(crate) data_frame_kept: bool,
    /// Indices of chunks that were rewritten.
    pub(crate) rewritten: Vec<usize>,
    pub(crate) notes: Vec<String>,
}

/// Changes gathered chunk by chunk.
#[derive(Debug)]
pub(crate) struct Draft<'a> {
    pub(crate) layout: &'a Layout,
    splices: Vec<Splice>,
    pub(crate) rewritten: Vec<usize>,
    pub(crate) notes: Vec<String>,
}

impl Draft<'_> {
    pub(crate) fn splice(&mut self, from: u64, to: u64, bytes: Vec<u8>) {
        self.splices.push(Splice { from, to, bytes });
    }

    /// Puts as many bytes in place of those from `at` on.
    pub(crate) fn overwrite(&mut self, at: u64, bytes: &[u8]) {
        self.splice(at, at + bytes.len() as u64, bytes.to_vec());
    }

    pub(crate) fn size_field(&self, bytes: u64) -> Result<[u8; 4], WaveError> {
        match u32::try_from(bytes) {
            Ok(size) if size != ELSEWHERE => Ok(self.layout.sizes.form.write_u32(size)),
            _ => Err(WaveError::ChunkTooLong { bytes }),
        }
    }

    /// A size field, a body and, after an odd one, a zero pad byte.
    fn sized(&self, body: &[u8]) -> Result<Vec<u8>, WaveError> {
        let pad = vec![0; body.len() % 2];
        Ok([&self.size_field(body.len() as u64)?[..], body, &pad].concat())
    }

    fn edit(&mut self, edit: &Edit) -> Result<(), WaveError> {
        let Some(&span) = self.layout.spans.get(edit.index) else { return Ok(()) };
        if span.entry.is_some() {
            let pad = vec![0; edit.body.len() % 2];
            self.splice(span.body(), span.next, [&edit.body[..], &pad].concat());
            self.resize(&span, edit.body.len() as u64)?;
        } else {
            self.splice(span.offset + 4, span.next, self.sized(&edit.body)?);
        }
        self.rewritten.push(edit.index);
        Ok(())
    }

    /// Writes the size of a chunk where the input has it.
    fn resize(&mut self, span: &Span, bytes: u64) -> Result<(), WaveError> {
        let ds64 = self.layout.sizes.ds64.as_ref();
        match span.entry.and_then(|k| ds64?.entries.get(k)) {
            Some(entry) => {
                self.overwrite(entry.offset, &bytes.to_le_bytes());
                self.rewritten.push(0);
            }
            None => self.overwrite(span.offset + 4, &self.size_field(bytes)?),
        }
        Ok(())
    }

    /// Bytes by which the output is longer outside the samples, and shorter.
    pub(super) fn growth(&self) -> (u64, u64) {
        let come = self.splices.iter().map(|splice| splice.bytes.len() as u64).sum();
        let gone = self.splices.iter().map(|splice| splice.to - splice.from).sum();
        (come, gone)
    }
}

/// Decides every byte outside the samples: what stays is copied, what changes is
/// spliced in.
pub(crate) fn plan<R: Read + Seek>(input: &mut Reader<R>, changes: &Changes) -> Result<Plan, WaveError> {
    let history = history::edits(input, changes)?;
    let layout = input.layout();
    let header = input.header();
    let format = changes.format;
    let data = layout.spans[layout.data];
    let samples_end = header.data_offset + header.data_bytes;
    let same_format = format == header.format;
    let same_data = same_format && !data.size_wrong;
    let mut draft = Draft { layout, splices: Vec::new(), rewritten: Vec::new(), notes: Vec::new() };
    let (mut samples_bytes, mut body_bytes) = (header.data_bytes, data.bytes);
    if !same_data {
        let frame_bytes = u64::from(header.channels) * u64::from(format.encoding.bytes());
        if frame_bytes > u64::from(u16::MAX) {
            return Err(WaveError::FrameTooWide { bytes: frame_bytes });
        }
        samples_bytes = header.frames * frame_bytes;
        body_bytes = samples_bytes;
        draft.splice(samples_end, data.next, vec![0; (body_bytes % 2) as usize]);
        if !same_format && !data.size_wrong && data.bytes > header.data_bytes {
            draft.notes.push(format!(
                "{} bytes after the last whole frame were left out with the change of encoding",
                data.bytes - header.data_bytes
            ));
        }
        coding(&mut draft, header, changes)?;
    }
    for edit in &history.edits {
        draft.edit(edit)?;
    }
    draft.notes.extend(history.notes);
    for (index, span) in layout.spans.iter().enumerate() {
        if span.size_wrong && index != layout.data && !draft.rewritten.contains(&index) {
            draft.resize(span, span.bytes)?;
            draft.rewritten.push(index);
        }
    }
    let (come, gone) = draft.growth();
    let total = header.file_bytes - header.data_bytes - gone + samples_bytes + come;
    let lengths = Lengths { total, data: body_bytes, same_data };
    let other_form = sizes::settle(&mut draft, header, lengths, changes.riff_limit_bytes)?;
    let Draft { mut splices, rewritten, notes, .. } = draft;
    splices.sort_by_key(|splice| (splice.from, splice.to));
    let split = splices.partition_point(|splice| splice.from < header.data_offset);
    Ok(Plan {
        head: pieces(0, header.data_offset, &splices[..split]),
        tail: pieces(samples_end, header.file_bytes, &splices[split..]),
        data_frame_kept: same_data && !other_form,
        rewritten,
        notes,
    })
}

fn pieces(from: u64, to: u64, splices: &[Splice]) -> Vec<Piece> {
    let mut pieces = Vec::new();
    let mut copied = from;
    for splice in splices {
        if copied < splice.from {
            pieces.push(Piece::Copy { from: copied, to: splice.from });
        }
        if !splice.bytes.is_empty() {
            pieces.push(Piece::Bytes(splice.bytes.clone()));
        }
        copied = splice.to;
    }
    if copied < to {
        pieces.push(Piece::Copy { from: copied, to });
    }
    pieces
}

/// `fmt ` and `fact` for another format. Float samples need a `fact` chunk with their
/// number (Multimedia Programming Interface and Data Specifications 1.0, 1991:
/// required for any coding but PCM); one that is there is set right.
fn coding(draft: &mut Draft<'_>, header: &Header, changes: &Changes) -> Result<(), WaveError> {
    let (layout, form, format) = (draft.layout, header.form, changes.format);
    // EBU Tech 3306: a count beyond 32 bits stands in `ds64`.
    let count = form.write_u32(u32::try_from(header.frames).unwrap_or(ELSEWHERE));
    if format != header.format {
        let body = format::rewrite(&layout.fmt_body, header.channels, header.header_rate_hz, format, form);
        draft.edit(&Edit { index: layout.fmt, body })?;
        draft.notes.push(format!("`fmt ` was rewritten for {}", format.encoding.name()));
        if format.encoding.is_float() && layout.fact.is_none() {
            let after = layout.spans[layout.fmt].next;
            draft.splice(after, after, [&b"fact"[..], &draft.sized(&count)?].concat());
            draft.notes.push("a `fact` chunk was added after `fmt `, as float samples require one".into());
        }
    }
    if let Some((index, declared)) = layout.fact
        && form.write_u32(declared) != count
        && !(form.is_wide() && declared == ELSEWHERE)
    {
        let span = layout.spans[index];
        draft.overwrite(span.body(), &count);
        if span.size_wrong {
            draft.resize(&span, span.bytes)?;
        }
        draft.rewritten.push(index);
        draft.notes.push(format!("`fact` was corrected from {declared} to {} frames", header.frames));
    }
    Ok(())
}
