//! What a walk has to say: sizes and padding that are not what they should be.

use super::super::chunks::Span;
use super::super::data_size::DataSize;
use super::super::ds64;
use super::super::error::{WaveError, show_bytes};
use super::super::form::ELSEWHERE;
use super::super::padding::Trust;
use super::super::source::Source;
use super::Walk;
use std::io::{Read, Seek};

impl Walk {
    /// Says where padding within the file does not follow the rules. (That of its last
    /// chunk may be missing: see [`Self::riff_note`].)
    pub(super) fn padding_note(&mut self, last: &Span, next: Trust) {
        let odd = last.bytes % 2 == 1;
        let place = || format!("chunk {} at byte {} of {} bytes", show_bytes(&last.id), last.offset, last.bytes);
        if next > Trust::No && odd && last.next == last.end() {
            self.notes.push(format!("{} has no pad byte (byte {}); kept as it is", place(), last.end()));
        } else if next > Trust::No && !odd && last.next > last.end() {
            self.notes.push(format!(
                "{} is followed by a byte that its even size leaves no room for (byte {}); kept as it is",
                place(),
                last.end()
            ));
        } else if next > Trust::No && last.next > last.end() + 1 {
            self.notes.push(format!("{} has two pad bytes (byte {}); kept as it is", place(), last.end()));
        }
    }

    /// Says what of `ds64` is not true.
    pub(super) fn ds64_notes(&mut self, data: &Span, size: &DataSize, frames: u64) {
        let Some(ds64) = &self.sizes.ds64 else { return };
        let at = ds64::OFFSET;
        // 0 is what writers put there that take the count for the dummy it is.
        if ds64.frames != 0 && ds64.frames != frames {
            let declared = ds64.frames;
            self.notes.push(format!(
                "`ds64` at byte {at} declares {declared} frames (byte {}), `data` holds {frames}; not used",
                at + 24
            ));
        }
        if ds64.present_entries < ds64.declared_entries {
            self.notes.push(format!(
                "`ds64` at byte {at} declares a table of {} chunks (byte {}), found room for {}; the output gets the right number",
                ds64.declared_entries,
                at + 32,
                ds64.present_entries
            ));
        }
        if ds64.data_bytes != size.declared {
            self.notes.push(format!(
                "`ds64` at byte {at} declares {} bytes in `data` (byte {}), `data` itself {} (byte {}): that is used; the output gets right sizes",
                ds64.data_bytes,
                at + 16,
                size.declared,
                data.offset + 4,
            ));
        }
    }

    pub(super) fn trailing_note(&mut self, data: &Span, size: &DataSize, file_bytes: u64, trailing_bytes: u64) {
        if trailing_bytes == 0 {
            return;
        }
        let from = file_bytes - trailing_bytes;
        let last = self.spans.last().is_some_and(|last| last.offset == data.offset);
        let samples = if last && !size.is_wrong() {
            let right = file_bytes - data.body();
            format!(
                "; if they are samples, the size at byte {} should be {right} instead of {}",
                data.offset + 4,
                data.bytes
            )
        } else {
            String::new()
        };
        self.notes.push(format!(
            "{trailing_bytes} bytes after the last chunk (byte {from}) are no chunk; carried over unchanged{samples}"
        ));
    }

    /// Says what is unusual about the RIFF size; whether it is wrong.
    pub(super) fn riff_note(&mut self, file_bytes: u64, trailing_bytes: u64) -> bool {
        // A last chunk of odd size may or may not have its pad byte, and the RIFF
        // size may or may not count it: none of that is damage.
        let (end, padded) = self.spans.last().map_or((12, 12), |s| (s.end(), s.end() + s.bytes % 2));
        let declared = self.riff_declared();
        let riff_end = declared.checked_add(8);
        let wrong = ![end, padded, file_bytes].map(Some).contains(&riff_end);
        let found = file_bytes - trailing_bytes - 8;
        let place = match &self.sizes.ds64 {
            Some(_) if self.riff_field == ELSEWHERE => format!("byte {} (`ds64`)", ds64::OFFSET + 8),
            _ => "byte 4".into(),
        };
        if wrong {
            self.notes.push(format!(
                "the RIFF size at {place} declares {declared}, found {found}; the output gets the right size"
            ));
        } else if riff_end != Some(file_bytes) && trailing_bytes == 0 {
            self.notes.push(format!(
                "the RIFF size at {place} declares {declared}, found {found}: the pad byte of the last chunk"
            ));
        }
        wrong
    }
}

/// Declared and found, where the chunks behind show what is right.
pub(super) fn size_note<R: Read + Seek>(
    source: &mut Source<R>,
    span: &Span,
    declared: u64,
    next: u64,
) -> Result<String, WaveError> {
    Ok(format!(
        "chunk {} at byte {} declares {declared} bytes, found {} up to {} at byte {next}, where chunks begin that end with the file; the output gets the right size",
        show_bytes(&span.id),
        span.offset,
        next - span.body(),
        source.array_at::<4>(next)?.map_or(String::new(), |id| show_bytes(&id)),
    ))
}
