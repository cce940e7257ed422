//! How many hertz a stage takes from its pass band to its stop band.
//!
//! At each edge of a stage the transition goes from the pass edge to the stop edge, both
//! found on the exact response of the stage's own sections:
//!
//! | family | pass edge | stop edge |
//! |---|---|---|
//! | Butterworth, Bessel | the edge: half power | where the required attenuation is first reached |
//! | Chebyshev I | the edge: the ripple ends | the same |
//! | Chebyshev II | the half-power point | the edge: the stop band begins |
//! | elliptic | the edge: the ripple ends | where the stop attenuation is first reached |
//! | any, its order found from limits | the edge: the ripple ends | where the stop attenuation is first reached |
//! | notch | the half-power point of the digital filter | where the required attenuation is first reached |
//!
//! The required attenuation is the largest `reduce_db` of a band with its center on the
//! stop side of the edge (between the edges of a band-stop or notch) which the stage
//! reaches somewhere in that band, by itself. Where there is no such band, a family
//! without a stop attenuation has no stop edge.

use super::extrema::Profile;
use super::{BandDesign, PlacedStage};
use crate::section::Section;
use crate::spec::{Family, FilterKind, Order, Stage};

/// Attenuation at the half-power points: 10 log10 2 dB.
pub(super) const HALF_POWER_DB: f64 = 3.010_299_956_639_812;

/// From pass band to stop band at one edge.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transition {
    /// Where the pass band ends, Hz; `None` where the response does not come up to
    /// [`Transition::pass_db`] at all.
    pub pass_hz: Option<f64>,
    /// Attenuation there, dB: half power or the ripple.
    pub pass_db: f64,
    /// Where [`Transition::stop_db`] is reached, Hz, counted from the pass band; `None` where
    /// there is no such attenuation or the response does not come down to it.
    pub stop_hz: Option<f64>,
    /// Attenuation of the stop band, dB; `None` for a family without one that serves
    /// no reduce band.
    pub stop_db: Option<f64>,
}

impl Transition {
    /// Distance of pass edge and stop edge, Hz; `None` where one of them is missing.
    pub fn width_hz(&self) -> Option<f64> {
        Some((self.stop_hz? - self.pass_hz?).abs())
    }
}

/// In which direction the stop band lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Side {
    Above,
    Below,
}

/// The transitions of `placed`, one for each of its edges in their order; `sections` are
/// those of this stage alone, and `bands` all bands of the design.
pub fn transitions(placed: &PlacedStage, sections: &[Section], rate_hz: f64, bands: &[BandDesign]) -> Vec<Transition> {
    let sides: &[Side] = match &placed.stage {
        // They have no edges between a pass band and a stop band.
        Stage::Equalizer(_) | Stage::Weighting(_) | Stage::Digital(_) | Stage::Analog(_) => return Vec::new(),
        Stage::Notch(_) => &[Side::Above, Side::Below],
        Stage::Filter(filter) => match filter.kind {
            FilterKind::Lowpass => &[Side::Above],
            FilterKind::Highpass => &[Side::Below],
            FilterKind::Bandpass => &[Side::Below, Side::Above],
            FilterKind::Bandstop => &[Side::Above, Side::Below],
        },
    };
    let profile = Profile::new(sections, rate_hz, &placed.edges_hz);
    let edges = placed.edges_hz.iter().zip(sides);
    edges.map(|(&edge_hz, &side)| transition(placed, &profile, (edge_hz, side), bands)).collect()
}

fn transition(placed: &PlacedStage, profile: &Profile<'_>, edge: (f64, Side), bands: &[BandDesign]) -> Transition {
    let (edge_hz, side) = edge;
    let (family, limited, ripple_db, stop_db) = match &placed.stage {
        Stage::Notch(_) | Stage::Equalizer(_) | Stage::Weighting(_) | Stage::Digital(_) | Stage::Analog(_) => {
            (None, false, None, None)
        }
        Stage::Filter(filter) => {
            let limited = matches!(filter.order, Order::Limits(_));
            (Some(filter.family), limited, filter.ripple_db, filter.stop_db)
        }
    };
    let pass_db = ripple_db.unwrap_or(HALF_POWER_DB);
    let stop_db = stop_db.or_else(|| required_db(placed, profile, edge, pass_db, bands));
    let pass_hz = match family {
        _ if limited => Some(edge_hz),
        // Upward through the transition, from the stop edge.
        Some(Family::Chebyshev2) => out_of(profile, edge_hz, side, |gain_db| gain_db < -pass_db),
        // Outward from the zero; the edges as written are off by the bilinear transform.
        None => {
            let center_hz = placed.edges_hz.iter().sum::<f64>() / placed.edges_hz.len() as f64;
            out_of(profile, center_hz, side, |gain_db| gain_db < -pass_db)
        }
        Some(Family::Butterworth | Family::Bessel | Family::Chebyshev1 | Family::Elliptic) => Some(edge_hz),
    };
    let stop_hz = match (family, stop_db, pass_hz) {
        (Some(Family::Chebyshev2), ..) if !limited => Some(edge_hz),
        (_, Some(stop_db), Some(pass_hz)) => into_stop(profile, pass_hz, side, stop_db),
        _ => None,
    };
    Transition { pass_hz, pass_db, stop_hz, stop_db }
}

/// From `hz` in the stop band to the first frequency on the pass band's side at which
/// `fallen` is no longer true of the gain.
fn out_of(profile: &Profile<'_>, hz: f64, side: Side, fallen: impl Fn(f64) -> bool) -> Option<f64> {
    let end = match side {
        Side::Above => profile.end_below(hz, fallen),
        Side::Below => profile.end_above(hz, fallen),
    };
    end.map(|(_, outside_hz)| outside_hz)
}

/// From the pass edge to the first frequency in the stop band's direction at which the
/// attenuation is `stop_db` or more.
fn into_stop(profile: &Profile<'_>, pass_hz: f64, side: Side, stop_db: f64) -> Option<f64> {
    let short = |gain_db: f64| gain_db > -stop_db;
    let end = match side {
        Side::Above => profile.end_above(pass_hz, short),
        Side::Below => profile.end_below(pass_hz, short),
    };
    end.map(|(_, outside_hz)| outside_hz)
}

/// The largest `reduce_db` that this stage serves at this edge; more than `pass_db`.
fn required_db(
    placed: &PlacedStage,
    profile: &Profile<'_>,
    (edge_hz, side): (f64, Side),
    pass_db: f64,
    bands: &[BandDesign],
) -> Option<f64> {
    let stops_between = match &placed.stage {
        Stage::Filter(filter) => filter.kind == FilterKind::Bandstop,
        stage => matches!(stage, Stage::Notch(_)),
    };
    let on_stop_side = |center_hz: f64| match (stops_between, side, placed.edges_hz.as_slice()) {
        (true, _, [low_hz, high_hz]) => (*low_hz..=*high_hz).contains(&center_hz),
        (_, Side::Above, _) => center_hz >= edge_hz,
        (_, Side::Below, _) => center_hz <= edge_hz,
    };
    bands
        .iter()
        .filter_map(|design| {
            let line = design.band.line;
            let reduce_db = design.band.requirement.reduce_db()?;
            let reached = || profile.within(line.from_hz, line.to_hz).any(|point| point.gain_db <= -reduce_db);
            (reduce_db > pass_db && on_stop_side(line.center_hz) && reached()).then_some(reduce_db)
        })
        .reduce(f64::max)
}
