//! The job of `filter`.

use super::counted::Counted;
use super::documents::Documents;
use super::journal::{self, Journal};
use super::plan::{self, Plan, RatePlan};
use super::{JobError, Outcome, Progress, batch, defect, in_pool, paths, rfc3339, run_entry, scan, spec_entry};
use crate::package::{self, Contents, Emit, Item};
use crate::report::{
    Db, DesignEntry, Head, NotFinite, Recording, Skipped, Status, SummaryBuilder, WitnessBand, WitnessEntry,
};
use crate::spec::SpecFile;
use std::io;
use std::path::PathBuf;
use std::time::Instant;

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
    /// Where the figures also go as a table.
    pub table: Option<PathBuf>,
    /// The package that is made of outputs and report.
    pub emit: Option<Emit>,
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
    in_pool(job.jobs, || run_in_pool(job, progress))
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
        let bytes_read = counted.bytes();
        return Ok(Outcome { seconds, complete, bytes_read, dry, ..Outcome::new(summary, highlights, designs) });
    }
    let made = paths::make_folder(&job.output).map_err(|cause| JobError::NotWritable {
        what: "the output folder",
        path: job.output.clone(),
        cause,
    })?;
    let documents =
        Documents::begin(&plan.report, job.table.as_deref(), progress).inspect_err(|_| paths::unmake(&made))?;
    progress.temporary(&job.output.join(journal::JOURNAL_NAME));
    let journal = Journal::create(&job.output).map_err(|cause| JobError::NotWritable {
        what: "the output folder",
        path: job.output.clone(),
        cause,
    })?;
    let (seen, not_begun) = batch::run(&plan, &journal, job.replace, progress, seen).map_err(|cause| {
        JobError::Record { what: "the journal", path: job.output.join(journal::JOURNAL_NAME), cause }
    })?;
    let complete = not_begun == 0;
    let (summary, highlights) = seen.finish(skipped);
    let deviation = plan.rates.values().map(|rate| rate.witness.deviation).reduce(f64::max);
    let run = run_entry(started, clock, job.jobs, deviation);
    let head = Head::new(run, complete, spec_entry(&job.spec)?, designs);
    documents.finish(job.replace, &head, &journal, &summary)?;
    let package = match job.emit {
        Some(emit) if complete => emit_package(emit, job, &plan, &rfc3339(started), &journal, progress)?,
        _ => Vec::new(),
    };
    journal.remove().map_err(|cause| JobError::Record {
        what: "the journal",
        path: job.output.join(journal::JOURNAL_NAME),
        cause,
    })?;
    Ok(Outcome {
        report_path: Some(plan.report),
        table_path: job.table.clone(),
        package,
        seconds: clock.elapsed().as_secs_f64(),
        complete,
        not_begun,
        bytes_read: counted.bytes(),
        ..Outcome::new(summary, highlights, head.designs)
    })
}

/// What a package of this run would hold besides the outputs.
pub(super) fn package_contents<'a>(job: &'a FilterJob, report: &'a std::path::Path, started: &'a str) -> Contents<'a> {
    Contents {
        input: &job.input,
        replace: job.replace,
        output: &job.output,
        report,
        table: job.table.as_deref(),
        title: job.spec.spec.title.as_deref(),
        started,
    }
}

fn emit_package(
    emit: Emit,
    job: &FilterJob,
    plan: &Plan,
    started: &str,
    journal: &Journal,
    progress: &dyn Progress,
) -> Result<Vec<PathBuf>, JobError> {
    let contents = package_contents(job, &plan.report, started);
    let mut items = journal.sorted_with_paths().filter_map(|entry| match entry {
        Ok((path, line)) => item(path, &line).transpose(),
        Err(error) => Some(Err(error)),
    });
    package::write(emit, &contents, &mut items, &|path| progress.temporary(path)).map_err(JobError::Package)?;
    Ok(package::files(emit, &contents))
}

/// The output of a journal entry; `None` where the recording failed.
fn item(path: PathBuf, line: &str) -> io::Result<Option<Item>> {
    let recording: Recording = serde_json::from_str(line)?;
    let output = recording.output.filter(|_| recording.status == Status::Done);
    Ok(output.map(|output| Item { path, sha256: output.sha256, bytes: output.bytes }))
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
