//! A place in the cascade: what kind of stage stands there, and the figures that the search
//! may turn.

use super::curve::{Curve, attenuation_db};
use super::points::Points;
use crate::design::placement::PlacedStage;
use crate::design::recipe;
use crate::spec::{Family, FilterKind, FilterStage, NotchStage, Order, Phase, Placement, Row, Stage, Width};

/// A product of powers below this goes into the sum of decibels before it falls out of f64.
const SMALL_POWER: f64 = 1e-200;

/// A figure of a stage.
#[derive(Clone, Debug, PartialEq)]
pub struct Parameter {
    /// Its value: Hz, dB, or a Q.
    pub value: f64,
    /// What one step of the search is: so much, or for a logarithmic one a factor of e.
    pub unit: f64,
    /// Whether it is searched by factors.
    pub logarithmic: bool,
    /// Least and largest value.
    pub range: (f64, f64),
}

impl Parameter {
    /// A figure that is searched in steps of `unit`.
    pub fn linear(value: f64, unit: f64, range: (f64, f64)) -> Parameter {
        Parameter { value: value.clamp(range.0, range.1), unit, logarithmic: false, range }
    }

    /// A figure that is searched by factors.
    pub fn logarithmic(value: f64, range: (f64, f64)) -> Parameter {
        Parameter { value: value.clamp(range.0, range.1), unit: 1.0, logarithmic: true, range }
    }

    /// The value `steps` away, in its range.
    pub fn moved(&self, steps: f64) -> f64 {
        let value = if self.logarithmic { self.value * libm::exp(steps) } else { self.value + steps * self.unit };
        value.clamp(self.range.0, self.range.1)
    }

    /// How many steps it can go down and up.
    pub fn reach(&self) -> (f64, f64) {
        let steps = |to: f64| {
            if self.logarithmic { libm::log(to / self.value) } else { (to - self.value) / self.unit }
        };
        (steps(self.range.0).min(0.0), steps(self.range.1).max(0.0))
    }
}

/// Where the edges of a stop come from.
#[derive(Clone, Debug, PartialEq)]
pub enum Lines {
    /// Its own figures: two edges of a band-stop, center and width of a notch.
    Own,
    /// Lines of a row by their numbers, all of one width: in Hz, or as the same Q.
    Row {
        /// The row of the band; its width says which kind of width.
        row: Row,
        /// The numbers of its lines, rising.
        harmonics: Vec<u32>,
    },
}

/// What kind of stage.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Shape {
    /// High-pass: an edge.
    Highpass,
    /// Low-pass: an edge.
    Lowpass,
    /// Band-stop: two edges, or the width of a row.
    Stop,
    /// Notch: center and width, or the width of a row.
    Notch,
}

/// A stage, or the stages of a row's lines.
#[derive(Clone, Debug, PartialEq)]
pub struct Slot {
    /// Its kind.
    pub shape: Shape,
    /// Its prototype; that of a notch means nothing.
    pub family: Family,
    /// Order of the prototype; 1 for a notch.
    pub order: u32,
    /// Where the edges come from.
    pub lines: Lines,
    /// Edge figures, then the ripple, then the stop attenuation, as far as the family has them.
    pub parameters: Vec<Parameter>,
    /// The lines it is for, by their indices.
    pub targets: Vec<usize>,
}

impl Slot {
    /// Number of stages, or of stages in its row.
    pub fn count(&self) -> u32 {
        match &self.lines {
            Lines::Own => 1,
            Lines::Row { harmonics, .. } => u32::try_from(harmonics.len()).unwrap_or(u32::MAX),
        }
    }

    /// Second-order sections.
    pub fn sections(&self) -> u32 {
        match self.shape {
            Shape::Highpass | Shape::Lowpass => self.order.div_ceil(2),
            Shape::Stop => self.order * self.count(),
            Shape::Notch => self.count(),
        }
    }

    /// Whether its row can be written as one stage: lines 1 to the last.
    fn is_whole_row(&self) -> bool {
        match &self.lines {
            Lines::Own => false,
            Lines::Row { harmonics, .. } => is_whole_row(harmonics),
        }
    }

    /// The stages as a spec has them: one, or one a line where a row does not begin at its
    /// first.
    pub fn stages(&self, values: &[f64]) -> Vec<Stage> {
        match &self.lines {
            Lines::Own => self.own(values).into_iter().collect(),
            Lines::Row { row, harmonics } if self.is_whole_row() => {
                let last = harmonics.last().copied().unwrap_or(1);
                self.row(values, row, row.center_hz, last).into_iter().collect()
            }
            Lines::Row { row, harmonics } => harmonics
                .iter()
                .filter_map(|harmonic| self.row(values, row, row.center_hz * f64::from(*harmonic), 1))
                .collect(),
        }
    }

    fn own(&self, values: &[f64]) -> Option<Stage> {
        let (kind, placement, rest) = match self.shape {
            Shape::Highpass => (FilterKind::Highpass, Placement::Edge { edge_hz: *values.first()? }, 1),
            Shape::Lowpass => (FilterKind::Lowpass, Placement::Edge { edge_hz: *values.first()? }, 1),
            Shape::Stop => {
                (FilterKind::Bandstop, Placement::Edges { edges_hz: [*values.first()?, *values.get(1)?] }, 2)
            }
            Shape::Notch => {
                let width = Width::Hz(*values.get(1)?);
                return Some(Stage::Notch(NotchStage {
                    row: Row { center_hz: *values.first()?, width, harmonics: 1 },
                }));
            }
        };
        Some(Stage::Filter(self.filter(kind, placement, values.get(rest..)?)))
    }

    fn row(&self, values: &[f64], row: &Row, center_hz: f64, harmonics: u32) -> Option<Stage> {
        let figure = *values.first()?;
        let width = match row.width {
            Width::Hz(_) => Width::Hz(figure),
            Width::Q(_) => Width::Q(figure),
        };
        let row = Row { center_hz, width, harmonics };
        if self.shape == Shape::Notch {
            return Some(Stage::Notch(NotchStage { row }));
        }
        Some(Stage::Filter(self.filter(FilterKind::Bandstop, Placement::Row(row), values.get(1..)?)))
    }

    fn filter(&self, kind: FilterKind, placement: Placement, decibels: &[f64]) -> FilterStage {
        let mut decibels = decibels.iter().copied();
        FilterStage {
            kind,
            family: self.family,
            order: Order::Given(self.order),
            placement,
            ripple_db: if self.family.takes_ripple() { decibels.next() } else { None },
            stop_db: if self.family.takes_stop() { decibels.next() } else { None },
        }
    }

    /// The present values of its figures.
    pub fn values(&self) -> Vec<f64> {
        self.parameters.iter().map(|parameter| parameter.value).collect()
    }

    /// Attenuation of all passes at each point, dB, with the figures `values`; `None` where
    /// there is no such filter.
    pub fn attenuations(&self, values: &[f64], points: &Points, phase: Phase) -> Option<Vec<f64>> {
        let stages = match &self.lines {
            Lines::Own => vec![self.own(values)?],
            Lines::Row { row, harmonics } => harmonics
                .iter()
                .map(|&harmonic| self.row(values, row, row.center_hz * f64::from(harmonic), 1))
                .collect::<Option<Vec<_>>>()?,
        };
        let passes = f64::from(phase.passes());
        // Powers multiply, so that a row of many lines takes one logarithm a point.
        let (mut sums, mut powers) = (vec![0.0; points.all.len()], vec![1.0; points.all.len()]);
        for stage in stages {
            let edges_hz = edges(&stage);
            for (rate_hz, own, start) in points.by_rate() {
                let upper_hz = edges_hz.last().copied()?;
                if upper_hz >= rate_hz / 2.0 {
                    // Lines of one row are left out quietly, stages of their own may be refused.
                    if points.leaves_out || self.is_whole_row() {
                        continue;
                    }
                    return None;
                }
                let placed =
                    PlacedStage { stage_index: 0, stage: stage.clone(), harmonic: None, edges_hz: edges_hz.clone() };
                let recipe = recipe::recipe(&placed, phase, rate_hz).ok()?;
                let curve = Curve::new(&recipe, rate_hz)?;
                let sums = sums.get_mut(start..start + own.len())?;
                let powers = powers.get_mut(start..start + own.len())?;
                for ((sum, power), point) in sums.iter_mut().zip(powers).zip(own) {
                    *power *= curve.power(point.at);
                    if *power < SMALL_POWER {
                        *sum += passes * attenuation_db(*power);
                        *power = 1.0;
                    }
                }
            }
        }
        for (sum, power) in sums.iter_mut().zip(powers) {
            *sum += passes * attenuation_db(power);
        }
        Some(sums)
    }
}

/// Whether lines with these numbers, rising, can be written as one stage: 1 to the last.
pub fn is_whole_row(harmonics: &[u32]) -> bool {
    harmonics.iter().zip(1..).all(|(harmonic, number)| *harmonic == number)
}

/// The edges of a stage that is no row of two or more, Hz.
fn edges(stage: &Stage) -> Vec<f64> {
    let of_row = |row: &Row| row.lines().next().map_or_else(Vec::new, |line| vec![line.from_hz, line.to_hz]);
    match stage {
        Stage::Notch(notch) => of_row(&notch.row),
        Stage::Filter(filter) => match &filter.placement {
            Placement::Edge { edge_hz } => vec![*edge_hz],
            Placement::Edges { edges_hz } => edges_hz.to_vec(),
            Placement::Row(row) => of_row(row),
        },
        Stage::Equalizer(_) | Stage::Weighting(_) | Stage::Digital(_) | Stage::Analog(_) => Vec::new(),
    }
}
