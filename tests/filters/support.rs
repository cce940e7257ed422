//! Stages for tests, and tables of (frequency, requirement).

use bandproof::design::{PlacedStage, response, sections};
use bandproof::section::Section;
use bandproof::spec::{Family, FilterKind, FilterStage, NotchStage, Order, Placement, Row, Stage, Width};
use std::f64::consts::PI;

/// A filter as a test writes it.
#[derive(Clone, Debug, PartialEq)]
pub struct Filter {
    pub family: Family,
    pub kind: FilterKind,
    pub order: u32,
    pub ripple_db: Option<f64>,
    pub stop_db: Option<f64>,
    pub edges_hz: Vec<f64>,
    pub rate_hz: f64,
}

impl Filter {
    pub fn placed(&self) -> PlacedStage {
        let placement = match *self.edges_hz {
            [low, high] => Placement::Edges { edges_hz: [low, high] },
            [edge_hz] => Placement::Edge { edge_hz },
            _ => panic!("one edge or two: {:?}", self.edges_hz),
        };
        PlacedStage {
            stage_index: 0,
            stage: Stage::Filter(FilterStage {
                kind: self.kind,
                family: self.family,
                order: Order::Given(self.order),
                placement,
                ripple_db: self.ripple_db,
                stop_db: self.stop_db,
            }),
            harmonic: None,
            edges_hz: self.edges_hz.clone(),
        }
    }

    pub fn sections(&self) -> Vec<Section> {
        sections::build(&[self.placed()], self.rate_hz).unwrap_or_else(|error| panic!("{self:?}: {error}"))
    }

    pub fn gain_db(&self, frequency_hz: f64) -> f64 {
        response::gain_db(&self.sections(), frequency_hz, self.rate_hz)
    }
}

pub fn filter(family: Family, kind: FilterKind, order: u32, edges_hz: &[f64], rate_hz: f64) -> Filter {
    Filter { family, kind, order, ripple_db: None, stop_db: None, edges_hz: edges_hz.to_vec(), rate_hz }
}

/// One notch, placed.
pub fn notch(center_hz: f64, width_hz: f64) -> PlacedStage {
    let row = Row { center_hz, width: Width::Hz(width_hz), harmonics: 1 };
    PlacedStage {
        stage_index: 0,
        stage: Stage::Notch(NotchStage { row }),
        harmonic: None,
        edges_hz: vec![center_hz - width_hz / 2.0, center_hz + width_hz / 2.0],
    }
}

pub fn family(name: &str) -> Family {
    match name {
        "butterworth" => Family::Butterworth,
        "chebyshev1" => Family::Chebyshev1,
        "chebyshev2" => Family::Chebyshev2,
        "elliptic" => Family::Elliptic,
        "bessel" => Family::Bessel,
        _ => panic!("unknown family {name}"),
    }
}

pub fn kind(name: &str) -> FilterKind {
    match name {
        "lowpass" => FilterKind::Lowpass,
        "highpass" => FilterKind::Highpass,
        "bandpass" => FilterKind::Bandpass,
        "bandstop" => FilterKind::Bandstop,
        _ => panic!("unknown kind {name}"),
    }
}

/// What direct-form coefficients with a0 = 1 can't avoid, dB: 1 + a1 + a2 is a multiple
/// of 2^-53 where the poles are near z = 1, so each section's denominator A is off by
/// up to 2^-54, at the frequency looked at and at the one at which the gain is set.
pub fn unavoidable_db(filter: &Filter, sections: &[Section], frequency_hz: f64) -> f64 {
    let reference_hz = match (filter.kind, &filter.edges_hz[..]) {
        (FilterKind::Lowpass, _) => 0.0,
        (FilterKind::Bandpass, [low, high]) => {
            let warped = |f: &f64| (PI * f / filter.rate_hz).tan();
            (warped(low) * warped(high)).sqrt().atan() / PI * filter.rate_hz
        }
        _ => filter.rate_hz / 2.0,
    };
    let inverse = |section: &Section, frequency_hz| {
        response::at(&[Section { b: [1.0, 0.0, 0.0], a: section.a }], frequency_hz, filter.rate_hz).norm()
    };
    let relative: f64 = sections
        .iter()
        .map(|section| (inverse(section, frequency_hz) + inverse(section, reference_hz)) * 2f64.powi(-54))
        .sum();
    20.0 / std::f64::consts::LN_10 * relative
}

/// What a response must be at a frequency.
#[derive(Clone, Copy, Debug)]
pub enum Tol {
    /// This gain, within this many dB.
    GainDb(f64, f64),
    /// No more than this, dB.
    GainBelowDb(f64),
}

/// Holds sections against a table; a failure shows them and the whole response.
pub fn check_table(sections: &[Section], rate_hz: f64, table: &[(f64, Tol)]) {
    let rows: Vec<(f64, f64, Tol, bool)> = table
        .iter()
        .map(|&(frequency_hz, tol)| {
            let gain_db = response::gain_db(sections, frequency_hz, rate_hz);
            let holds = match tol {
                Tol::GainDb(want, within) => (gain_db - want).abs() <= within,
                Tol::GainBelowDb(limit) => gain_db <= limit,
            };
            (frequency_hz, gain_db, tol, holds)
        })
        .collect();
    assert!(rows.iter().all(|row| row.3), "(Hz, dB, required, holds): {rows:#?}\n{sections:#?}");
}
