//! Dataset packages: what others need to take over a folder of outputs with its report.
//!
//! Two forms. A **Data Package** is one descriptor beside the report that lists every
//! output with length and hash (`datapackage`). A **bag** is the folder above the
//! output folder with manifests of all that lies in it (`bagit`, RFC 8493). Either is
//! made in three steps: [`files`] names what it would add, [`check`] refuses what can't
//! become a package before a run writes anything, [`write()`] makes it when outputs,
//! report and table are finished. A run that continues an earlier one asks
//! [`is_as_written`] whether the package it finds is that run's own, and any run
//! [takes it back](take_back) before it replaces what it lists.
//!
//! The same run gives the same bytes, but for the date of the run.

mod bag_info;
mod bagit;
mod datapackage;
mod error;
mod manifest;
mod names;
mod new_file;
mod payload;
mod places;

pub use error::PackageError;
use new_file::{Complete, Purpose};
use std::io;
use std::path::{Path, PathBuf};

/// `--emit`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Emit {
    /// A Data Package descriptor beside the report.
    Datapackage,
    /// A bag (RFC 8493) around the output folder.
    Bagit,
}

impl Emit {
    /// Both.
    pub const ALL: [Emit; 2] = [Emit::Datapackage, Emit::Bagit];
}

/// What a package is made of.
#[derive(Clone, Debug)]
pub struct Contents<'a> {
    /// The folder of originals, or the one original. No bag is made among them.
    pub input: &'a Path,
    /// The output folder.
    pub output: &'a Path,
    /// The report's file.
    pub report: &'a Path,
    /// The table's file.
    pub table: Option<&'a Path>,
    /// The spec's title.
    pub title: Option<&'a str>,
    /// When the run started, RFC 3339, UTC.
    pub started: &'a str,
    /// Whether files of an earlier package may be replaced: because the user says so, or
    /// because they are known to be this program's own ([`is_as_written`]).
    pub replace: bool,
}

/// An output as the report lists it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Item {
    /// Relative to the output folder, as it is on the disk.
    pub path: PathBuf,
    /// SHA-256, lower-case hexadecimal.
    pub sha256: String,
    /// Length in bytes.
    pub bytes: u64,
}

/// The files a package would add or replace.
pub fn files(emit: Emit, contents: &Contents<'_>) -> Vec<PathBuf> {
    match emit {
        Emit::Datapackage => datapackage::files(contents),
        Emit::Bagit => bagit::files(contents),
    }
}

/// Refuses what can't become a package, before anything is written. That the files of
/// [`files`] do not exist yet is checked elsewhere.
///
/// `paths` are those of the planned outputs, each relative to the output folder.
///
/// # Errors
/// Whatever a Data Package or a bag can't hold or name, and places where none may be
/// made; see [`PackageError`].
pub fn check(emit: Emit, contents: &Contents<'_>, paths: &mut dyn Iterator<Item = &Path>) -> Result<(), PackageError> {
    match emit {
        Emit::Datapackage => datapackage::check(contents, paths),
        Emit::Bagit => bagit::check(contents, paths),
    }
}

/// Whether each file of [`files`] that is there was written by an earlier run of the same
/// job: byte for byte what [`write()`] would make of the same contents. A package that was
/// broken off while it was written passes with those files it has, and so does none at all.
///
/// Title, start and `items` are those of the earlier run's report, and that report and its
/// table are still in their places. An output that has gone or changed since then does not
/// count against the package, which lists it as it was; any other file of a bag's payload
/// that came, went or changed does. Everything is compared as it is rendered, with nothing
/// held in memory but one item.
///
/// # Errors
/// Files that can't be read, and whatever [`check`] refuses; see [`PackageError`].
pub fn is_as_written(
    emit: Emit,
    contents: &Contents<'_>,
    items: &mut dyn Iterator<Item = io::Result<Item>>,
) -> Result<bool, PackageError> {
    if files(emit, contents).iter().all(|file| is_absent(file)) {
        return Ok(true);
    }
    // A package of a report that is gone is not known to be anybody's.
    if [Some(contents.report), contents.table].into_iter().flatten().any(is_absent) {
        return Ok(false);
    }
    for file in render(emit, contents, items, Purpose::Compare)? {
        if !file.absent_or_same()? {
            return Ok(false);
        }
    }
    Ok(true)
}

/// Takes an earlier package back, before a run replaces the first file that it lists: what
/// it says would not be true any more, and if the run were broken off nobody would replace
/// it.
///
/// Where the package `is_as_written`, all its files go, the declaration of a bag first;
/// [`write()`] makes them anew. Where it is not, its files may hold what somebody else
/// wrote, and they stay until they are replaced, but for the declaration, if
/// [`Contents::replace`] allows that: two fixed lines and nobody's work, without which no
/// program takes the folder for a valid bag.
///
/// # Errors
/// [`PackageError::Write`], and the folders and manifests that [`check`] refuses.
pub fn take_back(emit: Emit, contents: &Contents<'_>, is_as_written: bool) -> Result<(), PackageError> {
    let going = match emit {
        _ if is_as_written => files(emit, contents),
        Emit::Bagit if contents.replace => bagit::declaration_to_replace(contents)?,
        Emit::Bagit | Emit::Datapackage => Vec::new(),
    };
    // The last to come is the first to go.
    going.iter().rev().try_for_each(|file| match std::fs::remove_file(file) {
        Err(cause) if cause.kind() != io::ErrorKind::NotFound => Err(PackageError::Write { path: file.clone(), cause }),
        _ => Ok(()),
    })
}

/// Writes the package around finished outputs, report and table. Files appear under their
/// names complete; in a bag, `bagit.txt` is the last.
///
/// `items` come sorted by path, byte by byte with `/` between components, as the report
/// lists them; one is held at a time. `temporary` hears of each file that is begun under
/// a temporary name and must not be left if the program ends in the middle.
///
/// # Errors
/// An output that is not on the disk any more, files that can't be read or written, and
/// whatever [`check`] refuses and has come about since; see [`PackageError`]. Then there
/// is no package, and outputs, report and table are as they were.
pub fn write(
    emit: Emit,
    contents: &Contents<'_>,
    items: &mut dyn Iterator<Item = io::Result<Item>>,
    temporary: &dyn Fn(&Path),
) -> Result<(), PackageError> {
    // An earlier declaration would call the folder a bag with manifests that are not true
    // any more.
    take_back(emit, contents, false)?;
    let files = render(emit, contents, items, Purpose::Write(temporary))?;
    files.into_iter().try_for_each(|file| file.settle(contents.replace))
}

/// Renders the files of a package, in the order of [`files`], in which they get their names.
fn render(
    emit: Emit,
    contents: &Contents<'_>,
    items: &mut dyn Iterator<Item = io::Result<Item>>,
    purpose: Purpose<'_>,
) -> Result<Vec<Complete>, PackageError> {
    match emit {
        Emit::Datapackage => datapackage::render(contents, items, purpose),
        Emit::Bagit => bagit::render(contents, items, purpose),
    }
}

fn is_absent(file: &Path) -> bool {
    file.symlink_metadata().is_err_and(|error| error.kind() == io::ErrorKind::NotFound)
}
