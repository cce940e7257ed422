//! The cascade with the fewest sections that guarantees every requirement.
//!
//! `needs` says what the bands ask for and how far a stop may eat into a keep band that
//! excepts its line, `groups` which lines belong together and which stages may take them
//! out, `start` with which figures, `climb` turns the figures of a cascade until its
//! least slack is largest, `search` finds the fewest sections, `polish` makes of them
//! what a person would write, `verify` holds that against the exact response at every
//! rate, and `conflict` says what is in the way where there is no cascade.
//!
//! Stages are high-pass, low-pass, band-stop and notch. What counts, in this order: fewest
//! second-order sections (an odd order has one of first order, which counts as one), least
//! taken out of keep bands by exceptions, gentler families (notches, Butterworth, Chebyshev
//! II, Chebyshev I, elliptic), larger margin.
//!
//! Where nothing is to be kept, stops would be traded for one filter that takes out
//! everything; so then all that is farther from the lines than their stops may reach counts
//! as kept within 3 dB.

mod climb;
mod conflict;
mod curve;
mod error;
mod groups;
mod linear;
pub mod margin;
mod needs;
mod points;
mod polish;
mod search;
mod slot;
mod start;
mod verify;

pub use error::{AutoError, Conflict, Unsaid};
pub use needs::MOST_EXTENTS;
pub use verify::Spare;

use crate::spec::{Auto, BeyondHalfRate, Family, Spec};
use groups::Group;
use needs::Needs;
use polish::Finished;
use search::{Failure, Search, Way};

/// Most sections of a cascade where the spec does not say: this many, or where rows have
/// more lines [`SECTIONS_A_LINE`] times as many as there are lines.
pub const MOST_SECTIONS: u32 = 60;

/// See [`MOST_SECTIONS`].
pub const SECTIONS_A_LINE: u32 = 4;

/// Rows of at most so many lines are taken apart where that may save sections.
const MOST_APART: usize = 16;

/// Structures that are polished.
const MOST_POLISHED: usize = 4;

/// A cascade that was found.
#[derive(Clone, Debug, PartialEq)]
pub struct Found {
    /// The spec with the stages in place of `auto`.
    pub spec: Spec,
    /// Second-order sections of one pass at a rate at which everything fits.
    pub sections: u32,
    /// The sample rates at which every requirement is guaranteed, Hz, rising.
    pub rates_hz: Vec<u32>,
    /// What each band with a requirement has to spare, in the order of frequency: keep bands
    /// first.
    pub spares: Vec<Spare>,
}

/// The spec with the stages that were found in place of `auto`; a spec without `auto` as it
/// is. `rates_hz` are the sample rates at which every requirement must be guaranteed.
///
/// # Errors
/// No cascade within the limits guarantees them all.
pub fn resolve(spec: &Spec, rates_hz: &[u32]) -> Result<Spec, AutoError> {
    match spec.auto {
        Some(auto) => find(spec, auto, rates_hz).map(|found| found.spec),
        None => Ok(spec.clone()),
    }
}

/// Finds the cascade for the bands of `spec`, whatever stages it has.
///
/// # Errors
/// As [`resolve`].
pub fn find(spec: &Spec, auto: Auto, rates_hz: &[u32]) -> Result<Found, AutoError> {
    if rates_hz.is_empty() {
        return Err(AutoError::NoRate);
    }
    let needs = Needs::new(spec, rates_hz)?;
    let found = |spec: Spec, sections: u32, spares: Vec<Spare>| Found {
        spec,
        sections,
        rates_hz: needs.rates_hz.clone(),
        spares,
    };
    if needs.lines.is_empty() {
        let untouched = Spec { stages: Vec::new(), auto: None, ..spec.clone() };
        let spares = verify::verify(&untouched, &needs, 1.0).unwrap_or_default();
        return Ok(found(untouched, 0, spares));
    }
    let allowed = most_sections(auto, &needs);
    // Beyond what is allowed, to tell how many it takes.
    match search(spec, auto.family, &needs, u32::MAX) {
        Ok(finished) if finished.sections <= allowed => Ok(found(finished.spec, finished.sections, finished.spares)),
        Ok(finished) => Err(AutoError::TooFew { needed: finished.sections, allowed }),
        Err((failure, groups)) => Err(why_not(spec, auto, &needs, &failure, &groups)),
    }
}

/// Why there is no cascade: stages of lines of a row that do not fit at a rate, where without
/// them there is one, else bands that can't be had together.
fn why_not(spec: &Spec, auto: Auto, needs: &Needs, failure: &Failure, groups: &[Group]) -> AutoError {
    let half_hz = f64::from(needs.lowest_hz()) / 2.0;
    let one_by_one = groups.iter().filter(|group| group.is_one_by_one()).flat_map(|group| &group.lines);
    let beyond =
        one_by_one.filter_map(|line| needs.lines.get(*line)).find(|line| line.row.is_some() && !line.fits(half_hz));
    let Some(line) = beyond.filter(|_| !needs.leaves_out) else {
        return conflict::explain(spec, auto, needs, failure, groups);
    };
    let relaxed = Spec { beyond_half_rate: BeyondHalfRate::LeaveOut, ..spec.clone() };
    match Needs::new(&relaxed, &needs.rates_hz).map(|needs| (search(&relaxed, auto.family, &needs, u32::MAX), needs)) {
        Err(error) => error,
        Ok((Ok(_), _)) => AutoError::OneByOne {
            line: line.name.clone(),
            line_hz: (line.from_hz, line.to_hz),
            rate_hz: needs.lowest_hz(),
        },
        // Something else is in the way too, and that line would be in the way of saying what.
        Ok((Err((failure, groups)), needs)) => conflict::explain(&relaxed, auto, &needs, &failure, &groups),
    }
}

fn most_sections(auto: Auto, needs: &Needs) -> u32 {
    let lines = u32::try_from(needs.lines.len()).unwrap_or(u32::MAX);
    auto.max_sections.unwrap_or(MOST_SECTIONS.max(lines.saturating_mul(SECTIONS_A_LINE)))
}

/// The best cascade of at most `most` sections, or what is in its way.
fn search(spec: &Spec, family: Option<Family>, needs: &Needs, most: u32) -> Result<Finished, (Failure, Vec<Group>)> {
    let searched = family.unwrap_or(Family::Elliptic);
    let groups = groups::groups(needs);
    let whole = with(spec, needs, groups.clone(), searched, family.is_none(), most);
    let apart: Vec<Group> = groups.iter().flat_map(Group::apart).collect();
    let may_be_fewer = apart.len() > groups.len()
        && apart.len() <= MOST_APART
        && whole.as_ref().is_ok_and(|whole| {
            let lines = u32::try_from(needs.lines.len()).unwrap_or(u32::MAX);
            whole.sections > lines
        });
    if may_be_fewer || (whole.is_err() && apart.len() > groups.len()) {
        let below = whole.as_ref().map_or(most, |whole| whole.sections - 1);
        if let Ok(fewer) = with(spec, needs, apart, searched, family.is_none(), below) {
            return Ok(fewer);
        }
    }
    whole.map_err(|failure| (failure, groups))
}

fn with(
    spec: &Spec,
    needs: &Needs,
    groups: Vec<Group>,
    family: Family,
    free: bool,
    most: u32,
) -> Result<Finished, Failure> {
    let mut search = Search::new(needs, groups, family);
    let mut above = 0;
    loop {
        let (sections, ways) = search.fewest(above, most)?;
        let ways: Vec<&Way> = ways.iter().take(MOST_POLISHED).collect();
        let mut polished: Vec<_> =
            ways.iter().filter_map(|way| polish::polish(way, needs, search.groups(), free)).collect();
        polish::best_first(&mut polished);
        if let Some(finished) = polished.into_iter().find_map(|one| one.finish(needs, spec)) {
            return Ok(finished);
        }
        above = sections;
    }
}
