//! What entries of an earlier run say of files, a few words a recording.

use super::{Source, is_escaped};
use crate::files::digest::of_hexadecimal;
use crate::job::journal::Older;
use crate::report::{Recording, Status};
use sha2::{Digest, Sha256};
use std::collections::HashMap;

/// What an entry says of a recording that is done.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Claim {
    pub(super) input: File,
    pub(super) output: File,
    source: Source,
    /// Place among the entries of its source.
    ordinal: u64,
}

/// Length and hash.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct File {
    pub(super) bytes: u64,
    pub(super) sha256: [u8; 32],
}

/// The latest claim of each recording, by a hash of its path as reported and of whether that
/// is escaped: paths may be long, and the plan holds them already.
#[derive(Debug, Default)]
pub(super) struct Claims {
    latest: HashMap<[u8; 16], Claim>,
    /// Other outputs that a recording had: what stands on the disk until it is done again.
    older: HashMap<[u8; 16], Vec<File>>,
}

fn key(path: &str, escaped: bool) -> [u8; 16] {
    let hash: [u8; 32] = Sha256::new_with_prefix([u8::from(escaped)]).chain_update(path).finalize().into();
    hash.first_chunk().copied().unwrap_or_default()
}

impl Claims {
    /// Takes in an entry. A failure takes nothing away: whether an earlier output still
    /// stands, its bytes say.
    pub(super) fn add(&mut self, recording: &Recording, source: Source, ordinal: u64) {
        if let Some(claim) = Claim::of(recording, source, ordinal) {
            let (key, output) = (key(&recording.path, is_escaped(recording)), claim.output);
            if let Some(before) = self.latest.insert(key, claim).filter(|before| before.output != output) {
                self.older.entry(key).or_default().push(before.output);
            }
        }
    }

    /// Takes in an output that an earlier run made and a later one was to make again.
    pub(super) fn add_older(&mut self, older: &Older) {
        if let Some(sha256) = of_hexadecimal(&older.sha256) {
            let file = File { bytes: older.bytes, sha256 };
            self.older.entry(key(&older.path, older.escaped)).or_default().push(file);
        }
    }

    /// Outputs of a recording before that of its latest claim.
    pub(super) fn older(&self, shown: &str, escaped: bool) -> &[File] {
        self.older.get(&key(shown, escaped)).map_or(&[], Vec::as_slice)
    }

    pub(super) fn get(&self, shown: &str, escaped: bool) -> Option<&Claim> {
        self.latest.get(&key(shown, escaped))
    }

    pub(super) fn is_empty(&self) -> bool {
        self.latest.is_empty() && self.older.is_empty()
    }

    /// Whether this is the entry that the claim of its recording was made from.
    pub(super) fn is_latest(&self, recording: &Recording, source: Source, ordinal: u64) -> bool {
        self.get(&recording.path, is_escaped(recording))
            .is_some_and(|claim| (claim.source, claim.ordinal) == (source, ordinal))
    }
}

impl Claim {
    fn of(recording: &Recording, source: Source, ordinal: u64) -> Option<Self> {
        if recording.status != Status::Done {
            return None;
        }
        let (input, output) = (recording.input.as_ref()?, recording.output.as_ref()?);
        Some(Claim {
            input: File { bytes: input.bytes, sha256: of_hexadecimal(input.sha256.as_deref()?)? },
            output: File { bytes: output.bytes, sha256: of_hexadecimal(&output.sha256)? },
            source,
            ordinal,
        })
    }
}
