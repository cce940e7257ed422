//! Why a dataset can't be held against its report at all.

use crate::job::JobError;
use crate::report::ReadError;
use std::io;
use std::path::PathBuf;

/// Why a whole recheck failed. A file that is not as it was, or can't be read, is one of
/// the [`super::Findings`] instead.
#[derive(Debug, thiserror::Error)]
pub enum RecheckError {
    /// The report can't be read.
    #[error("the report {path} {cause}")]
    Report {
        /// As given.
        path: PathBuf,
        /// Why.
        cause: ReadError,
    },
    /// A root can't be looked at.
    #[error("{option} {path} can't be read: {cause}; give the folder that holds the recordings {holds}")]
    Root {
        /// `--input` or `--output`.
        option: &'static str,
        /// As given.
        path: PathBuf,
        /// The system's reason.
        cause: String,
        /// `before` or `after`.
        holds: &'static str,
    },
    /// A single file for a report of several.
    #[error("{option} {path} is a file, and the report lists {listed} recordings: give the folder that holds them")]
    OneFile {
        /// `--input` or `--output`.
        option: &'static str,
        /// As given.
        path: PathBuf,
        /// Entries of the report.
        listed: u64,
    },
    /// A report of `measure` does not say where its recordings lie.
    #[error(
        "the report {0} is one of `measure`, and none of the recordings after lie below its folder: give --output with \
         the folder that was AFTER, and --input with the one that was BEFORE to check these too"
    )]
    WhereIsAfter(PathBuf),
    /// `--replay` with a report of `measure`.
    #[error(
        "the report {0} is one of `measure`, where nothing was filtered, so nothing can be filtered again: leave out \
         --replay (--remeasure measures the pairs again)"
    )]
    NothingToReplay(PathBuf),
    /// `--replay` or `--remeasure` without the inputs.
    #[error("{0} needs the recordings before: give --input with their folder")]
    NeedsInput(&'static str),
    /// The spec within the report can't be read.
    #[error("the spec in the report {path} can't be used: {cause}")]
    Spec {
        /// The report.
        path: PathBuf,
        /// Why.
        cause: String,
    },
    /// The table can't be written where it is to be, or the recording of the idle device
    /// can't be read.
    #[error(transparent)]
    Job(Box<JobError>),
    /// The table would take the name of a recording that is missing.
    #[error("--csv {0} is the name of a recording that the report lists: choose another")]
    TableIsRecording(PathBuf),
    /// The report's pairs were measured with a recording of the idle device.
    #[error(
        "the pairs of the report {0} were measured with a recording of the idle device (its hash is `noise_sha256`): give \
         it with --noise to measure them again"
    )]
    NeedsNoise(PathBuf),
    /// Another recording of the idle device than that of the report.
    #[error("--noise {noise} has SHA-256 {found}, and the report {report} {told}: {repair}")]
    OtherNoise {
        /// As given.
        noise: PathBuf,
        /// Its hash.
        found: String,
        /// The report.
        report: PathBuf,
        /// What that says.
        told: String,
        /// What to do.
        repair: &'static str,
    },
    /// The table failed while it was written.
    #[error("the table {path} could not be written: {cause}")]
    TableLost {
        /// As given.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// The report changed between the two times it is read.
    #[error("the report {0} changed while it was being read: start again when nothing writes to it")]
    ReportChanged(PathBuf),
    /// No threads.
    #[error("{jobs} threads could not be started: {cause}; give a smaller --jobs")]
    Threads {
        /// How many were asked for.
        jobs: usize,
        /// The system's reason.
        cause: String,
    },
}

impl From<JobError> for RecheckError {
    fn from(error: JobError) -> Self {
        RecheckError::Job(Box::new(error))
    }
}

impl RecheckError {
    /// Whether it was refused before any recording was read (exit status 2).
    pub fn is_refusal(&self) -> bool {
        match self {
            RecheckError::Job(cause) => cause.is_refusal(),
            RecheckError::TableLost { .. } | RecheckError::ReportChanged(_) | RecheckError::Threads { .. } => false,
            _ => true,
        }
    }
}
