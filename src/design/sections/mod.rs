//! Placed stages to second-order sections.
//!
//! Prototype, band transform, bilinear transform; then every pole pair gets the
//! zeros that lie nearest (`pairing`), and the sections of a stage get their order
//! and gain (`arrange`). Stages stay in the spec's order, and each keeps its own
//! gain.

mod arrange;
mod pairing;

use super::prototype::{self, Prototype};
use super::transform::{self, Analog, Edges};
use super::wording::figure;
use super::{DesignError, PlacedStage, notch};
use crate::section::Section;
use crate::spec::{FilterKind, FilterStage, NotchStage, Stage};
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

/// The sections of the whole cascade, in the order they run.
///
/// # Errors
/// [`DesignError::Edges`] and [`DesignError::Prototype`] for stages that did not come
/// from a placed spec; [`DesignError::PoleAtUnitCircle`] and
/// [`DesignError::PoleAtEnd`] for filters that f64 coefficients can't hold.
pub fn build(stages: &[PlacedStage], rate_hz: f64) -> Result<Vec<Section>, DesignError> {
    let mut cascade = Vec::new();
    for stage in stages {
        cascade.append(&mut build_stage(stage, rate_hz)?);
    }
    Ok(cascade)
}

/// The sections of one stage, or of one line of a row, in the order they run.
///
/// # Errors
/// As [`build`].
pub fn build_stage(placed: &PlacedStage, rate_hz: f64) -> Result<Vec<Section>, DesignError> {
    let sections = match &placed.stage {
        Stage::Filter(stage) => filter(placed, stage, rate_hz)?,
        Stage::Notch(stage) => notch_sections(placed, stage, rate_hz)?,
    };
    for section in &sections {
        check_margins(placed, section, rate_hz)?;
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

/// The size of one stage, or of one line of a row.
pub fn size(stage: &Stage) -> StageSize {
    let total_order = match stage {
        Stage::Filter(FilterStage { kind: FilterKind::Lowpass | FilterKind::Highpass, order, .. }) => *order,
        Stage::Filter(FilterStage { order, .. }) => order.saturating_mul(2),
        Stage::Notch(_) => 2,
    };
    StageSize { total_order, sections: total_order.div_ceil(2) }
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

fn filter(placed: &PlacedStage, stage: &FilterStage, rate_hz: f64) -> Result<Vec<Section>, DesignError> {
    let prototype = prototype::new(stage.family, stage.order, stage.ripple_db, stage.stop_db)
        .map_err(|source| DesignError::Prototype { stage: label(placed), source })?;
    from_prototype(&prototype, stage.kind, &placed.edges_hz, rate_hz).ok_or_else(|| DesignError::Edges {
        stage: label(placed),
        found: format!("edges_hz = {:?}", placed.edges_hz),
        expected: match stage.kind {
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
    let inside = |f: f64| f > 0.0 && f < rate_hz / 2.0;
    let edges = match *edges_hz {
        [edge] if inside(edge) => Edges::one(edge, rate_hz),
        [low, high] if inside(low) && inside(high) && low < high => Edges::two(low, high, rate_hz),
        _ => return None,
    };
    let analog = transform::transform(prototype, kind, edges)?;
    Some(from_analog(&analog))
}

fn from_analog(analog: &Analog) -> Vec<Section> {
    arrange::arrange(&pairing::pair(analog), analog)
}

fn notch_sections(placed: &PlacedStage, stage: &NotchStage, rate_hz: f64) -> Result<Vec<Section>, DesignError> {
    let harmonic = placed.harmonic.unwrap_or(1);
    // From the row, not from the edges: their mean would round.
    let line = stage.row.lines().find(|line| line.harmonic == harmonic);
    let (center_hz, width_hz) = match (line, stage.row.width) {
        (Some(line), crate::spec::Width::Hz(hz)) => (line.center_hz, hz),
        (Some(line), crate::spec::Width::Q(q)) => (line.center_hz, line.center_hz / q),
        (None, _) => (0.0, 0.0),
    };
    let inside = |f: f64| f > 0.0 && f < rate_hz / 2.0;
    if !(inside(center_hz) && inside(width_hz)) {
        return Err(DesignError::Edges {
            stage: label(placed),
            found: format!("center {center_hz} Hz, width {width_hz} Hz"),
            expected: "center and width of a notch lie above 0 and below half the sample rate",
            rate_hz,
        });
    }
    Ok(from_analog(&notch::analog(center_hz, width_hz, rate_hz)))
}

fn check_margins(placed: &PlacedStage, section: &Section, rate_hz: f64) -> Result<(), DesignError> {
    let [_, a1, a2] = section.a;
    let distance = 1.0 - pole_radius(section);
    if distance < POLE_MARGIN || distance.is_nan() {
        let cos = (-a1 / (2.0 * libm::sqrt(a2.abs()))).clamp(-1.0, 1.0);
        let frequency_hz = libm::acos(cos) / (2.0 * PI) * rate_hz;
        return Err(DesignError::PoleAtUnitCircle { stage: label(placed), frequency_hz, distance, rate_hz });
    }
    if a2 != 0.0 {
        for (sign, end) in [(1.0, "0 Hz"), (-1.0, "half the sample rate")] {
            if (1.0 + sign * a1) + a2 < END_MARGIN {
                return Err(DesignError::PoleAtEnd { stage: label(placed), end, rate_hz });
            }
        }
    }
    Ok(())
}

/// `stage 2, line 7 (350 Hz)`; the number is the one a reader of the spec counts.
fn label(placed: &PlacedStage) -> String {
    let line = placed.harmonic.map(|harmonic| format!(", line {harmonic}")).unwrap_or_default();
    let frequency = match *placed.edges_hz {
        [edge] => format!("{} Hz", figure(edge)),
        [low, high] => format!("{} Hz", figure((low + high) / 2.0)),
        _ => "no edges".to_owned(),
    };
    format!("stage {}{line} ({frequency})", placed.stage_index + 1)
}
