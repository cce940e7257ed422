//! The design check: each requirement against the exact response.

use super::extrema::{Point, Profile};
use super::{Placed, exceptions, response, settling};
use crate::section::Section;
use crate::spec::{NamedBand, Requirement};

/// Whether the design can hold a requirement.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Check {
    /// It holds everywhere in the band.
    Guaranteed,
    /// It depends on where in the band (reduce) or how loud (residual) the energy is.
    Depends,
    /// It fails whatever a recording holds: a keep band loses too much where nothing is
    /// excepted, or a reduce band loses enough nowhere.
    Impossible,
}

/// Where and how far an `impossible` requirement fails.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Violation {
    /// Frequency of the worst point, Hz.
    pub at_hz: f64,
    /// Gain there, dB; not below -[`CAP_DB`].
    pub gain_db: f64,
}

/// A band and what the design promises in it. Attenuations are capped at [`CAP_DB`] both
/// ways. They are those outside a keep band's exceptions, or of the whole band where
/// the exceptions leave nothing of it.
#[derive(Clone, Debug, PartialEq)]
pub struct BandDesign {
    /// The band at this rate.
    pub band: NamedBand,
    /// Least attenuation in the band, dB.
    pub attenuation_min_db: f64,
    /// Largest attenuation in the band, dB.
    pub attenuation_max_db: f64,
    /// The range around the band's deepest point in which the attenuation is at
    /// least `reduce_db` (residual bands: at least `-residual_dbfs`), Hz; it may
    /// reach beyond the band. `None` for other bands and where no point in the band
    /// reaches it.
    pub reaches_hz: Option<(f64, f64)>,
    /// Ranges taken out of a keep band, Hz, clipped to it, rising and disjoint.
    pub excepted_hz: Vec<(f64, f64)>,
    /// Group delay at the band's arithmetic center; `None` for reduce and residual bands.
    pub group_delay_s: Option<f64>,
    /// Seconds until a steady line at the center is down by `reduce_db`; reduce bands only.
    /// With two passes it is as many seconds before the end that it is no more.
    pub startup_s: Option<f64>,
    /// Shortest recording in which the band can be judged: settling plus 10 bins;
    /// `None` without a requirement.
    pub shortest_s: Option<f64>,
    /// `None` without a requirement.
    pub check: Option<Check>,
    /// Where an impossible requirement fails: a keep band at its worst point, a reduce
    /// band at its deepest. `None` as well for a keep band that its exceptions cover
    /// entirely, which is impossible too: nothing is left of it.
    pub violation: Option<Violation>,
}

impl BandDesign {
    /// Width of all that is taken out of a keep band, Hz.
    pub fn excepted_width_hz(&self) -> f64 {
        // Not `sum`, which makes -0 of nothing.
        self.excepted_hz.iter().fold(0.0, |width_hz, (from_hz, to_hz)| width_hz + (to_hz - from_hz))
    }
}

/// Attenuations are capped here, both ways, dB: deeper than this is below arithmetic.
pub const CAP_DB: f64 = 180.0;

/// A limit that a stage just meets is missed by the rounding of its coefficients, dB: a
/// 3.2 Hz stop at 50 Hz and 384 kHz by 1e-8. A thousandth of what the report shows.
const TOLERANCE_DB: f64 = 1e-6;

/// Bins that a band must hold to be judged: see [`BandDesign::shortest_s`].
const BINS: f64 = 10.0;

/// Holds every placed band against the net response before any output gain: that of `sections`
/// run once, or forward and backward where `passes` is 2. `settling_s` is what a recording
/// leaves out, at both ends together.
///
/// Extremes are those of the response at any frequency of the band, ends included
/// (see [`Profile`]).
pub fn check(placed: &Placed, sections: &[Section], passes: u32, rate_hz: f64, settling_s: f64) -> Vec<BandDesign> {
    let lines: Vec<(f64, f64)> = placed
        .bands
        .iter()
        .filter_map(|band| band.requirement.reduce_db().map(|reduce_db| (band.line.center_hz, reduce_db)))
        .collect();
    let both_ways = passes > 1;
    let startups = if both_ways { settling::startups_both_ways } else { settling::startups };
    let mut startups = startups(sections, rate_hz, &lines).into_iter();
    let mut designs = judge(placed, &sections.repeat(passes as usize), rate_hz);
    for design in &mut designs {
        let line = design.band.line;
        match design.band.requirement {
            Requirement::Reduce { .. } => {
                design.startup_s = startups.next().flatten().map(|frames| frames as f64 / rate_hz);
            }
            Requirement::Keep { .. } | Requirement::Observe if both_ways => design.group_delay_s = Some(0.0),
            Requirement::Keep { .. } | Requirement::Observe => {
                let center_hz = 0.5 * (line.from_hz + line.to_hz);
                let delay_s = response::group_delay_s(sections, center_hz, rate_hz);
                design.group_delay_s = Some(delay_s).filter(|s| s.is_finite());
            }
            Requirement::Residual { .. } => {}
        }
        let is_required = design.band.requirement != Requirement::Observe;
        design.shortest_s = is_required.then(|| settling_s + BINS / (line.to_hz - line.from_hz));
    }
    designs
}

/// [`check`] of `net_sections`, all passes one after another, without the times, which take
/// longest to find: `group_delay_s`, `startup_s` and `shortest_s` are `None`.
pub fn judge(placed: &Placed, net_sections: &[Section], rate_hz: f64) -> Vec<BandDesign> {
    let marks: Vec<f64> =
        placed.bands.iter().flat_map(|band| [band.line.from_hz, band.line.center_hz, band.line.to_hz]).collect();
    let profile = Profile::new(net_sections, rate_hz, &marks);
    placed
        .bands
        .iter()
        .map(|band| {
            let mut design = unjudged(band.clone());
            match &band.requirement {
                Requirement::Reduce { reduce_db } => reduce(&profile, *reduce_db, &mut design),
                Requirement::Residual { residual_dbfs } => {
                    reduce(&profile, -residual_dbfs, &mut design);
                    // However little is let through, it may have been too loud before.
                    design.check = Some(Check::Depends);
                    design.violation = None;
                }
                Requirement::Keep { keep_db, except } => {
                    keep(&profile, *keep_db, except, &placed.bands, &mut design);
                }
                Requirement::Observe => {
                    let points: Vec<Point> = profile.within(band.line.from_hz, band.line.to_hz).collect();
                    set_extremes(&points, &mut design);
                }
            }
            design
        })
        .collect()
}

fn unjudged(band: NamedBand) -> BandDesign {
    BandDesign {
        attenuation_min_db: 0.0,
        attenuation_max_db: 0.0,
        reaches_hz: None,
        excepted_hz: Vec::new(),
        group_delay_s: None,
        startup_s: None,
        shortest_s: None,
        check: None,
        violation: None,
        band,
    }
}

fn attenuation_db(gain_db: f64) -> f64 {
    (-gain_db).clamp(-CAP_DB, CAP_DB)
}

fn set_extremes(points: &[Point], design: &mut BandDesign) {
    let attenuations = || points.iter().map(|point| attenuation_db(point.gain_db));
    design.attenuation_min_db = attenuations().fold(CAP_DB, f64::min);
    design.attenuation_max_db = attenuations().fold(-CAP_DB, f64::max);
}

/// Everything about a reduce band but its startup; `wanted_db` of attenuation.
fn reduce(profile: &Profile<'_>, wanted_db: f64, design: &mut BandDesign) {
    let line = design.band.line;
    let points: Vec<Point> = profile.within(line.from_hz, line.to_hz).collect();
    set_extremes(&points, design);
    let limit_db = wanted_db - TOLERANCE_DB;
    let off_center = |point: &Point| (point.hz - line.center_hz).abs();
    // Of several points at the cap the one nearest the center stands for the band.
    let deepest = points.iter().copied().max_by(|a, b| {
        let depth = attenuation_db(a.gain_db).total_cmp(&attenuation_db(b.gain_db));
        depth.then(off_center(b).total_cmp(&off_center(a)))
    });
    design.check = Some(if design.attenuation_min_db >= limit_db {
        Check::Guaranteed
    } else if design.attenuation_max_db < limit_db {
        Check::Impossible
    } else {
        Check::Depends
    });
    let Some(deepest) = deepest else { return };
    if design.check == Some(Check::Impossible) {
        design.violation = Some(Violation { at_hz: deepest.hz, gain_db: -attenuation_db(deepest.gain_db) });
        return;
    }
    design.reaches_hz = Some(reach(profile, deepest.hz, wanted_db));
}

/// The range around `deepest_hz` in which the attenuation is at least `wanted_db`; a
/// ripple that rises to that very figure does not end it.
fn reach(profile: &Profile<'_>, deepest_hz: f64, wanted_db: f64) -> (f64, f64) {
    let about_enough = |gain_db: f64| -gain_db >= wanted_db - TOLERANCE_DB;
    let not_enough = |gain_db: f64| -gain_db < wanted_db;
    // First as far as rounding allows, then back to the figure itself.
    let below_hz = profile.end_below(deepest_hz, about_enough).map_or(0.0, |(inside, _)| inside);
    let above_hz = profile.end_above(deepest_hz, about_enough).map_or(profile.half_rate_hz(), |(inside, _)| inside);
    let back = |end_hz: f64, found: Option<(f64, f64)>| {
        if not_enough(profile.gain_db(end_hz)) { found.map_or(end_hz, |(_, enough)| enough) } else { end_hz }
    };
    let from_hz = back(below_hz, profile.end_above(below_hz, not_enough)).min(deepest_hz);
    let to_hz = back(above_hz, profile.end_below(above_hz, not_enough)).max(deepest_hz);
    (from_hz, to_hz)
}

fn keep(profile: &Profile<'_>, keep_db: f64, except: &[String], bands: &[NamedBand], design: &mut BandDesign) {
    let extent = (design.band.line.from_hz, design.band.line.to_hz);
    design.excepted_hz = exceptions::ranges(profile, extent, keep_db, except, bands);
    let kept = exceptions::remainder(extent, &design.excepted_hz);
    let points: Vec<Point> = kept.iter().flat_map(|&(low, high)| profile.within(low, high)).collect();
    let worst = points.iter().copied().max_by(|a, b| a.gain_db.abs().total_cmp(&b.gain_db.abs()));
    let Some(worst) = worst else {
        // Nothing is left to keep, and nothing can be promised about it.
        set_extremes(&profile.within(extent.0, extent.1).collect::<Vec<_>>(), design);
        design.check = Some(Check::Impossible);
        return;
    };
    set_extremes(&points, design);
    if worst.gain_db.abs() > keep_db + TOLERANCE_DB {
        design.check = Some(Check::Impossible);
        design.violation = Some(Violation { at_hz: worst.hz, gain_db: -attenuation_db(worst.gain_db) });
    } else {
        design.check = Some(Check::Guaranteed);
    }
}
