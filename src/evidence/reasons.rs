//! The sentences beside verdicts: what was seen, and what the user could do.

use super::floors::Floor;
use super::gains::{Response, SubGain};
use super::verdicts::{FEWEST_TO_MISS, RESOLVED, STANDS_DB, Shown};
use super::{BandTask, ReasonCode};
use crate::spec::Requirement;

/// A reason by code and sentence; no code where the verdict is not `unproven`.
pub type Reason = (Option<ReasonCode>, Option<String>);

/// A level as a sentence has it.
pub fn level(dbfs: Option<f64>) -> String {
    dbfs.map_or_else(|| "less than -200 dBFS".to_owned(), |dbfs| format!("{dbfs:.1} dBFS"))
}

/// Where a floor mostly comes from, for use in a sentence.
fn origin(floor: &Floor) -> &'static str {
    if floor.is_leakage() { "leakage from outside the band" } else { "rounding of the samples" }
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
        Some(needed) => format!("nothing remains after the time the filter takes to settle: {needed}"),
        None => format!(
            "nothing of its {seconds:.1} s remains after the time the filter takes to settle: use a longer recording"
        ),
    }
}

/// No bin at all.
pub fn out_of_range(band: &BandTask, rate_hz: u32) -> String {
    let half_hz = f64::from(rate_hz) / 2.0;
    format!("the band begins at {} Hz, the recording ends at half its sample rate, {half_hz} Hz", band.from_hz)
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
/// does, `after` whether it is the one after filtering.
pub fn open(shown: &Shown, requirement: &Requirement, limiting: &Floor, after: bool) -> Reason {
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
        (Requirement::Reduce { reduce_db }, Some(db)) => {
            format!(": at most {db:.1} dB can be shown, {reduce_db} dB are asked for")
        }
        (Requirement::Residual { residual_dbfs }, _) => {
            format!(": too close to it to tell whether {residual_dbfs} dBFS are kept")
        }
        _ => String::new(),
    };
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
    decides: Option<&SubGain>,
    keep_db: f64,
    band: &BandTask,
    seconds: f64,
    count: usize,
) -> Reason {
    if count < FEWEST_TO_MISS && response.resolved < RESOLVED && needed(band, seconds).is_some() {
        return (Some(ReasonCode::TooShort), Some(too_few_bins(band, seconds, count)));
    }
    if response.resolved < RESOLVED && response.hidden_by_leakage + response.hidden_by_rounding == 0 {
        let found = "the exceptions leave only pieces of less than 10 bins of most of the band";
        return (Some(ReasonCode::TooShort), Some(format!("{found}: a longer recording would have more")));
    }
    let percent = 100.0 * response.resolved;
    if response.resolved < RESOLVED {
        let found = if response.resolved == 0.0 {
            "nothing of the band stands 10 dB above its floor; it".to_owned()
        } else {
            format!("only {percent:.0} % of the band stands 10 dB above its floor; the rest")
        };
        return if response.hidden_by_leakage > response.hidden_by_rounding {
            let advice = "is hidden by leakage from outside the band: except what is loud beside it, or set the band's edges further from it";
            (Some(ReasonCode::LoudNeighbor), Some(format!("{found} {advice}")))
        } else {
            let advice = "is hidden by the rounding of the samples: a louder recording or an output encoding of more bits would show more";
            (Some(ReasonCode::TooQuiet), Some(format!("{found} {advice}")))
        };
    }
    let Some(sub) = decides else { return (Some(ReasonCode::TooQuiet), None) };
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
pub fn keep_missed(sub: &SubGain, keep_db: f64) -> String {
    format!("{}, outside +-{keep_db} dB", gain_of(sub))
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
