//! Running the plan: every recording once, on all threads, into the journal.

use super::failure::{Failure, contained};
use super::journal::Journal;
use super::memory::MemoryBudget;
use super::plan::{Brief, Plan, Planned};
use super::recording::process;
use super::{Progress, entry, paths};
use crate::report::{Recording, Status, SummaryBuilder};
use crate::wave::{Header, Reader};
use std::fs::{self, File};
use std::io::{self, BufWriter};
use std::path::Path;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::{Mutex, PoisonError};
use tempfile::NamedTempFile;

/// Beginning and end of temporary names in OUT.
pub(super) const TEMPORARY: (&str, &str) = (".bandproof-", ".part");
const BUFFER_BYTES: usize = 1 << 18;

/// Everything the threads share.
struct Batch<'a> {
    plan: &'a Plan,
    journal: &'a Journal,
    replace: bool,
    progress: &'a dyn Progress,
    budget: MemoryBudget,
    seen: Mutex<SummaryBuilder>,
    journal_error: Mutex<Option<io::Error>>,
}

/// Processes every recording of the plan in the current thread pool, largest first, and
/// says how many it did not begin because it was interrupted.
pub fn run(
    plan: &Plan,
    journal: &Journal,
    replace: bool,
    progress: &dyn Progress,
    seen: SummaryBuilder,
) -> Result<(SummaryBuilder, u64), io::Error> {
    let mut order: Vec<&Planned> = plan.recordings.iter().collect();
    order.sort_by_key(|planned| (std::cmp::Reverse(planned.found.bytes), &planned.shown));
    let batch = Batch {
        plan,
        journal,
        replace,
        progress,
        budget: MemoryBudget::of_this_machine(),
        seen: Mutex::new(seen),
        journal_error: Mutex::new(None),
    };
    for (path, why) in &plan.unreadable {
        batch.record(Path::new(path), Recording::failed(path.clone(), why.clone()), || Ok(()));
    }
    let next = AtomicUsize::new(0);
    // One long task a thread: a thread that finds no recording left is free to
    // transform segments of those still running.
    rayon::broadcast(|_| {
        while !progress.interrupted() {
            let Some(planned) = order.get(next.fetch_add(1, Ordering::Relaxed)) else { break };
            batch.one(planned);
        }
    });
    // The counter runs past the end once a thread finds nothing left.
    let not_begun = order.len().saturating_sub(next.into_inner()) as u64;
    let error = batch.journal_error.into_inner().unwrap_or_else(PoisonError::into_inner);
    match error {
        Some(error) => Err(error),
        None => Ok((batch.seen.into_inner().unwrap_or_else(PoisonError::into_inner), not_begun)),
    }
}

/// A finished output still under its temporary name.
struct Ready {
    temporary: NamedTempFile,
    recording: Recording,
}

impl Batch<'_> {
    fn one(&self, planned: &Planned) {
        let relative = &planned.found.relative;
        // What is known of the recording if it fails half-way.
        let mut header = None;
        match contained(|| self.produce(planned, &mut header)) {
            Ok(Ready { temporary, recording }) => {
                self.record(relative, recording, || self.settle(temporary, &planned.target));
            }
            Err(failure) => self.record(relative, entry::failed(planned, &failure, header.as_ref()), || Ok(())),
        }
    }

    /// Journal entry first, then the final name: a name without an entry can't come
    /// about, and an entry without a name is replaced by one that says so.
    fn record(&self, relative: &Path, mut recording: Recording, settle: impl FnOnce() -> Result<(), Failure>) {
        if !self.enter(relative, &recording) {
            return;
        }
        if let Err(failure) = settle() {
            recording = Recording {
                status: Status::Failed,
                error: Some(failure.to_string()),
                output: None,
                spectrum: None,
                channels: Vec::new(),
                ..recording
            };
            if !self.enter(relative, &recording) {
                return;
            }
        }
        self.progress.finished(&recording.path, recording.error.as_deref());
        self.seen.lock().unwrap_or_else(PoisonError::into_inner).add(&recording);
    }

    /// Puts an entry into the journal; an error is kept for the end of the run.
    fn enter(&self, relative: &Path, recording: &Recording) -> bool {
        match self.journal.append(relative, recording) {
            Ok(()) => true,
            Err(error) => {
                self.journal_error.lock().unwrap_or_else(PoisonError::into_inner).get_or_insert(error);
                false
            }
        }
    }

    fn settle(&self, temporary: NamedTempFile, target: &Path) -> Result<(), Failure> {
        let persisted = if self.replace { temporary.persist(target) } else { temporary.persist_noclobber(target) };
        persisted.map(drop).map_err(|error| Failure::Write(error.error))
    }

    fn produce(&self, planned: &Planned, known: &mut Option<Header>) -> Result<Ready, Failure> {
        let brief = planned.header.as_ref().map_err(|why| Failure::Header(why.clone()))?;
        let rate = self.plan.rates.get(&brief.rate_hz).ok_or_else(changed)?;
        let _room = self.budget.enter(brief, &rate.treatment);
        let file = File::open(&planned.found.path).map_err(Failure::Open)?;
        let metadata = file.metadata().map_err(Failure::Open)?;
        let reader = Reader::open(file)?;
        let header = known.insert(reader.header().clone());
        if Brief::of(header) != *brief {
            return Err(changed());
        }
        let temporary = temporary_beside(&planned.target).map_err(Failure::Write)?;
        self.progress.temporary(temporary.path());
        let sink = BufWriter::with_capacity(BUFFER_BYTES, temporary);
        let (sink, processed) = process(reader, sink, &rate.treatment, &|bytes| self.progress.advanced(bytes))?;
        let temporary = sink.into_inner().map_err(|error| Failure::Write(error.into_error()))?;
        carry_over(temporary.as_file(), &metadata).map_err(Failure::Write)?;
        Ok(Ready { temporary, recording: entry::done(planned, header, &processed, rate)? })
    }
}

fn changed() -> Failure {
    Failure::Header("it changed while this run was going on; run again when nothing writes to it".into())
}

/// A temporary file in the folder the output goes to, so that the rename can't cross
/// file systems.
fn temporary_beside(target: &Path) -> io::Result<NamedTempFile> {
    let folder = target.parent().unwrap_or(Path::new("."));
    fs::create_dir_all(folder)?;
    let builder = &mut tempfile::Builder::new();
    builder.prefix(TEMPORARY.0).suffix(TEMPORARY.1).tempfile_in(folder).map_err(paths::cause_without_name)
}

/// The input's permissions and modification time, before the final name.
fn carry_over(output: &File, input: &fs::Metadata) -> io::Result<()> {
    if let Ok(modified) = input.modified() {
        output.set_modified(modified)?;
    }
    output.set_permissions(input.permissions())
}
