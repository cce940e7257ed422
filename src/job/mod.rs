//! Finding recordings, planning a run, processing each, the witness, the journal.
//!
//! [`run`] is the job of `filter`: [`plan`] decides everything and refuses what can't hold
//! before anything is written, `batch` sends every recording through
//! [`recording::process`], `journal` keeps what is done, and the report is put
//! together from it at the end. [`measure()`] is the job of `measure`, on the same rails:
//! pairs instead of recordings, and nothing written but the report.

mod batch;
mod collector;
mod collide;
mod counted;
pub(crate) mod discover;
pub(crate) mod documents;
mod earlier;
mod entry;
mod error;
pub(crate) mod failure;
mod filter;
pub(crate) mod guard;
mod journal;
mod measure;
pub(crate) mod memory;
mod noise;
pub mod pair;
pub(crate) mod paths;
pub mod plan;
mod record;
pub mod recording;
mod scan;
mod segments;
mod settled;
pub(crate) mod sink;
pub mod witness;

use crate::design::auto::Found;
use crate::report::{DesignEntry, Finite, Highlights, NotFinite, Run, SpecEntry, Summary};
use crate::spec::SpecFile;
pub use error::JobError;
pub use filter::{DryRun, FilterJob, PlannedRecording, run};
pub use measure::{MeasureJob, PairNames, measure, measure_pair};
pub use noise::{IdleNoise, NoiseError};
pub use plan::Plan;
pub use recording::RecordingError;
use std::path::{Path, PathBuf};
use std::time::Instant;

/// Work was given up because the user asked for an end.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("interrupted")]
pub struct Interrupted;

/// Hears how many bytes of samples went through, block by block, and says whether to go on.
pub type Pass<'a> = dyn Fn(u64) -> Result<(), Interrupted> + Sync + 'a;

/// Hears how a run goes. Called from all threads.
pub trait Progress: Sync {
    /// Stages are being found from the bands, which may take a while.
    fn finding(&self) {}
    /// The plan is made; this many recordings and bytes of samples are to be done.
    fn planned(&self, recordings: u64, bytes: u64);
    /// So many more input bytes went through.
    fn advanced(&self, bytes: u64);
    /// A recording ended; `failed` says why it could not be processed.
    fn finished(&self, path: &str, failed: Option<&str>);
    /// What an earlier run left is being read to see what of it can be kept: so many
    /// bytes, of which [`Self::advanced`] will hear.
    fn checking(&self, _bytes: u64) {}
    /// Asked before each recording is begun and with each of its blocks: once true, none
    /// is begun any more, those in work are dropped, and the report says that it is not
    /// complete.
    fn interrupted(&self) -> bool {
        false
    }
    /// Hears that so many more input bytes went through, and says whether to go on.
    ///
    /// # Errors
    /// The run was interrupted.
    fn pass(&self, bytes: u64) -> Result<(), Interrupted> {
        self.advanced(bytes);
        if self.interrupted() { Err(Interrupted) } else { Ok(()) }
    }
    /// A file was begun that must not be left if the program ends in the middle. It is
    /// gone, or has another name, once the run is over.
    fn temporary(&self, _path: &Path) {}
}

/// What came of a run.
#[derive(Debug)]
pub struct Outcome {
    /// Counts and verdicts.
    pub summary: Summary,
    /// What a person has to know first.
    pub highlights: Highlights,
    /// The stages that were found from the bands, where the spec leaves them to the program.
    pub found: Option<Found>,
    /// The spec at each sample rate.
    pub designs: Vec<DesignEntry>,
    /// Where the report is; `None` after a dry run.
    pub report_path: Option<PathBuf>,
    /// Where the table is, if one was asked for.
    pub table_path: Option<PathBuf>,
    /// Files of the dataset package, if one was asked for and the run is complete.
    pub package: Vec<PathBuf>,
    /// Wall time.
    pub seconds: f64,
    /// Recordings that an earlier run had done, found unchanged and kept.
    pub kept: u64,
    /// False where the run was interrupted before every recording was done.
    pub complete: bool,
    /// Recordings that an interrupted run did not begin or gave up half-way.
    pub not_done: u64,
    /// Bytes of samples that were read.
    pub bytes_read: u64,
    /// What a dry run would do.
    pub dry: Option<DryRun>,
}

impl Outcome {
    /// Of a run that is complete and wrote nothing.
    fn new(summary: Summary, highlights: Highlights, designs: Vec<DesignEntry>) -> Self {
        Outcome {
            summary,
            highlights,
            found: None,
            designs,
            report_path: None,
            table_path: None,
            package: Vec::new(),
            seconds: 0.0,
            complete: true,
            kept: 0,
            not_done: 0,
            bytes_read: 0,
            dry: None,
        }
    }
}

/// Runs `work` on `jobs` threads.
fn in_pool<T: Send>(jobs: usize, work: impl FnOnce() -> Result<T, JobError> + Send) -> Result<T, JobError> {
    let threads = |cause: rayon::ThreadPoolBuildError| JobError::Threads { jobs, cause: cause.to_string() };
    rayon::ThreadPoolBuilder::new().num_threads(jobs).build().map_err(threads)?.install(work)
}

/// The facts of one run.
fn run_entry(started: jiff::Timestamp, clock: Instant, jobs: usize, witness_deviation: Option<f64>) -> Run {
    Run {
        started: rfc3339(started),
        seconds: clock.elapsed().into(),
        jobs,
        witness_deviation: witness_deviation.and_then(Finite::new),
    }
}

/// UTC, whole seconds.
fn rfc3339(time: jiff::Timestamp) -> String {
    time.strftime("%Y-%m-%dT%H:%M:%SZ").to_string()
}

fn defect(error: &NotFinite) -> JobError {
    JobError::Defect(error.to_string())
}

fn spec_entry(spec: &SpecFile) -> Result<SpecEntry, JobError> {
    SpecEntry::new(spec).map_err(|error| JobError::Defect(error.to_string()))
}
