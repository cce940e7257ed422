//! A place to write to that keeps nothing.

use std::io::{self, Seek, SeekFrom, Write};

/// Takes bytes and forgets them.
#[derive(Debug, Default)]
pub struct Nowhere {
    position: u64,
}

impl Write for Nowhere {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.position += bytes.len() as u64;
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl Seek for Nowhere {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        self.position = match to {
            SeekFrom::Start(position) => position,
            SeekFrom::End(offset) | SeekFrom::Current(offset) => self.position.saturating_add_signed(offset),
        };
        Ok(self.position)
    }
}
