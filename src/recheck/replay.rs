//! A recording filtered again, into nothing.

use super::AgainCounts;
use super::files::{State, not_read};
use super::findings::Disagreement;
use super::listing::{Expected, Listed, hex};
use super::rates::Rates;
use crate::files::digest::of_hexadecimal;
use crate::files::open;
use crate::job::Pass;
use crate::job::failure::{Failure, contained};
use crate::job::recording::{Processed, RecordingError, process};
use crate::job::sink::Nowhere;
use crate::report::Db;
use crate::wave::{Reader, WaveError};
use std::path::Path;

/// What came of it.
pub(super) enum Replayed {
    /// It went through; the hash of the input comes with it.
    Done(Box<Processed>),
    /// It can't be processed.
    Failed(String),
    /// The file could not be read, so nothing is known.
    NotRead(State),
}

/// Filters the recording at `path` again; nothing is kept and nothing is measured.
pub(super) fn replay(path: &Path, rates: &Rates, pass: &Pass<'_>) -> Replayed {
    let file = match open::regular(path) {
        Ok(file) => file,
        Err(error) => return Replayed::NotRead(not_read(&error)),
    };
    let done = contained(|| {
        let reader = Reader::open_as(file, rates.spec.rate)?;
        let rate_hz = reader.header().rate_hz;
        let unknown = || Failure::Header(format!("the report has no design for its sample rate, {rate_hz} Hz"));
        // Bands only decide what is measured.
        let mut treatment = rates.treatments.get(&rate_hz).ok_or_else(unknown)?.clone();
        treatment.bands.clear();
        Ok(process(reader, Nowhere::default(), &treatment, pass)?.1)
    });
    match done {
        Ok(processed) => Replayed::Done(Box::new(processed)),
        Err(Failure::Recording(RecordingError::Wave(error @ WaveError::Io { .. }))) => {
            Replayed::NotRead(State::Unreadable(format!("can't be read: {error}")))
        }
        Err(failure) => Replayed::Failed(failure.to_string()),
    }
}

/// The state of an input that was read to its end by a replay.
pub(super) fn input_state(processed: &Processed, bytes: u64, expected: &Expected) -> State {
    match expected.sha256.as_ref().map(hex) {
        None => State::WithoutHash,
        Some(then) if then == processed.input.sha256 => State::Unchanged,
        Some(_) => State::Changed { bytes, sha256: of_hexadecimal(&processed.input.sha256) },
    }
}

/// Counts a replay and says what is not as the report says.
pub(super) fn compare(entry: &Listed, replayed: &Replayed, counts: &mut AgainCounts) -> Vec<Disagreement> {
    let now = match replayed {
        Replayed::NotRead(_) => {
            counts.not_done += 1;
            return Vec::new();
        }
        Replayed::Done(processed) => Ok(processed),
        Replayed::Failed(error) => Err(error),
    };
    let then = match (&entry.error, &entry.after) {
        (None, Some(after)) => after.expected.sha256.as_ref().map(hex),
        _ => None,
    };
    let now_hash = now.ok().map(|processed| processed.written.sha256.clone());
    let mut found = Vec::new();
    if then != now_hash {
        found.push(Disagreement::Replay {
            path: entry.path.clone(),
            sha256_then: then,
            sha256_now: now_hash,
            error_then: entry.error.clone(),
            error_now: now.err().cloned(),
        });
    } else if let Ok(processed) = now {
        found = figures(entry, processed);
    }
    if found.is_empty() {
        counts.same += 1
    } else {
        counts.different += 1
    }
    found
}

/// Figures of the output that only filtering shows. All are exact: the sample path gives
/// the same bits everywhere.
fn figures(entry: &Listed, processed: &Processed) -> Vec<Disagreement> {
    let Some(made) = entry.after.as_ref().and_then(|after| after.made) else { return Vec::new() };
    let peak_dbfs = Db::new(20.0 * libm::log10(processed.output.written_peak)).map(Db::get);
    let clipped = |count: u64| Some(count as f64);
    let figures = [
        ("peak_dbfs", made.peak_dbfs, peak_dbfs),
        ("clipped_samples", clipped(made.clipped_samples), clipped(processed.output.clipped_samples)),
        ("gain_db", Some(made.gain_db), Some(processed.gain_db)),
    ];
    let differing = figures.into_iter().filter(|(_, then, now)| then != now);
    differing
        .map(|(figure, then, now)| Disagreement::Figure {
            path: entry.path.clone(),
            channel: None,
            band: None,
            figure,
            then,
            now,
        })
        .collect()
}
