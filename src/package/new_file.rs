//! Files of a package: rendered once, either to be written or to be compared with what
//! is there.

use super::PackageError;
use crate::files::comparing::Comparing;
use crate::files::digest::{Digest, Hashing};
use crate::files::temporary;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

/// What rendering is for.
#[derive(Clone, Copy)]
pub enum Purpose<'a> {
    /// The files are to be written; each temporary file is announced.
    Write(&'a dyn Fn(&Path)),
    /// The files are to be compared with those that are there.
    Compare,
}

impl Purpose<'_> {
    /// Whether the outputs are to be as they were left.
    pub fn outputs_must_be_there(self) -> bool {
        matches!(self, Purpose::Write(_))
    }
}

/// Where the bytes of a file go.
enum Body {
    New(NamedTempFile),
    There(Comparing),
}

impl Write for Body {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        match self {
            Body::New(file) => file.write(bytes),
            Body::There(file) => file.write(bytes),
        }
    }

    fn flush(&mut self) -> io::Result<()> {
        match self {
            Body::New(file) => file.flush(),
            Body::There(file) => file.flush(),
        }
    }
}

/// A file being rendered.
pub struct NewFile {
    target: PathBuf,
    fault: fn(&Path, io::Error) -> PackageError,
    out: BufWriter<Hashing<Body>>,
}

impl NewFile {
    /// Begins the file that is to become `target`, under a temporary name beside it, or
    /// opens the one that is there.
    pub fn begin(target: &Path, purpose: Purpose<'_>) -> Result<Self, PackageError> {
        let (body, fault): (_, fn(&Path, io::Error) -> PackageError) = match purpose {
            Purpose::Write(note) => {
                let file = temporary::beside(target).map_err(|cause| not_written(target, cause))?;
                note(file.path());
                (Body::New(file), not_written)
            }
            Purpose::Compare => {
                (Body::There(Comparing::with(target).map_err(|cause| not_read(target, cause))?), not_read)
            }
        };
        Ok(NewFile { target: target.into(), fault, out: BufWriter::with_capacity(1 << 16, Hashing::new(body)) })
    }

    /// Goes on writing.
    pub fn write(&mut self, with: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), PackageError> {
        with(&mut self.out).map_err(|cause| (self.fault)(&self.target, cause))
    }

    /// Ends the file. What is to be written is on the disk then, still under its temporary
    /// name.
    pub fn complete(self) -> Result<Complete, PackageError> {
        let NewFile { target, fault, out } = self;
        let complete = || {
            let (body, digest) = out.into_inner().map_err(io::IntoInnerError::into_error)?.finish();
            if let Body::New(file) = &body {
                file.as_file().sync_all()?;
            }
            Ok((body, digest))
        };
        match complete() {
            Ok((body, digest)) => Ok(Complete { target, body, digest }),
            Err(cause) => Err(fault(&target, cause)),
        }
    }
}

/// A rendered file: one that waits for its name, or one that was compared.
pub struct Complete {
    target: PathBuf,
    body: Body,
    /// Of all that was rendered.
    pub digest: Digest,
}

impl Complete {
    /// Gives a file that was written its name, in the place of another only where `replace`
    /// says so.
    pub fn settle(self, replace: bool) -> Result<(), PackageError> {
        match self.body {
            Body::New(file) => {
                temporary::settle(file, &self.target, replace).map_err(|cause| not_written(&self.target, cause))
            }
            Body::There(_) => Ok(()),
        }
    }

    /// Whether nothing stands in this file's place, or exactly what was rendered.
    pub fn absent_or_same(self) -> Result<bool, PackageError> {
        let Complete { target, body, .. } = self;
        let read = |cause| not_read(&target, cause);
        match target.symlink_metadata() {
            Err(error) if error.kind() == io::ErrorKind::NotFound => Ok(true),
            Err(error) => Err(read(error)),
            Ok(_) => match body {
                Body::There(file) => file.same().map_err(read),
                Body::New(_) => Ok(false),
            },
        }
    }
}

fn not_written(path: &Path, cause: io::Error) -> PackageError {
    PackageError::Write { path: path.into(), cause }
}

fn not_read(path: &Path, cause: io::Error) -> PackageError {
    PackageError::Unreadable { path: path.into(), cause }
}
