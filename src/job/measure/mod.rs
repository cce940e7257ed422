//! The job of `measure`: pairs of recordings that something else filtered.

mod entry;
mod pairs;

use super::counted::Counted;
use super::documents::Documents;
use super::failure::{Failure, contained};
use super::guard::{self, Guarded};
use super::journal::Journal;
use super::memory::MemoryBudget;
use super::noise::IdleNoise;
use super::pair::PairTask;
use super::plan::Brief;
use super::record::Record;
use super::{JobError, Outcome, Pass, Progress, defect, in_pool, run_entry, spec_entry};
use crate::design::{Design, design};
use crate::files::open;
use crate::files::place::folder_of;
use crate::report::{DesignEntry, Head, Recording, SummaryBuilder};
use crate::spec::{Spec, SpecFile};
use crate::wave::{Header, RateMeaning, Reader};
pub use entry::PairNames;
use pairs::{Pair, Pairs, Sided};
use rayon::prelude::*;
use std::collections::{BTreeMap, HashSet};
use std::fmt::Display;
use std::fs::File;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::Instant;

/// What `measure` is asked to do.
#[derive(Clone, Debug)]
pub struct MeasureJob {
    /// The spec.
    pub spec: SpecFile,
    /// Where the spec was read from, so that it can't be written over.
    pub spec_path: Option<PathBuf>,
    /// A folder of recordings as they went in, or one.
    pub before: PathBuf,
    /// A folder of the same recordings as they came out, or one.
    pub after: PathBuf,
    /// Where the report goes.
    pub report: PathBuf,
    /// Where the figures also go as a table.
    pub table: Option<PathBuf>,
    /// A recording of the idle device.
    pub noise: Option<PathBuf>,
    /// The delay, where it is known, frames.
    pub delay_frames: Option<f64>,
    /// Largest delay either way to look for, seconds.
    pub max_delay_s: f64,
    /// Whether existing files may be overwritten.
    pub replace: bool,
    /// Only recordings that match one of these patterns, if there are any.
    pub include: Vec<String>,
    /// No recordings that match one of these patterns.
    pub exclude: Vec<String>,
    /// Threads, at least 1.
    pub jobs: usize,
}

/// Measures every pair and writes the report.
///
/// # Errors
/// What keeps the whole run from starting or from being reported; a pair that fails is
/// an entry of the report.
pub fn measure(job: &MeasureJob, progress: &dyn Progress) -> Result<Outcome, JobError> {
    in_pool(job.jobs, || measure_in_pool(job, progress))
}

/// What is asked at one sample rate.
struct Rate {
    design: Design,
    task: PairTask,
}

fn measure_in_pool(job: &MeasureJob, progress: &dyn Progress) -> Result<Outcome, JobError> {
    let counted = Counted::new(progress);
    let progress: &dyn Progress = &counted;
    let started = jiff::Timestamp::now();
    let clock = Instant::now();
    let Pairs { pairs, unpaired, unpaired_files, unreadable, skipped } =
        pairs::find(&job.before, &job.after, &job.include, &job.exclude, job.spec.spec.rate)?;
    refuse_to_overwrite(job, &pairs, &unpaired_files)?;
    let headers = pairs.iter().filter_map(|pair| pair.before.header.as_ref().ok());
    // As in `filter`: what exceptions take out of keep bands follows from the stages.
    let (spec, found) = super::plan::in_force(&job.spec, headers.map(|brief| brief.rate_hz), progress)?;
    let rates = rates(job, &spec.spec, &pairs)?;
    let designs = design_entries(&rates)?;
    // Each recording is read twice.
    let bytes = pairs.iter().map(|pair| 2 * (pair.before.found.bytes + pair.after.found.bytes)).sum();
    progress.planned(pairs.len() as u64, bytes);

    let documents = Documents::begin(&job.report, job.table.as_deref(), progress)?;
    let journal = Journal::nameless(folder_of(&job.report)).map_err(|cause| JobError::NotWritable {
        what: "the report",
        path: job.report.clone(),
        cause,
    })?;
    let seen = SummaryBuilder::new(&job.spec.spec).map_err(|error| defect(&error))?;
    let batch = Batch { rates, record: Record::new(&journal, progress, seen), budget: MemoryBudget::of_this_machine() };
    for (path, why) in &unreadable {
        batch.record.add(Path::new(path), Recording::failed(path.clone(), why.clone()), || Ok(()));
    }
    let mut order: Vec<&Pair> = pairs.iter().collect();
    order.sort_by_key(|pair| (std::cmp::Reverse(pair.before.found.bytes), &pair.before.shown));
    let not_done = batch.record.each(&order, |pair| batch.one(pair));
    let complete = not_done == 0;
    let (mut summary, highlights) = batch
        .record
        .finish()
        .map_err(|cause| JobError::Record { what: "the report", path: job.report.clone(), cause })?
        .finish(skipped);
    summary.unpaired = Some(unpaired);
    let run = run_entry(started, clock, job.jobs, None);
    let head = Head::new(run, complete, spec_entry(&spec)?, designs);
    documents.finish(&|_| job.replace, &head, &journal, &summary)?;
    Ok(Outcome {
        found,
        report_path: Some(job.report.clone()),
        table_path: job.table.clone(),
        seconds: clock.elapsed().as_secs_f64(),
        complete,
        not_done,
        bytes_read: counted.bytes(),
        ..Outcome::new(summary, highlights, head.designs)
    })
}

fn refuse_to_overwrite(job: &MeasureJob, pairs: &[Pair], unpaired: &[PathBuf]) -> Result<(), JobError> {
    let recordings = pairs.iter().flat_map(|pair| [pair.before.found.path.as_path(), pair.after.found.path.as_path()]);
    let others = job.spec_path.iter().chain(&job.noise).chain(unpaired).map(PathBuf::as_path);
    let documents = [("--report", job.report.as_path())].into_iter();
    guard::check(&Guarded {
        reads: recordings.chain(others).collect(),
        input: &job.before,
        output: None,
        outputs: Vec::new(),
        documents: documents.chain(job.table.as_deref().map(|table| ("--csv", table))).collect(),
        replace: job.replace,
        ours: HashSet::new(),
        reason: None,
    })
}

/// The design of `spec` at every sample rate of a recording before. Nothing is checked against it:
/// something else filtered.
fn rates(job: &MeasureJob, spec: &Spec, pairs: &[Pair]) -> Result<BTreeMap<u32, Rate>, JobError> {
    let noise = job
        .noise
        .as_deref()
        .map(|path| IdleNoise::open(path, job.spec.spec.rate))
        .transpose()
        .map_err(JobError::Noise)?
        .map(Arc::new);
    let mut first_with: BTreeMap<u32, &str> = BTreeMap::new();
    for pair in pairs {
        if let Ok(header) = &pair.before.header {
            first_with.entry(header.rate_hz).or_insert(&pair.before.shown);
        }
    }
    let designed = |(&rate_hz, &recording): (&u32, &&str)| {
        let design = design(spec, rate_hz)
            .map_err(|cause| JobError::Design { recording: recording.into(), cause: cause.into() })?;
        let task = PairTask {
            max_delay_s: job.max_delay_s,
            delay_frames: job.delay_frames,
            noise: noise.clone(),
            ..PairTask::new(spec, &design)
        };
        Ok((rate_hz, Rate { design, task }))
    };
    first_with.par_iter().map(designed).collect()
}

fn design_entries(rates: &BTreeMap<u32, Rate>) -> Result<Vec<DesignEntry>, JobError> {
    let entry = |rate: &Rate| DesignEntry::not_applied(&rate.design).map_err(|error| defect(&error));
    rates.values().map(entry).collect()
}

/// Everything the threads share.
struct Batch<'a> {
    rates: BTreeMap<u32, Rate>,
    record: Record<'a>,
    budget: MemoryBudget,
}

impl Batch<'_> {
    fn one(&self, pair: &Pair) {
        let relative = &pair.before.found.relative;
        // What is known of the pair if it fails half-way.
        let mut headers = [None, None];
        let recording = match contained(|| self.produce(pair, &mut headers)) {
            Ok(recording) => recording,
            Err(failure) if failure.is_interruption() => {
                self.record.drop_one();
                return;
            }
            Err(failure) => entry::failed(&names(pair), &failure, &headers),
        };
        self.record.add(relative, recording, || Ok(()));
    }

    fn produce(&self, pair: &Pair, headers: &mut [Option<Header>; 2]) -> Result<Recording, Failure> {
        let brief = usable("before", &pair.before)?;
        let rate = self.rates.get(&brief.rate_hz).ok_or_else(super::batch::changed)?;
        let _room = self.budget.enter(brief, &rate.task.treatment);
        let pass = |bytes| self.record.progress.pass(bytes);
        let files = [pair.before.found.path.as_path(), pair.after.found.path.as_path()];
        measure_files(files, &names(pair), &rate.task, &pass, headers)
    }
}

fn names(pair: &Pair) -> PairNames {
    PairNames {
        before: pair.before.shown.clone(),
        after: pair.after.shown.clone(),
        escaped: pair.before.escaped || pair.after.escaped,
    }
}

/// What the header said when the run was planned.
fn usable<'a>(side: &str, recording: &'a Sided) -> Result<&'a Brief, Failure> {
    recording.header.as_ref().map_err(|why| Failure::Header(format!("{side}: {why}")))
}

/// The report's entry of one pair, measured as [`measure`] does.
///
/// # Errors
/// A sentence on what keeps it from being measured.
pub fn measure_pair(
    before: &Path,
    after: &Path,
    names: &PairNames,
    task: &PairTask,
    pass: &Pass<'_>,
) -> Result<Recording, String> {
    let measured = contained(|| measure_files([before, after], names, task, pass, &mut [None, None]));
    measured.map_err(|failure| failure.to_string())
}

/// `headers` are left as far as they could be read.
fn measure_files(
    [before, after]: [&Path; 2],
    names: &PairNames,
    task: &PairTask,
    pass: &Pass<'_>,
    [header_before, header_after]: &mut [Option<Header>; 2],
) -> Result<Recording, Failure> {
    let before = open("before", before, task.rate)?;
    let header_before = &*header_before.insert(before.header().clone());
    let after = open("after", after, task.rate)?;
    let header_after = &*header_after.insert(after.header().clone());
    let measured = super::pair::measure(before, after, task, pass)?;
    Ok(entry::done(names, [header_before, header_after], &measured, task)?)
}

fn open(side: &str, path: &Path, rate: Option<RateMeaning>) -> Result<Reader<File>, Failure> {
    let failed = |why: &dyn Display| Failure::Header(format!("{side}: {why}"));
    let file = open::regular(path).map_err(|cause| failed(&Failure::Open(cause)))?;
    Reader::open_as(file, rate).map_err(|cause| failed(&cause))
}
