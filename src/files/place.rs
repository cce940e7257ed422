//! Where files really are, and which are the same.

use std::collections::HashMap;
use std::fs::Metadata;
use std::io;
use std::path::{Component, Path, PathBuf};
use std::time::SystemTime;

/// The folder `file` lies in, as given.
pub fn folder_of(file: &Path) -> &Path {
    file.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."))
}

/// The path with links resolved as far as it exists and the rest as written.
pub fn real(path: &Path) -> PathBuf {
    let absolute = std::path::absolute(path).unwrap_or_else(|_| path.into());
    let existing = absolute.ancestors().find_map(|above| Some((above, above.canonicalize().ok()?)));
    let Some((above, mut whole)) = existing else { return absolute };
    for part in absolute.strip_prefix(above).unwrap_or(Path::new("")).components() {
        match part {
            // What does not exist hides no link: `..` is one step back.
            Component::ParentDir => _ = whole.pop(),
            other => whole.push(other),
        }
    }
    whole
}

/// Where files of many folders really are; each folder is looked up once.
#[derive(Debug, Default)]
pub struct Places {
    folders: HashMap<PathBuf, PathBuf>,
}

impl Places {
    /// Where a file that is put at `path` would be: links to its folder are resolved, one in
    /// its own place is not, because a new file takes that.
    pub fn of(&mut self, path: &Path) -> PathBuf {
        match path.file_name() {
            Some(name) => self.of_folder(folder_of(path)).join(name),
            None => real(path),
        }
    }

    /// Where `folder` is, as [`real`] says.
    pub fn of_folder(&mut self, folder: &Path) -> &Path {
        if !self.folders.contains_key(folder) {
            self.folders.insert(folder.to_path_buf(), real(folder));
        }
        self.folders.get(folder).map_or(Path::new(""), PathBuf::as_path)
    }
}

/// A file by device and inode: the same for every hard link.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Identity(u64, u64);

impl Identity {
    /// The identity of the file at `path`; `None` where the system has none or there is no
    /// file.
    pub fn of(path: &Path) -> Option<Self> {
        Self::of_metadata(path.metadata())
    }

    /// The same for what stands at `path` itself, which may be a link.
    pub fn of_entry(path: &Path) -> Option<Self> {
        Self::of_metadata(path.symlink_metadata())
    }

    #[cfg(unix)]
    fn of_metadata(metadata: io::Result<Metadata>) -> Option<Self> {
        use std::os::unix::fs::MetadataExt;
        metadata.ok().map(|metadata| Identity(metadata.dev(), metadata.ino()))
    }

    #[cfg(not(unix))]
    fn of_metadata(_: io::Result<Metadata>) -> Option<Self> {
        None
    }
}

/// What a file looks like from outside: another one if it was written to or replaced.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Stamp {
    identity: Option<Identity>,
    bytes: u64,
    modified: Option<SystemTime>,
}

impl Stamp {
    /// Of the file at `path`; `None` where there is none.
    pub fn of(path: &Path) -> Option<Self> {
        let metadata = path.metadata().ok()?;
        Some(Stamp { identity: Identity::of(path), bytes: metadata.len(), modified: metadata.modified().ok() })
    }
}

/// Whether two paths lead to one file that exists.
pub fn same_file(one: &Path, other: &Path) -> bool {
    match (Identity::of(one), Identity::of(other)) {
        (Some(one), Some(other)) => one == other,
        _ => one.canonicalize().ok().is_some_and(|one| other.canonicalize().ok() == Some(one)),
    }
}
