//! Dataset packages: what others need to take over a folder of outputs with its report.
//!
//! Two forms. A **Data Package** is one descriptor beside the report that lists every
//! output with length and hash (`datapackage`). A **bag** is the folder above the
//! output folder with manifests of all that lies in it (`bagit`, RFC 8493). Either is
//! made in three steps: [`files`] names what it would add, [`check`] refuses what can't
//! become a package before a run writes anything, [`write()`] makes it when outputs,
//! report and table are finished.
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
    /// Whether files of an earlier package may be replaced.
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
    match emit {
        Emit::Datapackage => datapackage::write(contents, items, temporary),
        Emit::Bagit => bagit::write(contents, items, temporary),
    }
}
