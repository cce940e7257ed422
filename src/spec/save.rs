//! A spec as a new file.

use super::document::{Comments, document};
use super::{Spec, SpecSyntax};
use crate::files::temporary;
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

/// Why a spec is not written.
#[derive(Debug, thiserror::Error)]
pub enum SaveError {
    /// The name says neither TOML nor JSON.
    #[error("{}: a spec is written as .toml or .json; give the file such a name", .0.display())]
    Extension(PathBuf),
    /// Something is there already.
    #[error("{} exists, and a spec is written to new files only; name another or remove it", .0.display())]
    Exists(PathBuf),
    /// The spec has a figure that no file can hold.
    #[error("the spec can't be put into words: {0}")]
    Words(#[from] serde_json::Error),
    /// The system refuses.
    #[error("{} can't be written: {cause}", .path.display())]
    Write {
        /// The file.
        path: PathBuf,
        /// What the system says.
        cause: io::Error,
    },
}

/// The notation that a new spec file of this name has.
///
/// # Errors
/// [`SaveError::Extension`], [`SaveError::Exists`]: what can be refused before any work.
pub fn check(path: &Path) -> Result<SpecSyntax, SaveError> {
    let syntax = SpecSyntax::of_path(path).ok_or_else(|| SaveError::Extension(path.into()))?;
    if path.symlink_metadata().is_ok() { Err(SaveError::Exists(path.into())) } else { Ok(syntax) }
}

/// Writes `spec` to the new file `path`, which appears complete.
///
/// # Errors
/// See [`SaveError`]; what was there stays.
pub fn save(spec: &Spec, comments: &Comments, path: &Path) -> Result<(), SaveError> {
    let text = document(spec, check(path)?, comments)?;
    let lost = |cause: io::Error| match cause.kind() {
        io::ErrorKind::AlreadyExists => SaveError::Exists(path.into()),
        _ => SaveError::Write { path: path.into(), cause },
    };
    let mut file = temporary::beside(path).map_err(lost)?;
    file.write_all(text.as_bytes()).and_then(|()| file.as_file().sync_all()).map_err(lost)?;
    temporary::settle(file, path, false).map_err(lost)
}
