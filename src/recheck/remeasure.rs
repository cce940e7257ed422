//! Every recording measured again, the report read along as a stream.

use super::check::Found;
use super::compare::compare;
use super::files::{Look, look};
use super::findings::Disagreement;
use super::listing::{self, Listed, Listing};
use super::rates::Rates;
use super::roots::Roots;
use super::rows::Rows;
use super::summary::verdicts;
use super::{Command, RecheckError, RecheckJob};
use crate::files::open;
use crate::job::failure::{Failure, contained};
use crate::job::memory::MemoryBudget;
use crate::job::pair::{PairError, PairTask, remeasure};
use crate::job::plan::Brief;
use crate::job::{IdleNoise, PairNames, Pass, Progress, measure_pair};
use crate::report::{
    BandEntry, ChannelEntry, DelaySource, Finite, Input, NotFinite, Recording, Status, SummaryBuilder,
};
use crate::wave::{Reader, WaveError};
use std::io::Write;
use std::path::Path;
use std::sync::mpsc::{Receiver, sync_channel};
use std::sync::{Arc, Mutex, PoisonError};

/// What came of one recording.
enum Again {
    /// It was measured: the entry with its fresh figures.
    Measured(Box<Recording>),
    /// It can't be measured as it is now.
    Failed(String),
    /// A file is missing or can't be read, which is told of the file.
    NotDone(String),
}

/// Everything the threads share.
pub(super) struct Remeasure<'a> {
    pub(super) job: &'a RecheckJob,
    pub(super) listing: &'a Listing,
    pub(super) roots: &'a Roots,
    pub(super) rates: &'a Rates,
    pub(super) noise: Option<Arc<IdleNoise>>,
}

impl Remeasure<'_> {
    /// Measures everything and writes the rows to `out`, if there is one. The current
    /// thread must be one of the pool's.
    pub(super) fn run<W: Write + Send>(&self, out: Option<W>, progress: &dyn Progress) -> Result<Found, RecheckError> {
        let lost = |cause| RecheckError::TableLost { path: self.job.csv.clone().unwrap_or_default(), cause };
        let rows = Mutex::new(out.map(Rows::new).transpose().map_err(lost)?);
        let seen = SummaryBuilder::new(&self.rates.spec).ok().map(Mutex::new);
        let all = Mutex::new(Found::default());
        let budget = MemoryBudget::of_this_machine();
        // A few entries ahead: the report is parsed by a thread of its own while others measure.
        let (sender, receiver) = sync_channel(2 * self.job.jobs);
        let receiver = Mutex::new(receiver);
        let parsed = std::thread::scope(|scope| {
            let parser = scope.spawn(move || {
                let mut place = 0;
                listing::read(&self.job.report, &mut |recording| {
                    place += 1;
                    // Nobody listens any more after an interruption.
                    sender.send((place - 1, recording)).map_err(|_| "stopped".to_owned())
                })
            });
            rayon::broadcast(|_| {
                let mut found = Found::default();
                while !progress.interrupted() {
                    let Some((place, recording)) = next(&receiver) else { break };
                    let now = self.one(place, &recording, &budget, &mut found, progress);
                    if let Some(seen) = &seen {
                        seen.lock().unwrap_or_else(PoisonError::into_inner).add(&recording);
                    }
                    if let Some(rows) = rows.lock().unwrap_or_else(PoisonError::into_inner).as_mut() {
                        rows.put(place, now.unwrap_or(recording));
                    }
                }
                all.lock().unwrap_or_else(PoisonError::into_inner).add(found);
            });
            drop(receiver);
            parser.join()
        });
        let mut found = all.into_inner().unwrap_or_else(PoisonError::into_inner);
        if progress.interrupted() {
            return Ok(found);
        }
        let changed = || RecheckError::ReportChanged(self.job.report.clone());
        let (_, summary) = parsed.map_err(|_| changed())?.map_err(|_| changed())?;
        if let Some(seen) = seen {
            let (counted, _) = seen.into_inner().unwrap_or_else(PoisonError::into_inner).finish(summary.skipped);
            found.disagreements.extend(verdicts(&summary, &counted).map(|what| Disagreement::Report { what }));
        }
        if let Some(rows) = rows.into_inner().unwrap_or_else(PoisonError::into_inner) {
            rows.finish().map_err(lost)?;
        }
        Ok(found)
    }

    /// Measures one recording again; what the table is to say of it, where that is not what
    /// the report says.
    fn one(
        &self,
        place: usize,
        then: &Recording,
        budget: &MemoryBudget,
        found: &mut Found,
        progress: &dyn Progress,
    ) -> Option<Recording> {
        if then.status == Status::Failed {
            return None;
        }
        // The report is the one that was listed, or a table of its entries would be of another.
        let entry = self.listing.entries.get(place).filter(|entry| entry.path == then.path);
        let again = match entry {
            Some(entry) => self.again(entry, then, budget, progress),
            None => Again::NotDone("the report changed while it was being read".to_owned()),
        };
        match again {
            // Given up half-way.
            Again::Failed(_) | Again::NotDone(_) if progress.interrupted() => None,
            Again::Measured(now) => {
                let differing = compare(then, &now);
                if differing.is_empty() {
                    found.remeasure.same += 1
                } else {
                    found.remeasure.different += 1
                }
                found.disagreements.extend(differing);
                Some(*now)
            }
            Again::Failed(why) => {
                found.remeasure.different += 1;
                let what = format!("can't be measured any more: {why}");
                found.disagreements.push(Disagreement::Entry { path: then.path.clone(), what });
                Some(Recording::failed(then.path.clone(), why))
            }
            Again::NotDone(why) => {
                found.remeasure.not_done += 1;
                Some(Recording::failed(then.path.clone(), why))
            }
        }
    }

    fn again(&self, entry: &Listed, then: &Recording, budget: &MemoryBudget, progress: &dyn Progress) -> Again {
        let before = self.roots.input.as_ref().and_then(|root| root.locate(entry));
        let after = self.roots.output.locate(entry);
        let (Some(before), Some(after)) = (before, after) else {
            return Again::NotDone("a recording is missing".to_owned());
        };
        for path in [&before, &after] {
            if !matches!(look(Some(path)), Look::There(_)) {
                return Again::NotDone("a recording is missing or can't be read".to_owned());
            }
        }
        let pass = |bytes| progress.pass(bytes);
        let measured = contained(|| match self.listing.command {
            Command::Filter => self.filtered(entry, then, [&before, &after], budget, &pass),
            Command::Measure => self.pair(entry, then, [&before, &after], budget, &pass),
        });
        match measured {
            Ok(again) => again,
            Err(Failure::Open(error)) => Again::NotDone(format!("can't be opened: {error}")),
            Err(failure) => Again::Failed(failure.to_string()),
        }
    }

    /// An output of `filter` against its input.
    fn filtered(
        &self,
        entry: &Listed,
        then: &Recording,
        files: [&Path; 2],
        budget: &MemoryBudget,
        pass: &Pass<'_>,
    ) -> Result<Again, Failure> {
        let [before, after] = files;
        let (before, after) =
            (open::regular(before).map_err(Failure::Open)?, open::regular(after).map_err(Failure::Open)?);
        let of = |side: &str, error: WaveError| Failure::Header(format!("the {side}: {error}"));
        let before = Reader::open_as(before, self.rates.spec.rate).map_err(|error| of("input", error))?;
        let after = Reader::open_as(after, self.rates.spec.rate).map_err(|error| of("output", error))?;
        let rate_hz = before.header().rate_hz;
        let Some(treatment) = self.rates.treatments.get(&rate_hz) else {
            return Ok(Again::Failed(format!("the report has no design for its sample rate, {rate_hz} Hz")));
        };
        let Some(made) = entry.after.as_ref().and_then(|after| after.made) else {
            return Ok(Again::NotDone("the report has no output for it".to_owned()));
        };
        // What the header says; `compare` holds it against the report's.
        let input = then.input.clone().map(|input| Input {
            rate_hz,
            time_expansion: Finite::ratio(rate_hz, before.header().header_rate_hz),
            ..input
        });
        let _room = budget.enter(&Brief::of(before.header()), treatment);
        let figures = match remeasure(before, after, treatment, made.gain_db, pass) {
            Ok(figures) => figures,
            Err(PairError::Before(error @ WaveError::Io { .. }) | PairError::After(error @ WaveError::Io { .. })) => {
                return Ok(Again::NotDone(error.to_string()));
            }
            Err(error) => return Ok(Again::Failed(error.to_string())),
        };
        let channels = figures.iter().zip(1..).map(|(figures, channel)| {
            let bands = treatment.bands.iter().zip(figures).map(|(task, figures)| BandEntry::new(task, figures));
            Ok(ChannelEntry { channel, bands: bands.collect::<Result<_, _>>()? })
        });
        let channels = channels.collect::<Result<_, NotFinite>>()?;
        Ok(Again::Measured(Box::new(Recording { input, channels, ..then.clone() })))
    }

    /// A pair that something else filtered.
    fn pair(
        &self,
        entry: &Listed,
        then: &Recording,
        [before, after]: [&Path; 2],
        budget: &MemoryBudget,
        pass: &Pass<'_>,
    ) -> Result<Again, Failure> {
        let header =
            Reader::open_as(open::regular(before).map_err(Failure::Open)?, self.rates.spec.rate)?.header().clone();
        let Some(task) = self.rates.pairs.get(&header.rate_hz) else {
            return Ok(Again::Failed(format!("the report has no design for its sample rate, {} Hz", header.rate_hz)));
        };
        let mut task = PairTask { noise: self.noise.clone(), ..task.clone() };
        if let Some(pair) = &then.pair {
            if pair.delay_source == Some(DelaySource::Given) {
                task.delay_frames = pair.delay_frames.map(|frames| frames.get());
            }
            if let Some(max_delay_s) = pair.max_delay_s {
                task.max_delay_s = max_delay_s.get();
            }
        }
        let names =
            PairNames { before: then.path.clone(), after: entry.after_path().to_owned(), escaped: entry.escaped };
        let _room = budget.enter(&Brief::of(&header), &task.treatment);
        Ok(match measure_pair(before, after, &names, &task, pass) {
            Ok(recording) => Again::Measured(Box::new(recording)),
            Err(why) => Again::Failed(why),
        })
    }
}

/// The next entry; `None` at the report's end.
fn next(receiver: &Mutex<Receiver<(usize, Recording)>>) -> Option<(usize, Recording)> {
    receiver.lock().unwrap_or_else(PoisonError::into_inner).recv().ok()
}
