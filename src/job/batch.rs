//! Running the plan: every recording once, on all threads, into the journal.

use super::earlier::Standing;
use super::failure::{Failure, contained};
use super::journal::Journal;
use super::memory::MemoryBudget;
use super::plan::{Brief, Plan, Planned};
use super::record::Record;
use super::recording::process;
use super::settled::Settled;
use super::{Progress, entry};
use crate::files::place::{Stamp, folder_of};
use crate::files::{open, temporary};
use crate::report::{Recording, SummaryBuilder};
use crate::wave::{Header, Reader, reads_back};
use std::fs::{self, File};
use std::io::{self, BufWriter};
use std::path::Path;
use std::sync::atomic::{AtomicU64, Ordering};
use tempfile::NamedTempFile;

const BUFFER_BYTES: usize = 1 << 18;

/// A failed recording has no output, but there may be one of an earlier run.
const OLDER_OUTPUT: &str =
    "a file with the output's name was there before this run and was left alone; it is not of this run";

/// Everything the threads share.
struct Batch<'a> {
    plan: &'a Plan,
    record: Record<'a>,
    replace: bool,
    settled: Settled,
    /// Outputs of an earlier run that are to be replaced and are not yet.
    outdated: AtomicU64,
    budget: MemoryBudget,
}

/// Processes every recording of the plan in the current thread pool, largest first, and
/// says how many it did not do because it was interrupted. Those that an earlier run has
/// done are in the journal and in `seen` already.
pub fn run(
    plan: &Plan,
    journal: &Journal,
    replace: bool,
    progress: &dyn Progress,
    seen: SummaryBuilder,
) -> Result<Ran, io::Error> {
    let mut order: Vec<&Planned> = plan.to_do().collect();
    order.sort_by_key(|planned| (std::cmp::Reverse(planned.found.bytes), &planned.shown));
    let record = Record::new(journal, progress, seen);
    let kept = plan.recordings.iter().filter(|planned| planned.standing == Standing::Kept);
    let settled = Settled::with(kept.map(|planned| planned.target.as_path()));
    let outdated = plan.recordings.iter().filter(|planned| planned.standing == Standing::Outdated).count() as u64;
    let outdated = AtomicU64::new(outdated);
    let batch = Batch { plan, record, replace, settled, outdated, budget: MemoryBudget::of_this_machine() };
    for (path, why) in &plan.unreadable {
        batch.record.add(Path::new(path), Recording::failed(path.clone(), why.clone()), || Ok(()));
    }
    let not_done = batch.record.each(&order, |planned| batch.one(planned));
    let outdated = batch.outdated.into_inner();
    Ok(Ran { seen: batch.record.finish()?, not_done, outdated })
}

/// What came of all recordings together.
pub struct Ran {
    /// What the report comes to.
    pub seen: SummaryBuilder,
    /// Recordings that were not done because of an interrupt.
    pub not_done: u64,
    /// Outputs of an earlier run that were to be replaced and were not.
    pub outdated: u64,
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
                self.record.add(relative, recording, || self.settle(temporary, planned));
            }
            Err(failure) if failure.is_interruption() => self.record.drop_one(),
            Err(failure) => {
                let mut recording = entry::failed(planned, &failure, header.as_ref());
                // Where it collides, what is there is the output of another.
                if planned.collides.is_none() && planned.target.symlink_metadata().is_ok() {
                    recording.notes.push(OLDER_OUTPUT.into());
                }
                self.record.add(relative, recording, || Ok(()));
            }
        }
    }

    fn settle(&self, file: NamedTempFile, planned: &Planned) -> Result<(), Failure> {
        // What an earlier run wrote may go, but not what somebody put in its place since.
        let same = planned.outdated.is_some() && planned.outdated == Stamp::of(&planned.target);
        let replace = self.replace || same;
        self.settled.settle(file, &planned.target, replace)?;
        if planned.standing == Standing::Outdated {
            self.outdated.fetch_sub(1, Ordering::Relaxed);
        }
        Ok(())
    }

    fn produce(&self, planned: &Planned, known: &mut Option<Header>) -> Result<Ready, Failure> {
        let brief = planned.usable().map_err(|why| Failure::Header(why.to_owned()))?;
        let rate = self.plan.rates.get(&brief.rate_hz).ok_or_else(changed)?;
        let _room = self.budget.enter(brief, &rate.treatment);
        let file = open::regular(&planned.found.path).map_err(Failure::Open)?;
        let metadata = file.metadata().map_err(Failure::Open)?;
        let reader = Reader::open_as(file, self.plan.spec.spec.rate)?;
        let header = known.insert(reader.header().clone());
        if Brief::of(header) != *brief {
            return Err(changed());
        }
        let temporary = temporary_beside(&planned.target).map_err(Failure::Write)?;
        self.record.progress.temporary(temporary.path());
        // The file itself: errors of the temporary file name it, which would mean nothing.
        let sink = BufWriter::with_capacity(BUFFER_BYTES, temporary.as_file());
        let (sink, processed) = process(reader, sink, &rate.treatment, &|bytes| self.record.progress.pass(bytes))?;
        sink.into_inner().map_err(|error| Failure::Write(error.into_error()))?;
        // Of a file that was written to while it was read, the length may be the same.
        let now = fs::metadata(&planned.found.path);
        if now.is_ok_and(|now| now.modified().ok() != metadata.modified().ok()) {
            return Err(changed());
        }
        reads_back(temporary.as_file(), header, processed.format, &processed.written)?;
        carry_over(temporary.as_file(), &metadata).map_err(Failure::Write)?;
        Ok(Ready { temporary, recording: entry::done(planned, header, &processed, rate)? })
    }
}

pub(super) fn changed() -> Failure {
    Failure::Header("it changed while this run was going on; run again when nothing writes to it".into())
}

/// A temporary file where the output goes.
fn temporary_beside(target: &Path) -> io::Result<NamedTempFile> {
    fs::create_dir_all(folder_of(target))?;
    temporary::private_beside(target)
}

/// The input's permissions and modification time, before the final name.
fn carry_over(output: &File, input: &fs::Metadata) -> io::Result<()> {
    if let Ok(modified) = input.modified() {
        output.set_modified(modified)?;
    }
    output.set_permissions(input.permissions())
}
