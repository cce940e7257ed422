//! All that lies in the output folder: outputs of this run and whatever else is there.

use super::new_file::Purpose;
use super::places::posix;
use super::{Item, PackageError};
use crate::files::digest::{self, Digest};
use crate::files::temporary::{is_run_name, is_temporary_name};
use std::cmp::Ordering;
use std::io;
use std::iter::Peekable;
use std::path::{Path, PathBuf};
use walkdir::{DirEntry, WalkDir};

/// One file of the payload.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct PayloadFile {
    /// Relative to the output folder, `/` between components.
    pub path: String,
    /// Its content.
    pub digest: Digest,
}

/// Every file below `output`, sorted by path, each with its path below it.
///
/// # Errors
/// Items of what a bag can't hold: links, devices, names that are not UTF-8, temporary
/// files of an interrupted run, folders that can't be looked into.
pub fn files_below(output: &Path) -> impl Iterator<Item = Result<(PathBuf, String), PackageError>> + '_ {
    let walk = WalkDir::new(output).min_depth(1).follow_links(false).sort_by(in_path_order);
    walk.into_iter().filter_map(move |entry| match entry {
        Ok(entry) if entry.file_type().is_dir() => None,
        // The run's own list of finished outputs and the like, which go away at its end.
        Ok(entry) if entry.depth() == 1 && is_run_name(entry.file_name().as_encoded_bytes()) => None,
        Ok(entry) => Some(named(output, entry)),
        Err(error) => {
            let path = error.path().unwrap_or(output).to_path_buf();
            Some(Err(PackageError::Unreadable { path, cause: error.into() }))
        }
    })
}

/// The order of whole paths byte by byte, which is the report's: a folder counts as its
/// name with the `/` that follows it, so that `a-b/x` comes before `a/x`.
fn in_path_order(left: &DirEntry, right: &DirEntry) -> Ordering {
    fn bytes(entry: &DirEntry) -> impl Iterator<Item = &u8> {
        let end: &[u8] = if entry.file_type().is_dir() { b"/" } else { b"" };
        entry.file_name().as_encoded_bytes().iter().chain(end)
    }
    bytes(left).cmp(bytes(right))
}

fn named(output: &Path, entry: DirEntry) -> Result<(PathBuf, String), PackageError> {
    let kind = entry.file_type();
    if !kind.is_file() {
        let what = if kind.is_symlink() { "a link" } else { "neither a file nor a folder" };
        return Err(PackageError::NotAFile { path: entry.into_path(), what });
    }
    if is_temporary_name(entry.file_name().as_encoded_bytes()) {
        return Err(PackageError::Leftover(entry.into_path()));
    }
    let path = entry.into_path();
    match path.strip_prefix(output).ok().and_then(posix) {
        Some(relative) => Ok((path, relative)),
        None => Err(PackageError::NotUtf8(path)),
    }
}

/// Makes sure that an output is there as long as it was written.
pub fn still_there(output: &Path, item: &Item) -> Result<(), PackageError> {
    let path = output.join(&item.path);
    let what = match path.symlink_metadata() {
        Ok(metadata) if metadata.is_file() && metadata.len() == item.bytes => return Ok(()),
        Ok(metadata) if metadata.is_file() => {
            format!("is {} bytes long, where {} were written", metadata.len(), item.bytes)
        }
        Ok(_) => "is no regular file any more".to_owned(),
        Err(error) if error.kind() == io::ErrorKind::NotFound => "is gone".to_owned(),
        Err(error) => format!("can't be looked at ({error})"),
    };
    Err(PackageError::Changed { path, what })
}

/// Walks the output folder and takes the hashes of this run's outputs from the run: they
/// are of what was written, so damage on the disk since then shows. The rest is read.
pub struct Payload<'a> {
    output: &'a Path,
    items: Peekable<&'a mut dyn Iterator<Item = io::Result<Item>>>,
    purpose: Purpose<'a>,
}

impl<'a> Payload<'a> {
    /// `items` sorted by path as in [`super::write`].
    pub fn new(output: &'a Path, items: &'a mut dyn Iterator<Item = io::Result<Item>>, purpose: Purpose<'a>) -> Self {
        Payload { output, items: items.peekable(), purpose }
    }

    /// Hands over every file of the payload, sorted by path. Where files are compared, the
    /// outputs as the run left them count as the payload, whatever has become of them.
    pub fn each(mut self, mut take: impl FnMut(&PayloadFile) -> Result<(), PackageError>) -> Result<(), PackageError> {
        for found in files_below(self.output) {
            let (place, path) = match found {
                // It goes before anything is written.
                Err(PackageError::Leftover(_)) if !self.purpose.outputs_must_be_there() => continue,
                found => found?,
            };
            let digest = match self.item_at(Some(&path), &mut take)? {
                Some(item) => Digest { sha256: item.sha256, bytes: item.bytes },
                None => digest::of_file(&place).map_err(|cause| PackageError::Unreadable { path: place, cause })?,
            };
            take(&PayloadFile { path, digest })?;
        }
        self.item_at(None, &mut take).map(drop)
    }

    /// The output at `path`, if this run made that file. The items before it (without a
    /// path: all) are passed over.
    fn item_at(
        &mut self,
        path: Option<&str>,
        take: &mut impl FnMut(&PayloadFile) -> Result<(), PackageError>,
    ) -> Result<Option<Item>, PackageError> {
        loop {
            let name = match self.items.peek() {
                Some(Ok(item)) => posix(&item.path),
                Some(Err(_)) => None,
                None => return Ok(None),
            };
            let order = name.as_deref().zip(path).map(|(name, path)| name.cmp(path));
            match order {
                Some(Ordering::Greater) => return Ok(None),
                Some(Ordering::Equal) => return self.next_checked(),
                // The walk has come past it: gone, or listed by the system under
                // another spelling of its name, and then the walk's reading stands.
                Some(Ordering::Less) | None => {
                    let Some(item) = self.next_checked()? else { continue };
                    if let Some(path) = name.filter(|_| self.only_listed(&item)) {
                        let digest = Digest { sha256: item.sha256, bytes: item.bytes };
                        take(&PayloadFile { path, digest })?;
                    }
                }
            }
        }
    }

    fn only_listed(&self, item: &Item) -> bool {
        !self.purpose.outputs_must_be_there() && self.output.join(&item.path).symlink_metadata().is_err()
    }

    fn next_checked(&mut self) -> Result<Option<Item>, PackageError> {
        let Some(item) = self.items.next() else { return Ok(None) };
        let item = item.map_err(PackageError::Items)?;
        if self.purpose.outputs_must_be_there() {
            still_there(self.output, &item)?;
        }
        Ok(Some(item))
    }
}
