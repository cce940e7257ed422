//! What must hold of any bytes whatever: they are refused in words, or read as they
//! are and written as it is claimed.

use std::io::Write as _;

use bandproof::job::recording::Processed;
use bandproof::wave::{
    Changes, Chunk, Encoding, Form, Header, History, RIFF_LIMIT_BYTES, RateMeaning, Reader, SampleFormat, WaveError,
    Writer, WrittenFigures, reads_back,
};
use sha2::{Digest, Sha256};

use crate::bounded::Bounded;
use crate::independent;
use crate::random::Random;
use crate::walk::walk;

/// What came of a file.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// Refused by its header.
    Refused,
    /// Refused by its samples.
    Unreadable,
    /// Read and written, the same in its own format but for repairs.
    Repaired,
    /// Read, and written byte for byte in its own format.
    Identical,
    /// Written, but refused because it would be read otherwise than it was written.
    Doubtful,
}

fn sha256(bytes: &[u8]) -> String {
    let mut text = String::with_capacity(64);
    for byte in Sha256::digest(bytes) {
        for nibble in [byte >> 4, byte & 15] {
            text.push(char::from(b"0123456789abcdef"[usize::from(nibble)]));
        }
    }
    text
}

/// What a line of history speaks of.
pub const HISTORY: &str = "fuzzing 1.0";

/// A sentence that begins with a place inside the file.
fn check_words(error: &WaveError, file: &[u8]) {
    let text = error.to_string();
    let Some(rest) = text.strip_prefix("byte ") else {
        assert!(text.starts_with("empty: "), "no place: {text}");
        return;
    };
    let (offset, sentence) = rest.split_once(": ").unwrap_or_default();
    assert!(offset.parse::<u64>().is_ok_and(|offset| offset <= file.len() as u64), "a place outside: {text}");
    assert!(sentence.len() > 20 && !text.chars().any(char::is_control), "{text:?}");
    assert!(!matches!(error, WaveError::Io { .. }), "{text}");
}

/// What a header claims of the bytes it was read from.
fn check_header(header: &Header, file: &[u8]) {
    assert!(header.channels >= 1 && header.rate_hz >= 1 && header.frames >= 1);
    let frame_bytes = u64::from(header.channels) * u64::from(header.format.encoding.bytes());
    assert_eq!(header.frames * frame_bytes, header.data_bytes);
    assert_eq!(header.file_bytes, file.len() as u64);
    let (mut at, mut odd) = (12, 0);
    for chunk in &header.chunks {
        // A pad byte after a size that counts one already may stand there too.
        assert!((at..=at + 1 + odd).contains(&chunk.offset), "begins at {}, not {at}: {}", chunk.offset, chunk.name());
        assert_eq!(&file[chunk.offset as usize..][..4], chunk.id);
        at = chunk.offset + 8 + chunk.bytes;
        odd = chunk.bytes % 2;
    }
    assert!(at <= header.file_bytes);
    let count = |id| header.chunks.iter().filter(|chunk| chunk.id == id).count();
    assert_eq!((count(*b"fmt "), count(*b"data")), (1, 1));
    let data = data_of(header);
    assert_eq!(header.data_offset, data.offset + 8);
    assert!(header.data_bytes <= data.bytes && data.bytes - header.data_bytes < frame_bytes);
    assert!(
        header.notes.iter().all(|note| note.len() > 20 && !note.chars().any(char::is_control)),
        "{:?}",
        header.notes
    );
}

fn data_of(header: &Header) -> &Chunk {
    header.chunks.iter().find(|chunk| chunk.id == *b"data").unwrap()
}

fn bits(planes: &[Vec<f64>]) -> Vec<Vec<u64>> {
    planes.iter().map(|plane| plane.iter().map(|value| value.to_bits()).collect()).collect()
}

/// Whatever `guan` says of the rate, it is refused in words or comes to a rate.
fn check_rates(header: &Header, file: &[u8]) {
    for meaning in [None, Some(RateMeaning::Header), Some(RateMeaning::Acoustic)] {
        match Reader::open_as(Bounded::new(file), meaning) {
            Ok(reader) => {
                let opened = reader.header();
                check_header(opened, file);
                assert_eq!(opened.header_rate_hz, header.rate_hz);
                assert!(meaning == Some(RateMeaning::Acoustic) || opened.rate_hz == header.rate_hz);
            }
            Err(error) => {
                check_words(&error, file);
                assert_ne!(meaning, Some(RateMeaning::Header), "{error}");
            }
        }
    }
}

/// One output with what was claimed of it.
struct Output {
    bytes: Vec<u8>,
    written: WrittenFigures,
    /// The samples handed to the writer.
    planes: Vec<Vec<f64>>,
    format: SampleFormat,
    riff_limit_bytes: u64,
}

/// Reads a recording and writes it with `changes`, each sample passed through `change`.
fn copy(
    reader: &mut Reader<Bounded<'_>>,
    file: &[u8],
    changes: &Changes,
    block: usize,
    change: impl Fn(f64) -> f64,
) -> Result<Output, WaveError> {
    let channels = usize::from(reader.header().channels);
    let mut writer = Writer::begin(Vec::new(), reader, changes)?;
    let mut all = vec![Vec::new(); channels];
    let mut planes = vec![Vec::new(); channels];
    loop {
        planes.iter_mut().for_each(Vec::clear);
        if reader.read(block, &mut planes)? == 0 {
            break;
        }
        planes.iter_mut().flatten().for_each(|value| *value = change(*value));
        writer.write(&planes)?;
        all.iter_mut().zip(&planes).for_each(|(all, plane)| all.extend_from_slice(plane));
    }
    let input = reader.finish()?;
    assert_eq!(input.sha256, sha256(file), "hash of the input");
    assert_eq!(input.bytes, file.len() as u64);
    let (bytes, written) = writer.finish(reader)?;
    assert_eq!(written.sha256, sha256(&bytes), "hash of the output");
    assert_eq!(written.bytes, bytes.len() as u64);
    Ok(Output { bytes, written, planes: all, format: changes.format, riff_limit_bytes: changes.riff_limit_bytes })
}

/// Passes a file through reader and writer, and what was written through reader, an
/// independent reader and a walk over its sizes. `is_legal`: nothing is wrong with it.
pub fn check(file: &[u8], is_legal: bool, random: &mut Random) -> Outcome {
    let bounded = Bounded::new(file);
    let exceeded = bounded.exceeded();
    let outcome = check_within(bounded, file, is_legal, random);
    assert_eq!(exceeded.what(), None);
    outcome
}

fn check_within(bounded: Bounded<'_>, file: &[u8], is_legal: bool, random: &mut Random) -> Outcome {
    let mut reader = match Reader::open(bounded) {
        Ok(reader) => reader,
        Err(error) => {
            check_words(&error, file);
            assert!(!is_legal, "{error}");
            return Outcome::Refused;
        }
    };
    let header = reader.header().clone();
    check_header(&header, file);
    // (A container wider than its bits is legal and worth a note all the same.)
    let odd = |note: &&String| !note.contains("in the upper part of");
    assert!(!is_legal || !header.notes.iter().any(|note| odd(&note)), "{:?}", header.notes);
    if header.guano.is_some() {
        check_rates(&header, file);
    }
    let block = random.pick(&[1, 3, 100, 5000]);
    let same = Changes::samples(header.format);
    let output = match copy(&mut reader, file, &same, block, |value| value) {
        Ok(output) => output,
        Err(error) => {
            check_words(&error, file);
            assert!(!is_legal, "{error}");
            assert!(matches!(error, WaveError::NotFinite { .. } | WaveError::LowerPart { .. }), "{error}");
            return Outcome::Unreadable;
        }
    };
    let decoded = independent::decode(&file[header.data_offset as usize..][..header.data_bytes as usize], &header);
    assert!(bits(&decoded) == bits(&output.planes), "other samples than the bytes say");
    if !is_clear(&header, &output, is_legal) {
        return Outcome::Doubtful;
    }
    check_output(file, &header, &output, is_legal);
    // What was repaired needs no repair again.
    let again = Reader::open(Bounded::new(&output.bytes))
        .and_then(|mut reader| copy(&mut reader, &output.bytes, &same, block, |value| value))
        .unwrap_or_else(|error| panic!("the output is refused: {error}"));
    assert!(again.bytes == output.bytes, "the output is changed when it is copied");

    reader.rewind();
    let encoding = random.pick(&[
        Encoding::Pcm8,
        Encoding::Pcm16,
        Encoding::Pcm24,
        Encoding::Pcm32,
        Encoding::Float32,
        Encoding::Float64,
    ]);
    // With or without another format, with or without a line of history.
    let format = if random.one_in(4) { header.format } else { SampleFormat::full(encoding) };
    let encoding = format.encoding;
    let history =
        random.one_in(2).then(|| History { tool: HISTORY.to_owned(), both_ways: false, spec_sha256: "ab".repeat(32) });
    let riff_limit_bytes = if random.one_in(4) { random.below(1000) as u64 } else { RIFF_LIMIT_BYTES };
    let other = Changes { format, riff_limit_bytes, history };
    match copy(&mut reader, file, &other, block, |value| exact(encoding, value)) {
        Ok(output) if is_clear(&header, &output, is_legal) => check_output(file, &header, &output, is_legal),
        Ok(_) => return Outcome::Doubtful,
        Err(WaveError::FrameTooWide { .. }) => {
            assert!(u32::from(header.channels) * u32::from(encoding.bytes()) > 65_535)
        }
        Err(WaveError::TooLong { bytes, limit }) => {
            assert!(header.form == Form::Rifx && bytes > limit && limit == riff_limit_bytes);
        }
        Err(error) => panic!("as {}: {error}", encoding.name()),
    }
    if output.bytes == file { Outcome::Identical } else { Outcome::Repaired }
}

/// The nearest value that an encoding holds.
fn exact(encoding: Encoding, value: f64) -> f64 {
    match encoding {
        Encoding::Float64 => value,
        Encoding::Float32 => f64::from(value.clamp(f64::from(f32::MIN), f64::from(f32::MAX)) as f32),
        _ => {
            let scale = (1u64 << (encoding.bytes() * 8 - 1)) as f64;
            (value * scale).round().clamp(-scale, scale - 1.0) / scale
        }
    }
}

/// Whether an output is read as it was written, as every one of a legal file is. A job hands
/// over no other.
fn is_clear(input: &Header, output: &Output, is_legal: bool) -> bool {
    match reads_back(Bounded::new(&output.bytes), input, output.format, &output.written) {
        Ok(()) => true,
        Err(error) => {
            assert!(!is_legal && matches!(error, WaveError::NotReadBack { .. }), "{error}");
            false
        }
    }
}

/// Holds an output against what was claimed of it.
fn check_output(file: &[u8], input: &Header, output: &Output, is_legal: bool) {
    let reader = Reader::open(Bounded::new(&output.bytes));
    let mut reader = reader.unwrap_or_else(|error| panic!("the output is refused: {error}"));
    let header = reader.header().clone();
    check_header(&header, &output.bytes);
    check_form(input, &header, output);
    assert_eq!(
        (header.frames, header.channels, header.rate_hz, header.format),
        (input.frames, input.channels, input.rate_hz, output.format)
    );
    let repairs = header.notes.iter().filter(|note| note.contains("the output gets"));
    assert_eq!(repairs.collect::<Vec<_>>(), Vec::<&String>::new(), "sizes of the output");
    let mut planes = vec![Vec::new(); usize::from(header.channels)];
    while reader.read(4096, &mut planes).unwrap_or_else(|error| panic!("the output is refused: {error}")) > 0 {}
    let is_float = output.format.encoding.is_float();
    // An integer knows no negative zero.
    let expected: Vec<Vec<f64>> = match is_float {
        true => output.planes.clone(),
        false => output.planes.iter().map(|plane| plane.iter().map(|value| value + 0.0).collect()).collect(),
    };
    assert!(bits(&planes) == bits(&expected), "other samples in the output than were written");
    walk(file, input, &output.bytes, &header, &output.written, is_legal);
    independent::hound(&output.bytes, &header, &expected);
}

/// A RIFF file becomes RF64 where it is too long for its sizes, and nothing else does.
fn check_form(input: &Header, header: &Header, output: &Output) {
    let bytes = output.bytes.len() as u64;
    if header.form == input.form {
        let last = header.chunks.last().map_or(0, |last| last.offset + 8 + last.bytes);
        assert!(input.form != Form::Riff || last <= output.riff_limit_bytes, "{last} bytes in a RIFF file");
    } else {
        assert_eq!((input.form, header.form), (Form::Riff, Form::Rf64));
        assert!(bytes > output.riff_limit_bytes, "{bytes} bytes became RF64");
    }
}

/// Holds what a whole run wrote against its figures.
pub fn check_claims(file: &[u8], input: &Header, bytes: &[u8], processed: &Processed) {
    assert_eq!(processed.input.sha256, sha256(file));
    assert_eq!(
        (processed.written.sha256.as_str(), processed.written.bytes),
        (sha256(bytes).as_str(), bytes.len() as u64)
    );
    let mut reader = Reader::open(Bounded::new(bytes)).unwrap_or_else(|error| panic!("the output is refused: {error}"));
    let header = reader.header().clone();
    let mut planes = vec![Vec::new(); usize::from(header.channels)];
    while reader.read(4096, &mut planes).unwrap_or_else(|error| panic!("the output is refused: {error}")) > 0 {}
    assert_eq!(header.format, processed.format);
    let peak = planes.iter().flatten().fold(0.0, |peak: f64, value| peak.max(value.abs()));
    assert_eq!(peak.to_bits(), processed.output.written_peak.to_bits(), "the peak as written");
    let output = Output {
        bytes: bytes.to_vec(),
        written: processed.written.clone(),
        planes,
        format: processed.format,
        riff_limit_bytes: RIFF_LIMIT_BYTES,
    };
    if is_clear(input, &output, false) {
        check_output(file, input, &output, false);
    }
}

/// Keeps the bytes of a case that failed, where cargo keeps what tests write.
pub fn keep(file: &[u8], name: &str) -> String {
    let path = std::path::Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let written = std::fs::File::create(&path).and_then(|mut kept| kept.write_all(file));
    match written {
        Ok(()) => format!("its {} bytes are in {}", file.len(), path.display()),
        Err(error) => format!("its {} bytes could not be kept: {error}", file.len()),
    }
}
