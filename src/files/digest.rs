//! SHA-256 of files, and of what is being written.

use super::open;
use sha2::{Digest as _, Sha256};
use std::io::{self, Read, Write};
use std::path::Path;

/// Block in which files are read: large enough that system calls don't count, small enough
/// to be hashed from the second-level cache.
pub const BUFFER_BYTES: usize = 1 << 18;

/// What a manifest says of a file's content.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Digest {
    /// SHA-256, lower-case hexadecimal.
    pub sha256: String,
    /// Length in bytes.
    pub bytes: u64,
}

/// Reads a file to its end.
pub fn of_file(path: &Path) -> io::Result<Digest> {
    let (sha256, bytes) = of_reader(open::regular(path)?, &mut vec![0; BUFFER_BYTES], &mut |_| Ok(()))?;
    Ok(Digest { sha256: hexadecimal(&sha256), bytes })
}

/// SHA-256 and length of what is left in `file`, read in blocks of `buffer`; `read` hears
/// of each how long it is, and may give up.
///
/// # Errors
/// What the system says, and what `read` does.
pub fn of_reader(
    mut file: impl Read,
    buffer: &mut [u8],
    read: &mut dyn FnMut(u64) -> io::Result<()>,
) -> io::Result<([u8; 32], u64)> {
    let mut hasher = Sha256::new();
    let mut bytes = 0;
    loop {
        match file.read(buffer) {
            Ok(0) => return Ok((hasher.finalize().into(), bytes)),
            Ok(count) => {
                hasher.update(buffer.get(..count).unwrap_or_default());
                bytes += count as u64;
                read(count as u64)?;
            }
            Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
            Err(error) => return Err(error),
        }
    }
}

/// Lower-case hexadecimal.
pub fn hexadecimal(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// The bytes of a SHA-256 in hexadecimal; `None` for what is none.
pub fn of_hexadecimal(text: &str) -> Option<[u8; 32]> {
    let mut bytes = [0; 32];
    if text.len() != 2 * bytes.len() {
        return None;
    }
    for (byte, digits) in bytes.iter_mut().zip(text.as_bytes().as_chunks::<2>().0) {
        *byte = u8::from_str_radix(std::str::from_utf8(digits).ok()?, 16).ok()?;
    }
    Some(bytes)
}

/// Passes bytes on and hashes those that were taken.
pub struct Hashing<W> {
    inner: W,
    hash: Sha256,
    bytes: u64,
}

impl<W: Write> Hashing<W> {
    /// Nothing written yet.
    pub fn new(inner: W) -> Self {
        Hashing { inner, hash: Sha256::new(), bytes: 0 }
    }

    /// The writer, and the digest of what went into it.
    pub fn finish(self) -> (W, Digest) {
        (self.inner, Digest { sha256: hexadecimal(&self.hash.finalize()), bytes: self.bytes })
    }
}

impl<W: Write> Write for Hashing<W> {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        let count = self.inner.write(bytes)?;
        self.hash.update(bytes.get(..count).unwrap_or_default());
        self.bytes += count as u64;
        Ok(count)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.inner.flush()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of_bytes(bytes: &[u8]) -> Digest {
        let mut sink = Hashing::new(io::sink());
        sink.write_all(bytes).unwrap();
        sink.finish().1
    }

    /// FIPS 180-4's examples for SHA-256 ("abc") and the well-known hash of nothing,
    /// both from memory.
    #[test]
    fn published_hashes() {
        let abc = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        let nothing = "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855";
        assert_eq!(of_bytes(b"abc"), Digest { sha256: abc.into(), bytes: 3 });
        assert_eq!(of_bytes(b""), Digest { sha256: nothing.into(), bytes: 0 });
    }

    #[test]
    fn a_file_longer_than_the_buffer_hashes_like_its_bytes() {
        let bytes: Vec<u8> = (0..BUFFER_BYTES + 77).map(|index| (index % 251) as u8).collect();
        let mut file = tempfile::NamedTempFile::new().unwrap();
        file.write_all(&bytes).unwrap();
        let whole = Digest { sha256: hexadecimal(&Sha256::digest(&bytes)), bytes: bytes.len() as u64 };
        assert_eq!(of_file(file.path()).unwrap(), whole);
    }
}
