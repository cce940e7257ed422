//! What a report lists, held small: a report of a hundred thousand recordings must not
//! fill memory with figures that only `--remeasure` looks at.

use super::{Command, RecheckError};
use crate::files::digest::{hexadecimal, of_hexadecimal};
use crate::job::paths;
use crate::report::{Head, ReadError, Recording, Status, Summary, read_report};
use std::collections::HashSet;
use std::fs::File;
use std::io::BufReader;
use std::path::Path;

/// Block in which a report is read.
const BUFFER_BYTES: usize = 1 << 18;

/// A SHA-256.
pub(super) type Hash = [u8; 32];

/// A report without its figures.
#[derive(Debug)]
pub(super) struct Listing {
    pub(super) head: Head,
    pub(super) summary: Summary,
    pub(super) command: Command,
    pub(super) entries: Vec<Listed>,
    /// Hash of the recording of the idle device, where pairs were measured with one.
    pub(super) noise_sha256: Option<String>,
}

/// One entry.
#[derive(Debug)]
pub(super) struct Listed {
    pub(super) path: String,
    /// Whether the name is not UTF-8 and `path` stands for it.
    pub(super) escaped: bool,
    /// Why it failed; `None` for one that is done.
    pub(super) error: Option<String>,
    pub(super) rate_hz: Option<u32>,
    /// `None` where the header could not be read.
    pub(super) input: Option<Expected>,
    pub(super) after: Option<After>,
}

/// What a file was.
#[derive(Clone, Copy, Debug)]
pub(super) struct Expected {
    pub(super) bytes: u64,
    /// `None` where the file was not read to its end.
    pub(super) sha256: Option<Hash>,
}

/// The recording after.
#[derive(Debug)]
pub(super) struct After {
    /// `None` where it is that of the entry.
    path: Option<String>,
    pub(super) expected: Expected,
    /// `None` where something else made it.
    pub(super) made: Option<Made>,
}

/// What `filter` noted of an output.
#[derive(Clone, Copy, Debug)]
pub(super) struct Made {
    pub(super) peak_dbfs: Option<f64>,
    pub(super) clipped_samples: u64,
    pub(super) gain_db: f64,
}

impl Listed {
    fn new(recording: Recording) -> Self {
        let Recording { path, error, notes, input, output, pair, .. } = recording;
        let own = |other: String| (other != path).then_some(other);
        let after = match (output, pair) {
            (Some(output), _) => Some(After {
                expected: Expected { bytes: output.bytes, sha256: of_hexadecimal(&output.sha256) },
                path: own(output.path),
                made: Some(Made {
                    peak_dbfs: output.peak_dbfs.map(|db| db.get()),
                    clipped_samples: output.clipped_samples,
                    gain_db: output.gain_db.get(),
                }),
            }),
            (None, Some(pair)) => Some(After {
                expected: Expected { bytes: pair.bytes, sha256: pair.sha256.as_deref().and_then(of_hexadecimal) },
                path: own(pair.path),
                made: None,
            }),
            (None, None) => None,
        };
        Listed {
            escaped: notes.iter().any(|note| note == paths::ESCAPED_NOTE),
            rate_hz: input.as_ref().map(|input| input.rate_hz),
            input: input
                .map(|input| Expected { bytes: input.bytes, sha256: input.sha256.as_deref().and_then(of_hexadecimal) }),
            after,
            error,
            path,
        }
    }

    pub(super) fn done(&self) -> bool {
        self.error.is_none()
    }

    /// Length of both recordings of one that is done.
    pub(super) fn both_bytes(&self) -> u64 {
        let after = self.after.as_ref().map_or(0, |after| after.expected.bytes);
        let before = self.input.map_or(0, |input| input.bytes);
        if self.done() { before.saturating_add(after) } else { 0 }
    }

    /// Path of the recording after, relative to its root.
    pub(super) fn after_path(&self) -> &str {
        self.after.as_ref().and_then(|after| after.path.as_deref()).unwrap_or(&self.path)
    }
}

/// Calls `each` with every recording of the report.
pub(super) fn read(
    path: &Path,
    each: &mut dyn FnMut(Recording) -> Result<(), String>,
) -> Result<(Head, Summary), RecheckError> {
    let refused = |cause| RecheckError::Report { path: path.into(), cause };
    let file = File::open(path).map_err(|error| refused(ReadError::Io(error)))?;
    read_report(BufReader::with_capacity(BUFFER_BYTES, file), each).map_err(refused)
}

impl Listing {
    /// Reads a report and refuses one that can't be checked by.
    pub(super) fn read(path: &Path) -> Result<Self, RecheckError> {
        let mut entries = Vec::new();
        // Which command wrote it stands at its end.
        let (mut no_output, mut no_pair) = (None, None);
        let mut noise_sha256 = None;
        let (head, summary) = read(path, &mut |recording| {
            let done = recording.status == Status::Done;
            let place = entries.len() + 1;
            if done && (recording.output.is_none() || recording.pair.is_some()) {
                no_output.get_or_insert((place, recording.path.clone()));
            }
            if recording.output.is_some() || (done && recording.pair.as_ref().is_none_or(|pair| pair.sha256.is_none()))
            {
                no_pair.get_or_insert((place, recording.path.clone()));
            }
            let noise = recording.pair.as_ref().and_then(|pair| pair.noise_sha256.clone());
            if noise_sha256.is_none() {
                noise_sha256 = noise;
            }
            entries.push(Listed::new(recording));
            Ok(())
        })?;
        let command = if summary.unpaired.is_some() { Command::Measure } else { Command::Filter };
        let unusable = |(place, what): (usize, String)| RecheckError::Report {
            path: path.into(),
            cause: ReadError::Unusable { what, entry: Some(place) },
        };
        let odd = match command {
            Command::Filter => no_output.map(|(place, path)| {
                (place, format!("`{path}` is done but has no `output` alone, as every recording of `filter` has"))
            }),
            Command::Measure => no_pair.map(|(place, path)| {
                (place, format!("`{path}` has no `pair` with a hash alone, as every recording of `measure` has"))
            }),
        };
        if let Some(odd) = odd {
            return Err(unusable(odd));
        }
        if let Some(twice) = listed_twice(&entries) {
            return Err(unusable(twice));
        }
        Ok(Listing { head, summary, command, entries, noise_sha256 })
    }
}

/// The first path that two entries share on the same side.
fn listed_twice(entries: &[Listed]) -> Option<(usize, String)> {
    let (mut before, mut after) = (HashSet::new(), HashSet::new());
    for (entry, place) in entries.iter().zip(1..) {
        if !before.insert((entry.path.as_str(), entry.escaped)) {
            return Some((place, format!("`{}` is listed a second time", entry.path)));
        }
        if entry.after.is_some() && !after.insert((entry.after_path(), entry.escaped)) {
            return Some((place, format!("`{}` is the recording after a second time", entry.after_path())));
        }
    }
    None
}

/// A hash as reports write it.
pub(super) fn hex(hash: &Hash) -> String {
    hexadecimal(hash)
}
