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
    /// A relative of RIFF/WAVE that is not read.
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
        what: String,
        /// What to do.
        repair: String,
    },
    /// Where a chunk should begin there is no chunk id.
    #[error(
        "byte {offset}: found {found} where a chunk before `data` should begin, expected four printable characters; \
         {before}, or the file is damaged: export the recording again"
    )]
    BadChunkId {
        /// Where.
        offset: u64,
        /// The four bytes.
        found: String,
        /// What led there.
        before: String,
    },
    /// An RF64 or BW64 file whose 64-bit sizes are not where they belong.
    #[error(
        "byte {offset}: {found}, expected a `ds64` chunk of at least 28 bytes right after `WAVE` with the 64-bit sizes \
         of this {form} file; copy the recording again from the recorder's card, or export it again"
    )]
    Ds64 {
        /// Where.
        offset: u64,
        /// What was found.
        found: String,
        /// `RF64` or `BW64`.
        form: &'static str,
    },
    /// Bytes between the end of `data` and the chunks after it.
    #[error(
        "byte {offset}: {bytes} bytes that are no chunk stand between the end of `data` (byte {data}, declared {declared} \
         bytes) and {next}, expected a chunk; if they are samples, the size at byte {size_offset} should be {right}, \
         else take them out"
    )]
    Gap {
        /// Where they begin.
        offset: u64,
        /// How many.
        bytes: u64,
        /// Where the id of `data` stands.
        data: u64,
        /// What it declares.
        declared: u64,
        /// The chunk after them, with its place.
        next: String,
        /// Where the size of `data` stands.
        size_offset: u64,
        /// What it should be then.
        right: u64,
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
        "byte {offset}: `data` without a `fmt ` chunk before it, nor one after it where its size ends; expected one to \
         say how samples are stored; export the recording again"
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
    /// A big-endian output would not fit into 32-bit sizes.
    #[error(
        "the output would take {bytes} bytes, expected at most {limit}: RIFX files have 32-bit sizes and no form with \
         64; choose a narrower `encoding`, split the recording, or convert it to little-endian RIFF"
    )]
    TooLong {
        /// Its length.
        bytes: u64,
        /// What 32-bit sizes allow.
        limit: u64,
    },
    /// A chunk written anew would not fit into its 32-bit size.
    #[error("a chunk of the output would take {bytes} bytes, expected at most 4294967294 (32-bit size); shorten it")]
    ChunkTooLong {
        /// Bytes of its body.
        bytes: u64,
    },
    /// A frame of the output would not fit into the 16-bit block align.
    #[error("a frame of the output would take {bytes} bytes, expected at most 65535; choose a narrower `encoding`")]
    FrameTooWide {
        /// Bytes of a frame.
        bytes: u64,
    },
    /// GUANO says that the recording is time-expanded, and nobody said which rate
    /// frequencies mean.
    #[error(
        "byte {offset}: `guan` says that the recording is time-expanded ({told}): the header's rate is {header_rate_hz} \
         Hz, the acoustic rate {acoustic}; write rate = \"acoustic\" at the top of the spec if its frequencies mean \
         the sound itself, or rate = \"header\" if they mean the recording as it plays"
    )]
    TimeExpanded {
        /// Where the id of `guan` stands.
        offset: u64,
        /// The fields that tell it.
        told: String,
        /// Hz.
        header_rate_hz: u32,
        /// The rate at which sound was sampled, with its unit; both where the fields disagree.
        acoustic: String,
    },
    /// A GUANO field that decides on the sample rate has no number above 0.
    #[error(
        "byte {offset}: `{key}` in `guan` is {found}, expected a number above 0: it can't be told whether the recording \
         is time-expanded; correct the field, or write rate = \"header\" at the top of the spec if its frequencies mean \
         the recording as it plays"
    )]
    RateField {
        /// Where its line begins.
        offset: u64,
        /// `TE` or `Samplerate`.
        key: &'static str,
        /// What it has.
        found: String,
    },
    /// The header's rate, `TE` and `Samplerate` can't all be right.
    #[error(
        "byte {offset}: `guan` contradicts itself: the header's rate of {header_rate_hz} Hz times a TE of {expansion} is \
         {product_hz} Hz, and Samplerate says {told_hz}; correct the wrong field, or write rate = \"header\" at the top \
         of the spec if its frequencies mean the recording as it plays"
    )]
    RatesDisagree {
        /// Where the id of `guan` stands.
        offset: u64,
        /// Hz.
        header_rate_hz: u32,
        /// `TE`.
        expansion: f64,
        /// What both come to, Hz.
        product_hz: f64,
        /// `Samplerate`, Hz.
        told_hz: f64,
    },
    /// The acoustic rate is none that a recording can have.
    #[error(
        "byte {offset}: by `guan` ({told}) and the header's rate of {header_rate_hz} Hz the acoustic rate is \
         {acoustic_hz} Hz, expected a whole number from 1 to 4294967295; correct the field, or write rate = \"header\" \
         at the top of the spec if its frequencies mean the recording as it plays"
    )]
    AcousticRate {
        /// Where the id of `guan` stands.
        offset: u64,
        /// The fields that tell it.
        told: String,
        /// Hz.
        header_rate_hz: u32,
        /// Hz.
        acoustic_hz: f64,
    },
    /// Damage of several kinds at once: what was written is not what would be read.
    #[error(
        "byte {offset}: the sizes around `data` contradict each other so that the output would not be read as it was \
         written: {found}; set the sizes of the recording right, or export it again"
    )]
    NotReadBack {
        /// Where the id of `data` stands.
        offset: u64,
        /// What would be read.
        found: String,
    },
    /// The operating system refused.
    #[error("byte {offset}: {doing}: {source}{}", advice(source))]
    Io {
        /// What was being done.
        doing: &'static str,
        /// Where, bytes from the start of the file.
        offset: u64,
        /// What the system said.
        source: io::Error,
    },
}

/// What to do about an error of the system, where that is known.
fn advice(error: &io::Error) -> &'static str {
    match error.kind() {
        io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded => "; make room there and run again",
        io::ErrorKind::FileTooLarge => "; raise the limit on the size of files and run again",
        _ => "",
    }
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
