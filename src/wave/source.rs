//! A file read at given places, with the place in every error.

use std::io::{self, Read, Seek, SeekFrom};

use super::error::WaveError;

/// Stands for "position unknown": the next read seeks.
const UNKNOWN: u64 = u64::MAX;

/// A reader that knows its length and position, so that consecutive reads cost no
/// seek and a file that shrinks is told from one that can't be read.
#[derive(Debug)]
pub(crate) struct Source<R> {
    inner: R,
    at: u64,
    bytes: u64,
}

impl<R: Read + Seek> Source<R> {
    /// Takes the length of the file as it is now.
    pub(crate) fn new(mut inner: R) -> Result<Self, WaveError> {
        let bytes = inner.seek(SeekFrom::End(0)).map_err(|source| WaveError::Io {
            doing: "finding the end of the file",
            offset: 0,
            source,
        })?;
        Ok(Source { inner, at: bytes, bytes })
    }

    /// Length of the file when it was opened.
    pub(crate) fn bytes(&self) -> u64 {
        self.bytes
    }

    /// Fills `buffer` from `offset` on.
    pub(crate) fn read_at(&mut self, offset: u64, buffer: &mut [u8], doing: &'static str) -> Result<(), WaveError> {
        if self.at != offset {
            self.at = UNKNOWN;
            self.inner.seek(SeekFrom::Start(offset)).map_err(|source| WaveError::Io { doing, offset, source })?;
        }
        self.at = UNKNOWN;
        match self.inner.read_exact(buffer) {
            Ok(()) => {
                self.at = offset + buffer.len() as u64;
                Ok(())
            }
            Err(error) if error.kind() == io::ErrorKind::UnexpectedEof => {
                let found = self.inner.seek(SeekFrom::End(0)).unwrap_or(offset);
                Err(WaveError::Changed { offset, expected: self.bytes, found })
            }
            Err(source) => Err(WaveError::Io { doing, offset, source }),
        }
    }

    /// `N` bytes from `offset` on, or `None` if the file ends before.
    pub(crate) fn array_at<const N: usize>(&mut self, offset: u64) -> Result<Option<[u8; N]>, WaveError> {
        if offset.checked_add(N as u64).is_none_or(|end| end > self.bytes) {
            return Ok(None);
        }
        let mut array = [0; N];
        self.read_at(offset, &mut array, "reading the header")?;
        Ok(Some(array))
    }

    /// Hands the bytes from `from` to `to` to `take`, block by block.
    pub(crate) fn copy(
        &mut self,
        from: u64,
        to: u64,
        doing: &'static str,
        mut take: impl FnMut(&[u8]) -> Result<(), WaveError>,
    ) -> Result<(), WaveError> {
        let mut buffer = vec![0; to.saturating_sub(from).min(super::BLOCK_BYTES as u64) as usize];
        let mut offset = from;
        while offset < to {
            let n = (to - offset).min(buffer.len() as u64) as usize;
            self.read_at(offset, &mut buffer[..n], doing)?;
            take(&buffer[..n])?;
            offset += n as u64;
        }
        Ok(())
    }

    /// An error if the file is no longer as long as it was.
    pub(crate) fn check_length(&mut self) -> Result<(), WaveError> {
        let offset = self.bytes;
        self.at = UNKNOWN;
        let found = self.inner.seek(SeekFrom::End(0)).map_err(|source| WaveError::Io {
            doing: "finding the end of the file again",
            offset,
            source,
        })?;
        if found == self.bytes { Ok(()) } else { Err(WaveError::Changed { offset, expected: self.bytes, found }) }
    }
}
