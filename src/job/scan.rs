//! A look ahead: every recording read and filtered, nothing written.

use super::Progress;
use super::earlier::Standing;
use super::failure::{Failure, contained};
use super::plan::{Plan, Planned};
use super::recording::process;
use super::sink::Nowhere;
use crate::files::open;
use crate::wave::Reader;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::{Mutex, PoisonError};

/// What a scan says would come of a recording.
#[derive(Debug)]
pub struct Foreseen {
    /// What would fail or overload.
    pub problem: String,
    /// Whether it would fail.
    pub fails: bool,
}

/// Reads and filters every recording without writing or measuring: what would fail
/// or overload, by the recording's place in the plan.
pub fn scan(plan: &Plan, progress: &dyn Progress) -> Vec<Option<Foreseen>> {
    let results: Vec<Mutex<Option<Foreseen>>> = plan.recordings.iter().map(|_| Mutex::new(None)).collect();
    let next = AtomicUsize::new(0);
    rayon::broadcast(|_| {
        while !progress.interrupted() {
            let index = next.fetch_add(1, Ordering::Relaxed);
            let Some(planned) = plan.recordings.get(index) else { break };
            if planned.standing == Standing::Kept {
                continue;
            }
            let foreseen = match contained(|| scan_one(plan, planned, progress)) {
                Ok(overload) => overload.map(|problem| Foreseen { problem, fails: false }),
                Err(failure) => Some(Foreseen { problem: failure.to_string(), fails: true }),
            };
            // Nothing has failed yet: the plan lists what would.
            progress.finished(&planned.shown, None);
            *results[index].lock().unwrap_or_else(PoisonError::into_inner) = foreseen;
        }
    });
    results.into_iter().map(|result| result.into_inner().unwrap_or_else(PoisonError::into_inner)).collect()
}

fn scan_one(plan: &Plan, planned: &Planned, progress: &dyn Progress) -> Result<Option<String>, Failure> {
    let brief = planned.usable().map_err(|why| Failure::Header(why.to_owned()))?;
    let Some(rate) = plan.rates.get(&brief.rate_hz) else { return Ok(None) };
    let file = open::regular(&planned.found.path).map_err(Failure::Open)?;
    let reader = Reader::open_as(file, plan.spec.spec.rate)?;
    let mut treatment = rate.treatment.clone();
    treatment.bands.clear();
    let (_, processed) = process(reader, Nowhere::default(), &treatment, &|bytes| progress.pass(bytes))?;
    Ok((processed.output.clipped_samples > 0 || processed.scaled).then(|| {
        if processed.scaled {
            format!("would be filtered again with a gain of {:.3} dB to fit full scale", processed.gain_db)
        } else {
            format!("{} samples would be saturated at full scale", processed.output.clipped_samples)
        }
    }))
}
