//! Placed stages to second-order sections.
//!
//! Prototype, band transform, bilinear transform; then every pole pair gets the
//! zeros that lie nearest (`pairing`), and the sections of a stage get their order
//! and gain (`arrange`). Stages stay in the spec's order, and each keeps its own
//! gain.

pub(super) mod arrange;
pub(super) mod coefficients;
mod pairing;

use super::prototype::{self, Prototype};
use super::recipe::{self, FilterRecipe, Recipe};
use super::rounding::Rounded;
use super::transform::{self, Analog, Edges};
use super::wording::figure;
use super::{DesignError, PlacedStage, equalizer, notch, transfer, weighting};
use crate::section::Section;
use crate::spec::{FilterKind, Phase};
use core::f64::consts::PI;

/// A pole must lie at least this far inside the unit circle.
///
/// Rounding moves a2 by up to 2.8e-16 and so the radius by up to 1.4e-16: at this
/// distance a resonance still has its width and height to 1.4 parts in 10^4 (0.0012 dB).
/// Ten times closer it would be 0.012 dB, and at 1e-16 the filter may be unstable.
pub const POLE_MARGIN: f64 = 1e-12;

/// 1 + a1 + a2 and 1 - a1 + a2 of a second-order section, the squared distances of its
/// poles from z = 1 and z = -1, must be at least this.
///
/// They are multiples of 2^-53, so rounding moves them by up to 5.6e-17: at this
/// distance, at which the poles of a 0.09 Hz filter at 384 kHz lie, by 3 parts in 10^5
/// (0.0002 dB).
pub const END_MARGIN: f64 = 2e-12;

/// The sections of one causal pass of all `stages`, in the order they run.
///
/// # Errors
/// As [`build_stage`], and those of [`recipe::recipe`].
pub fn build(stages: &[PlacedStage], rate_hz: f64) -> Result<Vec<Section>, DesignError> {
    let mut cascade = Vec::new();
    for placed in stages {
        let recipe = recipe::recipe(placed, Phase::Causal, rate_hz)?;
        cascade.append(&mut build_stage(placed, &recipe, rate_hz)?);
    }
    Ok(cascade)
}

/// The sections of one pass of one stage, or of one line of a row, in the order they run.
///
/// # Errors
/// [`DesignError::Edges`] and [`DesignError::Prototype`] for stages that did not come
/// from a placed spec; [`DesignError::PoleAtUnitCircle`] and
/// [`DesignError::PoleAtEnd`] for filters that f64 coefficients can't hold;
/// [`DesignError::Transfer`] and [`DesignError::Weighting`].
pub fn build_stage(placed: &PlacedStage, recipe: &Recipe, rate_hz: f64) -> Result<Vec<Section>, DesignError> {
    Ok(plain(&finish_stage(placed, recipe, rate_hz)?))
}

/// [`build_stage`], with what rounding dropped of each section.
///
/// # Errors
/// As [`build_stage`].
pub fn finish_stage(placed: &PlacedStage, recipe: &Recipe, rate_hz: f64) -> Result<Vec<Rounded>, DesignError> {
    let stage = || placed.label();
    let sections = match recipe {
        Recipe::Filter(recipe) => filter(placed, recipe, rate_hz)?,
        Recipe::Notch { center_hz, width_hz } => notch_sections(placed, *center_hz, *width_hz, rate_hz)?,
        Recipe::Equalizer(equalizer) => {
            let section = equalizer::finished(equalizer, rate_hz).ok_or_else(|| DesignError::Edges {
                stage: stage(),
                found: format!("{} Hz", figure(equalizer.hz)),
                expected: "it needs a frequency above 0 and below half the sample rate",
                rate_hz,
            })?;
            vec![section]
        }
        Recipe::Weighting(curve) => weighting::sections(*curve, rate_hz)
            .map(|sections| sections.into_iter().map(Rounded::unknown).collect())
            .map_err(|source| DesignError::Weighting { stage: stage(), source })?,
        Recipe::Digital(digital) => transfer::finish_digital(digital, rate_hz)
            .map_err(|source| DesignError::Transfer { stage: stage(), source })?,
        Recipe::Analog(analog) => transfer::finish_analog(analog, rate_hz)
            .map_err(|source| DesignError::Transfer { stage: stage(), source })?,
    };
    for one in &sections {
        check_margins(placed, &one.section, rate_hz)?;
    }
    Ok(sections)
}

/// What a stage amounts to, for people who state their methods.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct StageSize {
    /// Number of poles of the digital filter: the prototype's order for low-pass and
    /// high-pass, twice that for band-pass and band-stop, 2 for a notch.
    pub total_order: u32,
    /// Number of sections; an odd order has one of first order among them.
    pub sections: u32,
}

/// The size of one stage, or of one line of a row, that became `sections`.
pub fn size(sections: &[Section]) -> StageSize {
    let degree = |p: [f64; 3]| if p[2] != 0.0 { 2 } else { u32::from(p[1] != 0.0) };
    let total_order = sections.iter().map(|section| degree(section.a).max(degree(section.b))).sum();
    StageSize { total_order, sections: u32::try_from(sections.len()).unwrap_or(u32::MAX) }
}

/// Radius of the outer pole of a section, 0 or above.
pub fn pole_radius(section: &Section) -> f64 {
    let [_, a1, a2] = section.a;
    // In the distance d = 1 - |z| of a real pole the polynomial is
    // d^2 - (2 - |a1|) d + (1 - |a1| + a2), whose coefficients are exact near the
    // unit circle; a1^2 - 4 a2 would lose all its digits there.
    let middle = 2.0 - a1.abs();
    let product = (1.0 - a1.abs()) + a2;
    let discriminant = middle * middle - 4.0 * product;
    if discriminant <= 0.0 {
        return libm::sqrt(a2);
    }
    1.0 - 2.0 * product / (middle + libm::sqrt(discriminant))
}

fn filter(placed: &PlacedStage, recipe: &FilterRecipe, rate_hz: f64) -> Result<Vec<Rounded>, DesignError> {
    let prototype = prototype::new(recipe.family, recipe.order, recipe.ripple_db, recipe.stop_db)
        .map_err(|source| DesignError::Prototype { stage: placed.label(), source })?;
    finished(&prototype, recipe.kind, &recipe.edges_hz, rate_hz).ok_or_else(|| DesignError::Edges {
        stage: placed.label(),
        found: format!("edges_hz = {:?}", recipe.edges_hz),
        expected: match recipe.kind {
            FilterKind::Lowpass | FilterKind::Highpass => "it needs one edge above 0 and below half the sample rate",
            FilterKind::Bandpass | FilterKind::Bandstop => {
                "it needs two rising edges above 0 and below half the sample rate"
            }
        },
        rate_hz,
    })
}

/// The sections of a low-pass, high-pass, band-pass or band-stop with the given
/// prototype: one edge for the first two, two rising ones for the others, all above 0
/// and below half of `rate_hz`; `None` otherwise. Margins are not checked.
pub fn from_prototype(prototype: &Prototype, kind: FilterKind, edges_hz: &[f64], rate_hz: f64) -> Option<Vec<Section>> {
    Some(plain(&finished(prototype, kind, edges_hz, rate_hz)?))
}

fn finished(prototype: &Prototype, kind: FilterKind, edges_hz: &[f64], rate_hz: f64) -> Option<Vec<Rounded>> {
    let inside = |f: f64| f > 0.0 && f < rate_hz / 2.0;
    let edges = match *edges_hz {
        [edge] if inside(edge) => Edges::one(edge, rate_hz),
        [low, high] if inside(low) && inside(high) && low < high => Edges::two(low, high, rate_hz),
        _ => return None,
    };
    let analog = transform::transform(prototype, kind, edges)?;
    Some(from_analog(&analog))
}

/// The sections alone.
pub fn plain(sections: &[Rounded]) -> Vec<Section> {
    sections.iter().map(|one| one.section).collect()
}

fn from_analog(analog: &Analog) -> Vec<Rounded> {
    arrange::arrange(&pairing::pair(analog), analog)
}

fn notch_sections(
    placed: &PlacedStage,
    center_hz: f64,
    width_hz: f64,
    rate_hz: f64,
) -> Result<Vec<Rounded>, DesignError> {
    let inside = |f: f64| f > 0.0 && f < rate_hz / 2.0;
    if !(inside(center_hz) && inside(width_hz)) {
        return Err(DesignError::Edges {
            stage: placed.label(),
            found: format!("center {center_hz} Hz, width {width_hz} Hz"),
            expected: "center and width of a notch lie above 0 and below half the sample rate",
            rate_hz,
        });
    }
    Ok(from_analog(&notch::analog(center_hz, width_hz, rate_hz)))
}

/// Whether f64 coefficients hold the poles of `section`: see [`POLE_MARGIN`] and
/// [`END_MARGIN`].
pub(super) fn has_margins(section: &Section) -> bool {
    let [_, a1, a2] = section.a;
    let near_end = |sign: f64| a2 != 0.0 && (1.0 + sign * a1) + a2 < END_MARGIN;
    1.0 - pole_radius(section) >= POLE_MARGIN && !near_end(1.0) && !near_end(-1.0)
}

fn check_margins(placed: &PlacedStage, section: &Section, rate_hz: f64) -> Result<(), DesignError> {
    if has_margins(section) {
        return Ok(());
    }
    let [_, a1, a2] = section.a;
    let distance = 1.0 - pole_radius(section);
    if distance < POLE_MARGIN || distance.is_nan() {
        let cos = (-a1 / (2.0 * libm::sqrt(a2.abs()))).clamp(-1.0, 1.0);
        let frequency_hz = libm::acos(cos) / (2.0 * PI) * rate_hz;
        return Err(DesignError::PoleAtUnitCircle { stage: placed.label(), frequency_hz, distance, rate_hz });
    }
    let end = if (1.0 + a1) + a2 < END_MARGIN { "0 Hz" } else { "half the sample rate" };
    Err(DesignError::PoleAtEnd { stage: placed.label(), end, rate_hz })
}
