//! Nothing of a user's is overwritten: what would be written is held against what is there.

use super::JobError;
use crate::files::place::{Identity, Places, folder_of, real};
use std::collections::{HashMap, HashSet};
use std::path::{Path, PathBuf};

/// What a run reads and writes.
pub(crate) struct Guarded<'a> {
    /// Recordings, spec and whatever else is read.
    pub reads: Vec<&'a Path>,
    /// The folder of the originals, into which nothing is written.
    pub input: &'a Path,
    /// The folder that outputs stay below; `None` where there are none.
    pub output: Option<&'a Path>,
    /// Where recordings go.
    pub outputs: Vec<&'a Path>,
    /// Other files to be written, each with the option that says where.
    pub documents: Vec<(&'static str, &'a Path)>,
    /// Whether files that exist may be replaced.
    pub replace: bool,
    /// Files that an earlier run of the same job wrote: they may be replaced unasked.
    pub ours: HashSet<&'a Path>,
    /// Why the report that is there is not one of them.
    pub reason: Option<String>,
}

/// Refuses a run that would write over an input, the spec, anything that is no regular
/// file, or (without `--replace`) any existing file, one that a link inside OUT would lead
/// out of it, and one that would write two documents, or a document and an output, under
/// one name.
pub(crate) fn check(run: &Guarded<'_>) -> Result<(), JobError> {
    let originals = Originals::new(run);
    let mut places = Places::default();
    for output in &run.outputs {
        originals.refuse(output, "output folder", &mut places)?;
    }
    for &(option, document) in &run.documents {
        originals.refuse(document, option, &mut places)?;
    }
    outputs_stay_below(run, &mut places)?;
    one_name_each(run, &mut places)?;
    let targets = || run.outputs.iter().copied().chain(run.documents.iter().map(|&(_, document)| document));
    // A rename would put a file in the place of a device or a pipe.
    if let Some(other) = targets().find(|target| target.metadata().is_ok_and(|metadata| !metadata.is_file())) {
        return Err(JobError::NotAFile(other.into()));
    }
    if !run.replace {
        let there = |target: &&Path| !run.ours.contains(target) && target.symlink_metadata().is_ok();
        let existing: Vec<&Path> = targets().filter(there).collect();
        if let Some(first) = existing.first() {
            let reason = run.reason.clone();
            return Err(JobError::Exists { count: existing.len(), first: (*first).into(), reason });
        }
    }
    Ok(())
}

/// A linked folder in OUT may lead to another dataset, in which `--replace` would overwrite
/// files that nobody spoke of.
fn outputs_stay_below(run: &Guarded<'_>, places: &mut Places) -> Result<(), JobError> {
    let Some(root) = run.output else { return Ok(()) };
    let real_root = real(root);
    for output in &run.outputs {
        let folder = folder_of(output);
        let place = places.of_folder(folder);
        if !place.starts_with(&real_root) {
            return Err(JobError::OutputLeadsElsewhere { folder: folder.into(), place: place.into() });
        }
    }
    Ok(())
}

fn one_name_each(run: &Guarded<'_>, places: &mut Places) -> Result<(), JobError> {
    let documents: Vec<PathBuf> = run.documents.iter().map(|(_, document)| places.of(document)).collect();
    // The few documents are remembered, not the many outputs.
    let wanted: HashSet<&Path> = documents.iter().map(PathBuf::as_path).collect();
    let outputs = run.outputs.iter().map(|output| places.of(output)).filter(|place| wanted.contains(place.as_path()));
    let outputs: HashSet<PathBuf> = outputs.collect();
    for (at, &(option, document)) in run.documents.iter().enumerate() {
        let place = &documents[at];
        let what = if outputs.contains(place) {
            "an output recording"
        } else if let Some(other) = documents[..at].iter().position(|other| other == place) {
            run.documents[other].0
        } else {
            continue;
        };
        return Err(JobError::SameName { option, path: document.into(), what });
    }
    Ok(())
}

/// The files this run reads, by identity and by place.
struct Originals<'a> {
    by_identity: HashMap<Identity, &'a Path>,
    input_root: Option<PathBuf>,
}

impl<'a> Originals<'a> {
    fn new(run: &Guarded<'a>) -> Self {
        Originals {
            by_identity: run.reads.iter().filter_map(|&path| Some((Identity::of(path)?, path))).collect(),
            input_root: run.input.canonicalize().ok().filter(|root| root.is_dir()),
        }
    }

    fn refuse(&self, target: &Path, what: &'static str, places: &mut Places) -> Result<(), JobError> {
        let identity = Identity::of(target);
        if let Some(&original) = identity.and_then(|identity| self.by_identity.get(&identity)) {
            return Err(JobError::TouchesInput { target: target.into(), original: original.into(), what });
        }
        match &self.input_root {
            // What is there already may be a link itself.
            Some(root) if identity.map_or_else(|| places.of(target), |_| real(target)).starts_with(root) => {
                Err(JobError::OutputInInput { output: target.into(), input: root.clone(), relation: "inside" })
            }
            _ => Ok(()),
        }
    }
}
