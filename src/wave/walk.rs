//! The walk from chunk to chunk.
//!
//! The file's length is the truth; the sizes written in it are claims. Every step
//! of the walk moves on by at least the 8 bytes of a chunk header.

mod notes;

use std::io::{Read, Seek};

use super::Form;
use super::chunks::{Layout, MAX_CHUNKS, Span};
use super::data_size::{self, DataSize};
use super::ds64::{self, Ds64, Sizes};
use super::error::{WaveError, show_bytes};
use super::form::ELSEWHERE;
use super::format::{self, FMT_READ_BYTES, Fmt};
use super::padding::{KNOWN_IDS, Trust, next_chunk, trust};
use super::source::Source;
use super::tail::{DAMAGED_CHUNK, chunks_before, last_chunks};
use notes::size_note;

/// What tags begin with that are appended to files of sound of any kind (common practice, no
/// source).
const TAGS: [&[u8]; 4] = [b"TAG", b"APETAGEX", b"ID3", b"LYRICSBEGIN"];

/// Searches of a file's end. One settles all that follows but in files made to be hard.
const MAX_SEARCHES: usize = 4;

/// Checks the first 12 bytes and returns the form and the declared RIFF size.
fn head<R: Read + Seek>(source: &mut Source<R>) -> Result<(Form, u32), WaveError> {
    let bytes = source.bytes();
    if bytes == 0 {
        return Err(WaveError::EmptyFile);
    }
    let mut first = vec![0; bytes.min(12) as usize];
    source.read_at(0, &mut first, "reading the header")?;
    let start = &first[..first.len().min(4)];
    if start == b"FORM" {
        return Err(WaveError::OtherForm { form: "FORM".into(), meaning: "the big-endian ancestor of RIFF" });
    }
    if !Form::ALL.iter().any(|form| form.name().as_bytes().starts_with(start)) {
        return Err(WaveError::NotRiff { found: show_bytes(start) });
    }
    let (Some(form), Ok([_, _, _, _, s0, s1, s2, s3, kind @ ..])) = (Form::of(start), <[u8; 12]>::try_from(&first[..]))
    else {
        return Err(WaveError::HeaderCut { bytes });
    };
    if kind != *b"WAVE" {
        return Err(WaveError::NotWave { found: show_bytes(&kind) });
    }
    Ok((form, form.read_u32([s0, s1, s2, s3])))
}

/// Walks the whole file.
pub(crate) fn walk<R: Read + Seek>(source: &mut Source<R>) -> Result<Layout, WaveError> {
    let (form, riff_field) = head(source)?;
    let file_bytes = source.bytes();
    let ds64 = if form.is_big_endian() { None } else { Ds64::read(source)? };
    if form.is_wide() && ds64.is_none() {
        return Err(ds64::missing(source, form)?);
    }
    let mut walk = Walk::new(form, riff_field, ds64);
    let mut at = 12;
    let mut sure = trust(source, &walk.sizes, at)?;
    let mut trailing_bytes = 0;
    loop {
        let left = file_bytes.saturating_sub(at);
        if left == 0 {
            break;
        }
        let header = source.array_at::<8>(at)?;
        let (Some([a, b, c, d, field @ ..]), true) = (header, sure > Trust::No) else {
            if walk.data.is_none() {
                return Err(walk.no_chunk(source, at)?);
            }
            trailing_bytes = left;
            break;
        };
        if walk.spans.len() == MAX_CHUNKS {
            return Err(WaveError::TooManyChunks { offset: at, limit: MAX_CHUNKS });
        }
        at = walk.chunk(source, [a, b, c, d], at, field)?;
        let Some(last) = walk.spans.last_mut() else { break };
        let odd = last.bytes % 2 == 1;
        (last.next, sure) = next_chunk(source, &walk.sizes, at, odd)?;
        // Letters whose size leads nowhere are no chunk after the samples: they may be samples
        // themselves, or a text, and no size must be written into those.
        if sure == Trust::Printable && walk.data.is_some() {
            sure = Trust::No;
        }
        let last = *last;
        walk.padding_note(&last, sure);
        let Some(last) = walk.spans.last_mut() else { break };
        if sure == Trust::No {
            // Nothing follows, or no chunk: the pad byte, if any, is still this chunk's.
            last.next = (at + u64::from(odd)).min(file_bytes);
        }
        if sure < Trust::Fits && last.next < file_bytes && walk.end_at_last_chunks(source)? {
            sure = Trust::Known;
        }
        at = walk.spans.last().map_or(file_bytes, |last| last.next);
    }
    walk.refuse_doubtful_end(source)?;
    walk.refuse_unexplained_end(source, trailing_bytes)?;
    walk.finish(file_bytes, trailing_bytes)
}

struct Walk {
    sizes: Sizes,
    riff_field: u32,
    /// A `ds64` where none belongs: in a RIFF file, standing first.
    spare: Option<Ds64>,
    spans: Vec<Span>,
    fmt: Option<(usize, Fmt, Vec<u8>)>,
    fact: Option<(usize, u32)>,
    data: Option<(usize, DataSize)>,
    /// How often the end of the file was searched for chunks.
    searches: usize,
    notes: Vec<String>,
}

impl Walk {
    fn new(form: Form, riff_field: u32, ds64: Option<Ds64>) -> Self {
        let (ds64, spare) = if form.is_wide() { (ds64, None) } else { (None, ds64) };
        let sizes = Sizes::new(form, ds64);
        Walk {
            sizes,
            riff_field,
            spare,
            spans: Vec::new(),
            fmt: None,
            fact: None,
            data: None,
            searches: 0,
            notes: Vec::new(),
        }
    }

    fn riff_declared(&self) -> u64 {
        match &self.sizes.ds64 {
            Some(ds64) if self.riff_field == ELSEWHERE => ds64.riff_bytes,
            _ => u64::from(self.riff_field),
        }
    }

    /// Why the walk can't go on before it has seen `data`.
    fn no_chunk<R: Read + Seek>(&self, source: &mut Source<R>, at: u64) -> Result<WaveError, WaveError> {
        Ok(match source.array_at::<4>(at)? {
            Some(id) if source.bytes() - at >= 8 => {
                let before = match self.spans.last() {
                    Some(span) => format!(
                        "the size of chunk {} at byte {}, {} bytes, is wrong",
                        show_bytes(&span.id),
                        span.offset,
                        span.bytes
                    ),
                    None => "`WAVE` is followed by something else".into(),
                };
                WaveError::BadChunkId { offset: at, found: show_bytes(&id), before }
            }
            _ => {
                let found = format!("the file ends {} bytes into a chunk header of 8", source.bytes() - at);
                WaveError::MissingData { offset: at, found }
            }
        })
    }

    /// Where a chunk after the samples is not followed by another although the file goes
    /// on: whether chunks at its end show where it must end.
    fn end_at_last_chunks<R: Read + Seek>(&mut self, source: &mut Source<R>) -> Result<bool, WaveError> {
        let Some(&last) = self.spans.last() else { return Ok(false) };
        // Where `data` itself ends was settled when it was met; one of another name may be
        // none at all.
        if self.data.is_none() || last.id == *b"data" || !KNOWN_IDS.contains(&&last.id) {
            return Ok(false);
        }
        let Some(next) = self.last_chunks(source, last.body())? else { return Ok(false) };
        let note = size_note(source, &last, last.bytes, next)?;
        self.notes.push(note);
        if let Some(last) = self.spans.last_mut() {
            (last.bytes, last.next, last.size_wrong) = (next - last.body(), next, true);
        }
        Ok(true)
    }

    fn last_chunks<R: Read + Seek>(&mut self, source: &mut Source<R>, from: u64) -> Result<Option<u64>, WaveError> {
        if self.searches == MAX_SEARCHES {
            return Ok(None);
        }
        self.searches += 1;
        last_chunks(source, &self.sizes, from, DAMAGED_CHUNK)
    }

    /// Samples that were taken up to the end of the file lose what is no whole frame and
    /// gain a pad byte. If chunks then end with the file, they were cut short, and nobody
    /// can tell whether they or samples were meant.
    fn refuse_doubtful_end<R: Read + Seek>(&self, source: &mut Source<R>) -> Result<(), WaveError> {
        let (Some((data, size)), Some((_, fmt, _))) = (&self.data, &self.fmt) else { return Ok(()) };
        let span = self.spans[*data];
        let frame_bytes = u64::from(fmt.channels) * u64::from(fmt.format.encoding.bytes());
        let end = span.end() - span.bytes % frame_bytes;
        if !size.is_up_to_the_end() || (end == span.end() && end % 2 == span.body() % 2) {
            return Ok(());
        }
        let Some(offset) = chunks_before(source, &self.sizes, span.body(), end)? else { return Ok(()) };
        let name = source.array_at::<4>(offset)?.map_or(String::new(), |id| show_bytes(&id));
        Err(WaveError::Arrangement {
            offset,
            what: format!("chunk {name}, cut short at the end of samples without a right size,"),
            repair: format!(
                "if it is a chunk, cut the file there, else write the size of the samples, {}, at byte {}",
                span.bytes,
                span.offset + 4
            ),
        })
    }

    /// What follows the samples and is neither a chunk nor zeros nor a tag may be samples that a
    /// size written too early does not count. If it is as long as a click, somebody must say.
    fn refuse_unexplained_end<R: Read + Seek>(
        &self,
        source: &mut Source<R>,
        trailing_bytes: u64,
    ) -> Result<(), WaveError> {
        let (Some((data, size)), Some((_, fmt, _))) = (&self.data, &self.fmt) else { return Ok(()) };
        let span = self.spans[*data];
        let frame_bytes = u64::from(fmt.channels) * u64::from(fmt.format.encoding.bytes());
        let click_bytes = (u64::from(fmt.rate_hz) / 100).max(1) * frame_bytes;
        if *data + 1 < self.spans.len() || size.is_wrong() || trailing_bytes < click_bytes {
            return Ok(());
        }
        let from = source.bytes() - trailing_bytes;
        let mut start = vec![0; trailing_bytes.min(super::BLOCK_BYTES as u64) as usize];
        source.read_at(from, &mut start, "looking at what follows the samples")?;
        if TAGS.iter().any(|tag| start.starts_with(tag)) || start.iter().all(|&byte| byte == 0) {
            return Ok(());
        }
        Err(WaveError::Gap {
            offset: from,
            bytes: trailing_bytes,
            data: span.offset,
            declared: size.declared,
            next: "the end of the file".into(),
            size_offset: span.offset + 4,
            right: source.bytes() - span.body(),
        })
    }

    /// Takes in the chunk at `at` and returns where its body ends.
    fn chunk<R: Read + Seek>(
        &mut self,
        source: &mut Source<R>,
        id: [u8; 4],
        at: u64,
        field: [u8; 4],
    ) -> Result<u64, WaveError> {
        let declared = self.sizes.of(id, field);
        self.sizes.used(declared);
        let present = source.bytes() - at - 8;
        let bytes = declared.bytes.min(present);
        let index = self.spans.len();
        let mut span = Span { id, offset: at, bytes, next: 0, entry: declared.entry, size_wrong: false };
        match &id {
            b"fmt " => {
                self.fmt(source, &span)?;
                // Before the samples the walk ends there.
                if declared.bytes > present {
                    span.size_wrong = true;
                    self.notes.push(format!(
                        "chunk `fmt ` at byte {at} claims {} bytes, the file ends after {present}; the output gets the right size",
                        declared.bytes
                    ));
                }
            }
            b"data" => {
                if let Some((first, _)) = self.data {
                    return Err(second_data(&span, &self.spans[first]));
                }
                let size = data_size::find(source, &self.sizes, self.spare.as_ref(), self.riff_field, at, field)?;
                span.bytes = size.found;
                span.size_wrong = size.is_wrong();
                self.data = Some((index, size));
            }
            b"wavl" | b"slnt" => return Err(wavl(at)),
            b"LIST" | b"list" if source.array_at::<4>(at + 8)? == Some(*b"wavl") => return Err(wavl(at)),
            _ if Form::of(&id).is_some() => {
                return Err(WaveError::Arrangement {
                    offset: at,
                    what: format!("a second {} in one file", show_bytes(&id)),
                    repair: format!("if two recordings were joined, cut the file there: the first takes {at} bytes"),
                });
            }
            _ if declared.bytes > present => {
                let (name, declared) = (show_bytes(&id), declared.bytes);
                if self.data.is_none() {
                    let found = format!("chunk {name} claims {declared} bytes, the file ends after {present}");
                    return Err(WaveError::MissingData { offset: at, found });
                }
                if let Some(next) = self.last_chunks(source, at + 8)? {
                    (span.bytes, span.size_wrong) = (next - at - 8, true);
                    self.notes.push(size_note(source, &span, declared, next)?);
                } else {
                    span.size_wrong = true;
                    self.notes.push(format!(
                        "chunk {name} at byte {at} claims {declared} bytes, the file ends after {present}; the output gets the right size"
                    ));
                }
            }
            b"fact" if self.fact.is_none() && bytes >= 4 => {
                let count = source.array_at::<4>(at + 8)?;
                self.fact = count.map(|count| (index, self.sizes.form.read_u32(count)));
            }
            b"ds64" if !self.sizes.form.is_wide() || index > 0 => {
                let form = self.sizes.form.name();
                self.notes.push(format!("`ds64` at byte {at} does not belong there in {form} files"));
            }
            _ => {}
        }
        self.spans.push(span);
        Ok(span.end())
    }

    fn fmt<R: Read + Seek>(&mut self, source: &mut Source<R>, span: &Span) -> Result<(), WaveError> {
        let arrangement = |what: &str| WaveError::Arrangement {
            offset: span.offset,
            what: what.into(),
            repair: "export the recording as a plain WAV file with one `fmt ` and one `data`".into(),
        };
        if self.fmt.is_some() {
            return Err(arrangement("a second `fmt ` chunk"));
        }
        let mut body = vec![0; span.bytes.min(u64::from(u16::MAX)) as usize];
        source.read_at(span.body(), &mut body, "reading `fmt `")?;
        let known = &body[..body.len().min(FMT_READ_BYTES)];
        let fmt = format::parse(known, span.bytes, span.offset, self.sizes.form)?;
        if span.bytes > body.len() as u64 {
            return Err(arrangement("a `fmt ` chunk of more than 65535 bytes"));
        }
        self.fmt = Some((self.spans.len(), fmt, body));
        Ok(())
    }

    fn finish(mut self, file_bytes: u64, trailing_bytes: u64) -> Result<Layout, WaveError> {
        let Some((data, size)) = self.data.take() else {
            return Err(WaveError::MissingData { offset: file_bytes, found: "the file ends".into() });
        };
        let span = self.spans[data];
        let Some((fmt, parsed, fmt_body)) = self.fmt.take() else {
            return Err(WaveError::MissingFmt { offset: span.offset });
        };
        let frame_bytes = u64::from(parsed.channels) * u64::from(parsed.format.encoding.bytes());
        let data_bytes = span.bytes - span.bytes % frame_bytes;
        if data_bytes == 0 {
            return Err(WaveError::EmptyData { offset: span.offset, bytes: span.bytes, frame_bytes });
        }
        if fmt > data {
            self.notes.push(format!("`fmt ` at byte {} stands after `data`; order kept", self.spans[fmt].offset));
        }
        self.notes.extend(parsed.notes.iter().cloned());
        self.notes.extend(size.note(&span, frame_bytes));
        self.ds64_notes(&span, &size, data_bytes / frame_bytes);
        self.trailing_note(&span, &size, file_bytes, trailing_bytes);
        let riff_size_wrong = self.riff_note(file_bytes, trailing_bytes);
        Ok(Layout {
            riff_declared: self.riff_declared(),
            riff_field: self.riff_field,
            sizes: self.sizes,
            spans: self.spans,
            fmt,
            data,
            parsed,
            fmt_body,
            fact: self.fact,
            data_bytes,
            riff_size_wrong,
            trailing_bytes,
            notes: self.notes,
        })
    }
}

fn wavl(offset: u64) -> WaveError {
    WaveError::Arrangement {
        offset,
        what: "a `wavl` list of samples and silence".into(),
        repair: "export the recording as a plain WAV file with one `fmt ` and one `data`, silence written out".into(),
    }
}

fn second_data(second: &Span, first: &Span) -> WaveError {
    WaveError::Arrangement {
        offset: second.offset,
        what: "a second `data` chunk".into(),
        repair: format!(
            "it holds {} bytes, the first, at byte {}, {}, and whether both are one recording can't be told: \
             join them into one `data`, or rename the one that is not wanted (to `JUNK`)",
            second.bytes, first.offset, first.bytes
        ),
    }
}
