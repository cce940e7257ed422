//! A file in memory that refuses to be read out of proportion.

use std::cell::Cell;
use std::io::{self, Cursor, Read, Seek, SeekFrom};
use std::rc::Rc;

/// The most that one call may ask for: the end of a file, where chunks are searched. (A
/// block is 64 KiB, one frame of 65535 channels of 8 bytes is 512 KiB.)
const MOST_AT_ONCE: usize = 1 << 20;

/// Reads from memory and counts. What opens, reads and copies a recording in a bounded
/// number of passes never reaches the limits; what runs in circles does.
#[derive(Debug)]
pub struct Bounded<'a> {
    file: Cursor<&'a [u8]>,
    bytes_left: u64,
    seeks_left: u64,
    exceeded: Exceeded,
}

/// Says, after the reader is gone, whether a limit was passed.
#[derive(Clone, Debug, Default)]
pub struct Exceeded(Rc<Cell<Option<&'static str>>>);

impl Exceeded {
    pub fn what(&self) -> Option<&'static str> {
        self.0.get()
    }
}

impl<'a> Bounded<'a> {
    pub fn new(file: &'a [u8]) -> Self {
        let bytes = file.len() as u64;
        Bounded {
            file: Cursor::new(file),
            bytes_left: 64 * bytes + (1 << 20),
            // Chunk headers are 8 bytes each and some are looked at from several places.
            seeks_left: 4 * bytes + 1024,
            exceeded: Exceeded::default(),
        }
    }

    pub fn exceeded(&self) -> Exceeded {
        self.exceeded.clone()
    }

    fn refuse<T>(&self, what: &'static str) -> io::Result<T> {
        self.exceeded.0.set(Some(what));
        Err(io::Error::other(what))
    }
}

impl Read for Bounded<'_> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        if buffer.len() > MOST_AT_ONCE {
            return self.refuse("too much asked for at once");
        }
        let read = self.file.read(buffer)? as u64;
        match self.bytes_left.checked_sub(read.max(1)) {
            Some(left) => self.bytes_left = left,
            None => return self.refuse("too much read"),
        }
        Ok(read as usize)
    }
}

impl Seek for Bounded<'_> {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        match self.seeks_left.checked_sub(1) {
            Some(left) => self.seeks_left = left,
            None => return self.refuse("too many seeks"),
        }
        self.file.seek(to)
    }
}
