//! Recordings near and beyond 4 GiB, without their bytes.

use std::io::Cursor;

use bandproof::wave::{Changes, Encoding, Form, Reader, SampleFormat, Writer};

use crate::build::{Ds64, FmtFields, PCM, RawChunk, raw, riff, wide};

/// A recording of zeros as long as 32-bit sizes allow, without its bytes.
struct Vast {
    head: Vec<u8>,
    bytes: u64,
    at: u64,
}

impl std::io::Read for Vast {
    fn read(&mut self, buffer: &mut [u8]) -> std::io::Result<usize> {
        let n = buffer.len().min((self.bytes - self.at.min(self.bytes)) as usize);
        buffer[..n].fill(0);
        let head = self.head.get(self.at as usize..).unwrap_or_default();
        let from_head = head.len().min(n);
        buffer[..from_head].copy_from_slice(&head[..from_head]);
        self.at += n as u64;
        Ok(n)
    }
}

impl std::io::Seek for Vast {
    fn seek(&mut self, to: std::io::SeekFrom) -> std::io::Result<u64> {
        self.at = match to {
            std::io::SeekFrom::Start(at) => at,
            std::io::SeekFrom::End(by) => self.bytes.saturating_add_signed(by),
            std::io::SeekFrom::Current(by) => self.at.saturating_add_signed(by),
        };
        Ok(self.at)
    }
}

const FOUR_GIB: u64 = 1 << 32;

/// A recording of zeros; `bytes` of samples that are not there, `tail` after them.
fn vast(form: &[u8; 4], before: &[RawChunk], bytes: u64, declared: u32) -> Vast {
    let chunks =
        [&[FmtFields::plain(PCM, 1, 16).chunk()][..], before, &[raw(b"data", &[]).declaring(declared)]].concat();
    let head = match form {
        b"RIFF" => {
            let mut head = riff(&chunks);
            let size = head.len() as u64 - 8 + bytes;
            head[4..8].copy_from_slice(&(size as u32).to_le_bytes());
            head
        }
        _ => {
            let length = wide(form, &Ds64::default(), &chunks).len() as u64;
            wide(form, &Ds64 { riff: Some(length + bytes - 8), data: Some(bytes), ..Ds64::frames(bytes / 2) }, &chunks)
        }
    };
    Vast { bytes: head.len() as u64 + bytes, head, at: 0 }
}

/// The first bytes of the output and what it would say.
fn head(reader: &mut Reader<Vast>, encoding: Encoding) -> Vec<u8> {
    let mut head = Vec::new();
    Writer::begin(&mut head, reader, &Changes::samples(SampleFormat::full(encoding))).unwrap();
    head
}

#[test]
fn a_riff_near_four_gibibytes_grows_into_rf64() {
    let data = 0xffff_ff00u32;
    let mut reader = Reader::open(vast(b"RIFF", &[], u64::from(data), data)).unwrap();
    assert_eq!(reader.header().frames, u64::from(data) / 2);
    assert_eq!(reader.header().notes, Vec::<String>::new());
    assert_eq!(head(&mut reader, Encoding::Pcm16)[..4], *b"RIFF");
    let grown = head(&mut reader, Encoding::Pcm24);
    assert_eq!(grown[..8], *b"RF64\xff\xff\xff\xff");
    let bytes = u64::from(data) / 2 * 3;
    // The samples, and a pad byte for an odd number of bytes of them.
    assert_eq!(grown[20..28], (grown.len() as u64 - 8 + bytes + bytes % 2).to_le_bytes());
    assert_eq!(grown[28..36], bytes.to_le_bytes());
    assert_eq!(grown[36..44], (u64::from(data) / 2).to_le_bytes());
    assert_eq!(grown[grown.len() - 4..], [0xff; 4]);
    let mut planes = [Vec::new()];
    assert_eq!(reader.read(10, &mut planes).unwrap(), 10);
}

#[test]
fn the_longest_riff_there_can_be_stays_riff() {
    // 0xfffffffe is the largest size: 0xffffffff stands for none.
    let longest = FOUR_GIB - 2 - 36;
    let mut reader = Reader::open(vast(b"RIFF", &[], longest, longest as u32)).unwrap();
    assert_eq!(reader.header().file_bytes, bandproof::wave::RIFF_LIMIT_BYTES);
    assert_eq!(reader.header().notes, Vec::<String>::new());
    let same = head(&mut reader, Encoding::Pcm16);
    assert_eq!(same[..8], *b"RIFF\xfe\xff\xff\xff");
    let mut reader = Reader::open(vast(b"RIFF", &[raw(b"abcd", &[])], longest - 8, longest as u32)).unwrap();
    assert_eq!(head(&mut reader, Encoding::Pcm8)[..4], *b"RIFF");
}

#[test]
fn sizes_beyond_32_bits_are_read_and_written() {
    for form in [b"RF64", b"BW64"] {
        let bytes = 5 * FOUR_GIB + 6;
        let mut reader = Reader::open(vast(form, &[], bytes, u32::MAX)).unwrap();
        let header = reader.header().clone();
        assert_eq!((header.frames, header.data_bytes), (bytes / 2, bytes));
        assert_eq!(header.notes, Vec::<String>::new());
        let wider = head(&mut reader, Encoding::Float64);
        assert_eq!(wider[..4], *form);
        assert_eq!(wider[28..36], (4 * bytes).to_le_bytes());
        // `fact` says that the count stands in `ds64`.
        assert!(wider.windows(12).any(|w| *w == *b"fact\x04\0\0\0\xff\xff\xff\xff"));
        let smaller = head(&mut reader, Encoding::Pcm8);
        assert_eq!(smaller[28..36], (bytes / 2).to_le_bytes());
    }
}

#[test]
fn sizes_that_began_again_at_zero_are_seen_through() {
    let bytes = FOUR_GIB + 1000;
    let mut reader = Reader::open(vast(b"RIFF", &[], bytes, 1000)).unwrap();
    assert_eq!(reader.header().frames, bytes / 2);
    let note = format!("declares 1000 bytes, found {bytes} up to where a size counted past 32 bits ends");
    assert!(reader.header().notes[0].contains(&note), "{:?}", reader.header().notes);
    let output = head(&mut reader, Encoding::Pcm16);
    assert_eq!((&output[..4], &output[28..36]), (&b"RF64"[..], &bytes.to_le_bytes()[..]));
    // One of the two is off: 1000 bytes it is, and the rest is named.
    let mut other = vast(b"RIFF", &[], bytes, 1000);
    other.head[4] ^= 8;
    let reader = Reader::open(other).unwrap();
    assert_eq!(reader.header().frames, 500);
    let note = format!(
        "{FOUR_GIB} bytes after the last chunk (byte 1044) are no chunk; carried over unchanged; if they are samples, the size at byte 40 should be {bytes} instead of 1000"
    );
    assert!(reader.header().notes.contains(&note), "{:?}", reader.header().notes);
}

#[test]
fn a_riff_beyond_four_gibibytes_whose_sizes_were_never_written_becomes_rf64() {
    let bytes = FOUR_GIB + 2;
    for declared in [0, u32::MAX] {
        let mut reader = Reader::open(vast(b"RIFF", &[raw(b"abcd", b"1234")], bytes, declared)).unwrap();
        assert_eq!(reader.header().form, Form::Riff);
        assert_eq!(reader.header().data_bytes, bytes);
        let output = head(&mut reader, Encoding::Pcm16);
        assert_eq!((&output[..4], &output[28..36]), (&b"RF64"[..], &bytes.to_le_bytes()[..]));
    }
}

#[test]
fn a_head_longer_than_the_file_is_not_taken_for_it() {
    let file = wide(
        b"RF64",
        &Ds64 { data: Some(3 * FOUR_GIB), ..Ds64::frames(3) },
        &[FmtFields::plain(PCM, 1, 16).chunk(), raw(b"data", &[1; 6])],
    );
    let reader = Reader::open(Cursor::new(file)).unwrap();
    assert_eq!(reader.header().frames, 3);
}
