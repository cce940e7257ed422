//! Running the plan: every recording once, on all threads, into the journal.

use super::failure::{Failure, contained};
use super::journal::Journal;
use super::memory::MemoryBudget;
use super::plan::{Brief, Plan, Planned};
use super::record::Record;
use super::recording::process;
use super::{Progress, entry};
use crate::files::place::folder_of;
use crate::files::temporary;
use crate::report::{Recording, SummaryBuilder};
use crate::wave::{Header, Reader};
use std::fs::{self, File};
use std::io::{self, BufWriter};
use std::path::Path;
use tempfile::NamedTempFile;

const BUFFER_BYTES: usize = 1 << 18;

/// Everything the threads share.
struct Batch<'a> {
    plan: &'a Plan,
    record: Record<'a>,
    replace: bool,
    budget: MemoryBudget,
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
    let record = Record::new(journal, progress, seen);
    let batch = Batch { plan, record, replace, budget: MemoryBudget::of_this_machine() };
    for (path, why) in &plan.unreadable {
        batch.record.add(Path::new(path), Recording::failed(path.clone(), why.clone()), || Ok(()));
    }
    let not_begun = batch.record.each(&order, |planned| batch.one(planned));
    Ok((batch.record.finish()?, not_begun))
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
                self.record.add(relative, recording, || self.settle(temporary, &planned.target));
            }
            Err(failure) => self.record.add(relative, entry::failed(planned, &failure, header.as_ref()), || Ok(())),
        }
    }

    fn settle(&self, file: NamedTempFile, target: &Path) -> Result<(), Failure> {
        temporary::settle(file, target, self.replace).map_err(Failure::Write)
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
        self.record.progress.temporary(temporary.path());
        let sink = BufWriter::with_capacity(BUFFER_BYTES, temporary);
        let (sink, processed) = process(reader, sink, &rate.treatment, &|bytes| self.record.progress.advanced(bytes))?;
        let temporary = sink.into_inner().map_err(|error| Failure::Write(error.into_error()))?;
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
