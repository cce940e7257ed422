//! What was done, appended to the recording's own metadata.
//!
//! A recording with a `bext` chunk gets one more line of coding history, one without but
//! with a `guan` chunk one more field; any other has no place for it. Everything else in
//! the chunk stays byte for byte, and NUL bytes that pad its text are used up before it
//! grows.
//!
//! Sources, all from memory: EBU Tech 3285 v2 (`bext`: 602 bytes, then the coding history),
//! EBU R 98 (its lines: `A=` coding, `F=` sample rate in Hz, `W=` word length in bits, `M=`
//! mode, `T=` text without commas; CR LF at the end), GUANO metadata specification 1.0.

use std::io::{Read, Seek};

use super::chunks::Span;
use super::error::WaveError;
use super::plan::Edit;
use super::reader::Reader;
use super::{Changes, Encoding, Header, SampleFormat, guano};

/// What is to be said.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct History {
    /// Name and version of the program.
    pub tool: String,
    /// Whether it filtered forward and backward.
    pub both_ways: bool,
    /// SHA-256 of the spec file, lower-case hexadecimal.
    pub spec_sha256: String,
}

impl History {
    /// Without commas, which end a text of coding history.
    fn done(&self) -> &'static str {
        if self.both_ways { "filtered forward and backward (two passes; zero phase) by" } else { "filtered by" }
    }
}

/// What becomes of the input's chunks.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub(crate) struct Edits {
    pub(crate) edits: Vec<Edit>,
    /// Each a sentence for the report.
    pub(crate) notes: Vec<String>,
}

/// Fixed part of `bext`; the coding history is the rest.
const BEXT_BYTES: usize = 602;

/// Longer chunks are left as they are: they are read whole, and a history of more than some
/// kilobytes is damage.
const MAX_BYTES: u64 = 16 << 20;

/// Key of the GUANO field; those of later runs have a number after it.
const GUANO_KEY: &str = "Bandproof|History";

/// What [`Changes::history`] comes to for this input, which is left standing where it was.
///
/// # Errors
/// Those of reading the input.
pub(crate) fn edits<R: Read + Seek>(input: &mut Reader<R>, changes: &Changes) -> Result<Edits, WaveError> {
    let Some(history) = &changes.history else { return Ok(Edits::default()) };
    let find = |id: &[u8; 4]| input.layout().spans.iter().position(|span| span.id == *id);
    let Some(index) = find(b"bext").or_else(|| find(b"guan")) else {
        return Ok(left("the recording has neither a `bext` nor a `guan` chunk to append the history to".to_owned()));
    };
    let span = input.layout().spans[index];
    let place = format!("`{}` at byte {}", span.id.escape_ascii(), span.offset);
    if span.bytes > MAX_BYTES {
        return Ok(left(format!(
            "{place} holds {} bytes, more than the {MAX_BYTES} that a history is appended to; left as it is",
            span.bytes
        )));
    }
    if span.size_wrong {
        return Ok(left(format!("{place} has a wrong size: no history was appended")));
    }
    let body = body(input, &span)?;
    let (appended, new) = if span.id == *b"bext" {
        if body.len() < BEXT_BYTES {
            return Ok(left(format!(
                "{place} holds {} bytes, expected at least {BEXT_BYTES}: it is damaged, and no history was appended",
                body.len()
            )));
        }
        let line = coding_history(history, input.header(), changes.format);
        ("a line of coding history", append(&body, BEXT_BYTES, &line, LineEnd::CrLf))
    } else {
        let Some(end) = LineEnd::of(&body) else {
            return Ok(left(format!("{place} holds no text: no history appended")));
        };
        ("a field with the history", append(&body, 0, &guano_field(history, &body), end))
    };
    let note = format!("{appended} was appended to {place}: {} bytes before, {} after", body.len(), new.len());
    Ok(Edits { edits: vec![Edit { index, body: new }], notes: vec![note] })
}

/// Nothing done, and why.
fn left(why: String) -> Edits {
    Edits { edits: Vec::new(), notes: vec![why] }
}

fn body<R: Read + Seek>(input: &mut Reader<R>, span: &Span) -> Result<Vec<u8>, WaveError> {
    let mut body = Vec::new();
    input.copy(span.body(), span.end(), |bytes| {
        body.extend_from_slice(bytes);
        Ok(())
    })?;
    Ok(body)
}

/// How lines end.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum LineEnd {
    CrLf,
    Lf,
    Cr,
}

impl LineEnd {
    /// That of a text's lines, LF where it has one line; `None` for no text at all.
    fn of(body: &[u8]) -> Option<Self> {
        let text = &body[..text_bytes(body)];
        let has = |byte| text.contains(&byte);
        Some(match (has(b'\r'), has(b'\n')) {
            _ if text.is_empty() => return None,
            (true, true) if text.windows(2).any(|pair| pair == b"\r\n") => LineEnd::CrLf,
            (true, false) => LineEnd::Cr,
            _ => LineEnd::Lf,
        })
    }

    fn bytes(self) -> &'static [u8] {
        match self {
            LineEnd::CrLf => b"\r\n",
            LineEnd::Lf => b"\n",
            LineEnd::Cr => b"\r",
        }
    }
}

/// Bytes of a text before the NUL bytes that pad it.
fn text_bytes(body: &[u8]) -> usize {
    body.len() - body.iter().rev().take_while(|&&byte| byte == 0).count()
}

/// `body`, whose text begins at `from`, with a line more. A last line without an end gets
/// one before it. The size stays while padding lasts, and a text that ended with a NUL byte
/// still does.
fn append(body: &[u8], from: usize, line: &str, end: LineEnd) -> Vec<u8> {
    let text = from + text_bytes(body.get(from..).unwrap_or_default());
    let mut new = body[..text].to_vec();
    match body[from..text].last() {
        None | Some(b'\n') => {}
        // Half of it is there.
        Some(b'\r') if end == LineEnd::CrLf => new.push(b'\n'),
        Some(b'\r') if end == LineEnd::Cr => {}
        Some(_) => new.extend_from_slice(end.bytes()),
    }
    new.extend_from_slice(line.as_bytes());
    new.extend_from_slice(end.bytes());
    if text < body.len() {
        new.push(0);
        new.resize(new.len().max(body.len()), 0);
    }
    new
}

/// Printable ASCII without commas, which end a field of a coding history.
fn plain(text: &str) -> String {
    text.chars().map(|c| if matches!(c, ' '..='~') && c != ',' { c } else { ' ' }).collect()
}

/// One line of R 98, without its end. `W` is the number of valid bits; float samples have
/// no letter of their own there and are named in the text, as are more than two channels,
/// for which there is no mode. `F` is the rate that the header states.
fn coding_history(history: &History, header: &Header, format: SampleFormat) -> String {
    let mode = match header.channels {
        1 => "M=mono,",
        2 => "M=stereo,",
        _ => "",
    };
    let channels = if header.channels > 2 { format!("{} channels; ", header.channels) } else { String::new() };
    let coding = match format.encoding {
        Encoding::Float32 | Encoding::Float64 => "IEEE float; ",
        _ => "",
    };
    format!(
        "A=PCM,F={},W={},{mode}T={coding}{channels}{} {}; spec SHA-256 {}",
        header.header_rate_hz,
        format.valid_bits,
        history.done(),
        plain(&history.tool),
        plain(&history.spec_sha256)
    )
}

/// One field of GUANO, without the end of its line. Keys are unique, so that the second run
/// writes `Bandproof|History 2`, and so on.
fn guano_field(history: &History, text: &[u8]) -> String {
    let number = |key: &[u8]| -> Option<u64> {
        let rest = std::str::from_utf8(key).ok()?.strip_prefix(GUANO_KEY)?;
        if rest.is_empty() { Some(1) } else { rest.trim_start().parse::<u32>().ok().map(u64::from) }
    };
    let last = guano::fields(text).filter_map(|(key, _)| number(key)).max().unwrap_or(0);
    let number = if last > 0 { format!(" {}", last + 1) } else { String::new() };
    let (tool, spec_sha256) = (plain(&history.tool), plain(&history.spec_sha256));
    format!("{GUANO_KEY}{number}: {} {tool}; spec SHA-256 {spec_sha256}", history.done())
}
