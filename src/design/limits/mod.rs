//! The smallest order whose response holds a stage's limits.
//!
//! For each order the family's edges are placed so that the ripple ends exactly at the stated
//! edges, which leaves the largest attenuation at the stop edges. The prototype says whether
//! that can be enough; the finished digital filter, at its exact extrema, whether it is.
//!
//! Of a band-stop the transform fixes W1 W2 of the edges, and stop edges that lie off that
//! center are not reached equally. Where one of the pass edges moves toward the stop until
//! W1 W2 is that of the stop edges, the pass band grows, and the prototype's frequency at
//! both stop edges becomes (W2 - W1) / (Ws2 - Ws1), the largest that edges within the limits
//! can give. That is taken where it saves an order. (For a band-pass moving an edge outward
//! brings the prototype's frequency down at both stop edges.)

mod error;
mod regions;

use super::edges::{first_reaching, frequency_at, images_hz};
use super::prototype;
use super::recipe::FilterRecipe;
use super::transform::{prewarp, unwarp};
use super::wording::figure;
use super::{Slack, sections};
use crate::section::Section;
use crate::spec::{Family, FilterKind, FilterStage, Order, StopEdges};
pub use error::{Best, LimitsError};
use regions::Limits;

/// What one pass of a filter may miss a limit by, dB: a quarter of what the design check of
/// bands takes for rounding.
const TOLERANCE_DB: f64 = 2.5e-7;

/// A prototype that is short of the stop attenuation by more than this, dB, is not built:
/// the rounding of coefficients moves no finished filter by as much.
const SCREEN_DB: f64 = 0.1;

/// A finished filter that misses a limit by less than this, dB, may do so by the rounding of
/// its coefficients: it is designed again with so much in hand.
const ROUNDING_DB: f64 = 0.02;

/// How often that is tried.
const TRIES: usize = 4;

/// Bisections of the depth that an elliptic filter could hold.
const HALVINGS: usize = 60;

/// The stop edges as a slice, Hz.
pub(super) fn stop_edges_hz(stop: &StopEdges) -> &[f64] {
    match stop {
        StopEdges::One(hz) => std::slice::from_ref(hz),
        StopEdges::Two(hz) => hz,
    }
}

/// The recipe of one of `passes` equal passes with the smallest order that together hold the
/// limits of `stage`, whose edges are `edges_hz` (Hz) and whose stop edges are `stop`.
///
/// Poles may still lie too near the unit circle, which [`sections::build_stage`] reports.
///
/// # Errors
/// [`LimitsError::NotReached`] where no order of the family holds them,
/// [`LimitsError::Rounding`] where one would but for its coefficients in f64; the others for stages
/// that did not come from a placed spec.
pub fn recipe(
    stage: &FilterStage,
    edges_hz: &[f64],
    stop: StopEdges,
    passes: u32,
    rate_hz: f64,
) -> Result<FilterRecipe, LimitsError> {
    let stop_hz = stop_edges_hz(&stop);
    check_edges(stage.kind, edges_hz, stop_hz, rate_hz)?;
    let (ripple_db, stop_db) = check_figures(stage)?;
    let passes = f64::from(passes.max(1));
    let (ripple_db, stop_db) = (ripple_db / passes, stop_db / passes);
    let limits = Limits { kind: stage.kind, edges_hz, stop_hz, ripple_db, stop_db, rate_hz };
    let mut placements = vec![edges_hz.to_vec()];
    placements.extend(centered_on_stop(&limits));
    let mut rounded = None;
    for order in 1..=stage.family.highest_order() {
        for placement in &placements {
            let asked = Asked { family: stage.family, order, edges_hz: placement, limits: &limits };
            match asked.built() {
                Built::Holds(recipe) => return Ok(recipe),
                Built::Rounded { missed_db } => rounded = rounded.or(Some((order, missed_db))),
                Built::Short => {}
            }
        }
    }
    if let Some((order, missed_db)) = rounded {
        return Err(LimitsError::Rounding {
            order,
            missed_db: missed_db * passes,
            ripple_db: ripple_db * passes,
            stop_db: stop_db * passes,
            rate_hz,
        });
    }
    let last = placements.last().map_or(edges_hz, Vec::as_slice);
    Err(error::not_reached(stage.family, last, &limits, passes))
}

/// What the finished filter leaves of the limits of `stage`: the slack at its edges
/// `edges_hz` and its stop edges. `net` are the sections of all passes, made from `recipe`.
/// Empty for a stage whose order is given.
pub fn slack(
    stage: &FilterStage,
    edges_hz: &[f64],
    recipe: &FilterRecipe,
    net: &[Section],
    rate_hz: f64,
) -> Vec<Slack> {
    let (Order::Limits(stop), Some(ripple_db), Some(stop_db)) = (&stage.order, stage.ripple_db, stage.stop_db) else {
        return Vec::new();
    };
    let limits = Limits { kind: stage.kind, edges_hz, stop_hz: stop_edges_hz(stop), ripple_db, stop_db, rate_hz };
    limits.slack(recipe, net)
}

/// What is to be said where an edge was moved to save an order; `None` where none was.
pub fn moved_edge(stage: &FilterStage, edges_hz: &[f64], recipe: &FilterRecipe, rate_hz: f64) -> Option<String> {
    let (Order::Limits(stop), &[low_hz, high_hz]) = (&stage.order, edges_hz) else { return None };
    let limits =
        Limits { kind: stage.kind, edges_hz, stop_hz: stop_edges_hz(stop), ripple_db: 0.0, stop_db: 0.0, rate_hz };
    let moved = centered_on_stop(&limits)?;
    // The recipe keeps the center of the edges it was made for.
    let center = |edges_hz: &[f64]| edges_hz.iter().map(|&hz| prewarp(hz, rate_hz)).product::<f64>();
    let (own, written, there) = (center(&recipe.edges_hz), center(edges_hz), center(&moved));
    if (own - written).abs() <= (own - there).abs() {
        return None;
    }
    let (which, from_hz, to_hz) = match moved.as_slice() {
        [low, _] if *low != low_hz => ("lower", low_hz, *low),
        [_, high] => ("upper", high_hz, *high),
        _ => return None,
    };
    Some(format!(
        "its {which} pass edge was moved from {} to {} Hz, toward the stop, because with both edges as written order {} \
         would not hold its limits",
        figure(from_hz),
        figure(libm::round(to_hz * 1e3) / 1e3),
        recipe.order
    ))
}

/// What became of one order at one placement of the pass edges.
enum Built {
    /// The finished filter holds the limits, or has poles that f64 can't hold.
    Holds(FilterRecipe),
    /// Its prototype does not.
    Short,
    /// Its prototype does, the finished filter misses them by so much, dB.
    Rounded { missed_db: f64 },
}

/// One order at one placement of the pass edges.
struct Asked<'a> {
    family: Family,
    order: u32,
    /// Where the ripple is to end, Hz.
    edges_hz: &'a [f64],
    limits: &'a Limits<'a>,
}

impl Asked<'_> {
    /// What the finished filter of this order makes of the limits.
    fn built(&self) -> Built {
        let Limits { ripple_db: most_db, stop_db: least_db, .. } = *self.limits;
        let predicted_db = self.predicted_db(most_db, least_db).unwrap_or(f64::NEG_INFINITY);
        if predicted_db < least_db - SCREEN_DB {
            return Built::Short;
        }
        let (mut ripple_db, mut stop_db) = (most_db, least_db);
        let mut missed_db = f64::INFINITY;
        for _ in 0..TRIES {
            let Some((recipe, sections)) = self.sections(ripple_db, stop_db) else { break };
            if !sections.iter().all(sections::has_margins) {
                return Built::Holds(recipe);
            }
            let slack = self.limits.slack(&recipe, &sections);
            let missed = |is_stop: bool| {
                slack.iter().filter(|one| one.is_stop == is_stop).map(|one| -one.slack_db).fold(0.0, f64::max)
            };
            let (pass_db, short_db) = (missed(false), missed(true));
            if pass_db <= TOLERANCE_DB && short_db <= TOLERANCE_DB {
                return Built::Holds(recipe);
            }
            missed_db = missed_db.min(pass_db.max(short_db));
            ripple_db -= 2.0 * pass_db;
            stop_db += 2.0 * short_db;
            if pass_db.max(short_db) > ROUNDING_DB || ripple_db < 0.5 * most_db {
                break;
            }
        }
        // The prototype holds them exactly: nothing but the coefficients is in the way.
        if predicted_db >= least_db && missed_db.is_finite() { Built::Rounded { missed_db } } else { Built::Short }
    }

    fn sections(&self, ripple_db: f64, stop_db: f64) -> Option<(FilterRecipe, Vec<Section>)> {
        let recipe = self.recipe(ripple_db, stop_db)?;
        let prototype = prototype::new(recipe.family, recipe.order, recipe.ripple_db, recipe.stop_db).ok()?;
        let sections = sections::from_prototype(&prototype, recipe.kind, &recipe.edges_hz, self.limits.rate_hz)?;
        Some((recipe, sections))
    }

    /// Edges of the family such that the attenuation is `ripple_db` at the pass edges.
    fn recipe(&self, ripple_db: f64, stop_db: f64) -> Option<FilterRecipe> {
        let Asked { family, order, .. } = *self;
        let at = frequency_at(family, order, ripple_db, stop_db)?;
        let recipe = FilterRecipe {
            kind: self.limits.kind,
            family,
            order,
            edges_hz: images_hz(self.limits.kind, self.edges_hz, 1.0 / at, self.limits.rate_hz)?,
            ripple_db: family.takes_ripple().then_some(ripple_db),
            stop_db: family.takes_stop().then_some(stop_db),
        };
        Some(recipe)
    }

    /// Attenuation of the prototype at the stop edge it reaches last, dB.
    fn predicted_db(&self, ripple_db: f64, stop_db: f64) -> Option<f64> {
        let at = frequency_at(self.family, self.order, ripple_db, stop_db)?;
        let ripple = self.family.takes_ripple().then_some(ripple_db);
        let stop = self.family.takes_stop().then_some(stop_db);
        let prototype = prototype::approximate(self.family, self.order, ripple, stop).ok()?;
        let stop_rad = at * self.selectivity();
        Some(if stop_rad.is_finite() { prototype.attenuation_db(stop_rad) } else { f64::INFINITY })
    }

    /// The prototype's frequency at the stop edge that is reached last, over that at the pass
    /// edges.
    fn selectivity(&self) -> f64 {
        let rate_hz = self.limits.rate_hz;
        let of_stop = |stop_hz: &f64| match (self.limits.kind, self.edges_hz) {
            (FilterKind::Lowpass, &[edge_hz]) => prewarp(*stop_hz, rate_hz) / prewarp(edge_hz, rate_hz),
            (FilterKind::Highpass, &[edge_hz]) => prewarp(edge_hz, rate_hz) / prewarp(*stop_hz, rate_hz),
            (kind, &[low_hz, high_hz]) => {
                let [low, high, stop] = [low_hz, high_hz, *stop_hz].map(|hz| prewarp(hz, rate_hz));
                let detuned = ((stop * stop - low * high) / (stop * (high - low))).abs();
                if kind == FilterKind::Bandpass { detuned } else { 1.0 / detuned }
            }
            _ => 0.0,
        };
        self.limits.stop_hz.iter().map(of_stop).fold(f64::INFINITY, f64::min)
    }

    /// Attenuation that this order can have at all its stop edges, dB.
    fn depth_db(&self) -> Option<f64> {
        let Limits { ripple_db, stop_db, .. } = *self.limits;
        match self.family {
            Family::Butterworth | Family::Bessel | Family::Chebyshev1 => self.predicted_db(ripple_db, stop_db),
            // With equal ripple on either side of the transition the two families have the
            // same one.
            Family::Chebyshev2 => Asked { family: Family::Chebyshev1, ..*self }.predicted_db(ripple_db, stop_db),
            Family::Elliptic => {
                let holds = |db: f64| self.predicted_db(ripple_db, db).is_some_and(|found_db| found_db >= db);
                let (mut held, mut missed) = (ripple_db, stop_db);
                for _ in 0..HALVINGS {
                    let middle = 0.5 * (held + missed);
                    if holds(middle) { held = middle } else { missed = middle }
                }
                Some(held)
            }
        }
    }

    /// The stop edges, Hz, from which on this order has the stop attenuation.
    fn reached_hz(&self) -> Option<Vec<f64>> {
        let Limits { kind, ripple_db, stop_db, rate_hz, .. } = *self.limits;
        let at = frequency_at(self.family, self.order, ripple_db, stop_db)?;
        let FilterRecipe { family, order, ripple_db: ripple, stop_db: stop, .. } = self.recipe(ripple_db, stop_db)?;
        let prototype = prototype::approximate(family, order, ripple, stop).ok()?;
        images_hz(kind, self.edges_hz, first_reaching(&prototype, stop_db)? / at, rate_hz)
    }
}

/// The pass edges of a band-stop with the one moved that brings W1 W2 to that of the stop
/// edges; `None` where they lie there already, and for other kinds.
fn centered_on_stop(limits: &Limits<'_>) -> Option<Vec<f64>> {
    let (FilterKind::Bandstop, &[low_hz, high_hz], &[stop_low_hz, stop_high_hz]) =
        (limits.kind, limits.edges_hz, limits.stop_hz)
    else {
        return None;
    };
    let rate_hz = limits.rate_hz;
    let [low, high, stop_low, stop_high] = [low_hz, high_hz, stop_low_hz, stop_high_hz].map(|hz| prewarp(hz, rate_hz));
    let center = stop_low * stop_high;
    let moved = if low * high < center {
        vec![unwarp(center / high, rate_hz).max(low_hz), high_hz]
    } else {
        vec![low_hz, unwarp(center / low, rate_hz).min(high_hz)]
    };
    (moved != limits.edges_hz).then_some(moved)
}

fn check_edges(kind: FilterKind, edges_hz: &[f64], stop_hz: &[f64], rate_hz: f64) -> Result<(), LimitsError> {
    let (in_order, expected): (Vec<f64>, _) = match (kind, edges_hz, stop_hz) {
        (FilterKind::Lowpass, &[edge], &[stop]) => (vec![edge, stop], "stop_edge_hz above edge_hz"),
        (FilterKind::Highpass, &[edge], &[stop]) => (vec![stop, edge], "stop_edge_hz below edge_hz"),
        (FilterKind::Bandpass, &[low, high], &[stop_low, stop_high]) => {
            (vec![stop_low, low, high, stop_high], "stop_edges_hz on either side of edges_hz")
        }
        (FilterKind::Bandstop, &[low, high], &[stop_low, stop_high]) => {
            (vec![low, stop_low, stop_high, high], "stop_edges_hz between edges_hz")
        }
        (FilterKind::Lowpass | FilterKind::Highpass, ..) => (Vec::new(), "one edge_hz and one stop_edge_hz"),
        (FilterKind::Bandpass | FilterKind::Bandstop, ..) => (Vec::new(), "two edges_hz and two stop_edges_hz"),
    };
    let inside = |hz: &f64| *hz > 0.0 && *hz < rate_hz / 2.0;
    if !in_order.is_empty() && in_order.is_sorted_by(|a, b| a < b) && in_order.iter().all(inside) {
        return Ok(());
    }
    Err(LimitsError::Edges { edges_hz: edges_hz.to_vec(), stop_hz: stop_hz.to_vec(), expected, half_hz: rate_hz / 2.0 })
}

/// Ripple and stop attenuation, dB.
fn check_figures(stage: &FilterStage) -> Result<(f64, f64), LimitsError> {
    match (stage.ripple_db, stage.stop_db) {
        (Some(ripple_db), Some(stop_db)) if ripple_db > 0.0 && stop_db > ripple_db && stop_db.is_finite() => {
            Ok((ripple_db, stop_db))
        }
        (ripple_db, stop_db) => Err(LimitsError::Figures { ripple_db, stop_db }),
    }
}
