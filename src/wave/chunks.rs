//! The chunk structure: where each chunk of a RIFF/WAVE file begins and ends.
//!
//! The file's length is the truth; the sizes written in it are claims. Every step
//! of the walk moves on by at least the 8 bytes of a chunk header.

use std::io::{Read, Seek};

use super::error::{WaveError, show_bytes};
use super::format::{self, FMT_READ_BYTES, Fmt};
use super::padding::{Trust, next_chunk, only_chunks_follow, trust};
use super::source::Source;

/// Chunks accepted in one file. Recorders write fewer than twenty; the limit keeps a
/// damaged file of zero-sized chunks from holding the walk for hours.
pub(crate) const MAX_CHUNKS: usize = 4096;

/// One chunk and where the next thing begins.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Span {
    pub(crate) id: [u8; 4],
    /// Of the id.
    pub(crate) offset: u64,
    /// Of the body, as present in the file.
    pub(crate) bytes: u64,
    /// First byte of the next chunk, of what trails, or the end of the file.
    pub(crate) next: u64,
}

impl Span {
    pub(crate) fn body(&self) -> u64 {
        self.offset + 8
    }

    pub(crate) fn end(&self) -> u64 {
        self.body() + self.bytes
    }
}

/// A walked file.
#[derive(Clone, Debug)]
pub(crate) struct Layout {
    pub(crate) spans: Vec<Span>,
    /// Index of `fmt ` and of `data` among them.
    pub(crate) fmt: usize,
    pub(crate) data: usize,
    /// What `fmt ` says, and its body.
    pub(crate) parsed: Fmt,
    pub(crate) fmt_body: Vec<u8>,
    /// Index of the first `fact`, and the number of frames it declares.
    pub(crate) fact: Option<(usize, u32)>,
    /// Bytes of whole frames in `data`.
    pub(crate) data_bytes: u64,
    /// Whether the size of `data` is not what the file holds.
    pub(crate) data_size_wrong: bool,
    /// Whether the RIFF size is not what the file holds.
    pub(crate) riff_size_wrong: bool,
    /// Bytes after the last chunk that are no chunk.
    pub(crate) trailing_bytes: u64,
    pub(crate) notes: Vec<String>,
}

impl Layout {
    pub(crate) fn frame_bytes(&self) -> u64 {
        u64::from(self.parsed.channels) * u64::from(self.parsed.format.encoding.bytes())
    }
}

/// Checks the first 12 bytes and returns the declared RIFF size.
fn riff_head<R: Read + Seek>(source: &mut Source<R>) -> Result<u32, WaveError> {
    let bytes = source.bytes();
    if bytes == 0 {
        return Err(WaveError::EmptyFile);
    }
    let mut first = vec![0; bytes.min(12) as usize];
    source.read_at(0, &mut first, "reading the header")?;
    let start = &first[..first.len().min(4)];
    let other = match start {
        b"RIFX" => Some("big-endian RIFF"),
        b"RF64" | b"BW64" => Some("RIFF with 64-bit sizes"),
        b"FORM" => Some("the big-endian ancestor of RIFF"),
        _ => None,
    };
    if let Some(meaning) = other {
        return Err(WaveError::OtherForm { form: String::from_utf8_lossy(start).into_owned(), meaning });
    }
    if !b"RIFF".starts_with(start) {
        return Err(WaveError::NotRiff { found: show_bytes(start) });
    }
    let Ok([_, _, _, _, s0, s1, s2, s3, f0, f1, f2, f3]) = <[u8; 12]>::try_from(first) else {
        return Err(WaveError::HeaderCut { bytes });
    };
    if [f0, f1, f2, f3] != *b"WAVE" {
        return Err(WaveError::NotWave { found: show_bytes(&[f0, f1, f2, f3]) });
    }
    Ok(u32::from_le_bytes([s0, s1, s2, s3]))
}

/// Walks the whole file.
pub(crate) fn walk<R: Read + Seek>(source: &mut Source<R>) -> Result<Layout, WaveError> {
    let riff_size = riff_head(source)?;
    let file_bytes = source.bytes();
    let riff_end = u64::from(riff_size) + 8;
    let mut walk = Walk { spans: Vec::new(), fmt: None, fact: None, data: None, notes: Vec::new() };
    let mut at = 12;
    let mut sure = trust(source, at)?;
    let mut trailing_bytes = 0;
    loop {
        let left = file_bytes.saturating_sub(at);
        if left == 0 {
            break;
        }
        let header = source.array_at::<8>(at)?;
        let (Some([a, b, c, d, s0, s1, s2, s3]), true) = (header, sure > Trust::No) else {
            if walk.data.is_none() {
                return Err(walk.no_chunk(source, at)?);
            }
            trailing_bytes = left;
            break;
        };
        let id = [a, b, c, d];
        let declared = u32::from_le_bytes([s0, s1, s2, s3]);
        // A chunk id by chance among bytes appended to the file is no chunk.
        if sure == Trust::Printable && at >= riff_end && walk.data.is_some() {
            trailing_bytes = left;
            break;
        }
        if walk.spans.len() == MAX_CHUNKS {
            return Err(WaveError::TooManyChunks { offset: at, limit: MAX_CHUNKS });
        }
        at = walk.chunk(source, id, at, declared)?;
        let Some(last) = walk.spans.last_mut() else { break };
        let odd = last.bytes % 2 == 1;
        (last.next, sure) = next_chunk(source, at, odd)?;
        if sure == Trust::No {
            // Nothing follows, or no chunk: the pad byte, if any, is still this chunk's.
            last.next = (at + u64::from(odd)).min(file_bytes);
        }
        at = last.next;
    }
    walk.finish(file_bytes, riff_size, trailing_bytes)
}

struct Data {
    index: usize,
    declared: u32,
    size_wrong: bool,
}

struct Walk {
    spans: Vec<Span>,
    fmt: Option<(usize, Fmt, Vec<u8>)>,
    fact: Option<(usize, u32)>,
    data: Option<Data>,
    notes: Vec<String>,
}

impl Walk {
    /// Why the walk can't go on before it has seen `data`.
    fn no_chunk<R: Read + Seek>(&self, source: &mut Source<R>, at: u64) -> Result<WaveError, WaveError> {
        Ok(match source.array_at::<8>(at)? {
            Some([a, b, c, d, ..]) => WaveError::BadChunkId { offset: at, found: show_bytes(&[a, b, c, d]) },
            None => {
                let found =
                    format!("the file ends {} bytes into a chunk header of 8", source.bytes().saturating_sub(at));
                WaveError::MissingData { offset: at, found }
            }
        })
    }

    /// Takes in the chunk at `at` and returns where its body ends.
    fn chunk<R: Read + Seek>(
        &mut self,
        source: &mut Source<R>,
        id: [u8; 4],
        at: u64,
        declared: u32,
    ) -> Result<u64, WaveError> {
        let present = source.bytes() - at - 8;
        let bytes = u64::from(declared).min(present);
        let index = self.spans.len();
        let mut span = Span { id, offset: at, bytes, next: 0 };
        match &id {
            b"fmt " => {
                if self.data.is_some() && self.fmt.is_none() {
                    return Err(arrangement(at, "`fmt ` after `data`"));
                }
                if self.fmt.is_some() {
                    return Err(arrangement(at, "a second `fmt ` chunk"));
                }
                let mut body = vec![0; bytes.min(u64::from(u16::MAX)) as usize];
                source.read_at(at + 8, &mut body, "reading `fmt `")?;
                let fmt = format::parse(&body[..body.len().min(FMT_READ_BYTES)], bytes, at)?;
                if bytes > body.len() as u64 {
                    return Err(arrangement(at, "a `fmt ` chunk of more than 65535 bytes"));
                }
                self.fmt = Some((index, fmt, body));
            }
            b"data" => {
                if self.data.is_some() {
                    return Err(arrangement(at, "a second `data` chunk"));
                }
                let cut = u64::from(declared) > present;
                let unwritten = declared == 0 && present > 0 && !only_chunks_follow(source, at + 8)?;
                if unwritten {
                    span.bytes = present;
                }
                self.data = Some(Data { index, declared, size_wrong: cut || unwritten });
            }
            b"wavl" => return Err(arrangement(at, "a `wavl` list of samples and silence")),
            b"RIFF" => return Err(arrangement(at, "a second `RIFF` in one file")),
            b"LIST" if source.array_at::<4>(at + 8)? == Some(*b"wavl") => {
                return Err(arrangement(at, "a `wavl` list of samples and silence"));
            }
            _ if u64::from(declared) > present => {
                let name = show_bytes(&id);
                if self.data.is_none() {
                    let found = format!("chunk {name} claims {declared} bytes, the file ends after {present}");
                    return Err(WaveError::MissingData { offset: at, found });
                }
                self.notes.push(format!(
                    "chunk {name} at byte {at} claims {declared} bytes, the file ends after {present}; kept as it is"
                ));
            }
            b"fact" if self.fact.is_none() && bytes >= 4 => {
                self.fact = source.array_at::<4>(at + 8)?.map(|count| (index, u32::from_le_bytes(count)));
            }
            _ => {}
        }
        self.spans.push(span);
        Ok(span.end())
    }

    fn finish(mut self, file_bytes: u64, riff_size: u32, trailing_bytes: u64) -> Result<Layout, WaveError> {
        let Some(data) = self.data else {
            return Err(WaveError::MissingData { offset: file_bytes, found: "the file ends".into() });
        };
        let span = self.spans[data.index];
        let Some((fmt, parsed, fmt_body)) = self.fmt else {
            return Err(WaveError::MissingFmt { offset: span.offset });
        };
        let frame_bytes = u64::from(parsed.channels) * u64::from(parsed.format.encoding.bytes());
        let data_bytes = span.bytes - span.bytes % frame_bytes;
        if data_bytes == 0 {
            return Err(WaveError::EmptyData { offset: span.offset, bytes: span.bytes, frame_bytes });
        }
        self.notes.extend(parsed.notes.iter().cloned());
        let left = span.bytes - data_bytes;
        if data.size_wrong {
            let dropped = if left > 0 {
                format!("; the last {left} bytes are no whole frame and left out")
            } else {
                String::new()
            };
            self.notes.push(format!(
                "`data` at byte {} declares {} bytes, found {} up to the end of the file: {} whole frames taken{dropped}; the output gets right sizes",
                span.offset,
                data.declared,
                span.bytes,
                data_bytes / frame_bytes,
            ));
        } else if left > 0 {
            self.notes.push(format!(
                "`data` at byte {} holds {left} bytes after its last whole frame (byte {}): a pad counted in its size, or a cut frame; not filtered",
                span.offset,
                span.body() + data_bytes,
            ));
        }
        if trailing_bytes > 0 {
            self.notes.push(format!(
                "{trailing_bytes} bytes after the last chunk (byte {}) are no chunk; carried over unchanged",
                file_bytes - trailing_bytes
            ));
        }
        // A last chunk of odd size may or may not have its pad byte, and the RIFF
        // size may or may not count it: none of that is damage.
        let (end, padded) = self.spans.last().map_or((12, 12), |s| (s.end(), s.end() + s.bytes % 2));
        let riff_end = u64::from(riff_size) + 8;
        let riff_size_wrong = ![end, padded, file_bytes].contains(&riff_end);
        let found = file_bytes - trailing_bytes - 8;
        if riff_size_wrong {
            self.notes.push(format!(
                "the RIFF size at byte 4 declares {riff_size}, found {found}; the output gets the right size"
            ));
        } else if riff_end != file_bytes && trailing_bytes == 0 {
            self.notes.push(format!(
                "the RIFF size at byte 4 declares {riff_size}, found {found}: the pad byte of the last chunk; kept as it is"
            ));
        }
        Ok(Layout {
            spans: self.spans,
            fmt,
            data: data.index,
            parsed,
            fmt_body,
            fact: self.fact,
            data_bytes,
            data_size_wrong: data.size_wrong,
            riff_size_wrong,
            trailing_bytes,
            notes: self.notes,
        })
    }
}

fn arrangement(offset: u64, what: &'static str) -> WaveError {
    WaveError::Arrangement {
        offset,
        what,
        repair: "export the recording as a plain WAV file with one `fmt ` and one `data`",
    }
}
