//! Limits, whether finished sections hold them, and the filter of a given order that comes
//! nearest to them: all from handbook formulas, none from the search that is under test.

use crate::support::{Filter, filter};
use bandproof::design::extrema::Profile;
use bandproof::design::recipe::{FilterRecipe, Recipe, recipe};
use bandproof::design::{DesignError, PlacedStage, sections};
use bandproof::section::Section;
use bandproof::spec::{Family, FilterKind, FilterStage, Order, Phase, Placement, Stage, StopEdges};
use std::f64::consts::PI;

/// A stage whose order follows from limits.
#[derive(Clone, Debug)]
pub struct Limited {
    pub family: Family,
    pub kind: FilterKind,
    pub edges_hz: Vec<f64>,
    pub stop_hz: Vec<f64>,
    pub ripple_db: f64,
    pub stop_db: f64,
    pub rate_hz: f64,
}

/// The worst of what sections leave of limits, dB.
#[derive(Clone, Copy, Debug)]
pub struct Left {
    pub pass_db: f64,
    pub stop_db: f64,
}

impl Left {
    pub fn holds(&self, tolerance_db: f64) -> bool {
        self.pass_db >= -tolerance_db && self.stop_db >= -tolerance_db
    }
}

impl Limited {
    pub fn stage(&self) -> FilterStage {
        let placement = match *self.edges_hz {
            [edge_hz] => Placement::Edge { edge_hz },
            [low, high] => Placement::Edges { edges_hz: [low, high] },
            _ => panic!("one edge or two"),
        };
        let stop = match *self.stop_hz {
            [hz] => StopEdges::One(hz),
            [low, high] => StopEdges::Two([low, high]),
            _ => panic!("one stop edge or two"),
        };
        FilterStage {
            kind: self.kind,
            family: self.family,
            order: Order::Limits(stop),
            placement,
            ripple_db: Some(self.ripple_db),
            stop_db: Some(self.stop_db),
        }
    }

    pub fn placed(&self) -> PlacedStage {
        PlacedStage {
            stage_index: 0,
            stage: Stage::Filter(self.stage()),
            harmonic: None,
            edges_hz: self.edges_hz.clone(),
        }
    }

    pub fn recipe(&self, phase: Phase) -> Result<FilterRecipe, DesignError> {
        match recipe(&self.placed(), phase, self.rate_hz)? {
            Recipe::Filter(recipe) => Ok(recipe),
            other => panic!("{other:?}"),
        }
    }

    /// Sections of one pass.
    pub fn sections(&self, recipe: &FilterRecipe) -> Result<Vec<Section>, DesignError> {
        sections::build_stage(&self.placed(), &Recipe::Filter(recipe.clone()), self.rate_hz)
    }

    /// What `net` leaves of the limits anywhere on their sides.
    pub fn left(&self, net: &[Section]) -> Left {
        let marks: Vec<f64> = self.edges_hz.iter().chain(&self.stop_hz).copied().collect();
        let profile = Profile::new(net, self.rate_hz, &marks);
        let half = self.rate_hz / 2.0;
        let (edges, stops) = (&self.edges_hz, &self.stop_hz);
        let (pass, stop) = match self.kind {
            FilterKind::Lowpass => (vec![(0.0, edges[0])], vec![(stops[0], half)]),
            FilterKind::Highpass => (vec![(edges[0], half)], vec![(0.0, stops[0])]),
            FilterKind::Bandpass => (vec![(edges[0], edges[1])], vec![(0.0, stops[0]), (stops[1], half)]),
            FilterKind::Bandstop => (vec![(0.0, edges[0]), (edges[1], half)], vec![(stops[0], stops[1])]),
        };
        let gains = |sides: &[(f64, f64)]| -> Vec<f64> {
            sides.iter().flat_map(|&(from, to)| profile.within(from, to)).map(|point| point.gain_db).collect()
        };
        let lowest = gains(&pass).into_iter().map(|gain| gain.abs()).fold(0.0, f64::max);
        let highest = gains(&stop).into_iter().fold(f64::NEG_INFINITY, f64::max);
        Left { pass_db: self.ripple_db - lowest, stop_db: -highest - self.stop_db }
    }

    /// What is left of the limits by the filter of `order` that comes nearest to them: pass
    /// edges exact, for a band-stop also with one of them on the stop edges' center.
    pub fn left_by(&self, order: u32) -> Left {
        let mut best = self.left(&self.of_order(order, &self.edges_hz).sections());
        if self.kind == FilterKind::Bandstop {
            let w = |hz: f64| (PI * hz / self.rate_hz).tan();
            let hz = |w: f64| w.atan() / PI * self.rate_hz;
            let (low, high) = (self.edges_hz[0], self.edges_hz[1]);
            let center = w(self.stop_hz[0]) * w(self.stop_hz[1]);
            let moved = [hz(center / w(high)).max(low), hz(center / w(low)).min(high)];
            let other = self.left(&self.of_order(order, &moved).sections());
            if other.stop_db > best.stop_db && other.pass_db > -1e-6 {
                best = other;
            }
        }
        best
    }

    /// The filter of `order` whose ripple ends at `edges_hz`.
    fn of_order(&self, order: u32, edges_hz: &[f64]) -> Filter {
        let scale = self.pass_over_edge(order);
        let w = |hz: f64| (PI * hz / self.rate_hz).tan();
        let hz = |w: f64| w.atan() / PI * self.rate_hz;
        let own = match (self.kind, edges_hz) {
            _ if scale == 1.0 => edges_hz.to_vec(),
            (FilterKind::Lowpass, &[edge]) => vec![hz(w(edge) / scale)],
            (FilterKind::Highpass, &[edge]) => vec![hz(w(edge) * scale)],
            (kind, &[low, high]) => {
                let width = (w(high) - w(low)) * if kind == FilterKind::Bandpass { 1.0 / scale } else { scale };
                let upper = (width + (width * width + 4.0 * w(low) * w(high)).sqrt()) / 2.0;
                vec![hz(w(low) * w(high) / upper), hz(upper)]
            }
            _ => panic!("edges of the wrong number"),
        };
        let figures = |takes: bool, db: f64| takes.then_some(db);
        Filter {
            ripple_db: figures(self.family.takes_ripple(), self.ripple_db),
            stop_db: figures(self.family.takes_stop(), self.stop_db),
            ..filter(self.family, self.kind, order, &own, self.rate_hz)
        }
    }

    /// The prototype's frequency at which the ripple ends, its own edge at 1 (handbook; Bessel:
    /// sought on a finished low-pass).
    fn pass_over_edge(&self, order: u32) -> f64 {
        let ratio = |db: f64| 10f64.powf(db / 10.0) - 1.0;
        let n = f64::from(order);
        match self.family {
            Family::Butterworth => ratio(self.ripple_db).powf(0.5 / n),
            Family::Chebyshev1 | Family::Elliptic => 1.0,
            Family::Chebyshev2 => 1.0 / ((ratio(self.stop_db) / ratio(self.ripple_db)).sqrt().acosh() / n).cosh(),
            Family::Bessel => {
                let lowpass = filter(Family::Bessel, FilterKind::Lowpass, order, &[1_000.0], 8_000.0).sections();
                let profile = Profile::new(&lowpass, 8_000.0, &[]);
                let end = profile.end_above(0.0, |gain_db| gain_db > -self.ripple_db).unwrap().0;
                (PI * end / 8_000.0).tan() / (PI * 1_000.0 / 8_000.0f64).tan()
            }
        }
    }
}
