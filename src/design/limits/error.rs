//! Why no order holds the limits of a stage, with the figures and the repair.

use super::{Asked, Limits};
use crate::design::prototype::family_name;
use crate::design::transition::HALF_POWER_DB;
use crate::design::wording::figure;
use crate::spec::{Family, FilterKind};

/// Why no order holds the limits of a stage.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum LimitsError {
    /// The stop edges do not lie on the stop side of the edges. A spec that was read and
    /// placed has none of these.
    #[error(
        "its edges lie at {} Hz and its stop edges at {} Hz; it needs {expected}, all above 0 and below half the sample \
         rate, {} Hz",
        list(edges_hz), list(stop_hz), figure(*half_hz)
    )]
    Edges {
        /// Where the ripple ends, Hz.
        edges_hz: Vec<f64>,
        /// Where the stop band begins, Hz.
        stop_hz: Vec<f64>,
        /// What they must be.
        expected: &'static str,
        /// Half the sample rate, Hz.
        half_hz: f64,
    },
    /// Ripple and stop attenuation are missing or not in order. A spec that was read has none
    /// of these.
    #[error(
        "an order that follows from limits needs ripple_db above 0 and stop_db above that; they are {} and {}",
        given(*ripple_db), given(*stop_db)
    )]
    Figures {
        /// Pass band ripple, dB.
        ripple_db: Option<f64>,
        /// Stop band attenuation, dB.
        stop_db: Option<f64>,
    },
    /// The prototype of an order holds them, but no finished filter does.
    #[error(
        "order {order} would hold ripple_db = {} and stop_db = {}, but rounding its coefficients to f64 costs up to \
         {missed_db:.1e} dB more; raise ripple_db, lower stop_db, move the stop edges farther from the edges, or filter \
         at a lower sample rate",
        figure(*ripple_db), figure(*stop_db)
    )]
    Rounding {
        /// The lowest order whose prototype holds them.
        order: u32,
        /// What its finished filter misses them by, dB, all passes together.
        missed_db: f64,
        /// Ripple of all passes that is asked for, dB.
        ripple_db: f64,
        /// Stop attenuation of all passes that is asked for, dB.
        stop_db: f64,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// No order up to the family's highest holds them.
    #[error("{}", sentence(*family, *kind, *stop_db, best))]
    NotReached {
        /// Family of the stage.
        family: Family,
        /// Its kind.
        kind: FilterKind,
        /// Stop attenuation of all passes that is asked for, dB.
        stop_db: f64,
        /// What the order that comes nearest could hold.
        best: Box<Best>,
    },
}

/// What the order that comes nearest, in general the highest, comes to with the ripple as it
/// is asked for.
#[derive(Clone, Debug, PartialEq)]
pub struct Best {
    /// The order.
    pub order: u32,
    /// Ripple of all passes, as it is asked for, dB.
    pub ripple_db: f64,
    /// Stop edges that are asked for, Hz.
    pub stop_hz: Vec<f64>,
    /// Attenuation of all passes that it holds from there on, dB, rounded down.
    pub depth_db: Option<f64>,
    /// Stop edges from which on it holds the stop attenuation, Hz, rounded away from the pass
    /// band.
    pub reached_hz: Option<Vec<f64>>,
}

/// [`LimitsError::NotReached`] for `limits` of one of `passes` passes, with pass edges
/// at `edges_hz`.
pub(super) fn not_reached(family: Family, edges_hz: &[f64], limits: &Limits<'_>, passes: f64) -> LimitsError {
    let highest = family.highest_order();
    // Bessel filters grow steeper with their order only where the attenuation is large.
    let first = if family == Family::Bessel { 1 } else { highest };
    let candidates = (first..=highest).map(|order| Asked { family, order, edges_hz, limits });
    let by_depth = candidates.map(|asked| (asked.depth_db(), asked)).filter_map(|(db, asked)| Some((db?, asked)));
    let best = by_depth.max_by(|a, b| a.0.total_cmp(&b.0));
    let (depth_db, asked) = match best {
        Some((depth_db, asked)) => (Some(depth_db), asked),
        None => (None, Asked { family, order: highest, edges_hz, limits }),
    };
    // A thousandth of a hertz outward, a hundredth of a decibel down: what the sentence
    // names holds.
    let up = |hz: f64| libm::ceil(hz * 1e3 + 1e-3) / 1e3;
    let down = |hz: f64| libm::floor(hz * 1e3 - 1e-3) / 1e3;
    let reached_hz = asked.reached_hz().and_then(|found_hz| {
        let hz: Vec<f64> = match (limits.kind, found_hz.as_slice(), limits.stop_hz) {
            (FilterKind::Lowpass, &[hz], _) => vec![up(hz)],
            (FilterKind::Highpass, &[hz], _) => vec![down(hz)],
            // An edge that is reached already stays.
            (FilterKind::Bandpass, &[low, high], &[stop_low, stop_high]) => {
                vec![down(low).min(stop_low), up(high).max(stop_high)]
            }
            (FilterKind::Bandstop, &[low, high], &[stop_low, stop_high]) => {
                vec![up(low).max(stop_low), down(high).min(stop_high)]
            }
            _ => return None,
        };
        let fits = hz.iter().all(|hz| *hz > 0.0 && *hz < limits.rate_hz / 2.0) && hz.is_sorted_by(|a, b| a < b);
        fits.then_some(hz)
    });
    let depth_db = depth_db.map(|db| libm::floor(db * passes * 100.0 - 0.01) / 100.0);
    let (ripple_db, stop_hz) = (limits.ripple_db * passes, limits.stop_hz.to_vec());
    let best = Box::new(Best { order: asked.order, ripple_db, stop_hz, depth_db, reached_hz });
    LimitsError::NotReached { family, kind: limits.kind, stop_db: limits.stop_db * passes, best }
}

fn sentence(family: Family, kind: FilterKind, stop_db: f64, best: &Best) -> String {
    let Best { order, stop_hz, depth_db, reached_hz, .. } = best;
    let (name, stop_db) = (family_name(family), figure(stop_db));
    let key = if stop_hz.len() == 1 { "stop_edge_hz" } else { "stop_edges_hz" };
    let mut text = format!(
        "no {name} {} up to order {}, the highest, holds stop_db = {stop_db} {}",
        kind.name(),
        family.highest_order(),
        range(kind, stop_hz)
    );
    if let Some(depth_db) = depth_db {
        text.push_str(&format!(": order {order} has {} dB there", figure(*depth_db)));
    }
    if let Some(reached_hz) = reached_hz {
        let and = if depth_db.is_some() { ", and" } else { ": it has" };
        text.push_str(&format!("{and} {stop_db} dB {}", range(kind, reached_hz)));
    }
    text.push_str("; ");
    if let Some(reached_hz) = reached_hz {
        let edges = if reached_hz.len() == 1 { list(reached_hz) } else { format!("[{}]", listed(reached_hz, ", ")) };
        text.push_str(&format!("set {key} = {edges}, "));
    }
    // A spec takes no stop_db within half power or the ripple.
    if let Some(depth_db) = depth_db.filter(|db| *db > HALF_POWER_DB.max(best.ripple_db)) {
        text.push_str(&format!("or stop_db = {}, ", figure(depth_db)));
    }
    let steeper = if family == Family::Elliptic { "" } else { ", or take a family with a steeper edge" };
    text.push_str(&format!("or raise ripple_db{steeper}"));
    text
}

/// `from 1200 Hz on`, `up to 20 Hz`, `up to 20 Hz and from 1200 Hz on`, `from 48 to 52 Hz`.
fn range(kind: FilterKind, stop_hz: &[f64]) -> String {
    match (kind, stop_hz) {
        (FilterKind::Lowpass, [hz]) => format!("from {} Hz on", figure(*hz)),
        (FilterKind::Highpass, [hz]) => format!("up to {} Hz", figure(*hz)),
        (FilterKind::Bandpass, [low, high]) => format!("up to {} Hz and from {} Hz on", figure(*low), figure(*high)),
        (_, hz) => format!("from {} Hz", listed(hz, " to ")),
    }
}

fn listed(values: &[f64], between: &str) -> String {
    values.iter().map(|value| figure(*value)).collect::<Vec<_>>().join(between)
}

fn list(values: &[f64]) -> String {
    listed(values, " and ")
}

fn given(value: Option<f64>) -> String {
    value.map_or_else(|| "missing".to_owned(), figure)
}
