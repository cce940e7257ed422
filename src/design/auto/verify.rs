//! The last word: written stages, finished sections, exact extremes, at every rate.

use super::margin;
use super::needs::Needs;
use super::points::Ask;
use crate::design::check::judge;
use crate::design::extrema::Profile;
use crate::design::sections::build_stage;
use crate::design::{BandDesign, Check, DesignError, placement, recipe};
use crate::section::Section;
use crate::spec::{Requirement, Spec};

/// Where a finished cascade does not keep the margin.
#[derive(Clone, Copy, Debug)]
pub struct Miss {
    /// Index of the rate.
    pub rate: usize,
    /// Frequency, Hz.
    pub hz: f64,
    /// What is asked for there.
    pub ask: Ask,
}

/// What a band has to spare at the rate where that is least.
#[derive(Clone, Debug, PartialEq)]
pub struct Spare {
    /// Name of the band, of a line of a row with its number.
    pub name: String,
    /// Name of the band in the spec.
    pub base_name: String,
    /// What was asked for: `down by 60 dB`, `within 0.1 dB`.
    pub asked: String,
    /// How much more it falls, or how much less it loses, dB.
    pub spare_db: f64,
    /// At which rate that is least, Hz.
    pub rate_hz: u32,
    /// Width of all that exceptions take out of it, Hz, at the rate where that is most.
    pub excepted_hz: f64,
}

/// The designs of a cascade that holds with margin at every rate, and what each band has to
/// spare there.
///
/// # Errors
/// Where it does not; nothing where there is no such design at all.
pub fn verify(spec: &Spec, needs: &Needs, part: f64) -> Result<Vec<Spare>, Vec<Miss>> {
    let mut spares: Vec<Spare> = Vec::new();
    let mut misses = Vec::new();
    for (rate, &rate_hz) in needs.rates_hz.iter().enumerate() {
        let Ok((sections, bands)) = judged(spec, rate_hz) else { return Err(Vec::new()) };
        if !is_guaranteed(&bands) {
            // The points below say where, unless it is between what they see.
            misses.push(None);
        }
        let half_hz = f64::from(rate_hz) / 2.0;
        let marks: Vec<f64> = needs
            .keeps_at(half_hz)
            .flat_map(|keep| keep.segments(part, half_hz))
            .chain(needs.lines_at(half_hz).map(|(_, line)| (line.from_hz, line.to_hz)))
            .flat_map(|(from_hz, to_hz)| [from_hz, to_hz])
            .collect();
        let profile = Profile::new(&sections, f64::from(rate_hz), &marks);
        for keep in needs.keeps_at(half_hz) {
            let limit_db = margin::keep_limit_db(keep.keep_db);
            let mut worst_db: f64 = 0.0;
            for (from_hz, to_hz) in keep.segments(part, half_hz) {
                let points = profile.within(from_hz, to_hz);
                let Some(worst) = points.max_by(|a, b| a.gain_db.abs().total_cmp(&b.gain_db.abs())) else { continue };
                worst_db = worst_db.max(worst.gain_db.abs());
                if worst.gain_db.abs() > limit_db {
                    misses.push(Some(Miss { rate, hz: worst.hz, ask: Ask::Keep(limit_db) }));
                }
            }
            note(&mut spares, &keep.name, (rate_hz, &bands), keep.keep_db - worst_db, || {
                format!("within {} dB", super::super::wording::figure(keep.keep_db))
            });
        }
        for (_, line) in needs.lines_at(half_hz) {
            let need_db = line.need_db();
            let least = profile.within(line.from_hz, line.to_hz).max_by(|a, b| a.gain_db.total_cmp(&b.gain_db));
            let Some(least) = least else { continue };
            if -least.gain_db < need_db {
                misses.push(Some(Miss { rate, hz: least.hz, ask: Ask::Reduce(need_db) }));
            }
            note(&mut spares, &line.name, (rate_hz, &bands), -least.gain_db - line.reduce_db, || {
                format!("down by {} dB", super::super::wording::figure(line.reduce_db))
            });
        }
    }
    if misses.is_empty() { Ok(spares) } else { Err(misses.into_iter().flatten().collect()) }
}

/// The sections of all passes at a rate, and what they promise in each band: the design, but for
/// settling and startup, which take longest to find and decide nothing here.
fn judged(spec: &Spec, rate_hz: u32) -> Result<(Vec<Section>, Vec<BandDesign>), DesignError> {
    let placed = placement::place(spec, rate_hz)?;
    let rate_hz = f64::from(rate_hz);
    let mut sections = Vec::new();
    for stage in &placed.stages {
        let recipe = recipe::recipe(stage, spec.phase, rate_hz)?;
        sections.append(&mut build_stage(stage, &recipe, rate_hz)?);
    }
    let net_sections = sections.repeat(spec.phase.passes() as usize);
    let bands = judge(&placed, &net_sections, rate_hz);
    Ok((net_sections, bands))
}

/// Whether every requirement that a design can guarantee is guaranteed.
fn is_guaranteed(bands: &[BandDesign]) -> bool {
    bands.iter().all(|band| match band.band.requirement {
        Requirement::Reduce { .. } | Requirement::Keep { .. } => band.check == Some(Check::Guaranteed),
        Requirement::Residual { .. } | Requirement::Observe => true,
    })
}

fn note(
    spares: &mut Vec<Spare>,
    name: &str,
    (rate_hz, bands): (u32, &[BandDesign]),
    spare_db: f64,
    asked: impl Fn() -> String,
) {
    // What nobody wrote is no band.
    let Some(own) = bands.iter().find(|band| band.band.name == name) else { return };
    let excepted_hz = own.excepted_width_hz();
    match spares.iter_mut().find(|spare| spare.name == name) {
        Some(spare) => {
            if spare_db < spare.spare_db {
                (spare.spare_db, spare.rate_hz) = (spare_db, rate_hz);
            }
            spare.excepted_hz = spare.excepted_hz.max(excepted_hz);
        }
        None => {
            let base_name = own.band.base_name.clone();
            spares.push(Spare { name: name.to_owned(), base_name, asked: asked(), spare_db, rate_hz, excepted_hz });
        }
    }
}
