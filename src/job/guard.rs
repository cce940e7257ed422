//! Nothing of a user's is overwritten: what would be written is held against what is there.

use super::JobError;
use crate::files::place::{Identity, real};
use std::collections::HashMap;
use std::path::{Path, PathBuf};

/// What a run reads and writes.
pub(crate) struct Guarded<'a> {
    /// Recordings, spec and whatever else is read.
    pub reads: Vec<&'a Path>,
    /// The folder of the originals, into which nothing is written.
    pub input: &'a Path,
    /// Where recordings go.
    pub outputs: Vec<&'a Path>,
    /// Other files to be written, each with the option that says where.
    pub documents: Vec<(&'static str, &'a Path)>,
    /// Whether files that exist may be replaced.
    pub replace: bool,
}

/// Refuses a run that would write over an input, the spec, anything that is no regular
/// file, or (without `--replace`) any existing file, and one that would write two files
/// under one name.
pub(crate) fn check(run: &Guarded<'_>) -> Result<(), JobError> {
    let originals = Originals::new(run);
    for output in &run.outputs {
        originals.refuse(output, "output folder")?;
    }
    for &(option, document) in &run.documents {
        originals.refuse(document, option)?;
    }
    one_name_each(run)?;
    let targets = || run.outputs.iter().copied().chain(run.documents.iter().map(|&(_, document)| document));
    // A rename would put a file in the place of a device or a pipe.
    if let Some(other) = targets().find(|target| target.metadata().is_ok_and(|metadata| !metadata.is_file())) {
        return Err(JobError::NotAFile(other.into()));
    }
    if !run.replace {
        let existing: Vec<&Path> = targets().filter(|target| target.symlink_metadata().is_ok()).collect();
        if let Some(first) = existing.first() {
            return Err(JobError::Exists { count: existing.len(), first: (*first).into() });
        }
    }
    Ok(())
}

fn one_name_each(run: &Guarded<'_>) -> Result<(), JobError> {
    let places: Vec<PathBuf> = run.documents.iter().map(|(_, document)| real(document)).collect();
    for (at, &(option, document)) in run.documents.iter().enumerate() {
        let place = &places[at];
        let what = if run.outputs.iter().any(|output| real(output) == *place) {
            "an output recording"
        } else if let Some(other) = places[..at].iter().position(|other| other == place) {
            run.documents[other].0
        } else {
            continue;
        };
        return Err(JobError::SameName { option, path: document.into(), what });
    }
    Ok(())
}

/// The files this run reads, by identity and by place.
struct Originals {
    by_identity: HashMap<Identity, PathBuf>,
    input_root: Option<PathBuf>,
}

impl Originals {
    fn new(run: &Guarded<'_>) -> Self {
        Originals {
            by_identity: run.reads.iter().filter_map(|&path| Some((Identity::of(path)?, path.into()))).collect(),
            input_root: run.input.canonicalize().ok().filter(|root| root.is_dir()),
        }
    }

    fn refuse(&self, target: &Path, what: &'static str) -> Result<(), JobError> {
        if let Some(original) = Identity::of(target).and_then(|identity| self.by_identity.get(&identity)) {
            return Err(JobError::TouchesInput { target: target.into(), original: original.clone(), what });
        }
        match &self.input_root {
            Some(root) if real(target).starts_with(root) => {
                Err(JobError::OutputInInput { output: target.into(), input: root.clone(), relation: "inside" })
            }
            _ => Ok(()),
        }
    }
}
