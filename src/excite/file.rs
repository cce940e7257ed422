//! The recording's place on the disk.

use super::{ExciteError, Plan, Written};
use crate::files::digest::{self, Digest};
use crate::files::place::same_file;
use crate::files::temporary;
use std::io::{self, BufWriter};
use std::path::Path;

const BUFFER_BYTES: usize = 1 << 18;

/// How a file may be written.
pub struct Placing<'a> {
    /// Where the spec was read from, so that it can't be written over.
    pub spec_path: Option<&'a Path>,
    /// Whether an existing file may be overwritten.
    pub replace: bool,
    /// Asked now and then: once false, writing ends and nothing is left.
    pub go_on: &'a dyn Fn() -> bool,
    /// Told of the temporary file, which must not be left if the program ends at once.
    pub temporary: &'a dyn Fn(&Path),
}

/// A finished file.
#[derive(Clone, Debug, PartialEq)]
pub struct Saved {
    /// Levels as written.
    pub written: Written,
    /// Length of the file, bytes.
    pub bytes: u64,
    /// SHA-256 of the file as read back, lower-case hexadecimal.
    pub sha256: String,
}

/// Refuses a place that can't or must not be written to, before any work.
///
/// # Errors
/// [`ExciteError::Name`], [`ExciteError::TouchesSpec`], [`ExciteError::NotAFile`],
/// [`ExciteError::Exists`].
pub fn check(target: &Path, placing: &Placing<'_>) -> Result<(), ExciteError> {
    if !target.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("wav")) {
        return Err(ExciteError::Name(target.into()));
    }
    if let Some(spec) = placing.spec_path.filter(|spec| same_file(spec, target)) {
        return Err(ExciteError::TouchesSpec { target: target.into(), spec: spec.into() });
    }
    if target.metadata().is_ok_and(|metadata| !metadata.is_file()) {
        return Err(ExciteError::NotAFile(target.into()));
    }
    if !placing.replace && target.symlink_metadata().is_ok() {
        return Err(ExciteError::Exists(target.into()));
    }
    Ok(())
}

/// Writes the excitation to `target`: under a temporary name beside it, read back for its
/// hash, then renamed. On any error nothing is left, and what was there stays.
///
/// # Errors
/// Those of [`check`], [`ExciteError::NotWritable`], [`ExciteError::Write`],
/// [`ExciteError::Interrupted`].
pub fn save(plan: &Plan, target: &Path, placing: &Placing<'_>) -> Result<Saved, ExciteError> {
    check(target, placing)?;
    let file = temporary::beside(target).map_err(|cause| ExciteError::NotWritable { path: target.into(), cause })?;
    (placing.temporary)(file.path());
    let lost = |cause: io::Error| ExciteError::Write { path: target.into(), cause };
    let mut out = BufWriter::with_capacity(BUFFER_BYTES, file);
    let written = plan.write_while(&mut out, placing.go_on).map_err(lost)?;
    let written = written.ok_or_else(|| ExciteError::Interrupted(target.into()))?;
    let file = out.into_inner().map_err(|error| lost(error.into_error()))?;
    file.as_file().sync_all().map_err(lost)?;
    let Digest { sha256, bytes } = digest::of_file(file.path()).map_err(lost)?;
    temporary::settle(file, target, placing.replace).map_err(lost)?;
    Ok(Saved { written, bytes, sha256 })
}
