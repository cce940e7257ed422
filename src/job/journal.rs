//! The journal: each recording's report entry, on disk as soon as it is done.
//!
//! A recording's entry is appended after its output's temporary file is complete and
//! before that file gets its final name. At the end the report
//! takes the entries from here in the order of their paths, one in memory at a time.
//!
//! The file begins with a line that says which job it belongs to ([`Identity`]); each
//! further line is one entry as JSON. A run that is killed leaves it, and the next run of
//! the same job reads it ([`read`]).

use crate::files::digest::hexadecimal;
use crate::files::temporary;
pub use crate::files::temporary::JOURNAL_NAME;
use crate::report::{FORMAT, Recording};
use crate::spec::SpecFile;
use serde::{Deserialize, Serialize};
use sha2::{Digest as _, Sha256};
use std::collections::BTreeMap;
use std::fs::File;
use std::io::{self, BufRead, BufReader, Read, Seek, SeekFrom, Write};
use std::ops::Bound;
use std::path::{Path, PathBuf};
use std::sync::{Mutex, MutexGuard, PoisonError};

/// The job a journal belongs to: entries made by another are of no use.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Identity {
    /// Version of the entries' format.
    pub format: u32,
    /// Version of the program.
    pub tool_version: String,
    /// SHA-256 of the spec file, lower-case hexadecimal.
    pub spec_sha256: String,
    /// The same of the spec in force, every default filled in, as JSON: stages that are found
    /// from bands also depend on the sample rates of a run.
    pub normalized_sha256: String,
}

impl Identity {
    /// Of this program with a spec in force.
    ///
    /// # Errors
    /// The spec does not go into JSON, which no spec that was read does.
    pub fn of(spec: &SpecFile) -> serde_json::Result<Self> {
        let normalized = serde_json::to_vec(&spec.spec)?;
        Ok(Identity {
            format: FORMAT,
            tool_version: env!("CARGO_PKG_VERSION").to_owned(),
            spec_sha256: spec.file_sha256.clone(),
            normalized_sha256: hexadecimal(&Sha256::digest(&normalized)),
        })
    }
}

/// A line of a journal.
#[derive(Debug)]
pub enum Line {
    /// A recording that is done, or failed.
    Entry(Box<Recording>),
    /// An output that stands until its recording is done again.
    Older(Older),
}

impl Line {
    fn read(text: &[u8]) -> Option<Self> {
        let entry = serde_json::from_slice(text).map(Line::Entry).ok();
        entry.or_else(|| serde_json::from_slice(text).map(Line::Older).ok())
    }
}

/// An output that an earlier run of the job made of an input that is another by now.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Older {
    /// Path as reported.
    pub path: String,
    /// Whether that is escaped.
    pub escaped: bool,
    /// SHA-256, lower-case hexadecimal.
    pub sha256: String,
    /// Length in bytes.
    pub bytes: u64,
}

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
    /// Where each recording's latest entry stands: offset and length.
    entries: BTreeMap<Key, (u64, usize)>,
}

impl Inner {
    fn line(&mut self, offset: u64, bytes: usize) -> io::Result<String> {
        self.file.seek(SeekFrom::Start(offset))?;
        let mut line = vec![0; bytes];
        self.file.read_exact(&mut line)?;
        String::from_utf8(line).map_err(|error| io::Error::new(io::ErrorKind::InvalidData, error))
    }

    /// Offset and length of the line that was written.
    fn append(&mut self, mut line: Vec<u8>) -> io::Result<(u64, usize)> {
        let place = (self.end, line.len());
        line.push(b'\n');
        // A line that failed half-way is written over by the next.
        self.file.seek(SeekFrom::Start(self.end))?;
        self.file.write_all(&line)?;
        self.end += line.len() as u64;
        Ok(place)
    }
}

/// A recording: its path as reported and, where that is escaped, the path itself, because
/// an escaped name can read like another's. Held once for each of a hundred thousand
/// recordings: nothing is kept twice.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
struct Key {
    shown: Box<str>,
    escaped: Option<Box<Path>>,
}

impl Key {
    fn new(shown: &str, relative: &Path) -> Self {
        // Compared by components, so a separator of another system is no difference.
        let same = relative == Path::new(shown);
        Key { shown: shown.into(), escaped: (!same).then(|| relative.into()) }
    }

    /// The path below the input.
    fn relative(&self) -> PathBuf {
        self.escaped.as_deref().map_or_else(|| PathBuf::from(&*self.shown), Path::to_path_buf)
    }
}

impl Journal {
    /// Starts a journal in `folder` with the entries that `keep` appends. It takes the place
    /// of an earlier one only when it holds them all.
    ///
    /// # Errors
    /// What the system says, and what `keep` does.
    pub fn create(
        folder: &Path,
        identity: &Identity,
        keep: impl FnOnce(&Journal) -> io::Result<()>,
    ) -> io::Result<Self> {
        let path = folder.join(JOURNAL_NAME);
        let named = temporary::beside(&path)?;
        let mut line = serde_json::to_vec(identity)?;
        line.push(b'\n');
        let mut file = named.as_file().try_clone()?;
        file.write_all(&line)?;
        let mut journal = Journal::of(file, line.len() as u64, Some(path.clone()));
        keep(&journal)?;
        // The new name replaces whatever an earlier run left.
        match temporary::settle(named, &path, true) {
            Ok(()) => Ok(journal),
            Err(error) => {
                journal.path = None;
                Err(error)
            }
        }
    }

    /// Starts a journal on a file in `folder` that has no name: it is gone when the program
    /// ends, however it ends.
    ///
    /// # Errors
    /// What the system says.
    pub fn nameless(folder: &Path) -> io::Result<Self> {
        Ok(Journal::of(tempfile::tempfile_in(folder)?, 0, None))
    }

    /// The journal that a killed run left, as [`read`] reads it, to be read in the order of
    /// its recordings' paths.
    ///
    /// # Errors
    /// What the system says.
    pub fn reopen(folder: &Path, identity: &Identity) -> io::Result<Option<Self>> {
        let mut entries = BTreeMap::new();
        let file = lines(folder, identity, &mut |offset, bytes, line| {
            let Line::Entry(recording) = line else { return Ok(()) };
            let key = Key::new(&recording.path, Path::new(&recording.path));
            entries.insert(key, (offset, bytes));
            Ok(())
        })?;
        Ok(file.map(|file| Journal { path: None, inner: Mutex::new(Inner { file, end: 0, entries }) }))
    }

    fn of(file: File, end: u64, path: Option<PathBuf>) -> Self {
        Journal { path, inner: Mutex::new(Inner { file, end, entries: BTreeMap::new() }) }
    }

    /// Appends the entry of the recording at `relative` below the input, one line of
    /// JSON; it stands for any earlier entry of the same recording.
    pub fn append(&self, relative: &Path, recording: &Recording) -> io::Result<()> {
        let mut inner = self.lock();
        let place = inner.append(serde_json::to_vec(recording)?)?;
        inner.entries.insert(Key::new(&recording.path, relative), place);
        Ok(())
    }

    /// Notes an output that is to be replaced, so that a run after this one knows it if it is
    /// not. No entry of the report.
    pub fn remember(&self, older: &Older) -> io::Result<()> {
        self.lock().append(serde_json::to_vec(older)?).map(drop)
    }

    /// The entries as JSON, sorted by path.
    pub fn sorted(&self) -> impl Iterator<Item = io::Result<String>> + '_ {
        let order: Vec<(u64, usize)> = self.lock().entries.values().copied().collect();
        order.into_iter().map(|(offset, bytes)| self.lock().line(offset, bytes))
    }

    /// The entries as JSON with the paths of their recordings below the input, sorted by path.
    pub fn sorted_with_paths(&self) -> impl Iterator<Item = io::Result<(PathBuf, String)>> + '_ {
        let mut last = None;
        std::iter::from_fn(move || {
            let mut inner = self.lock();
            let from = last.take().map_or(Bound::Unbounded, Bound::Excluded);
            let (key, (offset, bytes)) =
                inner.entries.range((from, Bound::Unbounded)).next().map(|(k, v)| (k.clone(), *v))?;
            let relative = key.relative();
            last = Some(key);
            Some(inner.line(offset, bytes).map(|line| (relative, line)))
        })
    }

    fn lock(&self) -> MutexGuard<'_, Inner> {
        self.inner.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Removes the journal: the report holds everything.
    pub fn remove(self) -> io::Result<()> {
        self.path.map_or(Ok(()), std::fs::remove_file)
    }
}

/// Reads the journal that a killed run of the job `identity` left in `folder`. `each` is
/// given its entries in the order in which they were written: a later one of the same
/// recording counts. False where there is no journal, or one of another job.
///
/// The last line may be cut, and after a power failure any may be damaged: a line that is
/// no entry is passed over.
///
/// # Errors
/// What the system says, and what `each` does.
pub fn read(folder: &Path, identity: &Identity, each: &mut dyn FnMut(Line) -> io::Result<()>) -> io::Result<bool> {
    let lines = lines(folder, identity, &mut |_, _, line| each(line))?;
    Ok(lines.is_some())
}

/// Hands over each entry with its offset and length, and gives the file back.
fn lines(
    folder: &Path,
    identity: &Identity,
    each: &mut dyn FnMut(u64, usize, Line) -> io::Result<()>,
) -> io::Result<Option<File>> {
    let path = folder.join(JOURNAL_NAME);
    // Looked at before it is opened: a pipe would wait for a writer.
    match path.symlink_metadata() {
        Ok(metadata) if metadata.is_file() => {}
        Ok(_) => return Ok(None),
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(None),
        Err(error) => return Err(error),
    }
    let mut file = BufReader::with_capacity(1 << 16, File::open(path)?);
    let mut line = Vec::new();
    let mut offset = file.read_until(b'\n', &mut line)? as u64;
    if serde_json::from_slice::<Identity>(&line).ok().as_ref() != Some(identity) {
        return Ok(None);
    }
    loop {
        line.clear();
        let bytes = file.read_until(b'\n', &mut line)?;
        if bytes == 0 {
            return Ok(Some(file.into_inner()));
        }
        let text = line.strip_suffix(b"\n").unwrap_or(&line);
        if let Some(line) = Line::read(text) {
            each(offset, text.len(), line)?;
        }
        offset += bytes as u64;
    }
}
