//! What one pass of a placed stage is designed from: the spec's words for the net response
//! brought to what a prototype takes.

use super::prototype::power_ratio_minus_one;
use super::transform::{prewarp, unwarp};
use super::transition::HALF_POWER_DB;
use super::wording::figure;
use super::{DesignError, PlacedStage, Slack, edges, limits};
use crate::section::Section;
use crate::spec::{
    AnalogStage, Curve, DigitalFilter, EqualizerStage, Family, FilterKind, FilterStage, NotchStage, Order, Phase,
    Stage, Width,
};

/// What the sections of one pass of a stage, or of one line of a row, are made from.
#[derive(Clone, Debug, PartialEq)]
pub enum Recipe {
    /// An analog prototype.
    Filter(FilterRecipe),
    /// One second-order notch.
    Notch {
        /// Center, Hz.
        center_hz: f64,
        /// Distance of the half-power points of one pass, Hz.
        width_hz: f64,
    },
    /// A peak or shelf with the gain of one pass.
    Equalizer(EqualizerStage),
    /// A standard curve.
    Weighting(Curve),
    /// A user's transfer function in z.
    Digital(DigitalFilter),
    /// A user's transfer function in s.
    Analog(AnalogStage),
}

/// A prototype with its order, and edges as its family counts them.
#[derive(Clone, Debug, PartialEq)]
pub struct FilterRecipe {
    /// What it lets through.
    pub kind: FilterKind,
    /// Its prototype.
    pub family: Family,
    /// Order of the low-pass prototype.
    pub order: u32,
    /// One edge, or two rising ones, Hz: half-power points of Butterworth and Bessel, the end
    /// of the ripple of Chebyshev I and elliptic, the beginning of the stop band of
    /// Chebyshev II.
    pub edges_hz: Vec<f64>,
    /// Pass band ripple of one pass, dB.
    pub ripple_db: Option<f64>,
    /// Stop band attenuation of one pass, dB.
    pub stop_db: Option<f64>,
}

impl Recipe {
    /// Order of the low-pass prototype, where there is one.
    pub fn order(&self) -> Option<u32> {
        match self {
            Recipe::Filter(filter) => Some(filter.order),
            _ => None,
        }
    }
}

/// The recipe of one pass of `placed` at `rate_hz`.
///
/// With [`Phase::Zero`] what the spec says is said of two equal passes, whose decibels add
/// up:
///
/// * half of `ripple_db` and `stop_db` each; the edges of Chebyshev I, II and elliptic stay.
/// * half power at the edges of Butterworth and Bessel, and between the edges of a notch, is
///   half of 10 log10 2 dB of each pass, so the edges of a pass lie where its prototype
///   brings that about.
/// * half of `gain_db` of a peak or shelf, with the same `q` or `slope`. The frequency of
///   half the gain stays: see `half_gain`.
///
/// # Errors
/// [`DesignError::Limits`] where no order holds a stage's limits; [`DesignError::ZeroPhase`]
/// for a stage that is given by a whole transfer function; [`DesignError::OtherRate`] for one
/// that is given for another sample rate.
pub fn recipe(placed: &PlacedStage, phase: Phase, rate_hz: f64) -> Result<Recipe, DesignError> {
    match &placed.stage {
        Stage::Filter(stage) => filter(placed, stage, phase, rate_hz).map(Recipe::Filter),
        Stage::Notch(stage) => Ok(notch(placed, stage, phase, rate_hz)),
        Stage::Equalizer(stage) => Ok(Recipe::Equalizer(match phase {
            Phase::Causal => *stage,
            Phase::Zero => half_gain(*stage),
        })),
        whole if phase == Phase::Zero => Err(DesignError::ZeroPhase { stage: placed.label(), kind: whole.kind_name() }),
        Stage::Weighting(stage) => Ok(Recipe::Weighting(stage.curve)),
        Stage::Digital(stage) => match stage.rate_hz {
            Some(given_hz) if f64::from(given_hz) != rate_hz => {
                Err(DesignError::OtherRate { stage: placed.label(), given_hz, rate_hz })
            }
            _ => Ok(Recipe::Digital(stage.filter.clone())),
        },
        Stage::Analog(stage) => Ok(Recipe::Analog(stage.clone())),
    }
}

fn filter(placed: &PlacedStage, stage: &FilterStage, phase: Phase, rate_hz: f64) -> Result<FilterRecipe, DesignError> {
    let order = match stage.order {
        Order::Given(order) => order,
        Order::Limits(stop) => {
            return limits::recipe(stage, &placed.edges_hz, stop, phase.passes(), rate_hz)
                .map_err(|source| DesignError::Limits { stage: placed.label(), rate_hz, source });
        }
    };
    let passes = f64::from(phase.passes());
    let half_power = matches!(stage.family, Family::Butterworth | Family::Bessel);
    let edges_hz = (phase == Phase::Zero && half_power)
        .then(|| edges::frequency_at(stage.family, order, HALF_POWER_DB / passes, HALF_POWER_DB))
        .flatten()
        .and_then(|at_rad| edges::images_hz(stage.kind, &placed.edges_hz, 1.0 / at_rad, rate_hz))
        // An order or edges that can't be are for the sections to report.
        .unwrap_or_else(|| placed.edges_hz.clone());
    Ok(FilterRecipe {
        kind: stage.kind,
        family: stage.family,
        order,
        edges_hz,
        ripple_db: stage.ripple_db.map(|db| db / passes),
        stop_db: stage.stop_db.map(|db| db / passes),
    })
}

/// |H|^2 of a notch is 1 / (1 + t^2 / u^2), where t = tan(pi width / rate) and u depends on the
/// frequency and the center alone, with u = t at the half-power points. Of two passes each is
/// down to 1/sqrt 2 in power there: their t is sqrt(sqrt 2 - 1) times that of the net width.
fn notch(placed: &PlacedStage, stage: &NotchStage, phase: Phase, rate_hz: f64) -> Recipe {
    let harmonic = placed.harmonic.unwrap_or(1);
    // From the row, not from the edges: their mean would round.
    let line = stage.row.lines().find(|line| line.harmonic == harmonic);
    let (center_hz, width_hz) = match (line, stage.row.width) {
        (Some(line), Width::Hz(hz)) => (line.center_hz, hz),
        (Some(line), Width::Q(q)) => (line.center_hz, line.center_hz / q),
        (None, _) => (0.0, 0.0),
    };
    let width_hz = match phase {
        Phase::Causal => width_hz,
        Phase::Zero => {
            let narrower = libm::sqrt(power_ratio_minus_one(HALF_POWER_DB / f64::from(phase.passes())));
            unwarp(prewarp(width_hz, rate_hz) * narrower, rate_hz)
        }
    };
    Recipe::Notch { center_hz, width_hz }
}

/// One of two passes of a peak or shelf.
///
/// With A = 10^(gain_db / 40) the note's peak has |H|^2 = (x + A^2 / Q^2) / (x + 1 / (A^2 Q^2)),
/// x = (W/W0 - W0/W)^2, which is A^2 (half the gain) where x = 1/Q^2, whatever A. Its shelves
/// have |H|^2 = A^2 at W0, whatever A and Q: numerator and denominator differ by the factor A
/// and the sign of a real part there. So two passes of half the gain have half of the whole
/// gain where one pass of the whole gain has it.
fn half_gain(stage: EqualizerStage) -> EqualizerStage {
    EqualizerStage { gain_db: stage.gain_db / 2.0, ..stage }
}

/// What is left of the limits of a stage whose order follows from them; `own` are the
/// sections of one pass.
pub fn slack(placed: &PlacedStage, recipe: &Recipe, own: &[Section], phase: Phase, rate_hz: f64) -> Vec<Slack> {
    match (&placed.stage, recipe) {
        (Stage::Filter(stage), Recipe::Filter(recipe)) => {
            let net = own.repeat(phase.passes() as usize);
            limits::slack(stage, &placed.edges_hz, recipe, &net, rate_hz)
        }
        _ => Vec::new(),
    }
}

/// What a reader has to know of the recipe of one pass, in sentences without a capital and
/// a full stop.
pub fn remarks(placed: &PlacedStage, recipe: &Recipe, phase: Phase, rate_hz: f64) -> Vec<String> {
    let mut remarks = Vec::new();
    if phase == Phase::Zero {
        remarks.extend(pass_remark(placed, recipe));
    }
    if let (Stage::Filter(stage), Recipe::Filter(recipe)) = (&placed.stage, recipe) {
        remarks.extend(limits::moved_edge(stage, &placed.edges_hz, recipe, rate_hz));
    }
    if matches!(&placed.stage, Stage::Digital(stage) if stage.rate_hz.is_none()) {
        remarks.push("the coefficients are the same at every sample rate; give rate_hz to hold them to one".to_owned());
    }
    remarks
}

/// What one of two passes is.
fn pass_remark(placed: &PlacedStage, recipe: &Recipe) -> Option<String> {
    let decibels = |db: f64| format!("{} dB", figure(libm::round(db * 1e4) / 1e4));
    let hertz = |hz: f64| figure(libm::round(hz * 1e3) / 1e3);
    match recipe {
        Recipe::Filter(recipe) => {
            let order = recipe.order;
            let limited = matches!(&placed.stage, Stage::Filter(stage) if matches!(stage.order, Order::Limits(_)));
            let edges = || match recipe.edges_hz.as_slice() {
                [edge_hz] => format!("its half-power point at {} Hz", hertz(*edge_hz)),
                edges_hz => {
                    let edges: Vec<String> = edges_hz.iter().map(|&hz| hertz(hz)).collect();
                    format!("its half-power points at {} Hz", edges.join(" and "))
                }
            };
            let with = match (limited, recipe.ripple_db, recipe.stop_db) {
                (true, ..) => " and holds half of ripple_db and stop_db".to_owned(),
                (_, None, None) => format!(" with {}", edges()),
                (_, Some(ripple_db), None) => format!(" with half the ripple, {}", decibels(ripple_db)),
                (_, None, Some(stop_db)) => format!(" with half the stop attenuation, {}", decibels(stop_db)),
                (_, Some(ripple_db), Some(stop_db)) => format!(
                    " with half the ripple, {}, and half the stop attenuation, {}",
                    decibels(ripple_db),
                    decibels(stop_db)
                ),
            };
            Some(format!(
                "each of the two passes has order {order}{with}; together they fall with twice the slope of order {order}"
            ))
        }
        Recipe::Notch { width_hz, .. } => Some(format!(
            "each of the two passes is a notch {} Hz wide between half-power points",
            figure(libm::round(width_hz * 1e6) / 1e6)
        )),
        Recipe::Equalizer(equalizer) => {
            Some(format!("each of the two passes has half the gain, {}", decibels(equalizer.gain_db)))
        }
        Recipe::Weighting(_) | Recipe::Digital(_) | Recipe::Analog(_) => None,
    }
}
