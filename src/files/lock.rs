//! A folder that only one run writes into.

use std::fs::{File, TryLockError};
use std::io;
use std::path::Path;

/// Held while this lives; the system gives it up when the program ends, however it ends.
#[derive(Debug)]
pub struct FolderLock(#[allow(dead_code)] Option<File>);

impl FolderLock {
    /// Takes the lock of a folder that exists; `None` if another run holds it.
    ///
    /// The lock is on the folder itself, so nothing is left in it. Systems and file systems
    /// that can't lock a folder grant it to everyone: outputs still never take the place of
    /// a file that was not there when the run was planned.
    ///
    /// # Errors
    /// The folder can't be opened.
    pub fn take(folder: &Path) -> io::Result<Option<Self>> {
        if cfg!(not(unix)) {
            return Ok(Some(FolderLock(None)));
        }
        let file = File::open(folder)?;
        match file.try_lock() {
            Ok(()) => Ok(Some(FolderLock(Some(file)))),
            Err(TryLockError::WouldBlock) => Ok(None),
            Err(TryLockError::Error(_)) => Ok(Some(FolderLock(None))),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_folder_is_locked_once_and_free_again() {
        let folder = tempfile::tempdir().unwrap();
        let first = FolderLock::take(folder.path()).unwrap();
        assert!(first.is_some());
        assert_eq!(FolderLock::take(folder.path()).unwrap().is_none(), cfg!(unix));
        drop(first);
        assert!(FolderLock::take(folder.path()).unwrap().is_some());
        assert!(FolderLock::take(&folder.path().join("missing")).is_err());
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0);
    }
}
