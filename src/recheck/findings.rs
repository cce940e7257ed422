//! What a recheck found: plain data, which is also the JSON document.

use crate::report::Verdict;
use serde::Serialize;

/// What a recheck found. Lists are sorted by path, the same for any number of threads.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Findings {
    /// The report's path as it was given.
    pub report: String,
    /// The command that wrote the report: `filter` or `measure`.
    pub command: Command,
    /// Whether the dataset is what the report says: no disagreement, nothing unreadable,
    /// nothing left out by an interruption.
    pub agrees: bool,
    /// False where the recheck was interrupted.
    pub finished: bool,
    /// What the report says of itself: false where its own run was interrupted, and then
    /// there is a disagreement.
    pub report_complete: bool,
    /// Folder (or file) of the recordings after, as it was looked at.
    pub output_root: String,
    /// Folder (or file) of the recordings before; null where inputs were not looked at.
    pub input_root: Option<String>,
    /// What the report lists.
    pub recordings: Recordings,
    /// The recordings after.
    pub outputs: FileCounts,
    /// The recordings before; null where they were not looked at.
    pub inputs: Option<FileCounts>,
    /// Filtered again; null unless asked for.
    pub replay: Option<AgainCounts>,
    /// Measured again; null unless asked for.
    pub remeasure: Option<AgainCounts>,
    /// Everything that is not as the report says.
    pub disagreements: Vec<Disagreement>,
    /// What could not be looked at.
    pub unreadable: Vec<Unreadable>,
}

/// What wrote a report.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Command {
    /// It filtered recordings and measured them.
    Filter,
    /// It measured pairs that something else filtered.
    Measure,
}

/// Entries of the report.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct Recordings {
    /// All.
    pub listed: u64,
    /// Those that were done.
    pub done: u64,
    /// Those that failed: they have no output.
    pub failed: u64,
}

/// Files on one side.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct FileCounts {
    /// With the length and hash of the report.
    pub unchanged: u64,
    /// With another length or hash.
    pub changed: u64,
    /// No longer there.
    pub missing: u64,
    /// There, and not in the report.
    pub new: u64,
    /// There, and the report has no hash to check them by: recordings that failed before
    /// they were read to their end.
    pub without_hash: u64,
    /// There, and they could not be read.
    pub unreadable: u64,
    /// Bytes that were read for this.
    pub bytes_read: u64,
}

/// Recordings done a second time.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct AgainCounts {
    /// With the same result.
    pub same: u64,
    /// With another.
    pub different: u64,
    /// Not done, because a file was missing or could not be read.
    pub not_done: u64,
}

/// Which of the two recordings of an entry.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Side {
    /// Before.
    Input,
    /// After.
    Output,
}

/// Something that is not as the report says. Paths are relative to the root of their
/// side, written as in the report.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(tag = "kind", rename_all = "kebab-case")]
pub enum Disagreement {
    /// Another length or another hash.
    Changed {
        /// The file.
        path: String,
        /// Before or after.
        side: Side,
        /// Length in the report.
        bytes_then: u64,
        /// Length found.
        bytes_now: u64,
        /// Hash in the report; null where it has none.
        sha256_then: Option<String>,
        /// Hash found; null where the length alone told.
        sha256_now: Option<String>,
    },
    /// The file is not there.
    Missing {
        /// The file.
        path: String,
        /// Before or after.
        side: Side,
    },
    /// The report does not list the file.
    New {
        /// The file.
        path: String,
        /// Before or after.
        side: Side,
    },
    /// The run that wrote the report was interrupted, so recordings are missing from the
    /// report and not from the dataset: they are counted here and not named.
    Incomplete {
        /// Recordings before that the report does not list; null where inputs were not
        /// looked at.
        inputs_not_listed: Option<u64>,
        /// Recordings after that it does not list.
        outputs_not_listed: u64,
    },
    /// The report does not agree with itself.
    Report {
        /// A sentence.
        what: String,
    },
    /// The spec in the report does not come to the sections in the report.
    Design {
        /// The sample rate.
        rate_hz: u32,
        /// A sentence.
        what: String,
    },
    /// Filtered again, other bytes or another outcome came out.
    Replay {
        /// The recording before.
        path: String,
        /// Hash in the report; null where the recording failed then.
        sha256_then: Option<String>,
        /// Hash that came out; null where it fails now.
        sha256_now: Option<String>,
        /// What the report says of the failure; null where it was done.
        error_then: Option<String>,
        /// Why it fails now; null where it does not.
        error_now: Option<String>,
    },
    /// Filtered or measured again, a figure came out otherwise.
    Figure {
        /// The recording before.
        path: String,
        /// Channel, 1 for the first; null for a figure of the whole recording.
        channel: Option<u16>,
        /// Name of the band; null likewise.
        band: Option<String>,
        /// Key of the figure in the report, with its unit.
        figure: &'static str,
        /// In the report; null where it has none.
        then: Option<f64>,
        /// Found; null where there is none.
        now: Option<f64>,
    },
    /// Measured again, a verdict came out otherwise.
    Verdict {
        /// The recording before.
        path: String,
        /// Channel, 1 for the first.
        channel: u16,
        /// Name of the band.
        band: String,
        /// In the report; null where it has none.
        then: Option<Verdict>,
        /// Found; null where nothing is required.
        now: Option<Verdict>,
    },
    /// Measured again, something else than a figure or a verdict came out otherwise.
    Entry {
        /// The recording before.
        path: String,
        /// A sentence.
        what: String,
    },
}

/// A file or folder that could not be looked at.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
pub struct Unreadable {
    /// Relative to the root of its side.
    pub path: String,
    /// Before or after.
    pub side: Side,
    /// Why.
    pub error: String,
}

impl FileCounts {
    pub(super) fn add(&mut self, other: &FileCounts) {
        self.unchanged += other.unchanged;
        self.changed += other.changed;
        self.missing += other.missing;
        self.new += other.new;
        self.without_hash += other.without_hash;
        self.unreadable += other.unreadable;
        self.bytes_read += other.bytes_read;
    }
}

impl AgainCounts {
    pub(super) fn add(&mut self, other: &AgainCounts) {
        self.same += other.same;
        self.different += other.different;
        self.not_done += other.not_done;
    }
}

impl Disagreement {
    /// Place among what is told of one path.
    pub(super) fn rank(&self) -> (u8, Option<Side>) {
        match self {
            Disagreement::Incomplete { .. } | Disagreement::Report { .. } => (0, None),
            Disagreement::Design { .. } => (1, None),
            Disagreement::Changed { side, .. }
            | Disagreement::Missing { side, .. }
            | Disagreement::New { side, .. } => (2, Some(*side)),
            Disagreement::Replay { .. } => (3, None),
            Disagreement::Figure { channel: None, .. } => (4, None),
            Disagreement::Entry { .. } => (5, None),
            Disagreement::Figure { .. } | Disagreement::Verdict { .. } => (6, None),
        }
    }

    /// What it is about; `None` for what concerns the whole report.
    pub fn path(&self) -> Option<&str> {
        match self {
            Disagreement::Changed { path, .. }
            | Disagreement::Missing { path, .. }
            | Disagreement::New { path, .. }
            | Disagreement::Replay { path, .. }
            | Disagreement::Figure { path, .. }
            | Disagreement::Verdict { path, .. }
            | Disagreement::Entry { path, .. } => Some(path),
            Disagreement::Incomplete { .. } | Disagreement::Report { .. } | Disagreement::Design { .. } => None,
        }
    }
}
