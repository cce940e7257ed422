//! Why a recording can't be read or written.

use std::io;

/// Why a recording can't be read or written. Messages are shown after the path and
/// name the place in bytes from the start of the file, what was expected there and
/// what to do.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum WaveError {
    /// Nothing in the file at all.
    #[error("empty: the file has 0 bytes; copy it again from the recorder's card, or leave it out")]
    EmptyFile,
    /// A sound header, but not one frame of samples.
    #[error(
        "empty: `data` at byte {offset} holds {bytes} bytes and a frame takes {frame_bytes}, so there is no sample; \
         leave the recording out"
    )]
    EmptyData {
        /// Where the id of `data` stands.
        offset: u64,
        /// Bytes found in it.
        bytes: u64,
        /// Bytes of one frame.
        frame_bytes: u64,
    },
    /// The file does not begin as a RIFF file does.
    #[error(
        "byte 0: found {found}, expected `RIFF`: this is no WAV file whatever its name says; leave it out or convert it"
    )]
    NotRiff {
        /// The first bytes.
        found: String,
    },
    /// The file ends inside the 12 bytes every WAV file begins with.
    #[error(
        "byte {bytes}: the file ends inside its header, expected 12 bytes (`RIFF`, a size, `WAVE`); \
         copy it again from the recorder's card"
    )]
    HeaderCut {
        /// Length of the file.
        bytes: u64,
    },
    /// RIFF, but not sound.
    #[error("byte 8: found {found}, expected `WAVE`: a RIFF file of another kind; leave it out or convert it")]
    NotWave {
        /// The form type.
        found: String,
    },
    /// A relative of RIFF/WAVE this version does not read.
    #[error("byte 0: {form} files ({meaning}) are not read; convert the recording to plain RIFF/WAVE")]
    OtherForm {
        /// Its four letters.
        form: String,
        /// What they stand for.
        meaning: &'static str,
    },
    /// An arrangement of chunks this version does not read.
    #[error("byte {offset}: {what} is not read; {repair}")]
    Arrangement {
        /// Where it was met.
        offset: u64,
        /// The arrangement by name.
        what: &'static str,
        /// What to do.
        repair: &'static str,
    },
    /// Where a chunk should begin there is no chunk id.
    #[error(
        "byte {offset}: found {found} where a chunk before `data` should begin, expected four printable characters; \
         the size of the chunk before it is wrong, or the file is damaged: export the recording again"
    )]
    BadChunkId {
        /// Where.
        offset: u64,
        /// The four bytes.
        found: String,
    },
    /// More chunks than any recorder writes.
    #[error(
        "byte {offset}: more than {limit} chunks, expected a handful; the file is damaged: export the recording again"
    )]
    TooManyChunks {
        /// Where the first one too many stands.
        offset: u64,
        /// How many are accepted.
        limit: usize,
    },
    /// `data` without a `fmt `.
    #[error(
        "byte {offset}: `data` without a `fmt ` chunk, expected `fmt ` before it to say how samples are stored; \
         export the recording again"
    )]
    MissingFmt {
        /// Where `data` stands.
        offset: u64,
    },
    /// No `data`.
    #[error("byte {offset}: {found}, expected a `data` chunk with samples; copy or export the recording again")]
    MissingData {
        /// Where the search ended.
        offset: u64,
        /// What was found there.
        found: String,
    },
    /// `fmt ` is too short for what it announces.
    #[error(
        "byte {offset}: `fmt ` holds {found} bytes, expected at least {expected} ({what}); export the recording again"
    )]
    FmtShort {
        /// Where its id stands.
        offset: u64,
        /// Bytes in it (or in its extension).
        found: u64,
        /// Bytes needed.
        expected: u64,
        /// For what.
        what: &'static str,
    },
    /// Samples in a coding other than PCM and IEEE float.
    #[error("byte {offset}: samples are stored as {coding}, expected PCM or IEEE float; convert the recording first")]
    Coding {
        /// Where the format tag stands.
        offset: u64,
        /// The coding by name, else its tag or GUID.
        coding: String,
    },
    /// A field of `fmt ` that can't be.
    #[error("byte {offset}: `fmt ` says {found}, expected {expected}; export the recording again")]
    FmtValue {
        /// Where the field stands.
        offset: u64,
        /// Name and value.
        found: String,
        /// What would do.
        expected: String,
    },
    /// NaN or infinity among the samples read.
    #[error(
        "byte {offset}: the sample of frame {frame} (counted from 0), channel {channel} (from 1) is {value}, \
         expected a finite number; repair that sample, or leave the recording out"
    )]
    NotFinite {
        /// Where it stands.
        offset: u64,
        /// Frame, counted from 0.
        frame: u64,
        /// Channel, counted from 1.
        channel: usize,
        /// `NaN`, `inf` or `-inf`.
        value: f64,
    },
    /// Samples with fewer valid bits than their container, at its wrong end.
    #[error(
        "byte {offset}: the {valid_bits}-bit samples stand in the lower part of their {container_bytes}-byte containers, \
         expected the upper part; export the recording in another bit depth"
    )]
    LowerPart {
        /// Of the first sample.
        offset: u64,
        /// Bits declared valid.
        valid_bits: u16,
        /// Bytes of a container.
        container_bytes: u16,
    },
    /// A value handed to the writer that the output's format can't hold.
    #[error(
        "frame {frame} (counted from 0), channel {channel} (from 1): {value} can't be stored exactly as {encoding}; \
         if it is not finite the filter overflowed, else this is an error of the tool: report it"
    )]
    Inexact {
        /// Frame, counted from 0.
        frame: u64,
        /// Channel, counted from 1.
        channel: usize,
        /// The value.
        value: f64,
        /// Name of the output's encoding.
        encoding: &'static str,
    },
    /// The file's length changed while it was read.
    #[error(
        "byte {offset}: the file changed while it was read: expected {expected} bytes in all, found {found}; \
         wait until nothing writes to it and run again"
    )]
    Changed {
        /// Where reading stopped.
        offset: u64,
        /// Length when it was opened.
        expected: u64,
        /// Length now.
        found: u64,
    },
    /// A block with another number of channels, or channels of unequal length.
    #[error("a block of {found} does not fit, expected {expected}; this is an error of the tool: report it")]
    Block {
        /// What the block holds.
        found: String,
        /// What was expected.
        expected: String,
    },
    /// Finished before every frame was read or written, or more were written.
    #[error("{found} frames {verb}, expected {expected}; this is an error of the tool: report it")]
    FrameCount {
        /// `read` or `written`.
        verb: &'static str,
        /// How many.
        found: u64,
        /// How many there are.
        expected: u64,
    },
    /// The output would not fit into the 32-bit sizes of a RIFF file.
    #[error(
        "the output would take {bytes} bytes, expected at most 4294967303 (32-bit sizes); \
         choose a narrower `encoding`, or split the recording"
    )]
    TooLong {
        /// Its length.
        bytes: u64,
    },
    /// A frame of the output would not fit into the 16-bit block align.
    #[error("a frame of the output would take {bytes} bytes, expected at most 65535; choose a narrower `encoding`")]
    FrameTooWide {
        /// Bytes of a frame.
        bytes: u64,
    },
    /// The operating system refused.
    #[error("byte {offset}: {doing}: {source}")]
    Io {
        /// What was being done.
        doing: &'static str,
        /// Where, bytes from the start of the file.
        offset: u64,
        /// What the system said.
        source: io::Error,
    },
}

/// Bytes as a reader of a message would like to see them: in backticks when they are
/// printable, else in hexadecimal.
pub(crate) fn show_bytes(bytes: &[u8]) -> String {
    if bytes.iter().all(|b| (0x20..0x7f).contains(b)) {
        format!("`{}`", String::from_utf8_lossy(bytes))
    } else {
        let hex: Vec<String> = bytes.iter().map(|b| format!("{b:02x}")).collect();
        format!("the bytes {}", hex.join(" "))
    }
}
