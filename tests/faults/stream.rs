//! Streams that fail at every byte: reading and writing one recording never ends in a
//! result that looks whole.

use super::fixtures::{NOTCH_SPEC, hum_and_noise, wav16};
use bandproof::design::design;
use bandproof::job::plan::treatment;
use bandproof::job::recording::{Treatment, process};
use bandproof::spec::{SpecSyntax, parse};
use bandproof::wave::Reader;
use std::io::{self, Cursor, Read, Seek, SeekFrom, Write};
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Arc, OnceLock};

const EIO: i32 = 5;
const ENOSPC: i32 = 28;

/// A tenth of a second with a chunk before its samples and one after.
fn recording() -> Vec<u8> {
    let plain = wav16(8000, 1, &hum_and_noise(8000, 0.1, 0.3, 1));
    let mut bytes = plain[..36].to_vec();
    bytes.extend(b"bext\x06\0\0\0before");
    bytes.extend(&plain[36..]);
    bytes.extend(b"note\x05\0\0\0after\0");
    let size = u32::try_from(bytes.len() - 8).unwrap();
    bytes[4..8].copy_from_slice(&size.to_le_bytes());
    bytes
}

fn notch() -> &'static Treatment {
    static NOTCH: OnceLock<Treatment> = OnceLock::new();
    NOTCH.get_or_init(|| {
        let spec = parse(NOTCH_SPEC.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
        treatment(&spec, &design(&spec, 8000).unwrap())
    })
}

/// The whole output, or the sentence that says why there is none.
fn filtered(input: impl Read + Seek + Send, output: impl Write + Seek + Send) -> Result<String, String> {
    let reader = Reader::open(input).map_err(|error| error.to_string())?;
    let (_, processed) = process(reader, output, notch(), &|_| Ok(())).map_err(|error| error.to_string())?;
    Ok(processed.written.sha256)
}

/// Takes so many bytes and then has no room, or takes all and fails in the end.
struct Full {
    taken: Cursor<Vec<u8>>,
    room: usize,
    flushes: bool,
}

impl Write for Full {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        let left = self.room - self.taken.get_ref().len();
        if left == 0 && !bytes.is_empty() {
            return Err(io::Error::from_raw_os_error(ENOSPC));
        }
        self.taken.write(&bytes[..left.min(bytes.len())])
    }

    fn flush(&mut self) -> io::Result<()> {
        if self.flushes { Ok(()) } else { Err(io::Error::from_raw_os_error(ENOSPC)) }
    }
}

impl Seek for Full {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        self.taken.seek(to)
    }
}

#[test]
fn a_disk_that_fills_up_at_any_byte_fails_the_recording() {
    let input = recording();
    let whole = filtered(Cursor::new(&input), Cursor::new(Vec::new())).unwrap();
    for room in 0..input.len() {
        let full = Full { taken: Cursor::new(Vec::new()), room, flushes: true };
        let error = filtered(Cursor::new(&input), full).unwrap_err();
        let named =
            error.starts_with("byte ") && error.contains("writing") && error.contains("No space left on device");
        assert!(named, "room for {room} bytes: {error}");
    }
    let exact = Full { taken: Cursor::new(Vec::new()), room: input.len(), flushes: true };
    assert_eq!(filtered(Cursor::new(&input), exact).unwrap(), whole);
    let late = Full { taken: Cursor::new(Vec::new()), room: input.len(), flushes: false };
    let error = filtered(Cursor::new(&input), late).unwrap_err();
    assert!(error.contains("writing the last of the output"), "{error}");
}

/// What happens to a file at some byte of it.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Fault {
    /// From there on it can't be read.
    Unreadable,
    /// It is cut there once its header has been read.
    Cut,
    /// So many bytes more are there once its header has been read.
    Grown,
    /// It is read in pieces of one byte, with interrupted system calls between them.
    Slow,
}

/// A file to which that happens.
struct Faulty {
    bytes: Vec<u8>,
    at: u64,
    fault: Fault,
    place: usize,
    armed: Arc<AtomicBool>,
    /// Where the read that failed began.
    failed_at: Arc<AtomicUsize>,
    turn: bool,
}

impl Faulty {
    fn new(bytes: &[u8], fault: Fault, place: usize) -> Self {
        Faulty {
            bytes: bytes.to_vec(),
            at: 0,
            fault,
            place,
            armed: Arc::default(),
            failed_at: Arc::default(),
            turn: false,
        }
    }

    /// The file as long as it is now.
    fn now(&mut self) -> &[u8] {
        let armed = self.armed.load(Ordering::Relaxed);
        match self.fault {
            Fault::Cut if armed => &self.bytes[..self.place],
            Fault::Grown if armed && self.bytes.len() < self.place => {
                self.bytes.resize(self.place, 0);
                &self.bytes
            }
            _ => &self.bytes,
        }
    }
}

impl Read for Faulty {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let (at, place, fault) = (self.at as usize, self.place, self.fault);
        self.turn = !self.turn;
        if fault == Fault::Slow && self.turn {
            return Err(io::ErrorKind::Interrupted.into());
        }
        let left = self.now().get(at..).unwrap_or_default();
        let room = match fault {
            Fault::Slow => 1,
            Fault::Unreadable if at >= place && !buffer.is_empty() && !left.is_empty() => {
                self.failed_at.store(at, Ordering::Relaxed);
                return Err(io::Error::from_raw_os_error(EIO));
            }
            Fault::Unreadable => place.saturating_sub(at),
            _ => usize::MAX,
        };
        let count = buffer.len().min(left.len()).min(room);
        buffer[..count].copy_from_slice(&left[..count]);
        self.at += count as u64;
        Ok(count)
    }
}

impl Seek for Faulty {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        let end = self.now().len() as u64;
        self.at = match to {
            SeekFrom::Start(offset) => offset,
            SeekFrom::End(offset) => end.saturating_add_signed(offset),
            SeekFrom::Current(offset) => self.at.saturating_add_signed(offset),
        };
        Ok(self.at)
    }
}

#[test]
fn a_file_that_can_not_be_read_from_any_byte_on_fails_with_a_place() {
    let input = recording();
    for place in 0..input.len() {
        let file = Faulty::new(&input, Fault::Unreadable, place);
        let failed_at = Arc::clone(&file.failed_at);
        let error = filtered(file, Cursor::new(Vec::new())).unwrap_err();
        let named = error.starts_with("byte ")
            && (error.contains("reading") || error.contains("copying"))
            && error.contains("Input/output error");
        assert!(named, "unreadable from byte {place} on: {error}");
        let byte: usize = error["byte ".len()..].split(':').next().unwrap().parse().unwrap();
        // A block is named by its first byte.
        assert!(byte <= failed_at.load(Ordering::Relaxed), "unreadable from byte {place} on: {error}");
    }
    assert!(filtered(Faulty::new(&input, Fault::Unreadable, input.len()), Cursor::new(Vec::new())).is_ok());
}

#[test]
fn a_file_read_in_small_pieces_is_the_same_file() {
    let input = recording();
    let whole = filtered(Cursor::new(&input), Cursor::new(Vec::new())).unwrap();
    let slow = filtered(Faulty::new(&input, Fault::Slow, 0), Cursor::new(Vec::new())).unwrap();
    assert_eq!(slow, whole);
}

#[test]
fn a_file_whose_length_changes_while_it_is_read_fails() {
    let input = recording();
    let longer = [input.len() + 1, input.len() + 4096].map(|bytes| (Fault::Grown, bytes));
    for (fault, place) in (0..input.len()).map(|place| (Fault::Cut, place)).chain(longer) {
        let file = Faulty::new(&input, fault, place);
        let armed = Arc::clone(&file.armed);
        let reader = Reader::open(file).unwrap();
        // The header is known by now.
        armed.store(true, Ordering::Relaxed);
        let error = process(reader, Cursor::new(Vec::new()), notch(), &|_| Ok(())).unwrap_err().to_string();
        let figures = format!("expected {} bytes in all, found {place}", input.len());
        assert!(error.contains("changed while it was read") && error.contains(&figures), "{fault:?} {place}: {error}");
    }
}
