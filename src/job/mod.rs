//! Finding recordings, planning a run, processing each, the witness, the journal.
//!
//! [`run`] is the whole job: [`plan`] decides everything and refuses what can't hold
//! before anything is written, `batch` sends every recording through
//! [`recording::process`], `journal` keeps what is done, and the report is put
//! together from it at the end.

mod batch;
mod collector;
mod counted;
mod discover;
mod entry;
mod error;
mod failure;
mod guard;
mod journal;
mod memory;
mod paths;
pub mod plan;
pub mod recording;
mod scan;
mod sink;
pub mod witness;

use crate::report::{
    Db, DesignEntry, Finite, Head, Highlights, NotFinite, Run, Skipped, SpecEntry, Summary, SummaryBuilder,
    WitnessBand, WitnessEntry, write_report,
};
use crate::spec::SpecFile;
use counted::Counted;
pub use error::JobError;
use journal::Journal;
pub use plan::Plan;
use plan::RatePlan;
pub use recording::RecordingError;
use std::fs;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use std::time::Instant;
use tempfile::NamedTempFile;

/// What `filter` is asked to do.
#[derive(Clone, Debug)]
pub struct FilterJob {
    /// The spec.
    pub spec: SpecFile,
    /// Where the spec was read from, so that it can't be written over.
    pub spec_path: Option<PathBuf>,
    /// A folder of recordings, or one.
    pub input: PathBuf,
    /// The folder outputs go to; made if missing.
    pub output: PathBuf,
    /// Where the report goes; `None` for [`plan::REPORT_FILE_NAME`] in the output folder.
    pub report: Option<PathBuf>,
    /// Whether existing files may be overwritten.
    pub replace: bool,
    /// Only recordings that match one of these patterns, if there are any.
    pub include: Vec<String>,
    /// No recordings that match one of these patterns.
    pub exclude: Vec<String>,
    /// Threads, at least 1.
    pub jobs: usize,
    /// Plan and check only.
    pub dry_run: bool,
    /// In a dry run, also read and filter every recording.
    pub scan: bool,
}

/// Hears how a run goes. Called from all threads.
pub trait Progress: Sync {
    /// The plan is made; this many recordings and bytes of samples are to be done.
    fn planned(&self, recordings: u64, bytes: u64);
    /// So many more input bytes went through.
    fn advanced(&self, bytes: u64);
    /// A recording ended; `failed` says why it could not be processed.
    fn finished(&self, path: &str, failed: Option<&str>);
    /// Asked before each recording is begun: once true, no more are, and the report
    /// says that it is not complete.
    fn interrupted(&self) -> bool {
        false
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
    /// The spec at each sample rate.
    pub designs: Vec<DesignEntry>,
    /// Where the report is; `None` after a dry run.
    pub report_path: Option<PathBuf>,
    /// Wall time.
    pub seconds: f64,
    /// False where the run was interrupted before every recording was begun.
    pub complete: bool,
    /// Recordings that an interrupted run did not begin.
    pub not_begun: u64,
    /// Bytes of samples that were read.
    pub bytes_read: u64,
    /// What a dry run would do.
    pub dry: Option<DryRun>,
}

/// What a run would do.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct DryRun {
    /// The recordings, sorted by path, after whatever could not be looked at.
    pub recordings: Vec<PlannedRecording>,
}

/// One recording of a dry run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct PlannedRecording {
    /// As the report would show it.
    pub path: String,
    /// Where its output would go, its name as in [`Self::path`].
    pub output: String,
    /// Sample rate; `None` where the header can't be read.
    pub rate_hz: Option<u32>,
    /// Frames; likewise.
    pub frames: Option<u64>,
    /// What would fail or overload.
    pub problem: Option<String>,
    /// Whether it would fail: overload alone need not.
    pub fails: bool,
}

/// Runs the whole job.
///
/// # Errors
/// What keeps the whole run from starting or from being reported; a recording that
/// fails is an entry of the report.
pub fn run(job: &FilterJob, progress: &dyn Progress) -> Result<Outcome, JobError> {
    let threads = |cause: rayon::ThreadPoolBuildError| JobError::Threads { jobs: job.jobs, cause: cause.to_string() };
    let pool = rayon::ThreadPoolBuilder::new().num_threads(job.jobs).build().map_err(threads)?;
    pool.install(|| run_in_pool(job, progress))
}

fn run_in_pool(job: &FilterJob, progress: &dyn Progress) -> Result<Outcome, JobError> {
    let counted = Counted::new(progress);
    let progress: &dyn Progress = &counted;
    let started = jiff::Timestamp::now();
    let clock = Instant::now();
    let plan = Plan::new(job)?;
    let bytes = plan.recordings.iter().map(|planned| planned.found.bytes).sum();
    progress.planned(plan.recordings.len() as u64, bytes);
    let designs = design_entries(job, &plan)?;
    let skipped = Skipped { dot_underscore: plan.dot_underscore, other_files: plan.other_files };
    let seen = SummaryBuilder::new(&job.spec.spec).map_err(|error| defect(&error))?;
    if job.dry_run {
        let (summary, highlights) = seen.finish(skipped);
        let dry = Some(dry_run(job, &plan, progress));
        let complete = !(job.scan && progress.interrupted());
        let seconds = clock.elapsed().as_secs_f64();
        return Ok(Outcome {
            summary,
            highlights,
            designs,
            report_path: None,
            seconds,
            complete,
            not_begun: 0,
            bytes_read: counted.bytes(),
            dry,
        });
    }
    let made =
        paths::make_folder(&job.output).map_err(|cause| not_writable("the output folder", &job.output, cause))?;
    let report_file = temporary_report(&plan.report).inspect_err(|_| paths::unmake(&made))?;
    progress.temporary(report_file.path());
    progress.temporary(&job.output.join(journal::JOURNAL_NAME));
    let journal =
        Journal::create(&job.output).map_err(|cause| not_writable("the output folder", &job.output, cause))?;
    let (seen, not_begun) = batch::run(&plan, &journal, job.replace, progress, seen).map_err(|cause| {
        JobError::Record { what: "the journal", path: job.output.join(journal::JOURNAL_NAME), cause }
    })?;
    let complete = not_begun == 0;
    let (summary, highlights) = seen.finish(skipped);
    let run = Run {
        started: started.strftime("%Y-%m-%dT%H:%M:%SZ").to_string(),
        seconds: clock.elapsed().into(),
        jobs: job.jobs,
        witness_deviation: plan
            .rates
            .values()
            .map(|rate| rate.witness.deviation)
            .reduce(f64::max)
            .and_then(Finite::new),
    };
    let head = Head::new(run, complete, spec_entry(job)?, designs);
    let lost = |cause: io::Error| JobError::Record { what: "the report", path: plan.report.clone(), cause };
    write_whole_report(report_file, &plan.report, job.replace, &head, &journal, &summary).map_err(lost)?;
    journal.remove().map_err(lost)?;
    Ok(Outcome {
        summary,
        highlights,
        designs: head.designs,
        report_path: Some(plan.report),
        seconds: clock.elapsed().as_secs_f64(),
        complete,
        not_begun,
        bytes_read: counted.bytes(),
        dry: None,
    })
}

fn not_writable(what: &'static str, path: &Path, cause: io::Error) -> JobError {
    JobError::NotWritable { what, path: path.into(), cause }
}

/// The report's temporary file, made first so that a bad place costs no work.
fn temporary_report(report: &Path) -> Result<NamedTempFile, JobError> {
    let folder = report.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let mut builder = tempfile::Builder::new();
    builder.prefix(batch::TEMPORARY.0).suffix(batch::TEMPORARY.1);
    #[cfg(unix)]
    {
        // What any new file gets; tempfile's own default is for its owner only.
        use std::os::unix::fs::PermissionsExt;
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    builder.tempfile_in(folder).map_err(|cause| not_writable("the report", report, paths::cause_without_name(cause)))
}

fn write_whole_report(
    file: NamedTempFile,
    target: &Path,
    replace: bool,
    head: &Head,
    journal: &Journal,
    summary: &Summary,
) -> io::Result<()> {
    let mut out = BufWriter::with_capacity(1 << 18, file);
    write_report(&mut out, head, journal.sorted(), summary)?;
    out.flush()?;
    let file = out.into_inner().map_err(io::IntoInnerError::into_error)?;
    file.as_file().sync_all()?;
    let persisted = if replace { file.persist(target) } else { file.persist_noclobber(target) };
    persisted.map(drop).map_err(|error| error.error)
}

fn defect(error: &NotFinite) -> JobError {
    JobError::Defect(error.to_string())
}

fn spec_entry(job: &FilterJob) -> Result<SpecEntry, JobError> {
    SpecEntry::new(&job.spec).map_err(|error| JobError::Defect(error.to_string()))
}

fn design_entries(job: &FilterJob, plan: &Plan) -> Result<Vec<DesignEntry>, JobError> {
    let dither = plan::dither_name(&job.spec.spec);
    let entry = |rate: &RatePlan| DesignEntry::new(&rate.design, dither, Some(witness_entry(rate)?));
    plan.rates.values().map(|rate| entry(rate).map_err(|error| defect(&error))).collect()
}

fn witness_entry(rate: &RatePlan) -> Result<WitnessEntry, NotFinite> {
    let bands = rate.design.bands.iter().zip(&rate.witness.bands).map(|(band, seen)| {
        let db = |value: Option<f64>| value.map(Db::try_from).transpose();
        Ok(WitnessBand {
            name: band.band.name.clone(),
            attenuation_min_db: db(seen.map(|(least, _)| least))?,
            attenuation_max_db: db(seen.map(|(_, largest)| largest))?,
        })
    });
    Ok(WitnessEntry { agrees: rate.witness.agrees, bands: bands.collect::<Result<_, _>>()? })
}

fn dry_run(job: &FilterJob, plan: &Plan, progress: &dyn Progress) -> DryRun {
    let scanned = if job.scan { scan::scan(plan, progress) } else { plan.recordings.iter().map(|_| None).collect() };
    let unreadable = plan.unreadable.iter().map(|(path, why)| PlannedRecording {
        path: path.clone(),
        output: job.output.join(path).display().to_string(),
        rate_hz: None,
        frames: None,
        problem: Some(why.clone()),
        fails: true,
    });
    let recordings = plan.recordings.iter().zip(scanned).map(|(planned, scanned)| PlannedRecording {
        path: planned.shown.clone(),
        output: job.output.join(&planned.shown).display().to_string(),
        rate_hz: planned.header.as_ref().ok().map(|header| header.rate_hz),
        frames: planned.header.as_ref().ok().map(|header| header.frames),
        fails: planned.header.is_err() || scanned.as_ref().is_some_and(|seen| seen.fails),
        problem: scanned.map(|seen| seen.problem).or(planned.header.as_ref().err().cloned()),
    });
    DryRun { recordings: unreadable.chain(recordings).collect() }
}
