//! Which requirements rounded sections still hold.
//!
//! What the sections in full promise is the measure:
//!
//! * a requirement that is `guaranteed` must stay `guaranteed`;
//! * a `reduce` band that `depends` must reach its requirement over 99 % of the width over
//!   which it did, counted within the band;
//! * a `residual` band, which always `depends`, may lose 0.1 dB of the attenuation that it
//!   has everywhere;
//! * the exceptions of a `keep` band may take out 1 % more;
//! * every pole must stay inside the unit circle, by the margin that a design keeps;
//! * the rounding noise of integers, all of it, must lie below what a `reduce` band leaves of
//!   a full-scale sine, and below every `residual_dbfs`.
//!
//! Without the second and third, sections that miss a band almost everywhere would pass: it
//! is enough for `depends` that one frequency of the band comes down.

use crate::design::check::{BandDesign, Check, judge};
use crate::design::sections::{POLE_MARGIN, pole_radius};
use crate::design::wording::{self, beyond, decibel, figure};
use crate::design::{Design, Placed};
use crate::section::Section;
use crate::spec::{NamedBand, Requirement};

/// Part of the width over which a requirement was reached that must be left of it.
const WIDTH_KEPT: f64 = 0.99;

/// Most attenuation that a residual band may lose, dB.
const RESIDUAL_LOSS_DB: f64 = 0.1;

/// How much wider exceptions may get.
const EXCEPTED_GROWTH: f64 = 1.01;

/// The sections in full and what they promise.
#[derive(Clone, Debug)]
pub struct Reference {
    /// One pass of the cascade.
    pub sections: Vec<Section>,
    placed: Placed,
    rate_hz: u32,
    passes: u32,
    bands: Vec<BandDesign>,
}

/// Something that rounded sections no longer do.
#[derive(Clone, Debug, PartialEq)]
pub struct Loss {
    /// Band or section, what it does now and what it did in full.
    pub sentence: String,
    /// Whether the cascade is unstable, or the requirement out of its reach.
    pub is_refused: bool,
}

impl Reference {
    /// Of a `design` and the bands of its spec as `placed` at its rate.
    pub fn new(design: &Design, placed: Placed) -> Reference {
        let (passes, rate_hz) = (design.passes, design.rate_hz);
        let bands = judged(&placed, &design.sections, passes, rate_hz);
        Reference { sections: design.sections.clone(), placed, rate_hz, passes, bands }
    }

    /// Sample rate, Hz.
    pub fn rate_hz(&self) -> u32 {
        self.rate_hz
    }

    /// Whether any band requires anything.
    pub fn has_requirements(&self) -> bool {
        self.placed.bands.iter().any(|band| band.requirement != Requirement::Observe)
    }

    /// How often the cascade runs.
    pub fn passes(&self) -> u32 {
        self.passes
    }

    /// The requirement that noise of `noise_dbfs` drowns, the most demanding one.
    pub fn drowned(&self, noise_dbfs: f64) -> Option<Loss> {
        drowned(&self.placed.bands, noise_dbfs)
    }

    /// What `sections` in place of the reference's promise, without the times, and what they
    /// no longer do. Unstable ones promise nothing.
    pub fn hold(&self, sections: &[Section]) -> (Vec<BandDesign>, Vec<Loss>) {
        if let Some(unstable) = unstable(sections) {
            return (Vec::new(), vec![unstable]);
        }
        let bands = judged(&self.placed, sections, self.passes, self.rate_hz);
        let losses = self.bands.iter().zip(&bands).filter_map(|(full, rounded)| loss(full, rounded)).collect();
        (bands, losses)
    }
}

/// What `passes` of `sections` promise, without the times.
fn judged(placed: &Placed, sections: &[Section], passes: u32, rate_hz: u32) -> Vec<BandDesign> {
    judge(placed, &sections.repeat(passes as usize), f64::from(rate_hz))
}

fn unstable(sections: &[Section]) -> Option<Loss> {
    let radii = sections.iter().map(pole_radius).zip(1..);
    let outside: Vec<(f64, usize)> = radii.filter(|(radius, _)| !is_inside(*radius)).collect();
    let (radius, number) = outside.first()?;
    let sentence = match outside.len() {
        1 => format!("section {number} is unstable, it has a pole at a radius of {}", wording::radius(1.0 - radius)),
        count => format!(
            "{count} of {} sections are unstable, section {number} has a pole at a radius of {}",
            sections.len(),
            wording::radius(1.0 - radius)
        ),
    };
    Some(Loss { sentence, is_refused: true })
}

fn is_inside(radius: f64) -> bool {
    1.0 - radius >= POLE_MARGIN
}

fn loss(full: &BandDesign, rounded: &BandDesign) -> Option<Loss> {
    let name = &full.band.name;
    let found = match full.band.requirement {
        Requirement::Reduce { reduce_db } => reduce_loss(full, rounded, reduce_db),
        Requirement::Keep { keep_db, .. } => keep_loss(full, rounded, keep_db),
        Requirement::Residual { .. } => residual_loss(full, rounded),
        Requirement::Observe => None,
    };
    let is_refused = rounded.check == Some(Check::Impossible);
    found.map(|what| Loss { sentence: format!("band \"{name}\" {what}"), is_refused })
}

/// What noise of `noise_dbfs` drowns.
fn drowned(bands: &[NamedBand], noise_dbfs: f64) -> Option<Loss> {
    let left_dbfs = |band: &NamedBand| match band.requirement {
        Requirement::Reduce { reduce_db } => Some(-reduce_db),
        Requirement::Residual { residual_dbfs } => Some(residual_dbfs),
        Requirement::Keep { .. } | Requirement::Observe => None,
    };
    let levels = bands.iter().filter_map(|band| left_dbfs(band).map(|dbfs| (dbfs, &band.name)));
    let (least_dbfs, name) = levels.min_by(|a, b| a.0.total_cmp(&b.0))?;
    (noise_dbfs > least_dbfs).then(|| Loss {
        sentence: format!(
            "band \"{name}\" may have no more than {} dBFS left of a full-scale sine, and rounding makes noise of {} dBFS",
            figure(least_dbfs),
            beyond(noise_dbfs, least_dbfs)
        ),
        is_refused: false,
    })
}

fn reduce_loss(full: &BandDesign, rounded: &BandDesign, reduce_db: f64) -> Option<String> {
    let wanted = figure(reduce_db);
    if rounded.check == Some(Check::Impossible) {
        let most_db = rounded.attenuation_max_db;
        return Some(if most_db < 0.0 {
            format!("is raised by {} dB or more, and has to be down by {wanted} dB", decibel(-most_db))
        } else {
            format!("is down by {} dB at most, and {wanted} dB are required", beyond(most_db, reduce_db))
        });
    }
    if full.check == Some(Check::Guaranteed) {
        return (rounded.check != Some(Check::Guaranteed)).then(|| {
            let least = moved(rounded.attenuation_min_db, reduce_db);
            format!("is {least} at its highest point, and {wanted} dB down are required and guaranteed in full")
        });
    }
    let (before_hz, after_hz) = (reached_width_hz(full), reached_width_hz(rounded));
    (after_hz < WIDTH_KEPT * before_hz).then(|| {
        let (before_hz, after_hz) = (figure(before_hz), figure(after_hz));
        format!("is down by {wanted} dB over {after_hz} Hz, in full over {before_hz} Hz")
    })
}

/// `down by 26.9 dB`, `raised by 15.104 dB`, with the decimals that tell it from `limit_db`.
fn moved(attenuation_db: f64, limit_db: f64) -> String {
    let direction = if attenuation_db < 0.0 { "raised" } else { "down" };
    format!("{direction} by {} dB", beyond(attenuation_db.abs(), limit_db))
}

/// Width of what the band has of the range in which its requirement is reached, Hz.
fn reached_width_hz(design: &BandDesign) -> f64 {
    let line = design.band.line;
    design.reaches_hz.map_or(0.0, |(from_hz, to_hz)| (to_hz.min(line.to_hz) - from_hz.max(line.from_hz)).max(0.0))
}

fn keep_loss(full: &BandDesign, rounded: &BandDesign, keep_db: f64) -> Option<String> {
    if rounded.check == Some(Check::Impossible) {
        let at = match rounded.violation {
            Some(at) => format!(
                "has a gain of {} dB at {} Hz where {} dB are allowed",
                beyond(at.gain_db, keep_db),
                figure(at.at_hz),
                figure(keep_db)
            ),
            None => "is taken out entirely by its exceptions".to_owned(),
        };
        return Some(at);
    }
    let (before_hz, after_hz) = (full.excepted_width_hz(), rounded.excepted_width_hz());
    (after_hz > EXCEPTED_GROWTH * before_hz).then(|| {
        let (before_hz, after_hz) = (figure(before_hz), figure(after_hz));
        format!("loses {after_hz} Hz to its exceptions, in full {before_hz} Hz")
    })
}

fn residual_loss(full: &BandDesign, rounded: &BandDesign) -> Option<String> {
    let (before_db, after_db) = (full.attenuation_min_db, rounded.attenuation_min_db);
    (after_db < before_db - RESIDUAL_LOSS_DB).then(|| {
        format!("is {} at its highest point, in full {}", moved(after_db, before_db), moved(before_db, after_db))
    })
}
