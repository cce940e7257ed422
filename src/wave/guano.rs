//! What a `guan` chunk (GUANO metadata) says of the sample rate, and what that means for
//! frequencies.
//!
//! A time-expanded recording plays slower than life: its header states a lower sample rate
//! than the sound was sampled at, so a call at 40 kHz stands at 4 kHz. Two fields tell it,
//! `TE` (how many times slower) and `Samplerate` (the rate at which sound was sampled, Hz);
//! either alone does. Which rate the frequencies of a spec mean can't be told from the file.
//!
//! Source: GUANO metadata specification 1.0 (public, open), from memory: UTF-8 lines
//! `Key: value`, some with `Namespace|` before the key; `TE` missing means 1.

use std::io::{Read, Seek};

use super::Header;
use super::chunks::Span;
use super::error::{WaveError, show_bytes};
use super::source::Source;

/// Bytes looked at for fields, of all `guan` chunks of a file together. Recorders write some
/// hundreds; a damaged size can claim gigabytes.
const READ_BYTES: u64 = 1 << 16;

/// Which sample rate frequencies mean in a time-expanded recording.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RateMeaning {
    /// The header's: frequencies of the recording as it plays.
    Header,
    /// That at which sound was sampled: frequencies of the sound itself.
    Acoustic,
}

/// The fields that tell a time-expanded recording.
#[derive(Clone, Debug, PartialEq)]
pub struct Guano {
    /// Where the (first) chunk's id stands, bytes from the start of the file.
    pub offset: u64,
    /// `TE`: how many times slower than life the recording plays at the header's rate,
    /// above 0; `None` where the field is missing, has no value or can't be read.
    pub time_expansion: Option<f64>,
    /// `Samplerate`: the rate at which sound was sampled, Hz, above 0; `None` likewise.
    pub rate_hz: Option<f64>,
    /// What `TE` has in place of a number above 0.
    pub bad_time_expansion: Option<BadField>,
    /// What `Samplerate` has in place of a number above 0.
    pub bad_rate: Option<BadField>,
    /// What was unusual, each a sentence for the report.
    pub notes: Vec<String>,
}

/// A field without a usable number.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BadField {
    /// Where its line begins, bytes from the start of the file.
    pub offset: u64,
    /// What was found, in words.
    pub found: String,
}

/// Longest part of a value that a message repeats, bytes.
const SHOWN_BYTES: usize = 40;

/// What the lines of one field come to.
#[derive(Debug, Default)]
struct Field {
    number: Option<f64>,
    bad: Option<BadField>,
}

impl Field {
    fn take(&mut self, offset: u64, value: &[u8]) {
        let found = if value.is_empty() {
            // A form left blank says nothing.
            return;
        } else if let Some(number) = number(value) {
            match self.number {
                Some(other) if other != number => format!("both {other} and {number}"),
                _ => {
                    self.number = Some(number);
                    return;
                }
            }
        } else {
            let cut = &value[..value.len().min(SHOWN_BYTES)];
            format!("{}{}", show_bytes(cut), if cut.len() < value.len() { "..." } else { "" })
        };
        self.bad.get_or_insert(BadField { offset, found });
    }

    fn cut(&mut self, offset: u64) {
        self.bad.get_or_insert(BadField { offset, found: "a value that is cut off".to_owned() });
    }

    /// The number, unless another line of the field has another or none.
    fn number(&self) -> Option<f64> {
        self.number.filter(|_| self.bad.is_none())
    }
}

/// A decimal number above 0. A decimal comma is none: `1,000` may mean 1 or 1000.
fn number(value: &[u8]) -> Option<f64> {
    std::str::from_utf8(value).ok()?.parse().ok().filter(|&number: &f64| number > 0.0 && number.is_finite())
}

/// Lines of a chunk with the place of each, ends of lines of any kind left out.
fn lines(text: &[u8]) -> impl Iterator<Item = (usize, &[u8])> {
    let mut at = 0;
    text.split(|byte| matches!(byte, b'\n' | b'\r')).map(move |line| {
        let start = at;
        at += line.len() + 1;
        (start, line)
    })
}

/// Without blanks and NUL bytes around it.
fn bare(bytes: &[u8]) -> &[u8] {
    let blank = |byte: &u8| byte.is_ascii_whitespace() || *byte == 0;
    let start = bytes.iter().take_while(|byte| blank(byte)).count();
    let end = bytes.len() - bytes.iter().rev().take_while(|byte| blank(byte)).count();
    bytes.get(start..end).unwrap_or_default()
}

/// Key and value of a line, `None` where there is no colon.
pub(super) fn field(line: &[u8]) -> Option<(&[u8], &[u8])> {
    let line = line.strip_prefix(b"\xef\xbb\xbf").unwrap_or(line);
    let colon = line.iter().position(|&byte| byte == b':')?;
    Some((bare(&line[..colon]), bare(&line[colon + 1..])))
}

/// Key and value of every line that has them.
pub(super) fn fields(text: &[u8]) -> impl Iterator<Item = (&[u8], &[u8])> {
    lines(text).filter_map(|(_, line)| field(line))
}

/// Reads the fields of all `guan` chunks among `spans`; `None` without one.
///
/// Text that is no GUANO is no error: lines are taken as they come. At most
/// [`READ_BYTES`] are read.
pub(crate) fn read<R: Read + Seek>(source: &mut Source<R>, spans: &[Span]) -> Result<Option<Guano>, WaveError> {
    let mut left = READ_BYTES;
    let mut first = None;
    let mut notes = Vec::new();
    let (mut expansion, mut rate) = (Field::default(), Field::default());
    for span in spans.iter().filter(|span| span.id == *b"guan") {
        first.get_or_insert(span.offset);
        let mut text = vec![0; span.bytes.min(left) as usize];
        source.read_at(span.body(), &mut text, "reading `guan`")?;
        left -= text.len() as u64;
        let read_whole = text.len() as u64 == span.bytes;
        if !read_whole {
            notes.push(format!(
                "of `guan` at byte {} the first {} bytes of {} were looked at for the sample rate",
                span.offset,
                text.len(),
                span.bytes
            ));
        }
        let whole = read_whole && !span.size_wrong;
        let last = lines(&text).last().map_or(0, |(at, _)| at);
        for (at, line) in lines(&text) {
            let Some((key, value)) = field(line) else { continue };
            // Other spellings of the case are no GUANO, but who writes them means it.
            let field = if key.eq_ignore_ascii_case(b"TE") {
                &mut expansion
            } else if key.eq_ignore_ascii_case(b"Samplerate") {
                &mut rate
            } else {
                continue;
            };
            let offset = span.body() + at as u64;
            // `TE: 1` may be all that is left of `TE: 10`.
            if at == last && !whole { field.cut(offset) } else { field.take(offset, value) }
        }
    }
    Ok(first.map(|offset| Guano {
        offset,
        time_expansion: expansion.number(),
        rate_hz: rate.number(),
        bad_time_expansion: expansion.bad,
        bad_rate: rate.bad,
        notes,
    }))
}

impl Guano {
    /// Whether the recording is time-expanded by what could be read.
    fn expands(&self, header_rate_hz: u32) -> bool {
        self.time_expansion.is_some_and(|expansion| expansion != 1.0)
            || self.rate_hz.is_some_and(|rate_hz| rate_hz != f64::from(header_rate_hz))
    }

    /// The rates that both fields come to, Hz; that of `TE` needs the header's.
    fn acoustic_hz(&self, header_rate_hz: u32) -> (Option<f64>, Option<f64>) {
        (self.time_expansion.map(|expansion| whole(f64::from(header_rate_hz) * expansion)), self.rate_hz)
    }

    /// `TE 10, Samplerate 384000`.
    fn told(&self) -> String {
        let expansion = self.time_expansion.map(|expansion| format!("TE {expansion}"));
        let rate = self.rate_hz.map(|rate_hz| format!("Samplerate {rate_hz}"));
        let told: Vec<_> = [expansion, rate].into_iter().flatten().collect();
        told.join(", ")
    }

    /// Why nobody can tell whether the recording is time-expanded. A `TE` that can be read
    /// needs no `Samplerate`.
    fn unreadable(&self) -> Option<WaveError> {
        let bad =
            |key, field: &BadField| WaveError::RateField { offset: field.offset, key, found: field.found.clone() };
        if let Some(field) = &self.bad_time_expansion {
            return Some(bad("TE", field));
        }
        self.bad_rate.as_ref().filter(|_| self.time_expansion.is_none()).map(|field| bad("Samplerate", field))
    }
}

/// The whole number that `hz` is but for rounding: of the factor, whose decimal digits are
/// rarely binary ones, and of the product, half an ulp (2^-53) each.
fn whole(hz: f64) -> f64 {
    let nearest = hz.round();
    if (hz - nearest).abs() <= nearest * f64::EPSILON { nearest } else { hz }
}

/// Sets [`Header::rate_hz`] to the rate that frequencies mean.
///
/// # Errors
/// See [`super::Reader::open_as`].
pub(crate) fn resolve(header: &mut Header, meaning: Option<RateMeaning>) -> Result<(), WaveError> {
    let Some(guano) = &header.guano else { return Ok(()) };
    let header_rate_hz = header.header_rate_hz;
    let expands = guano.expands(header_rate_hz);
    let unreadable = guano.unreadable();
    let offset = guano.offset;
    if meaning == Some(RateMeaning::Header) {
        let what = match unreadable {
            Some(error) => format!("whether it is time-expanded is not known ({error})"),
            None if expands => format!("time-expanded (`guan` at byte {offset}: {})", guano.told()),
            None => return Ok(()),
        };
        header.notes.push(format!(
            "{what}; frequencies and times are those of the recording as it plays, at the header's {header_rate_hz} Hz"
        ));
        return Ok(());
    }
    if let Some(error) = unreadable {
        return Err(error);
    }
    let unused = guano.bad_rate.as_ref().map(|bad| {
        format!("`Samplerate` in `guan` at byte {} is {}, no number above 0; not used", bad.offset, bad.found)
    });
    if !expands {
        header.notes.extend(unused);
        return Ok(());
    }
    let (by_factor, by_rate) = guano.acoustic_hz(header_rate_hz);
    let told = guano.told();
    if meaning.is_none() {
        let acoustic = match (by_factor, by_rate) {
            (Some(one), Some(other)) if one != other => format!("{one} Hz by TE and {other} Hz by Samplerate"),
            (one, other) => format!("{} Hz", one.or(other).unwrap_or_default()),
        };
        return Err(WaveError::TimeExpanded { offset, told, header_rate_hz, acoustic });
    }
    if let (Some(expansion), Some(one), Some(other)) = (guano.time_expansion, by_factor, by_rate)
        && one != other
    {
        return Err(WaveError::RatesDisagree { offset, header_rate_hz, expansion, product_hz: one, told_hz: other });
    }
    let acoustic_hz = by_factor.or(by_rate).unwrap_or_default();
    if acoustic_hz.fract() != 0.0 || !(1.0..=f64::from(u32::MAX)).contains(&acoustic_hz) {
        return Err(WaveError::AcousticRate { offset, told, header_rate_hz, acoustic_hz });
    }
    // Whole and in range by the check above.
    header.rate_hz = acoustic_hz as u32;
    header.notes.push(format!(
        "time-expanded (`guan` at byte {offset}: {told}); frequencies and times are those of the sound itself, at \
         {acoustic_hz} Hz, and the header keeps its {header_rate_hz} Hz"
    ));
    header.notes.extend(unused);
    Ok(())
}
