//! The journal: each recording's report entry, on disk as soon as it is done.
//!
//! A recording's entry is appended after its output's temporary file is complete and
//! before that file gets its final name. At the end the report
//! takes the entries from here in the order of their paths, one in memory at a time.

pub use crate::files::temporary::JOURNAL_NAME;
use crate::report::Recording;
use std::collections::BTreeMap;
use std::fs::File;
use std::io::{self, Read, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

/// Entries of the recordings done so far.
#[derive(Debug)]
pub struct Journal {
    /// `None` where the file has no name.
    path: Option<PathBuf>,
    inner: Mutex<Inner>,
}

#[derive(Debug)]
struct Inner {
    file: File,
    end: u64,
    /// Where each recording's latest entry stands: offset and length. By the path as
    /// reported and the path itself, because an escaped name can read like another's.
    entries: BTreeMap<(String, PathBuf), (u64, usize)>,
}

impl Journal {
    /// Starts an empty journal in `folder`.
    pub fn create(folder: &Path) -> io::Result<Self> {
        let path = folder.join(JOURNAL_NAME);
        let file = File::options().read(true).write(true).create(true).truncate(true).open(&path)?;
        Ok(Journal::of(file, Some(path)))
    }

    /// Starts a journal on a file in `folder` that has no name: it is gone when the program
    /// ends, however it ends.
    pub fn nameless(folder: &Path) -> io::Result<Self> {
        Ok(Journal::of(tempfile::tempfile_in(folder)?, None))
    }

    fn of(file: File, path: Option<PathBuf>) -> Self {
        Journal { path, inner: Mutex::new(Inner { file, end: 0, entries: BTreeMap::new() }) }
    }

    /// Appends the entry of the recording at `relative` below the input, one line of
    /// JSON; it stands for any earlier entry of the same recording.
    pub fn append(&self, relative: &Path, recording: &Recording) -> io::Result<()> {
        let mut line = serde_json::to_vec(recording)?;
        let bytes = line.len();
        line.push(b'\n');
        let mut inner = self.inner.lock().unwrap_or_else(PoisonError::into_inner);
        // A line that failed half-way is written over by the next.
        let offset = inner.end;
        inner.file.seek(SeekFrom::Start(offset))?;
        inner.file.write_all(&line)?;
        inner.end += line.len() as u64;
        inner.entries.insert((recording.path.clone(), relative.to_path_buf()), (offset, bytes));
        Ok(())
    }

    /// The entries as JSON, sorted by path.
    pub fn sorted(&self) -> impl Iterator<Item = io::Result<String>> + '_ {
        self.sorted_with_paths().map(|entry| entry.map(|(_, line)| line))
    }

    /// The entries as JSON with the paths of their recordings below the input, sorted by path.
    pub fn sorted_with_paths(&self) -> impl Iterator<Item = io::Result<(PathBuf, String)>> + '_ {
        let order: Vec<(PathBuf, u64, usize)> = {
            let inner = self.inner.lock().unwrap_or_else(PoisonError::into_inner);
            inner.entries.iter().map(|((_, path), &(offset, bytes))| (path.clone(), offset, bytes)).collect()
        };
        order.into_iter().map(|(path, offset, bytes)| {
            let mut inner = self.inner.lock().unwrap_or_else(PoisonError::into_inner);
            inner.file.seek(SeekFrom::Start(offset))?;
            let mut line = vec![0; bytes];
            inner.file.read_exact(&mut line)?;
            let line = String::from_utf8(line).map_err(|error| io::Error::new(io::ErrorKind::InvalidData, error))?;
            Ok((path, line))
        })
    }

    /// Removes the journal: the report holds everything.
    pub fn remove(self) -> io::Result<()> {
        self.path.map_or(Ok(()), std::fs::remove_file)
    }
}
