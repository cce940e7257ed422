//! Every file of the report once, on all threads.

use super::files::{self, Look, State};
use super::findings::{Disagreement, Findings, Recordings, Unreadable};
use super::listing::{Expected, Listed, Listing};
use super::rates::Rates;
use super::replay::{self, Replayed};
use super::roots::{Root, Roots};
use super::summary;
use super::{AgainCounts, Command, FileCounts, RecheckJob, Side};
use crate::files::digest::BUFFER_BYTES;
use crate::files::digest::of_hexadecimal;
use crate::job::Progress;
use std::cmp::Reverse;
use std::io;
use std::path::Path;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Mutex, PoisonError};

/// A recheck in work.
pub(super) struct Check<'a> {
    job: &'a RecheckJob,
    listing: &'a Listing,
    roots: &'a Roots,
    rates: Option<&'a Rates>,
    found: Found,
    /// Whether an interruption left something out.
    left_out: AtomicBool,
}

/// What one thread, or all together, found.
#[derive(Debug, Default)]
pub(super) struct Found {
    pub(super) outputs: FileCounts,
    pub(super) inputs: FileCounts,
    pub(super) replay: AgainCounts,
    pub(super) remeasure: AgainCounts,
    pub(super) disagreements: Vec<Disagreement>,
    pub(super) unreadable: Vec<Unreadable>,
}

impl Found {
    pub(super) fn add(&mut self, other: Found) {
        self.outputs.add(&other.outputs);
        self.inputs.add(&other.inputs);
        self.replay.add(&other.replay);
        self.remeasure.add(&other.remeasure);
        self.disagreements.extend(other.disagreements);
        self.unreadable.extend(other.unreadable);
    }
}

impl<'a> Check<'a> {
    pub(super) fn new(job: &'a RecheckJob, listing: &'a Listing, roots: &'a Roots, rates: Option<&'a Rates>) -> Self {
        Check { job, listing, roots, rates, found: Found::default(), left_out: AtomicBool::new(false) }
    }

    /// Looks at every file that the report lists and for those that it does not.
    pub(super) fn files(&mut self, progress: &dyn Progress) {
        let entries = &self.listing.entries;
        // The largest first, so that no thread is left with one at the end.
        let mut order: Vec<usize> = (0..entries.len()).collect();
        order.sort_by_key(|&place| (Reverse(self.bytes(&entries[place])), place));
        let measured: fn(&Listed) -> u64 = match (self.job.remeasure, self.listing.command) {
            (true, Command::Filter) => |entry| entry.both_bytes(),
            // Read twice: to lay them against each other, and for their spectra.
            (true, Command::Measure) => |entry| entry.both_bytes().saturating_mul(2),
            (false, _) => |_| 0,
        };
        // Lengths are the report's word: no sum of them may overflow.
        let bytes = entries.iter().flat_map(|entry| [self.bytes(entry), measured(entry)]).fold(0, u64::saturating_add);
        progress.planned(entries.len() as u64, bytes);
        let next = AtomicUsize::new(0);
        let all = Mutex::new(Found::default());
        rayon::broadcast(|_| {
            let mut found = Found::default();
            let mut buffer = vec![0; BUFFER_BYTES];
            while !progress.interrupted() {
                let Some(&place) = order.get(next.fetch_add(1, Ordering::Relaxed)) else { break };
                self.entry(&entries[place], &mut buffer, &mut found, progress);
            }
            all.lock().unwrap_or_else(PoisonError::into_inner).add(found);
        });
        if next.into_inner() < order.len() {
            *self.left_out.get_mut() = true;
        }
        self.found.add(all.into_inner().unwrap_or_else(PoisonError::into_inner));
        self.unlisted(progress);
    }

    /// Bytes that will be read for an entry.
    fn bytes(&self, entry: &Listed) -> u64 {
        let after = entry.after.as_ref().map_or(0, |after| after.expected.bytes);
        let before = entry.input.filter(|_| self.roots.input.is_some()).map_or(0, |input| input.bytes);
        after.saturating_add(before)
    }

    fn entry(&self, entry: &Listed, buffer: &mut [u8], found: &mut Found, progress: &dyn Progress) {
        if let Some(after) = &entry.after {
            let path = self.roots.output.locate(entry);
            let mut read = |bytes| {
                found.outputs.bytes_read += bytes;
                progress.pass(bytes).map_err(io::Error::other)
            };
            let state = match files::look(path.as_deref()) {
                Look::Settled(state) => state,
                Look::There(bytes) => match &path {
                    Some(path) => files::check(path, bytes, &after.expected, buffer, &mut read),
                    None => State::Missing,
                },
            };
            self.enter(state, &after.expected, self.roots.output.shown(entry), Side::Output, found, progress);
        }
        if let Some(root) = &self.roots.input {
            self.input(entry, root, buffer, found, progress);
        }
    }

    /// The recording before: its file and, where asked for, what filtering it again gives.
    fn input(&self, entry: &Listed, root: &Root, buffer: &mut [u8], found: &mut Found, progress: &dyn Progress) {
        let path = root.locate(entry);
        let replay_rates = self.rates.filter(|_| self.job.replay);
        let Some(expected) = &entry.input else {
            // Its header could not be read, so nothing is known but that it was there.
            match &path {
                Some(path) if path.symlink_metadata().is_ok() => found.inputs.without_hash += 1,
                // A folder of either side that could not be looked into, by its side's name.
                _ if self.listing.command == Command::Measure && entry.after.is_none() => {
                    found.inputs.without_hash += 1;
                }
                _ => {
                    let unknown = Expected { bytes: 0, sha256: None };
                    self.enter(State::Missing, &unknown, &entry.path, Side::Input, found, progress);
                }
            }
            if let (Some(rates), Some(path)) = (replay_rates, &path) {
                self.replay(entry, path, rates, found, progress);
            }
            return;
        };
        let (path, bytes) = match (files::look(path.as_deref()), &path) {
            (Look::There(bytes), Some(path)) => (path, bytes),
            (Look::There(_), None) => return,
            (Look::Settled(state), _) => {
                found.replay.not_done += u64::from(replay_rates.is_some());
                self.enter(state, expected, &entry.path, Side::Input, found, progress);
                return;
            }
        };
        let replayed = replay_rates.map(|rates| self.replay(entry, path, rates, found, progress));
        let state = match replayed {
            // Filtering reads every byte anyway.
            Some(Replayed::Done(processed)) if bytes == expected.bytes => {
                found.inputs.bytes_read += bytes;
                replay::input_state(&processed, bytes, expected)
            }
            Some(Replayed::NotRead(state)) => state,
            _ => {
                let mut read = |bytes| {
                    found.inputs.bytes_read += bytes;
                    progress.pass(bytes).map_err(io::Error::other)
                };
                files::check(path, bytes, expected, buffer, &mut read)
            }
        };
        self.enter(state, expected, &entry.path, Side::Input, found, progress);
    }

    fn replay(
        &self,
        entry: &Listed,
        path: &Path,
        rates: &Rates,
        found: &mut Found,
        progress: &dyn Progress,
    ) -> Replayed {
        let replayed = replay::replay(path, rates, &|bytes| progress.pass(bytes));
        if progress.interrupted() {
            self.left_out.store(true, Ordering::Relaxed);
            return replayed;
        }
        // Not readable then and not readable now is the same.
        let failed_again = match (&replayed, &entry.error) {
            (Replayed::NotRead(State::Unreadable(error)), Some(_)) => Some(Replayed::Failed(error.clone())),
            _ => None,
        };
        let outcome = failed_again.as_ref().unwrap_or(&replayed);
        found.disagreements.extend(replay::compare(entry, outcome, &mut found.replay));
        replayed
    }

    /// Recordings that the report does not list, and what could not be looked into.
    fn unlisted(&mut self, progress: &dyn Progress) {
        let Roots { output, input } = self.roots;
        let mut sides = vec![(output, input.as_ref(), Side::Output)];
        sides.extend(input.as_ref().map(|input| (input, Some(output), Side::Input)));
        for (root, other, side) in sides {
            let mut new = root.unlisted(self.listing, other);
            if let Some(noise) = self.listing.noise_sha256.as_deref().and_then(of_hexadecimal) {
                // The report knows the recording of the idle device by its hash alone.
                let mut buffer = vec![0; BUFFER_BYTES];
                new.retain(|(_, path)| {
                    // Each is read to its end, and there may be many.
                    if progress.interrupted() {
                        *self.left_out.get_mut() = true;
                        return false;
                    }
                    !files::is(path, &noise, &mut buffer)
                });
            }
            let counts = if side == Side::Output { &mut self.found.outputs } else { &mut self.found.inputs };
            counts.new += new.len() as u64;
            // An interrupted run has not come to them.
            if self.listing.head.complete {
                self.found.disagreements.extend(new.into_iter().map(|(path, _)| Disagreement::New { path, side }));
            }
            let failed = |unreadable: &Unreadable| {
                // The run before could not look into it either; of two folders it says which.
                let path = match (self.listing.command, side) {
                    (Command::Filter, Side::Output) => return false,
                    (Command::Filter, Side::Input) => unreadable.path.clone(),
                    (Command::Measure, Side::Input) => format!("before/{}", unreadable.path),
                    (Command::Measure, Side::Output) => format!("after/{}", unreadable.path),
                };
                self.listing.entries.iter().any(|entry| entry.path == path && !entry.done())
            };
            self.found.unreadable.extend(root.unreadable().filter(|unreadable| !failed(unreadable)));
        }
    }

    /// Counts a file; what can't be read is told at once. A file given up half-way counts
    /// as left out.
    fn enter(
        &self,
        state: State,
        expected: &Expected,
        shown: &str,
        side: Side,
        found: &mut Found,
        progress: &dyn Progress,
    ) {
        if progress.interrupted() {
            self.left_out.store(true, Ordering::Relaxed);
            return;
        }
        let counts = if side == Side::Output { &mut found.outputs } else { &mut found.inputs };
        match state.enter(counts, expected, shown, side) {
            Ok(disagreement) => {
                found.disagreements.extend(disagreement);
                progress.finished(shown, None);
            }
            Err(error) => {
                progress.finished(shown, Some(&error));
                found.unreadable.push(Unreadable { path: shown.to_owned(), side, error });
            }
        }
    }

    /// Takes in what measuring again found.
    pub(super) fn add(&mut self, found: Found) {
        self.found.add(found);
    }

    /// Everything found, in order.
    pub(super) fn finish(self, interrupted: bool) -> Findings {
        let Check { job, listing, roots, rates, mut found, left_out } = self;
        let inputs = roots.input.as_ref().map(|_| found.inputs);
        let incomplete = (!listing.head.complete).then_some(Disagreement::Incomplete {
            inputs_not_listed: inputs.map(|inputs| inputs.new),
            outputs_not_listed: found.outputs.new,
        });
        let report = summary::counts(listing).map(|what| Disagreement::Report { what });
        let mut disagreements: Vec<Disagreement> = incomplete.into_iter().chain(report).collect();
        disagreements.extend(rates.into_iter().flat_map(|rates| rates.disagreements.clone()));
        disagreements.append(&mut found.disagreements);
        // Stable: what belongs to one recording stays in the order in which it was found.
        disagreements.sort_by(|a, b| (a.path(), a.rank()).cmp(&(b.path(), b.rank())));
        found.unreadable.sort();
        found.unreadable.dedup();
        // Measuring comes last, and nobody counts how far it came.
        let finished = !(interrupted && (left_out.into_inner() || job.remeasure));
        let done = listing.entries.iter().filter(|entry| entry.done()).count() as u64;
        let listed = listing.entries.len() as u64;
        Findings {
            report: job.report.display().to_string(),
            command: listing.command,
            agrees: disagreements.is_empty() && found.unreadable.is_empty() && finished,
            finished,
            report_complete: listing.head.complete,
            output_root: roots.output.path.display().to_string(),
            input_root: roots.input.as_ref().map(|root| root.path.display().to_string()),
            recordings: Recordings { listed, done, failed: listed - done },
            outputs: found.outputs,
            inputs,
            replay: job.replay.then_some(found.replay),
            remeasure: job.remeasure.then_some(found.remeasure),
            disagreements,
            unreadable: found.unreadable,
        }
    }
}
