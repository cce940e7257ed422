//! Files that appear under their names complete.

use super::PackageError;
use crate::files::digest::{Digest, Hashing};
use crate::files::temporary;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// A file being written under a temporary name beside its place.
pub struct NewFile {
    target: PathBuf,
    out: BufWriter<Hashing<NamedTempFile>>,
}

impl NewFile {
    /// Begins the file that is to become `target`, and tells `note` of it.
    pub fn begin(target: &Path, note: &dyn Fn(&Path)) -> Result<Self, PackageError> {
        let file = temporary::beside(target).map_err(|cause| not_written(target, cause))?;
        note(file.path());
        Ok(NewFile { target: target.into(), out: BufWriter::with_capacity(1 << 16, Hashing::new(file)) })
    }

    /// Goes on writing.
    pub fn write(&mut self, with: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), PackageError> {
        with(&mut self.out).map_err(|cause| not_written(&self.target, cause))
    }

    /// Brings what was written onto the disk, still under its temporary name.
    pub fn complete(self) -> Result<Complete, PackageError> {
        let target = self.target;
        let complete = || {
            let (file, digest) = self.out.into_inner().map_err(io::IntoInnerError::into_error)?.finish();
            file.as_file().sync_all()?;
            Ok((file, digest))
        };
        match complete() {
            Ok((file, digest)) => Ok(Complete { target, file, digest }),
            Err(cause) => Err(not_written(&target, cause)),
        }
    }
}

/// A finished file that waits for its name.
pub struct Complete {
    target: PathBuf,
    file: NamedTempFile,
    /// Of all that was written.
    pub digest: Digest,
}

impl Complete {
    /// Gives the file its name, in the place of another only where `replace` says so.
    pub fn settle(self, replace: bool) -> Result<(), PackageError> {
        let Complete { target, file, .. } = self;
        temporary::settle(file, &target, replace).map_err(|cause| not_written(&target, cause))
    }
}

fn not_written(path: &Path, cause: io::Error) -> PackageError {
    PackageError::Write { path: path.into(), cause }
}
