//! Nothing of a user's is overwritten: what would be written is held against what is there.

use super::plan::{Planned, canonical_as_far_as_it_exists};
use super::{FilterJob, JobError};
use std::collections::HashMap;
use std::path::{Path, PathBuf};

/// Refuses a run that would write over an input, the spec, anything that is no regular
/// file, or (without `--replace`) any existing file.
pub(super) fn check(job: &FilterJob, recordings: &[Planned], report: &Path) -> Result<(), JobError> {
    let originals = Originals::new(job, recordings);
    for recording in recordings {
        originals.refuse(&recording.target, "output folder")?;
    }
    originals.refuse(report, "--report")?;
    let real_report = canonical_as_far_as_it_exists(report);
    if recordings.iter().any(|recording| canonical_as_far_as_it_exists(&recording.target) == real_report) {
        return Err(JobError::ReportIsOutput(report.into()));
    }
    let targets = || recordings.iter().map(|recording| recording.target.as_path()).chain([report]);
    // A rename would put a file in the place of a device or a pipe.
    if let Some(other) = targets().find(|target| target.metadata().is_ok_and(|metadata| !metadata.is_file())) {
        return Err(JobError::NotAFile(other.into()));
    }
    if !job.replace {
        let existing: Vec<&Path> = targets().filter(|target| target.symlink_metadata().is_ok()).collect();
        if let Some(first) = existing.first() {
            return Err(JobError::Exists { count: existing.len(), first: first.into() });
        }
    }
    Ok(())
}

/// The files this run reads, by identity and by place.
struct Originals {
    by_identity: HashMap<FileIdentity, PathBuf>,
    input_root: Option<PathBuf>,
}

#[derive(PartialEq, Eq, Hash)]
struct FileIdentity(u64, u64);

/// Device and inode: the same for every hard link. `None` where the system has none
/// or the file does not exist.
fn identity(path: &Path) -> Option<FileIdentity> {
    #[cfg(unix)]
    {
        use std::os::unix::fs::MetadataExt;
        path.metadata().ok().map(|metadata| FileIdentity(metadata.dev(), metadata.ino()))
    }
    #[cfg(not(unix))]
    {
        _ = path;
        None
    }
}

impl Originals {
    fn new(job: &FilterJob, recordings: &[Planned]) -> Self {
        let files = recordings.iter().map(|recording| &recording.found.path).chain(job.spec_path.as_ref());
        Originals {
            by_identity: files.filter_map(|path| Some((identity(path)?, path.clone()))).collect(),
            input_root: job.input.canonicalize().ok().filter(|root| root.is_dir()),
        }
    }

    fn refuse(&self, target: &Path, what: &'static str) -> Result<(), JobError> {
        if let Some(original) = identity(target).and_then(|identity| self.by_identity.get(&identity)) {
            return Err(JobError::TouchesInput { target: target.into(), original: original.clone(), what });
        }
        match &self.input_root {
            Some(root) if canonical_as_far_as_it_exists(target).starts_with(root) => {
                Err(JobError::OutputInInput { output: target.into(), input: root.clone(), relation: "inside" })
            }
            _ => Ok(()),
        }
    }
}
