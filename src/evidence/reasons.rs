//! The sentences beside verdicts: what was seen, and what the user could do.

use super::floors::Floor;
use super::incoherent::{FEWEST_SEGMENTS, Known, enough_s};
use super::keep::{Kept, least_resolved};
use super::response::{Dip, Response, SubGain};
use super::verdicts::{FEWEST_TO_MISS, STANDS_DB, Shown};
use super::{BandTask, Measured, ReasonCode};
use crate::spec::Requirement;

/// A reason by code and sentence; no code where the verdict is not `unproven`.
pub type Reason = (Option<ReasonCode>, Option<String>);

/// A level as a sentence has it.
pub fn level(dbfs: Option<f64>) -> String {
    dbfs.map_or_else(|| "less than -200 dBFS".to_owned(), |dbfs| format!("{dbfs:.1} dBFS"))
}

/// Where a floor mostly comes from, for use in a sentence.
fn origin(floor: &Floor) -> &'static str {
    if floor.is_device() {
        "noise of the device, not coherent with what was played"
    } else if floor.is_leakage() {
        "leakage from outside the band"
    } else {
        "rounding of the samples"
    }
}

fn bins(count: usize) -> String {
    match count {
        0 => "no bin of the spectrum falls".to_owned(),
        1 => "one bin of the spectrum falls".to_owned(),
        _ => format!("{count} bins of the spectrum fall"),
    }
}

/// What length a band needs, where it is known and longer than the recording.
fn needed(band: &BandTask, seconds: f64) -> Option<String> {
    let shortest_s = band.shortest_s.filter(|shortest_s| *shortest_s > seconds)?;
    // Rounded up and down: a recording as long as is said here must do, and this one not.
    let digits = if shortest_s < 1.0 { 3 } else { 1 };
    let unit = if shortest_s < 1.0 { 1e3 } else { 10.0 };
    let (least_s, has_s) = ((shortest_s * unit).ceil() / unit, (seconds * unit).floor() / unit);
    Some(format!("the band needs a recording of at least {least_s:.digits$} s, this one has {has_s:.digits$} s"))
}

/// Nothing of the recording is settled.
pub fn unsettled(band: &BandTask, seconds: f64) -> String {
    match needed(band, seconds) {
        Some(needed) => format!("nothing remains without the time the filter takes to settle: {needed}"),
        None => format!(
            "nothing of its {seconds:.1} s remains without the time the filter takes to settle: use a longer recording"
        ),
    }
}

/// No bin at all.
pub fn out_of_range(band: &BandTask, rate_hz: u32) -> String {
    let half_hz = f64::from(rate_hz) / 2.0;
    format!("the band begins at {} Hz, the recording ends at half its sample rate, {half_hz} Hz", band.from_hz)
}

/// A band that reaches above what interpolation leaves alone.
pub fn interpolated(band: &BandTask, reaches_hz: f64) -> String {
    format!(
        "the band ends at {} Hz; the recording after had to be interpolated to undo the clock difference, which leaves levels alone only up to {reaches_hz:.0} Hz: a common clock, or a higher sample rate, would show more",
        band.to_hz
    )
}

/// The device's clock wanders too much for gains to be told.
pub fn wanders(scatter_s: f64, allowed_s: f64) -> String {
    format!(
        "the delay of the device wanders by {:.2} microseconds about its straight line; gains up to the band's upper edge can be told from {:.2} microseconds down: a steadier clock, or playing and recording on the same one, would do",
        scatter_s * 1e6,
        allowed_s * 1e6
    )
}

/// Gains are off, but may be those of a wrong delay; `found` says which.
pub fn uncertain_delay(found: Option<String>) -> String {
    let found = found.map_or(String::new(), |found| format!("{found}; but "));
    format!("{found}how the recordings lie against each other is not certain, as the notes say: --delay settles it")
}

/// Bins, but all of them in excepted ranges.
pub const ALL_EXCEPTED: &str = "all of the band lies in its exceptions: nothing of it is left to judge";

/// Too few bins for a verdict.
pub fn too_few_bins(band: &BandTask, seconds: f64, count: usize) -> String {
    let found = format!("{} into the band, {FEWEST_TO_MISS} are needed", bins(count));
    match needed(band, seconds) {
        Some(needed) => format!("{needed}: {found}"),
        None => format!("{found}: use a longer recording, or a wider band further from 0 Hz"),
    }
}

/// Nothing to reduce.
pub fn nothing_there(shown: &Shown, before_floor: &Floor) -> String {
    let found = format!(
        "before filtering the band holds {}, its floor is {} ({}): nothing there to remove that stands {STANDS_DB} dB above it",
        level(shown.before_dbfs),
        level(shown.before_floor_dbfs),
        origin(before_floor),
    );
    if before_floor.is_leakage() {
        format!("{found}; edges further from what is loud beside the band, or a longer recording, lower the floor")
    } else {
        found
    }
}

/// The floors of a reduce or residual band leave it open. `limiting` is the floor that
/// does, `after` whether it is the one after filtering, `enough_s` as of `incoherent`.
pub fn open(shown: &Shown, requirement: &Requirement, limiting: &Floor, after: bool, enough_s: f64) -> Reason {
    let (when, holds, floor) = if after {
        ("after", shown.after_dbfs, shown.after_floor_dbfs)
    } else {
        ("before", shown.before_dbfs, shown.before_floor_dbfs)
    };
    let found = format!(
        "{when} filtering the band holds {}, its floor is {} ({})",
        level(holds),
        level(floor),
        origin(limiting)
    );
    let asked = match (requirement, shown.demonstrable_db()) {
        (Requirement::Reduce { reduce_db }, Some(db)) if db < *reduce_db => {
            format!(": at most {db:.1} dB can be shown, {reduce_db} dB are asked for")
        }
        // It could have been shown, had less remained.
        (Requirement::Reduce { reduce_db }, Some(_)) => {
            let certain = shown
                .certain_db()
                .map_or("nothing is".to_owned(), |db| format!("{:.1} dB are", (db * 10.0).floor() / 10.0));
            let line = shown.steady_dbfs().map_or(String::new(), |dbfs| {
                format!(", as the device's own steady sound in it, {dbfs:.1} dBFS, may stand against what remains")
            });
            format!(": {certain} certain to have come off{line}; {reduce_db} dB are asked for")
        }
        (Requirement::Residual { residual_dbfs }, _) => {
            format!(": too close to it to tell whether {residual_dbfs} dBFS are kept")
        }
        _ => String::new(),
    };
    if limiting.is_device() {
        return (Some(ReasonCode::DeviceNoise), Some(format!("{found}{asked}; {}", less_noise(shown.known, enough_s))));
    }
    if limiting.is_leakage() {
        let advice = "set the band's edges further from what is loud beside it, or record longer where the recording limits the resolution";
        (Some(ReasonCode::LoudNeighbor), Some(format!("{found}{asked}; {advice}")))
    } else {
        let advice = "a louder recording or an output encoding of more bits would show more";
        (Some(ReasonCode::TooQuiet), Some(format!("{found}{asked}; {advice}")))
    }
}

/// A keep band that is neither: too little of it stands out, or it is too close.
pub fn keep_open(
    response: &Response,
    kept: &Kept,
    keep_db: f64,
    band: &BandTask,
    measured: &Measured<'_>,
    count: usize,
) -> Reason {
    let (seconds, least) = (measured.seconds, least_resolved(response));
    if count < FEWEST_TO_MISS && response.resolved < least && needed(band, seconds).is_some() {
        return (Some(ReasonCode::TooShort), Some(too_few_bins(band, seconds, count)));
    }
    let hidden = response.hidden_by_leakage + response.hidden_by_rounding + response.hidden_by_device;
    if response.resolved < least && response.beyond > hidden {
        let reaches_hz = measured.pair.map_or(0.0, |pair| pair.reaches_hz);
        return (Some(ReasonCode::OutOfRange), Some(interpolated(band, reaches_hz)));
    }
    if response.resolved < least && hidden == 0 {
        let found = "the exceptions leave only pieces of less than 10 bins of most of the band";
        return (Some(ReasonCode::TooShort), Some(format!("{found}: a longer recording would have more")));
    }
    let percent = 100.0 * response.resolved;
    if let Some(dip) = kept.dip.filter(|_| response.resolved >= least) {
        let found = format!("{}, too little of it to tell a dip from noise", comes_out(&dip));
        return (
            Some(ReasonCode::DeviceNoise),
            Some(format!("{found}; {}", less_noise(known_of(measured), enough_s(measured)))),
        );
    }
    if response.resolved < least || response.unclear > 0 {
        let found = if response.resolved == 0.0 {
            "nothing of the band stands 10 dB above its floor; it".to_owned()
        } else {
            format!("only {percent:.0} % of the band stands 10 dB above its floor; the rest")
        };
        let others = response.hidden_by_leakage.max(response.hidden_by_rounding);
        return if response.hidden_by_device > others || response.unclear > 0 {
            let advice = format!(
                "is hidden by noise of the device, not coherent with what was played: {}",
                less_noise(known_of(measured), enough_s(measured))
            );
            (Some(ReasonCode::DeviceNoise), Some(format!("{found} {advice}")))
        } else if response.hidden_by_leakage > response.hidden_by_rounding {
            let advice = "is hidden by leakage from outside the band: except what is loud beside it, or set the band's edges further from it";
            (Some(ReasonCode::LoudNeighbor), Some(format!("{found} {advice}")))
        } else {
            let advice = "is hidden by the rounding of the samples: a louder recording or an output encoding of more bits would show more";
            (Some(ReasonCode::TooQuiet), Some(format!("{found} {advice}")))
        };
    }
    let Some(sub) = &kept.decides else { return (Some(ReasonCode::TooQuiet), None) };
    let found = format!("{}, too close to the limit of {keep_db} dB to tell", gain_of(sub));
    let leaks_db = sub.low_by_db.max(sub.high_by_db);
    if sub.window_db > leaks_db.max(sub.error_db) {
        let advice = "sounds shorter than a segment of the spectrum may read that far off behind a filter that delays; a longer recording would tell";
        (Some(ReasonCode::TooShort), Some(format!("{found}; {advice}")))
    } else if leaks_db > 3.5 * sub.error_db {
        let advice = "what leaks in from outside the band may account for the difference";
        (Some(ReasonCode::LoudNeighbor), Some(format!("{found}; {advice}")))
    } else {
        (Some(ReasonCode::TooShort), Some(format!("{found}; a longer recording would narrow it down")))
    }
}

/// Why a keep band is missed.
pub fn keep_missed(kept: &Kept, keep_db: f64) -> Option<String> {
    match (&kept.dip, &kept.decides) {
        (Some(dip), _) => Some(format!("{}, outside +-{keep_db} dB", comes_out(dip))),
        (None, Some(sub)) => Some(format!("{}, outside +-{keep_db} dB", gain_of(sub))),
        (None, None) => None,
    }
}

/// How little comes out of a dip.
fn comes_out(dip: &Dip) -> String {
    let Dip { from_hz, to_hz, at_most_db, .. } = dip;
    format!(
        "from {from_hz:.1} to {to_hz:.1} Hz no more than {at_most_db:.1} dB of what went in comes out, noise included"
    )
}

/// How the device's noise in a sub-band is known.
fn known_of(measured: &Measured<'_>) -> Known {
    match measured.pair.and_then(|pair| pair.noise) {
        Some(idle) => Known::Idle { segments: idle.independent_segments, steady: 0.0 },
        None if measured.independent_segments >= FEWEST_SEGMENTS => Known::Coherence,
        None => Known::Pooled { certain_share: 0.0 },
    }
}

/// What shows more where the device's noise hides it.
fn less_noise(known: Known, enough_s: f64) -> String {
    let advice = "a louder or longer excitation, or a quieter device, would show more";
    match known {
        Known::Idle { .. } => advice.to_owned(),
        Known::Coherence | Known::Not => {
            format!("{advice}, and so may a recording of the idle device with --noise")
        }
        Known::Pooled { .. } => format!(
            "from {enough_s:.1} s on noise is told from what remains bin by bin; {advice}, and so may a recording of the idle device with --noise"
        ),
    }
}

fn gain_of(sub: &SubGain) -> String {
    format!(
        "the gain from {:.1} to {:.1} Hz is {:.3} dB with a standard error of {:.3} dB",
        sub.from_hz, sub.to_hz, sub.gain_db, sub.error_db
    )
}

/// What remains in a reduce or residual band.
pub fn remains(line: Option<(f64, Option<f64>)>) -> String {
    match line {
        Some((line_hz, dbfs)) => format!("a line at {line_hz:.2} Hz remains at {}", level(dbfs)),
        None => "what remains is ambient, no line".to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_stays_open_beside_a_hum_of_the_device_is_not_laid_to_the_floor() {
        let shown = |steady| Shown {
            before_dbfs: Some(-30.0),
            after_dbfs: Some(-70.0),
            after_floor_dbfs: Some(-70.0),
            device_share: 1.0,
            known: Known::Idle { segments: 8, steady },
            bins: 40,
            segments: 20,
            ..Shown::default()
        };
        let noise = Floor { rounding: 0.0, leakage: 0.0, arithmetic: 0.0, device: 1e-7 };
        let told = |reduce_db, steady| {
            open(&shown(steady), &Requirement::Reduce { reduce_db }, &noise, true, 5.0).1.unwrap_or_default()
        };
        assert!(
            told(45.0, 0.0).contains(": at most 40.0 dB can be shown, 45 dB are asked for;"),
            "{}",
            told(45.0, 0.0)
        );
        // sqrt(1e-7) + sqrt(1e-7) is 6.02 dB above either: 33.9 dB for certain.
        let beside = told(35.0, 1e-7);
        assert!(
            beside.contains(
                ": 33.9 dB are certain to have come off, as the device's own steady sound in it, -70.0 dBFS,"
            ),
            "{beside}"
        );
        assert!(beside.contains("; 35 dB are asked for;"), "{beside}");
    }

    #[test]
    fn the_length_that_is_asked_for_is_more_than_what_is_there() {
        let band = |shortest_s| BandTask {
            name: "hum".to_owned(),
            from_hz: 49.5,
            to_hz: 50.5,
            requirement: Requirement::Observe,
            excepted_hz: Vec::new(),
            shortest_s: Some(shortest_s),
        };
        let said = |shortest_s, seconds| needed(&band(shortest_s), seconds).unwrap_or_default();
        assert!(said(12.21, 12.19).ends_with("at least 12.3 s, this one has 12.1 s"));
        assert!(said(0.0304, 0.0004).ends_with("at least 0.031 s, this one has 0.000 s"));
        assert_eq!(said(0.5, 0.5), "");
    }
}
