//! What the exact response promises, as clauses of the sentence.

use super::super::{Methods, MethodsBand};
use super::figures::{down, hertz, listed, nearest, span, up};
use crate::design::check::CAP_DB;
use crate::design::{BandDesign, Design};
use crate::spec::Requirement;

/// A band from which less than this is taken off for sure passes: figures show thousandths.
const LEAST_DB: f64 = 0.001;

/// Lowered bands first, then kept, then observed ones, the lines of a row as one: what
/// follows upon the sentence's clauses so far. Empty where there are no bands.
pub fn promises(methods: &Methods, design: &Design) -> String {
    let (mut lowered, mut kept, mut passed) = (Vec::new(), Vec::new(), Vec::new());
    let bands: Vec<(&MethodsBand, &BandDesign)> = methods.bands.iter().zip(&design.bands).collect();
    let same = |a: &(&MethodsBand, &BandDesign), b: &(&MethodsBand, &BandDesign)| {
        a.1.band.in_row && a.1.band.base_name == b.1.band.base_name
    };
    for row in bands.chunk_by(same) {
        let name = name(row);
        let all = || row.iter().map(|(_, design)| *design);
        let least_db = all().map(|band| band.attenuation_min_db).fold(f64::INFINITY, f64::min);
        let largest_db = all().map(|band| band.attenuation_max_db).fold(f64::NEG_INFINITY, f64::max);
        // Without phase there is none to tell.
        let delay = if methods.causal { delay(row) } else { String::new() };
        let required = row.first().map(|(_, design)| &design.band.requirement);
        match required {
            Some(Requirement::Reduce { .. } | Requirement::Residual { .. }) if least_db >= CAP_DB => {
                lowered.push(format!("{CAP_DB} dB or more off {name}"));
            }
            Some(Requirement::Reduce { .. } | Requirement::Residual { .. }) if least_db >= LEAST_DB => {
                lowered.push(format!("{} dB off {name}", down(least_db, 3)));
            }
            Some(Requirement::Keep { .. }) => {
                let deviation_db = least_db.abs().max(largest_db.abs());
                let excepted_hz = all().map(BandDesign::excepted_width_hz).fold(0.0, |sum, hz| sum + hz);
                let outside = if excepted_hz > 0.0 {
                    format!(" outside {} Hz of exceptions", nearest(excepted_hz, 3))
                } else {
                    String::new()
                };
                kept.push(format!("{name} within {} dB{outside}{delay}", up(deviation_db, 2)));
            }
            _ => {
                let (low, high) = (gain(-largest_db), gain(-least_db));
                let gains =
                    if low == high { format!("a gain of {low}") } else { format!("gains from {low} to {high}") };
                passed.push(format!("{name} with {gains} dB{delay}"));
            }
        }
    }
    let clause = |verb: &str, items: Vec<String>| (!items.is_empty()).then(|| format!("{verb} {}", listed(&items)));
    let clauses = [clause("took at least", lowered), clause("kept", kept), clause("passed", passed)];
    match clauses.into_iter().flatten().collect::<Vec<_>>().as_slice() {
        [] => String::new(),
        [only] => format!("; by its exact response it {only}"),
        [most @ .., last] => format!("; by its exact response it {}; and {last}", most.join("; ")),
    }
}

/// `"hum" (49.5 to 50.5 Hz)`, `the 8 bands "hum" (49.5 to 400.5 Hz)`.
fn name(row: &[(&MethodsBand, &BandDesign)]) -> String {
    let base = row.first().map_or("", |(_, design)| design.band.base_name.as_str());
    let from_hz = row.first().map_or(0.0, |(_, design)| design.band.line.from_hz);
    let to_hz = row.last().map_or(0.0, |(_, design)| design.band.line.to_hz);
    let range = format!("({} to {} Hz)", hertz(from_hz), hertz(to_hz));
    match row {
        [(methods, _)] => format!("\"{}\" {range}", methods.name),
        _ => format!("each of the {} bands \"{base}\" {range}", row.len()),
    }
}

/// The group delay at the center of a kept or observed band, those of a row from the
/// least to the largest.
fn delay(row: &[(&MethodsBand, &BandDesign)]) -> String {
    let delays_ms = row.iter().filter_map(|(_, design)| design.group_delay_s.map(|s| s * 1e3));
    let (count, highest_ms) = delays_ms.clone().fold((0, 0.0_f64), |(n, ms), one| (n + 1, ms.max(one.abs())));
    let figures = if highest_ms < 0.0005 { "below 0.001".to_owned() } else { span(delays_ms, 3) };
    match count {
        0 => String::new(),
        1 => format!(" (group delay {figures} ms at its center)"),
        _ => format!(" (group delays {figures} ms at their centers)"),
    }
}

/// A gain; those of -180 dB stand for all that are lower.
fn gain(db: f64) -> String {
    if db <= -CAP_DB { format!("-{CAP_DB} or less") } else { nearest(db, 2) }
}
