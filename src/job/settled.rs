//! Outputs of a run under their names: none takes the place of another.

use super::failure::Failure;
use crate::files::place::Identity;
use crate::files::temporary;
use std::collections::HashSet;
use std::io;
use std::path::Path;
use std::sync::{Mutex, PoisonError};
use tempfile::NamedTempFile;

/// Which files have been written or kept.
///
/// The plan fails recordings whose outputs are known to be one file ([`super::collide`]).
/// Disks take more names for one than it knows of, and a link can come about while a run
/// goes on: where files may be replaced, this is what keeps the earlier one.
#[derive(Debug)]
pub(super) struct Settled(Mutex<HashSet<Identity>>);

impl Settled {
    /// With the outputs that an earlier run wrote and that are kept.
    pub(super) fn with<'a>(kept: impl Iterator<Item = &'a Path>) -> Self {
        Settled(Mutex::new(kept.filter_map(Identity::of_entry).collect()))
    }

    /// Gives a finished output its name, in the place of another file only where `replace`
    /// says so and that is no output of this run.
    pub(super) fn settle(&self, file: NamedTempFile, target: &Path, replace: bool) -> Result<(), Failure> {
        // Held over both steps, so that no other output comes between them.
        let mut settled = self.0.lock().unwrap_or_else(PoisonError::into_inner);
        if replace && Identity::of_entry(target).is_some_and(|there| settled.contains(&there)) {
            return Err(Failure::Taken);
        }
        temporary::settle(file, target, replace).map_err(|cause| match cause.kind() {
            io::ErrorKind::AlreadyExists => Failure::InTheWay(cause),
            _ => Failure::Write(cause),
        })?;
        settled.extend(Identity::of_entry(target));
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::io::Write;

    fn finished(target: &Path, text: &str) -> NamedTempFile {
        let mut file = temporary::beside(target).unwrap();
        file.write_all(text.as_bytes()).unwrap();
        file
    }

    #[test]
    fn an_output_replaces_what_was_there_but_no_other_output() {
        let folder = tempfile::tempdir().unwrap();
        let at = |name: &str| folder.path().join(name);
        std::fs::write(at("old.wav"), "old").unwrap();
        std::fs::write(at("kept.wav"), "kept").unwrap();
        let kept = at("kept.wav");
        let settled = Settled::with([kept.as_path()].into_iter());
        settled.settle(finished(&at("old.wav"), "new"), &at("old.wav"), true).unwrap();
        for (name, text) in [("old.wav", "new"), ("kept.wav", "kept")] {
            // As it would be under another spelling that the disk takes for the same.
            let error = settled.settle(finished(&at(name), "other"), &at(name), true).unwrap_err();
            assert!(matches!(error, Failure::Taken), "{name}: {error}");
            assert_eq!(std::fs::read_to_string(at(name)).unwrap(), text);
        }
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 2);
    }
}
