//! Where files really are, and which are the same.

use std::path::{Component, Path, PathBuf};

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

/// A file by device and inode: the same for every hard link.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Identity(u64, u64);

impl Identity {
    /// The identity of the file at `path`; `None` where the system has none or there is no
    /// file.
    pub fn of(path: &Path) -> Option<Self> {
        #[cfg(unix)]
        {
            use std::os::unix::fs::MetadataExt;
            path.metadata().ok().map(|metadata| Identity(metadata.dev(), metadata.ino()))
        }
        #[cfg(not(unix))]
        {
            _ = path;
            None
        }
    }
}

/// Whether two paths lead to one file that exists.
pub fn same_file(one: &Path, other: &Path) -> bool {
    match (Identity::of(one), Identity::of(other)) {
        (Some(one), Some(other)) => one == other,
        _ => one.canonicalize().ok().is_some_and(|one| other.canonicalize().ok() == Some(one)),
    }
}
