//! What `guan` says of the sample rate, in every form in which it is written, and what
//! becomes of it under each meaning.

use crate::build::{FmtFields, PCM, RawChunk, raw, riff};
use crate::chunks::guan;
use bandproof::wave::{Guano, Header, RateMeaning, Reader};
use std::io::Cursor;

/// A recording at 38.4 kHz in its header with these chunks before `data`.
fn recording(before: &[RawChunk], after: &[RawChunk]) -> Vec<u8> {
    let fmt = FmtFields { rate: 38_400, ..FmtFields::plain(PCM, 1, 16) };
    let mut chunks = vec![fmt.chunk()];
    chunks.extend_from_slice(before);
    chunks.push(raw(b"data", &[0; 100]));
    chunks.extend_from_slice(after);
    riff(&chunks)
}

/// Where the first chunk after `fmt ` begins: 12 bytes, then 8 + 16.
const GUAN_AT: u64 = 36;

fn opened(file: &[u8], meaning: Option<RateMeaning>) -> Result<Header, String> {
    let reader = Reader::open_as(Cursor::new(file), meaning).map_err(|error| error.to_string())?;
    Ok(reader.header().clone())
}

fn with(lines: &[&str], meaning: Option<RateMeaning>) -> Result<Header, String> {
    opened(&recording(&[guan(lines)], &[]), meaning)
}

fn guano(lines: &[&str]) -> Guano {
    let file = recording(&[guan(lines)], &[]);
    Reader::open(Cursor::new(file)).unwrap().header().guano.clone().unwrap()
}

#[test]
fn fields_are_read_however_they_are_spaced_and_ended() {
    for text in [
        &b"GUANO|Version: 1.0\nTE: 10\nSamplerate: 384000\n"[..],
        b"GUANO|Version: 1.0\r\nTE: 10\r\nSamplerate: 384000\r\n",
        b"GUANO|Version: 1.0\rTE: 10\rSamplerate: 384000\r",
        b"GUANO|Version:1.0\nTE:10\nSamplerate:384000",
        b"GUANO|Version: 1.0\n  TE  :  10.0  \n\tSamplerate\t:\t384000.0\t\n\n\n",
        b"GUANO|Version: 1.0\nTE: 10\nSamplerate: 384000\n\0\0\0\0",
        b"GUANO|Version: 1.0\nTE: 10\0\nSamplerate: 384000\0",
        b"\xef\xbb\xbfTE: 10\nSamplerate: 384000\n",
        b"TE: 1e1\nSamplerate: +384000\nTE: 10\n",
        b"te: 10\nSAMPLERATE: 384000\n",
        b"Note: \xff\xfe not UTF-8\nno colon here\n: no key\nTE: 10\nSamplerate: 384000\n",
        b"TE: \nTE: 10\nSamplerate:\nSamplerate: 384000\n",
    ] {
        let file = recording(&[raw(b"guan", text)], &[]);
        let found = Reader::open(Cursor::new(file)).unwrap().header().guano.clone().unwrap();
        let expected = Guano {
            offset: GUAN_AT,
            time_expansion: Some(10.0),
            rate_hz: Some(384_000.0),
            bad_time_expansion: None,
            bad_rate: None,
            notes: Vec::new(),
        };
        assert_eq!(found, expected, "{}", text.escape_ascii());
    }
}

#[test]
fn a_namespace_makes_another_field() {
    let found = guano(&["GUANO|Version: 1.0", "Recorder|TE: 10", "Recorder|Samplerate: 384000", "TEX: 4", "T E: 3"]);
    assert_eq!((found.time_expansion, found.rate_hz), (None, None));
    assert_eq!((found.bad_time_expansion, found.bad_rate), (None, None));
}

#[test]
fn what_is_no_number_above_0_is_named_with_its_line() {
    for value in ["0", "-3", "10,0", "1,000", "ten", "inf", "NaN", "10 x", "0x10", "1e999", "--1", "\u{661}\u{660}"] {
        let found = guano(&["GUANO|Version: 1.0", &format!("TE: {value}")]);
        assert_eq!(found.time_expansion, None, "{value}");
        let bad = found.bad_time_expansion.unwrap();
        assert_eq!(bad.offset, GUAN_AT + 8 + 19, "{value}");
        let said = with(&["GUANO|Version: 1.0", &format!("TE: {value}")], None).unwrap_err();
        assert!(said.starts_with("byte 63: `TE` in `guan` is "), "{said}");
        assert!(said.contains(&bad.found) && said.contains("rate = \"header\""), "{said}");
        if value.is_ascii() {
            assert_eq!(bad.found, format!("`{value}`"));
        }
        assert!(with(&["GUANO|Version: 1.0", &format!("TE: {value}")], Some(RateMeaning::Acoustic)).is_err());
        let header = with(&["GUANO|Version: 1.0", &format!("TE: {value}")], Some(RateMeaning::Header)).unwrap();
        assert_eq!(header.rate_hz, 38_400);
        assert!(header.notes[0].contains("`TE` in `guan`"), "{:?}", header.notes);
    }
}

#[test]
fn a_value_of_any_length_is_shown_in_part() {
    let said = with(&[&format!("TE: {}", "9".repeat(5000))], None).unwrap_err();
    assert!(said.len() < 400 && said.contains("999`..."), "{said}");
}

#[test]
fn a_field_given_twice_may_not_have_two_values() {
    let found = guano(&["TE: 10", "TE: 10.0"]);
    assert_eq!((found.time_expansion, found.bad_time_expansion), (Some(10.0), None));
    let said = with(&["TE: 10", "TE: 1"], None).unwrap_err();
    assert!(said.contains("`TE` in `guan` is both 10 and 1"), "{said}");
    // In two chunks as in one.
    let file = recording(&[guan(&["TE: 10"]), guan(&["TE: 8"])], &[]);
    assert!(opened(&file, None).unwrap_err().contains("both 10 and 8"));
}

#[test]
fn a_recording_at_its_own_rate_is_the_same_under_any_meaning() {
    for lines in
        [&["GUANO|Version: 1.0"][..], &["TE: 1"], &["TE:"], &["TE: 1.0", "Samplerate: 38400"], &["Samplerate: 38400.0"]]
    {
        let plain = with(lines, None).unwrap();
        assert_eq!((plain.rate_hz, plain.header_rate_hz, plain.notes.len()), (38_400, 38_400, 0));
        for meaning in RateMeaning::ALL {
            assert_eq!(with(lines, Some(*meaning)).unwrap(), plain, "{lines:?}");
        }
    }
    let without = recording(&[], &[]);
    for meaning in RateMeaning::ALL {
        assert_eq!(opened(&without, Some(*meaning)), opened(&without, None));
    }
}

#[test]
fn a_time_expanded_recording_fails_until_the_meaning_is_said() {
    for (lines, told, acoustic) in [
        (&["TE: 10"][..], "TE 10", "384000 Hz"),
        (&["TE: 10", "Samplerate: 384000"], "TE 10, Samplerate 384000", "384000 Hz"),
        (&["Samplerate: 384000"], "Samplerate 384000", "384000 Hz"),
        (&["TE: 1", "Samplerate: 384000"], "TE 1, Samplerate 384000", "38400 Hz by TE and 384000 Hz by Samplerate"),
        (&["TE: 10", "Samplerate: 38400"], "TE 10, Samplerate 38400", "384000 Hz by TE and 38400 Hz by Samplerate"),
        (&["TE: 0.5"], "TE 0.5", "19200 Hz"),
    ] {
        assert_eq!(
            with(lines, None).unwrap_err(),
            format!(
                "byte 36: `guan` says that the recording is time-expanded ({told}): the header's rate is 38400 Hz, the \
                 acoustic rate {acoustic}; write rate = \"acoustic\" at the top of the spec if its frequencies mean \
                 the sound itself, or rate = \"header\" if they mean the recording as it plays"
            )
        );
        let header = with(lines, Some(RateMeaning::Header)).unwrap();
        assert_eq!((header.rate_hz, header.header_rate_hz), (38_400, 38_400));
        assert_eq!(
            header.notes,
            [format!(
                "time-expanded (`guan` at byte 36: {told}); frequencies and times are those of the recording as it \
                 plays, at the header's 38400 Hz"
            )]
        );
    }
}

#[test]
fn the_acoustic_rate_is_that_of_the_header_times_the_expansion() {
    for (lines, rate_hz) in [
        (&["TE: 10"][..], 384_000),
        (&["TE: 10", "Samplerate: 384000"], 384_000),
        (&["Samplerate: 384000"], 384_000),
        (&["Samplerate: 250001"], 250_001),
        (&["TE: 0.5"], 19_200),
        // No binary fraction: 38400 times the nearest one is 46080.00000000000 but for rounding.
        (&["TE: 1.2", "Samplerate: 46080"], 46_080),
    ] {
        let header = with(lines, Some(RateMeaning::Acoustic)).unwrap();
        assert_eq!((header.rate_hz, header.header_rate_hz), (rate_hz, 38_400), "{lines:?}");
        assert_eq!(header.notes.len(), 1);
        assert!(header.notes[0].contains(&format!("at {rate_hz} Hz, and the header keeps its 38400 Hz")));
    }
}

#[test]
fn fields_that_contradict_each_other_are_told_with_all_three_figures() {
    for (expansion, rate, product) in [("10", "38400", "384000"), ("10", "384001", "384000"), ("1", "384000", "38400")]
    {
        let lines = [&*format!("TE: {expansion}"), &*format!("Samplerate: {rate}")];
        assert_eq!(
            with(&lines, Some(RateMeaning::Acoustic)).unwrap_err(),
            format!(
                "byte 36: `guan` contradicts itself: the header's rate of 38400 Hz times a TE of {expansion} is \
                 {product} Hz, and Samplerate says {rate}; correct the wrong field, or write rate = \"header\" at the \
                 top of the spec if its frequencies mean the recording as it plays"
            )
        );
    }
}

#[test]
fn an_acoustic_rate_must_be_a_whole_number_of_32_bits() {
    for (line, acoustic) in [
        ("TE: 1.00001", "38400.384"),
        ("Samplerate: 250000.5", "250000.5"),
        ("TE: 1000000", "38400000000"),
        ("TE: 1e-9", " 0.0000384"),
        ("Samplerate: 4294967296", "4294967296"),
    ] {
        let said = with(&[line], Some(RateMeaning::Acoustic)).unwrap_err();
        assert!(said.contains(acoustic) && said.contains("a whole number from 1 to 4294967295"), "{line}: {said}");
        assert!(with(&[line], None).unwrap_err().contains("time-expanded"), "{line}");
        assert_eq!(with(&[line], Some(RateMeaning::Header)).unwrap().rate_hz, 38_400);
    }
    assert_eq!(with(&["Samplerate: 4294967295"], Some(RateMeaning::Acoustic)).unwrap().rate_hz, u32::MAX);
}

/// `TE` decides by itself: a `Samplerate` that can't be read then costs no recording.
#[test]
fn an_unreadable_rate_fails_only_where_nothing_else_tells() {
    let said = with(&["Samplerate: 384 kHz"], None).unwrap_err();
    assert!(said.starts_with("byte 44: `Samplerate` in `guan` is `384 kHz`"), "{said}");
    for (expansion, rate_hz) in [("1", 38_400), ("10", 384_000)] {
        let lines = [&*format!("TE: {expansion}"), "Samplerate: 384 kHz"];
        let header = with(&lines, Some(RateMeaning::Acoustic)).unwrap();
        assert_eq!(header.rate_hz, rate_hz);
        assert!(header.notes.iter().any(|note| note.contains("`384 kHz`, no number above 0; not used")));
    }
}

#[test]
fn a_chunk_after_the_samples_counts_as_well() {
    let file = recording(&[], &[guan(&["TE: 10"])]);
    assert_eq!(opened(&file, Some(RateMeaning::Acoustic)).unwrap().rate_hz, 384_000);
    assert!(opened(&file, None).unwrap_err().starts_with("byte 144: "));
}

/// The last line of a chunk that the file's end cuts may have lost digits: `TE: 1` of `TE: 10`.
#[test]
fn a_line_that_is_cut_off_is_not_believed() {
    let text = b"GUANO|Version: 1.0\nTE: 1";
    let whole = recording(&[], &[raw(b"guan", text)]);
    assert_eq!(opened(&whole, None).unwrap().rate_hz, 38_400);
    let cut = recording(&[], &[raw(b"guan", text).declaring(40).padded(b"")]);
    let said = opened(&cut, None).unwrap_err();
    assert!(said.contains("`TE` in `guan` is a value that is cut off"), "{said}");
    // Fields before the last line are whole.
    let cut = recording(&[], &[raw(b"guan", b"TE: 10\nNote: the heron w").declaring(400).padded(b"")]);
    assert_eq!(opened(&cut, Some(RateMeaning::Acoustic)).unwrap().rate_hz, 384_000);
}

/// A file that says it holds a `guan` chunk of gigabytes, all of it zeros but for its start,
/// and counts what is read of it.
struct Vast {
    head: Vec<u8>,
    bytes: u64,
    at: u64,
    read: std::rc::Rc<std::cell::Cell<u64>>,
}

impl std::io::Read for Vast {
    fn read(&mut self, buffer: &mut [u8]) -> std::io::Result<usize> {
        let n = buffer.len().min((self.bytes - self.at) as usize);
        for (k, byte) in buffer[..n].iter_mut().enumerate() {
            *byte = usize::try_from(self.at).ok().and_then(|at| self.head.get(at + k).copied()).unwrap_or(0);
        }
        self.at += n as u64;
        self.read.set(self.read.get() + n as u64);
        Ok(n)
    }
}

impl std::io::Seek for Vast {
    fn seek(&mut self, to: std::io::SeekFrom) -> std::io::Result<u64> {
        self.at = match to {
            std::io::SeekFrom::Start(at) => at,
            std::io::SeekFrom::End(back) => self.bytes.saturating_add_signed(back),
            std::io::SeekFrom::Current(by) => self.at.saturating_add_signed(by),
        };
        Ok(self.at)
    }
}

#[test]
fn a_chunk_of_gigabytes_is_looked_at_in_part() {
    let vast_bytes = 3_000_000_000_u32;
    let mut head = recording(&[], &[]);
    head.extend(b"guan");
    head.extend(vast_bytes.to_le_bytes());
    head.extend(b"TE: 10\n");
    let bytes = head.len() as u64 - 7 + u64::from(vast_bytes);
    head[4..8].copy_from_slice(&((bytes - 8) as u32).to_le_bytes());
    let read = std::rc::Rc::new(std::cell::Cell::new(0));
    let vast = Vast { head, bytes, at: 0, read: read.clone() };
    let reader = Reader::open_as(vast, Some(RateMeaning::Acoustic)).unwrap();
    assert_eq!(reader.header().rate_hz, 384_000);
    assert!(read.get() < 70_000, "{} bytes read", read.get());
    let notes = &reader.header().notes;
    assert!(notes[0].contains("the first 65536 bytes of 3000000000 were looked at"), "{notes:?}");
}
