//! One file against the length and the hash it had.

use super::findings::{Disagreement, FileCounts, Side};
use super::listing::{Expected, Hash, hex};
use crate::files::{digest, open};
use std::io::{self, ErrorKind};
use std::path::Path;

/// What became of a file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum State {
    Unchanged,
    /// Another length, or another hash.
    Changed {
        bytes: u64,
        sha256: Option<Hash>,
    },
    Missing,
    /// There, and there is nothing to check it by.
    WithoutHash,
    Unreadable(String),
}

/// What a look at a file's entry in its folder tells.
pub(super) enum Look {
    /// A regular file of this length.
    There(u64),
    /// It decides: missing or unreadable.
    Settled(State),
}

/// Looks without opening: a pipe would wait for a writer.
pub(super) fn look(path: Option<&Path>) -> Look {
    let Some(path) = path else { return Look::Settled(State::Missing) };
    match path.metadata() {
        Ok(metadata) if metadata.is_file() => Look::There(metadata.len()),
        Ok(_) => Look::Settled(State::Unreadable("it is no file".to_owned())),
        Err(error) => Look::Settled(not_read(&error)),
    }
}

/// What an error in opening or reading a file says of it.
pub(super) fn not_read(error: &io::Error) -> State {
    match error.kind() {
        // The latter: a folder on the way is a file by now.
        ErrorKind::NotFound | ErrorKind::NotADirectory => State::Missing,
        _ => State::Unreadable(format!("can't be read: {error}")),
    }
}

/// Holds the file at `path` against `expected`. A file of another length is not read.
pub(super) fn check(
    path: &Path,
    bytes: u64,
    expected: &Expected,
    buffer: &mut [u8],
    read: &mut dyn FnMut(u64) -> io::Result<()>,
) -> State {
    if bytes != expected.bytes {
        return State::Changed { bytes, sha256: None };
    }
    let Some(sha256) = expected.sha256 else { return State::WithoutHash };
    match hash(path, buffer, read) {
        // It may have grown or shrunk since its length was taken.
        Ok((found, bytes)) if (found, bytes) != (sha256, expected.bytes) => {
            State::Changed { bytes, sha256: Some(found) }
        }
        Ok(_) => State::Unchanged,
        Err(error) => not_read(&error),
    }
}

/// Whether a file has this hash.
pub(super) fn is(path: &Path, sha256: &Hash, buffer: &mut [u8]) -> bool {
    hash(path, buffer, &mut |_| Ok(())).is_ok_and(|(found, _)| found == *sha256)
}

fn hash(path: &Path, buffer: &mut [u8], read: &mut dyn FnMut(u64) -> io::Result<()>) -> io::Result<(Hash, u64)> {
    digest::of_reader(open::regular(path)?, buffer, read)
}

impl State {
    /// Counts the file and says what is not as the report says. `shown` is its path.
    pub(super) fn enter(
        self,
        counts: &mut FileCounts,
        expected: &Expected,
        shown: &str,
        side: Side,
    ) -> Result<Option<Disagreement>, String> {
        let path = shown.to_owned();
        match self {
            State::Unchanged => counts.unchanged += 1,
            State::WithoutHash => counts.without_hash += 1,
            State::Changed { bytes, sha256 } => {
                counts.changed += 1;
                return Ok(Some(Disagreement::Changed {
                    path,
                    side,
                    bytes_then: expected.bytes,
                    bytes_now: bytes,
                    sha256_then: expected.sha256.as_ref().map(hex),
                    sha256_now: sha256.as_ref().map(hex),
                }));
            }
            State::Missing => {
                counts.missing += 1;
                return Ok(Some(Disagreement::Missing { path, side }));
            }
            State::Unreadable(error) => {
                counts.unreadable += 1;
                return Err(error);
            }
        }
        Ok(None)
    }
}
