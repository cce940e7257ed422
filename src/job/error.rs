//! Why a run can't start or can't end.

use super::{Interrupted, NoiseError, RecordingError};
use crate::design::DesignError;
use crate::design::auto::AutoError;
use crate::package::PackageError;
use std::io;
use std::path::PathBuf;

/// Why a whole run failed. One recording's failure is an entry of the report instead.
#[derive(Debug, thiserror::Error)]
pub enum JobError {
    /// IN does not exist or can't be looked at.
    #[error("the input {path} can't be read: {cause}; give a folder of recordings or one recording")]
    Input {
        /// As given.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// `--include` or `--exclude` is no pattern.
    #[error("the pattern `{pattern}` can't be used: {why}; `*` stands for part of a name, `**` for any folders")]
    Pattern {
        /// As given.
        pattern: String,
        /// What is wrong with it.
        why: String,
    },
    /// Nothing to do.
    #[error("no recordings in {path}: looked for names ending in .wav, .wave or .bwf and found {found}")]
    NoRecordings {
        /// The input.
        path: PathBuf,
        /// What was found instead.
        found: String,
    },
    /// OUT is the input or lies inside it.
    #[error(
        "the output {output} is {relation} the input {input}: outputs must never mix with the originals; choose a folder elsewhere"
    )]
    OutputInInput {
        /// The output as given.
        output: PathBuf,
        /// The input as given.
        input: PathBuf,
        /// `the same as` or `inside`.
        relation: &'static str,
    },
    /// A link inside OUT leads out of it.
    #[error(
        "{folder} leads out of the output folder, to {place}: nothing is written through a link to where it might \
         overwrite another's files; remove the link, or give that folder as the output of a run of its own"
    )]
    OutputLeadsElsewhere {
        /// As it would be written to.
        folder: PathBuf,
        /// Where it really is.
        place: PathBuf,
    },
    /// OUT exists and is no folder.
    #[error("the output {0} is a file: give a folder, which is made if it does not exist")]
    OutputIsFile(PathBuf),
    /// A file to be written is one of the inputs or the spec, under whatever name.
    #[error("{target} is the same file as {original}, which this run reads: choose another {what}")]
    TouchesInput {
        /// What would be written.
        target: PathBuf,
        /// What it would destroy.
        original: PathBuf,
        /// `output folder` or `--report`.
        what: &'static str,
    },
    /// Two files would have the same name.
    #[error("{option} {path} is also the name of {what}: choose another")]
    SameName {
        /// The option that says where a file goes.
        option: &'static str,
        /// Where.
        path: PathBuf,
        /// What else goes there: `an output recording` or another option.
        what: &'static str,
    },
    /// One of the two sides of `measure` is a folder, the other a recording.
    #[error(
        "{before} is {before_is}, {after} is {after_is}: give two folders, whose recordings are paired by their paths, \
         or two recordings"
    )]
    Sides {
        /// As given.
        before: PathBuf,
        /// `a folder` or `a file`.
        before_is: &'static str,
        /// As given.
        after: PathBuf,
        /// `a folder` or `a file`.
        after_is: &'static str,
    },
    /// Nothing to measure.
    #[error("no pairs: no recording has the same path below {before} and {after}, which hold {found}")]
    NoPairs {
        /// As given.
        before: PathBuf,
        /// As given.
        after: PathBuf,
        /// How many recordings each has, and what the first are called.
        found: String,
    },
    /// `--noise` is no recording.
    #[error("--noise: {0}")]
    Noise(NoiseError),
    /// The dataset package can't be made, and nothing was written.
    #[error("--emit: {0}")]
    NoPackage(PackageError),
    /// The dataset package could not be written; everything else was.
    #[error("the package could not be written: {0}; recordings and report are complete")]
    Package(PackageError),
    /// A file would have to stand where a folder, a device or a pipe is.
    #[error("{0} is there already and no regular file, so no file can take its name: choose another place")]
    NotAFile(PathBuf),
    /// Outputs or the report exist already.
    #[error(
        "{first} exists already{}{}: give --replace to overwrite, or choose another place",
        others(*count),
        why(reason.as_deref())
    )]
    Exists {
        /// How many.
        count: usize,
        /// The first in path order.
        first: PathBuf,
        /// Why it does not count as written by an earlier run of the same job, if that can
        /// be said.
        reason: Option<String>,
    },
    /// What an earlier run left can't be read.
    #[error("{path}, which an earlier run left, can't be read: {cause}; see to its permissions, or remove it")]
    Earlier {
        /// The journal.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// A killed run was of more recordings.
    #[error(
        "{path} is of a run that was broken off and did also {recording}, which is not part of this one: finish that run \
         first, or give --replace to forget it"
    )]
    OtherJournal {
        /// The journal.
        path: PathBuf,
        /// A recording in it.
        recording: String,
    },
    /// Another run writes into OUT.
    #[error("another run is writing into {0}: wait until it has ended, or choose another folder")]
    Busy(PathBuf),
    /// A package lists files that the run would replace, and is not made anew.
    #[error(
        "{0} belongs to a package that lists what this run would replace: give --emit as in the run that made it, \
         or --replace to let it go out of date"
    )]
    Packaged(PathBuf),
    /// The user asked for an end before anything was written.
    #[error("interrupted before anything was written")]
    Interrupted(#[from] Interrupted),
    /// A folder or the report's place can't be written to.
    #[error("{what} {path} can't be written: {cause}; choose a place that exists and that you may write to")]
    NotWritable {
        /// `the output folder` or `the report`.
        what: &'static str,
        /// Where.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// The spec does not fit a sample rate of this input.
    #[error(
        "{cause}{}",
        if cause.depends_on_rate() {
            format!("; the first recording with that rate is {recording}, and --exclude leaves recordings out")
        } else {
            String::new()
        }
    )]
    Design {
        /// A recording with that rate.
        recording: String,
        /// What does not fit.
        cause: Box<DesignError>,
    },
    /// No cascade is found that holds the bands at every sample rate of this input.
    #[error("{0}")]
    Auto(AutoError),
    /// The design check found requirements that can't hold.
    #[error("the spec can't hold, nothing was written:\n  {}", .0.join("\n  "))]
    Impossible(Vec<String>),
    /// The witness disagrees with the design: the tool's own error.
    #[error(
        "the witness at {rate_hz} Hz disagrees with the design by {deviation:.1e} of full scale at {at_hz:.3} Hz ({deviation_db:.1e} dB at \
         most where the response is above -40 dB): this is a defect of this program, nothing was written; please report it with the spec"
    )]
    Witness {
        /// The rate.
        rate_hz: u32,
        /// Largest complex deviation.
        deviation: f64,
        /// Where.
        at_hz: f64,
        /// Largest deviation in dB.
        deviation_db: f64,
    },
    /// The witness could not be run at all.
    #[error("the witness at {rate_hz} Hz could not be run: {cause}")]
    NoWitness {
        /// The rate.
        rate_hz: u32,
        /// Why.
        cause: RecordingError,
    },
    /// Something that can't be came out.
    #[error("{0}; this is a defect of this program, please report it with the spec")]
    Defect(String),
    /// No threads.
    #[error("{jobs} threads could not be started: {cause}; give a smaller --jobs")]
    Threads {
        /// How many were asked for.
        jobs: usize,
        /// The system's reason.
        cause: String,
    },
    /// Journal or report failed while or after recordings were written.
    #[error("{what} {path} could not be written: {cause}; the recordings listed as done are complete")]
    Record {
        /// `the journal` or `the report`.
        what: &'static str,
        /// Where.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
}

/// How many files exist besides the first.
fn others(count: usize) -> String {
    match count {
        ..2 => String::new(),
        2 => " and so does one other file to be written".to_owned(),
        _ => format!(" and so do {} other files to be written", count - 1),
    }
}

/// The reason in brackets.
fn why(reason: Option<&str>) -> String {
    reason.map(|reason| format!(" ({reason})")).unwrap_or_default()
}

impl JobError {
    /// Whether the run was refused before anything was written (exit status 2).
    pub fn is_refusal(&self) -> bool {
        match self {
            // The spec asks for more than can be checked.
            JobError::NoWitness { cause, .. } => matches!(cause, RecordingError::RingsTooLong { .. }),
            JobError::Witness { .. }
            | JobError::Defect(_)
            | JobError::Threads { .. }
            | JobError::Record { .. }
            | JobError::Package(_) => false,
            _ => true,
        }
    }
}
