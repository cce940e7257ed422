//! Claims held against the bytes on the disk.

use super::Earlier;
use super::claims::File as Claimed;
use crate::files::digest::{BUFFER_BYTES, of_reader};
use crate::files::open;
use crate::files::place::Stamp;
use crate::job::plan::Planned;
use crate::job::{Interrupted, Progress};
use rayon::prelude::*;
use std::io;
use std::path::Path;

/// How a recording stands before a run.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Standing {
    /// It is to be done, and nothing is in the way.
    #[default]
    Open,
    /// It was done: input and output are what the earlier entry says.
    Kept,
    /// It is to be done again. What has the output's name was written by an earlier run of
    /// this job and nobody changed it since.
    Outdated,
    /// Something that no run of this job is known to have written has the output's name.
    InTheWay,
}

/// Holds every claim against the files: outputs first, and inputs of those that agree.
///
/// # Errors
/// The user asked for an end.
pub fn verify(recordings: &mut [Planned], earlier: &Earlier, progress: &dyn Progress) -> Result<(), Interrupted> {
    let bytes = |planned: &Planned| {
        let claim = earlier.claim(&planned.shown, planned.escaped);
        claim.map_or(0, |claim| claim.input.bytes.saturating_add(claim.output.bytes))
    };
    progress.checking(recordings.iter().map(bytes).fold(0, u64::saturating_add));
    recordings.par_iter_mut().try_for_each_init(
        || vec![0; BUFFER_BYTES],
        |buffer, planned| {
            // Before its bytes are: what is written to it since then is seen.
            let stamp = Stamp::of(&planned.target);
            planned.standing = standing(planned, earlier, buffer, progress);
            planned.outdated = stamp.filter(|_| planned.standing == Standing::Outdated);
            if progress.interrupted() { Err(Interrupted) } else { Ok(()) }
        },
    )
}

fn standing(planned: &Planned, earlier: &Earlier, buffer: &mut [u8], progress: &dyn Progress) -> Standing {
    // What has its output's name then is that of another recording.
    if planned.collides.is_some() || planned.target.symlink_metadata().is_err() {
        return Standing::Open;
    }
    let claim = earlier.claim(&planned.shown, planned.escaped);
    let older = earlier.claims.older(&planned.shown, planned.escaped);
    // A link is nothing that a run writes.
    let linked = planned.target.is_symlink();
    let mut agrees = |path: &Path, claimed: &Claimed| agrees(path, claimed, buffer, progress).unwrap_or(false);
    if linked {
        return Standing::InTheWay;
    }
    if let Some(claim) = claim.filter(|claim| agrees(&planned.target, &claim.output)) {
        return if agrees(&planned.found.path, &claim.input) { Standing::Kept } else { Standing::Outdated };
    }
    // A run was broken off before it had replaced this one.
    if older.iter().any(|output| agrees(&planned.target, output)) { Standing::Outdated } else { Standing::InTheWay }
}

/// Whether the file at `path` has this length and hash; one of another length is not read.
fn agrees(path: &Path, claimed: &Claimed, buffer: &mut [u8], progress: &dyn Progress) -> io::Result<bool> {
    // Looked at before it is opened: a pipe would wait for a writer.
    let metadata = path.metadata()?;
    if !metadata.is_file() || metadata.len() != claimed.bytes {
        return Ok(false);
    }
    let mut read = |bytes| progress.pass(bytes).map_err(io::Error::other);
    let (sha256, bytes) = of_reader(open::regular(path)?, buffer, &mut read)?;
    Ok((sha256, bytes) == (claimed.sha256, claimed.bytes))
}
