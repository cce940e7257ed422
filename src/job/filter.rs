//! The job of `filter`.

use super::collide;
use super::counted::Counted;
use super::documents::Documents;
use super::earlier::{self, Standing};
use super::journal::{self, Identity, Journal};
use super::plan::{self, Plan, RatePlan};
use super::{JobError, Outcome, Progress, batch, defect, in_pool, paths, rfc3339, run_entry, scan, spec_entry};
use crate::files::leftover;
use crate::files::lock::FolderLock;
use crate::files::place::folder_of;
use crate::package::{self, Contents, Emit, Item};
use crate::report::{
    Db, DesignEntry, Head, NotFinite, Recording, Skipped, Status, SummaryBuilder, WitnessBand, WitnessEntry,
};
use crate::spec::SpecFile;
use std::collections::BTreeSet;
use std::io;
use std::path::{Path, PathBuf};
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
#[derive(Clone, Debug, PartialEq)]
pub struct DryRun {
    /// The spec in force, with the stages that were found where it leaves them to the program.
    pub spec: SpecFile,
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
    /// Whether an earlier run has done it and it would be kept.
    pub kept: bool,
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
    let started = jiff::Timestamp::now();
    let clock = Instant::now();
    // A dry run only looks; a folder that does not exist has nobody in it yet.
    let lock = if !job.dry_run && job.output.is_dir() { Some(lock(&job.output)?) } else { None };
    let mut plan = Plan::new(job, progress)?;
    let counted = Counted::new(progress);
    let progress: &dyn Progress = &counted;
    let bytes = plan.to_do().map(|planned| planned.found.bytes).sum();
    progress.planned(plan.to_do().count() as u64, bytes);
    let designs = design_entries(&plan)?;
    let skipped = Skipped { dot_underscore: plan.dot_underscore, other_files: plan.other_files };
    let mut seen = SummaryBuilder::new(&job.spec.spec).map_err(|error| defect(&error))?;
    let kept = (plan.recordings.len() - plan.to_do().count()) as u64;
    if job.dry_run {
        let (summary, highlights) = seen.finish(skipped);
        let dry = Some(dry_run(job, &plan, progress));
        let complete = !(job.scan && progress.interrupted());
        let seconds = clock.elapsed().as_secs_f64();
        let bytes_read = counted.bytes();
        let found = plan.found_stages;
        return Ok(Outcome {
            found,
            seconds,
            complete,
            bytes_read,
            kept,
            dry,
            ..Outcome::new(summary, highlights, designs)
        });
    }
    let (_lock, made) = match lock {
        Some(lock) => (lock, Vec::new()),
        None => {
            let made = make_and_lock(&job.output)?;
            // A folder in which no file can be made is refused right below.
            collide::by_case(&mut plan.recordings, |_, _| collide::case_insensitive(&job.output).unwrap_or(false));
            made
        }
    };
    if let Some(outcome) = all_done(job, &plan, skipped, &designs)? {
        let seconds = clock.elapsed().as_secs_f64();
        return Ok(Outcome { found: plan.found_stages, seconds, kept, ..outcome });
    }
    spare_packages(job, &plan)?;
    let (documents, journal) = begin(job, &plan, &mut seen, progress).inspect_err(|_| paths::unmake(&made))?;
    let batch::Ran { seen, not_done, outdated } = batch::run(&plan, &journal, job.replace, progress, seen)
        .map_err(|cause| JobError::Record { what: "the journal", path: journal_path(job), cause })?;
    let complete = not_done == 0;
    let (summary, highlights) = seen.finish(skipped);
    let deviation = plan.rates.values().map(|rate| rate.witness.deviation).reduce(f64::max);
    let run = run_entry(started, clock, job.jobs, deviation);
    let head = Head::new(run, complete, spec_entry(&plan.spec)?, designs);
    documents.finish(&|path| job.replace || plan.ours.iter().any(|ours| ours == path), &head, &journal, &summary)?;
    let package = match job.emit {
        Some(emit) if complete => emit_package(emit, job, &plan, &rfc3339(started), &journal, progress)?,
        _ => Vec::new(),
    };
    // Else it stays: nothing but it knows that the older outputs are of this job. In a bag it
    // would be a file that no manifest lists.
    if outdated == 0 || !package.is_empty() {
        journal.remove().map_err(|cause| JobError::Record { what: "the journal", path: journal_path(job), cause })?;
    }
    Ok(Outcome {
        found: plan.found_stages,
        report_path: Some(plan.report),
        table_path: job.table.clone(),
        package,
        seconds: clock.elapsed().as_secs_f64(),
        complete,
        kept,
        not_done,
        bytes_read: counted.bytes(),
        ..Outcome::new(summary, highlights, head.designs)
    })
}

/// What an earlier run has done whole is left as it is: report, table and package tell of it
/// already what this run would write, but for its own time.
fn all_done(
    job: &FilterJob,
    plan: &Plan,
    skipped: Skipped,
    designs: &[DesignEntry],
) -> Result<Option<Outcome>, JobError> {
    let Some(told) = plan.earlier.told() else { return Ok(None) };
    let head = Head::new(told.head.run.clone(), true, spec_entry(&plan.spec)?, designs.to_vec());
    let is_there = |file: &Path| plan.ours.iter().any(|ours| ours == file) && file.is_file();
    let contents = package_contents(job, &plan.report, "", false);
    let package = job.emit.map(|emit| package::files(emit, &contents)).unwrap_or_default();
    // Every recording is kept, and as many as the report lists: they are its own.
    let whole = told.head == head
        && plan.to_do().next().is_none()
        && told.summary.done == plan.recordings.len() as u64
        && told.summary.failed == 0
        && told.summary.skipped == skipped
        && job.table.iter().chain(&package).all(|file| is_there(file));
    if !whole {
        return Ok(None);
    }
    remove_leftovers(job, plan);
    Ok(Some(Outcome {
        report_path: Some(plan.report.clone()),
        table_path: job.table.clone(),
        package,
        ..Outcome::new(told.summary.clone(), told.highlights.clone(), designs.to_vec())
    }))
}

/// A package that an earlier run made and this one is not to make lists files that this run
/// replaces.
fn spare_packages(job: &FilterJob, plan: &Plan) -> Result<(), JobError> {
    let contents = package_contents(job, &plan.report, "", false);
    let others = Emit::ALL.into_iter().filter(|emit| job.emit != Some(*emit));
    let mut files = others.flat_map(|emit| package::files(emit, &contents)).filter(|file| file.exists());
    match files.next() {
        // Where no run of this job was, a package is of something else.
        Some(file) if !job.replace && !plan.earlier.is_empty() => Err(JobError::Packaged(file)),
        _ => Ok(()),
    }
}

/// Takes the lock of an output folder that exists.
fn lock(output: &Path) -> Result<FolderLock, JobError> {
    match FolderLock::take(output) {
        Ok(Some(lock)) => Ok(lock),
        Ok(None) => Err(JobError::Busy(output.into())),
        Err(cause) => Err(not_writable(output, cause)),
    }
}

/// Makes the output folder, which was not there when the run was planned, and says which
/// folders are new.
fn make_and_lock(output: &Path) -> Result<(FolderLock, Vec<PathBuf>), JobError> {
    let made = paths::make_folder(output).map_err(|cause| not_writable(output, cause))?;
    if made.is_empty() {
        // Another run made it in the meantime: what lies in it by now is in no plan.
        return Err(JobError::Busy(output.into()));
    }
    let lock = lock(output).inspect_err(|_| paths::unmake(&made))?;
    Ok((lock, made))
}

/// Takes away what a killed run left half-written, and opens report, table and journal, the
/// last with the entries that are kept.
fn begin(
    job: &FilterJob,
    plan: &Plan,
    seen: &mut SummaryBuilder,
    progress: &dyn Progress,
) -> Result<(Documents, Journal), JobError> {
    remove_leftovers(job, plan);
    let documents = Documents::begin(&plan.report, job.table.as_deref(), progress)?;
    let keep = |journal: &Journal| {
        plan.earlier.entries(&mut |recording| {
            let planned = plan.recording(&recording.path, earlier::is_escaped(&recording));
            let Some(planned) = planned.filter(|planned| planned.standing == Standing::Kept) else { return Ok(()) };
            journal.append(&planned.found.relative, &recording)?;
            seen.add(&recording);
            Ok(())
        })?;
        let outdated = plan.recordings.iter().filter(|planned| planned.standing == Standing::Outdated);
        let mut older = outdated.flat_map(|planned| plan.earlier.outputs(&planned.shown, planned.escaped));
        older.try_for_each(|older| journal.remember(&older))
    };
    let identity = Identity::of(&plan.spec).map_err(|error| JobError::Defect(error.to_string()))?;
    let journal = Journal::create(&job.output, &identity, keep).map_err(|cause| not_writable(&job.output, cause))?;
    // What the package says will not be true any more.
    if let Some(emit) = job.emit {
        let ours = plan.package_is_ours(job);
        package::take_back(emit, &package_contents(job, &plan.report, "", ours), ours).map_err(JobError::Package)?;
    }
    Ok((documents, journal))
}

/// In every folder that this run writes into.
fn remove_leftovers(job: &FilterJob, plan: &Plan) {
    let targets = plan.recordings.iter().map(|planned| planned.target.as_path());
    let documents = [Some(plan.report.as_path()), job.table.as_deref()].into_iter().flatten();
    let contents = package_contents(job, &plan.report, "", false);
    let package = job.emit.map(|emit| package::files(emit, &contents)).unwrap_or_default();
    let others = documents.chain(package.iter().map(PathBuf::as_path));
    let folders: BTreeSet<&Path> = targets.chain(others).map(folder_of).collect();
    for folder in folders.into_iter().chain([job.output.as_path()]) {
        // Not there yet, or not to be looked into: writing will say so.
        _ = leftover::remove(folder);
    }
}

fn journal_path(job: &FilterJob) -> PathBuf {
    job.output.join(journal::JOURNAL_NAME)
}

fn not_writable(output: &Path, cause: io::Error) -> JobError {
    JobError::NotWritable { what: "the output folder", path: output.into(), cause }
}

/// What a package of this run would hold besides the outputs.
pub(super) fn package_contents<'a>(job: &'a FilterJob, report: &'a Path, started: &'a str, ours: bool) -> Contents<'a> {
    Contents {
        input: &job.input,
        replace: job.replace || ours,
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
    let contents = package_contents(job, &plan.report, started, plan.package_is_ours(job));
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

fn design_entries(plan: &Plan) -> Result<Vec<DesignEntry>, JobError> {
    let dither = plan::dither_name(&plan.spec.spec);
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
        kept: false,
    });
    let recordings = plan.recordings.iter().zip(scanned).map(|(planned, scanned)| PlannedRecording {
        path: planned.shown.clone(),
        output: job.output.join(&planned.shown).display().to_string(),
        rate_hz: planned.header.as_ref().ok().map(|header| header.rate_hz),
        frames: planned.header.as_ref().ok().map(|header| header.frames),
        fails: planned.usable().is_err() || scanned.as_ref().is_some_and(|seen| seen.fails),
        kept: planned.standing == Standing::Kept,
        problem: scanned.map(|seen| seen.problem).or(planned.usable().err().map(str::to_owned)),
    });
    DryRun { spec: plan.spec.clone(), recordings: unreadable.chain(recordings).collect() }
}
