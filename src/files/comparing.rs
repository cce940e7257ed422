//! Holds what would be written against a file that is there.

use std::fs::File;
use std::io::{self, BufReader, Read, Write};
use std::path::Path;

const BUFFER_BYTES: usize = 1 << 16;

/// Takes what would be written and compares it, as it comes, with a file. Nothing is
/// written, and neither of the two is held in memory.
pub struct Comparing {
    /// `None` once it is known to differ.
    file: Option<BufReader<File>>,
    block: Vec<u8>,
}

impl Comparing {
    /// Begins at the start of the file at `path`. No file, a link, a device or a folder
    /// differs from whatever is written.
    ///
    /// # Errors
    /// A file that can't be opened.
    pub fn with(path: &Path) -> io::Result<Self> {
        let file = match path.symlink_metadata() {
            // A link to the right bytes is still not the file that was written.
            Ok(metadata) if metadata.is_file() => Some(BufReader::with_capacity(BUFFER_BYTES, File::open(path)?)),
            Ok(_) => None,
            Err(error) if error.kind() == io::ErrorKind::NotFound => None,
            Err(error) => return Err(error),
        };
        Ok(Comparing { file, block: Vec::new() })
    }

    /// Whether the file holds exactly what was written.
    ///
    /// # Errors
    /// Those of reading the file.
    pub fn same(self) -> io::Result<bool> {
        let Some(mut file) = self.file else { return Ok(false) };
        // Whatever is left was not written.
        Ok(file.by_ref().take(1).read_to_end(&mut Vec::new())? == 0)
    }
}

impl Write for Comparing {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if let Some(file) = &mut self.file {
            self.block.clear();
            file.by_ref().take(bytes.len() as u64).read_to_end(&mut self.block)?;
            if self.block != bytes {
                self.file = None;
            }
        }
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn same(there: &[u8], written: &[&[u8]]) -> bool {
        let file = tempfile::NamedTempFile::new().unwrap();
        std::fs::write(file.path(), there).unwrap();
        let mut sink = Comparing::with(file.path()).unwrap();
        for part in written {
            sink.write_all(part).unwrap();
        }
        sink.same().unwrap()
    }

    #[test]
    fn only_the_very_same_bytes_are_the_same() {
        assert!(same(b"report", &[b"re", b"", b"port"]));
        assert!(same(b"", &[]));
        for (there, written) in [
            (&b"report"[..], &b"repor"[..]),
            (b"report", b"reports"),
            (b"report", b"rePort"),
            (b"report", b""),
            (b"", b"report"),
        ] {
            assert!(!same(there, &[written]), "{there:?} {written:?}");
        }
    }

    #[test]
    fn a_difference_is_not_forgotten() {
        assert!(!same(b"abcdef", &[b"abX", b"def"]));
    }

    #[test]
    fn long_files_are_compared_to_the_end() {
        let mut bytes: Vec<u8> = (0..3 * BUFFER_BYTES + 7).map(|index| (index % 253) as u8).collect();
        let written = bytes.clone();
        let parts: Vec<&[u8]> = written.chunks(1000).collect();
        assert!(same(&bytes, &parts));
        *bytes.last_mut().unwrap() ^= 1;
        assert!(!same(&bytes, &parts));
    }

    #[test]
    fn what_is_no_file_is_never_the_same() {
        let folder = tempfile::tempdir().unwrap();
        let missing = folder.path().join("missing");
        for place in [missing.as_path(), folder.path()] {
            assert!(!Comparing::with(place).unwrap().same().unwrap());
        }
        #[cfg(unix)]
        {
            let (file, link) = (folder.path().join("file"), folder.path().join("link"));
            std::fs::write(&file, "").unwrap();
            std::os::unix::fs::symlink(&file, &link).unwrap();
            assert!(Comparing::with(&file).unwrap().same().unwrap());
            assert!(!Comparing::with(&link).unwrap().same().unwrap());
        }
    }
}
