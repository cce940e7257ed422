//! What all threads of a run share while recordings get done: journal, summary, progress.

use super::Progress;
use super::failure::Failure;
use super::journal::Journal;
use crate::report::{Recording, Status, SummaryBuilder};
use std::io;
use std::path::Path;
use std::sync::atomic::{AtomicU64, AtomicUsize, Ordering};
use std::sync::{Mutex, PoisonError};

/// Takes the entries of recordings as they are done.
pub struct Record<'a> {
    journal: &'a Journal,
    /// Hears how the run goes.
    pub progress: &'a dyn Progress,
    seen: Mutex<SummaryBuilder>,
    journal_error: Mutex<Option<io::Error>>,
    /// Recordings begun and given up because the run was interrupted.
    dropped: AtomicU64,
}

impl<'a> Record<'a> {
    /// Nothing done yet.
    pub fn new(journal: &'a Journal, progress: &'a dyn Progress, seen: SummaryBuilder) -> Self {
        let (seen, journal_error) = (Mutex::new(seen), Mutex::new(None));
        Record { journal, progress, seen, journal_error, dropped: AtomicU64::new(0) }
    }

    /// Does `one` for each of `items` in the current thread pool, in their order, and says
    /// how many were not begun or given up because the run was interrupted.
    pub fn each<T: Sync>(&self, items: &[T], one: impl Fn(&T) + Sync) -> u64 {
        let next = AtomicUsize::new(0);
        // One long task a thread: a thread that finds no recording left is free to
        // transform segments of those still running.
        rayon::broadcast(|_| {
            while !self.progress.interrupted() {
                let Some(item) = items.get(next.fetch_add(1, Ordering::Relaxed)) else { break };
                one(item);
            }
        });
        // The counter runs past the end once a thread finds nothing left.
        let not_begun = items.len().saturating_sub(next.into_inner()) as u64;
        not_begun + self.dropped.load(Ordering::Relaxed)
    }

    /// A recording was given up half-way: nothing of it is left, and nothing is said of it.
    pub fn drop_one(&self) {
        self.dropped.fetch_add(1, Ordering::Relaxed);
    }

    /// Journal entry first, then the final name: a name without an entry can't come
    /// about, and an entry without a name is replaced by one that says so.
    pub fn add(&self, relative: &Path, mut recording: Recording, settle: impl FnOnce() -> Result<(), Failure>) {
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

    /// Everything counted, unless the journal could not be written.
    pub fn finish(self) -> io::Result<SummaryBuilder> {
        match self.journal_error.into_inner().unwrap_or_else(PoisonError::into_inner) {
            Some(error) => Err(error),
            None => Ok(self.seen.into_inner().unwrap_or_else(PoisonError::into_inner)),
        }
    }
}
