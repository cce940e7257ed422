//! Temporary files that a killed run left.

use super::temporary::is_temporary_name;
use std::fs::{self, File};
use std::io;
use std::path::Path;

/// Removes the temporary files of this program in `folder` (not below it) that nobody is
/// writing: whoever writes one holds a lock on it. What can't be removed stays.
///
/// # Errors
/// The folder can't be looked into.
pub fn remove(folder: &Path) -> io::Result<()> {
    for entry in fs::read_dir(folder)? {
        let entry = entry?;
        let ours = is_temporary_name(entry.file_name().as_encoded_bytes());
        if ours && entry.file_type().is_ok_and(|kind| kind.is_file()) && is_free(&entry.path()) {
            // Another's by now, or on a disk that is read-only: it holds nothing of worth.
            _ = fs::remove_file(entry.path());
        }
    }
    Ok(())
}

fn is_free(path: &Path) -> bool {
    File::open(path).is_ok_and(|file| file.try_lock().is_ok())
}

#[cfg(test)]
mod tests {
    use super::super::temporary;
    use super::*;

    #[test]
    fn only_what_nobody_writes_any_more_is_removed() {
        let folder = tempfile::tempdir().unwrap();
        let at = |name: &str| folder.path().join(name);
        let names = [".bandproof-abc123.part", ".bandproof-journal", "a.wav", ".bandproof-x", "x.part"];
        names.iter().for_each(|name| fs::write(at(name), "x").unwrap());
        let in_work = temporary::beside(&at("b.wav")).unwrap();
        fs::create_dir(at(".bandproof-folder.part")).unwrap();
        remove(folder.path()).unwrap();
        assert!(!at(names[0]).exists());
        assert!(names[1..].iter().all(|name| at(name).exists()));
        assert!(in_work.path().exists() && at(".bandproof-folder.part").exists());
        let abandoned = in_work.into_temp_path().keep().unwrap();
        remove(folder.path()).unwrap();
        assert!(!abandoned.exists());
    }
}
