//! Does a dataset still match its report?
//!
//! [`run`] reads a report, finds the files it lists, and holds each against its length and
//! hash; on request it filters the inputs again and requires the same outputs, bit for
//! bit, and measures again and requires the same verdicts and figures. It writes nothing
//! but the table that it may be asked for.

mod check;
mod compare;
mod error;
mod files;
mod findings;
mod listing;
mod rates;
mod remeasure;
mod replay;
mod roots;
mod rows;
mod summary;

use crate::files::place::real;
use crate::job::documents::Document;
use crate::job::guard::{self, Guarded};
use crate::job::{IdleNoise, JobError, Progress};
use crate::wave::RateMeaning;
use check::{Check, Found};
pub use error::RecheckError;
pub use findings::{AgainCounts, Command, Disagreement, FileCounts, Findings, Recordings, Side, Unreadable};
use listing::Listing;
use rates::Rates;
use remeasure::Remeasure;
use roots::Roots;
use std::collections::HashSet;
use std::io;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// What `recheck` is asked to do.
#[derive(Clone, Debug)]
pub struct RecheckJob {
    /// The report.
    pub report: PathBuf,
    /// Folder of the recordings before, or the one; `None` leaves them alone.
    pub input: Option<PathBuf>,
    /// Folder of the recordings after, or the one; `None` for the report's own folder.
    pub output: Option<PathBuf>,
    /// Filter the inputs again.
    pub replay: bool,
    /// Measure again.
    pub remeasure: bool,
    /// The recording of the idle device that the report's pairs were measured with.
    pub noise: Option<PathBuf>,
    /// Where the figures of [`Self::remeasure`] go as a table.
    pub csv: Option<PathBuf>,
    /// Whether the table may replace a file.
    pub replace: bool,
    /// Threads, at least 1.
    pub jobs: usize,
}

/// Holds a dataset against its report.
///
/// # Errors
/// What keeps the whole recheck from starting; what is not as the report says, and files
/// that can't be read, are among the findings.
pub fn run(job: &RecheckJob, progress: &dyn Progress) -> Result<Findings, RecheckError> {
    for (asked, option) in [(job.replay, "--replay"), (job.remeasure, "--remeasure")] {
        if asked && job.input.is_none() {
            return Err(RecheckError::NeedsInput(option));
        }
    }
    let threads =
        |cause: rayon::ThreadPoolBuildError| RecheckError::Threads { jobs: job.jobs, cause: cause.to_string() };
    let pool = rayon::ThreadPoolBuilder::new().num_threads(job.jobs).build().map_err(threads)?;
    let listing = Listing::read(&job.report)?;
    if job.replay && listing.command == Command::Measure {
        return Err(RecheckError::NothingToReplay(job.report.clone()));
    }
    let roots = Roots::of(job, &listing)?;
    let again = job.replay || job.remeasure;
    let rates = if again { Some(Rates::of(&job.report, &listing)?) } else { None };
    let noise = match rates.as_ref().filter(|_| job.remeasure) {
        Some(rates) => idle_noise(job, &listing, rates.spec.rate)?,
        None => None,
    };
    let table = job.csv.as_deref().filter(|_| job.remeasure);
    let table = table.map(|table| begin_table(job, table, &listing, &roots, progress)).transpose()?;
    let mut check = Check::new(job, &listing, &roots, rates.as_ref());
    pool.install(|| check.files(progress));
    if let Some(rates) = rates.as_ref().filter(|_| job.remeasure) {
        let remeasure = Remeasure { job, listing: &listing, roots: &roots, rates, noise };
        let found = pool.install(|| measure_again(&remeasure, table, job.replace, progress))?;
        check.add(found);
    }
    Ok(check.finish(progress.interrupted()))
}

/// The recording of the idle device, which must be the one that the report names.
fn idle_noise(
    job: &RecheckJob,
    listing: &Listing,
    rate: Option<RateMeaning>,
) -> Result<Option<Arc<IdleNoise>>, RecheckError> {
    let Some(path) = &job.noise else {
        return match listing.noise_sha256 {
            Some(_) => Err(RecheckError::NeedsNoise(job.report.clone())),
            None => Ok(None),
        };
    };
    let other = |found: String, told: String, repair| RecheckError::OtherNoise {
        noise: path.clone(),
        found,
        report: job.report.clone(),
        told,
        repair,
    };
    let noise = IdleNoise::open(path, rate).map_err(JobError::Noise)?;
    let found = noise.sha256().to_owned();
    match &listing.noise_sha256 {
        Some(told) if *told == found => Ok(Some(Arc::new(noise))),
        Some(told) => Err(other(found, format!("names one with {told}"), "give that one")),
        None => Err(other(found, "was made without one".to_owned(), "leave it out")),
    }
}

/// The table under its temporary name, once it is sure to hurt nothing.
fn begin_table(
    job: &RecheckJob,
    table: &Path,
    listing: &Listing,
    roots: &Roots,
    progress: &dyn Progress,
) -> Result<Document, RecheckError> {
    let input = roots.input.as_ref().unwrap_or(&roots.output);
    let recordings = roots.output.recordings().chain(input.recordings());
    guard::check(&Guarded {
        reads: recordings.chain([job.report.as_path()]).chain(job.noise.as_deref()).collect(),
        input: &input.path,
        output: None,
        outputs: Vec::new(),
        documents: vec![("--csv", table)],
        replace: job.replace,
        ours: HashSet::new(),
        reason: None,
    })?;
    // A recording that is missing may come back.
    let place = real(table);
    if roots.all().any(|root| root.lists(listing, &place)) {
        return Err(RecheckError::TableIsRecording(table.into()));
    }
    let document = Document::begin("the table", table)?;
    progress.temporary(document.temporary());
    Ok(document)
}

/// Measures everything again and, if there is to be a table, fills and names it.
fn measure_again(
    remeasure: &Remeasure<'_>,
    table: Option<Document>,
    replace: bool,
    progress: &dyn Progress,
) -> Result<Found, RecheckError> {
    let Some(table) = table else { return remeasure.run(None::<io::Sink>, progress) };
    let mut result = None;
    let named = table.finish(replace, |out| {
        let found = remeasure.run(Some(out), progress);
        // Without a whole table the temporary file goes away.
        let whole = found.is_ok() && !progress.interrupted();
        result = Some(found);
        if whole { Ok(()) } else { Err(io::ErrorKind::Interrupted.into()) }
    });
    match (result, named) {
        (Some(Ok(found)), Ok(())) => Ok(found),
        (Some(Ok(found)), Err(_)) if progress.interrupted() => Ok(found),
        (Some(Err(error)), _) => Err(error),
        (_, Err(error)) => Err(error.into()),
        (None, Ok(())) => Ok(Found::default()),
    }
}
