//! The attenuation of one stage, or of one line of a row, from its prototype: exact but for
//! the rounding of coefficients, and cheap enough to be asked for millions of times.
//!
//! Frequencies are W = tan(pi f / rate), at which the bilinear transform has the digital
//! frequency f (see `transform`).

use crate::design::prototype::{self, Prototype};
use crate::design::recipe::{FilterRecipe, Recipe};
use crate::design::transform::{Edges, prewarp};
use crate::spec::{Family, FilterKind};
use std::cell::RefCell;
use std::collections::VecDeque;

/// Power below which nothing is told apart: 400 dB down.
const DEEPEST_POWER: f64 = 1e-40;

/// Prototype frequencies are held below this, rad/s.
const FARTHEST_RAD: f64 = 1e9;

/// |H|^2 of a prototype over w^2.
#[derive(Clone, Debug)]
struct Magnitude {
    /// One over the square of each zero.
    zeros: Vec<f64>,
    /// |p|^2 and 4 (re p)^2 of each pole pair.
    pairs: Vec<(f64, f64)>,
    /// Square of the real pole.
    real: Option<f64>,
    dc_power: f64,
}

impl Magnitude {
    fn new(prototype: &Prototype<f64>) -> Magnitude {
        Magnitude {
            zeros: prototype.zeros_rad.iter().map(|z| 1.0 / (z * z)).collect(),
            pairs: prototype.poles.iter().map(|p| (p.squared_magnitude(), 4.0 * p.re * p.re)).collect(),
            real: prototype.real_pole.map(|p| p * p),
            dc_power: prototype.dc_gain * prototype.dc_gain,
        }
    }

    fn power(&self, w: f64) -> f64 {
        let square = w * w;
        let mut power = self.dc_power;
        for (index, &(radius, damping)) in self.pairs.iter().enumerate() {
            let numerator = self.zeros.get(index).map_or(1.0, |zero| {
                let distance = 1.0 - square * zero;
                distance * distance
            });
            let distance = radius - square;
            power *= numerator * (radius * radius) / (distance * distance + damping * square);
        }
        self.real.map_or(power, |real| power * real / (real + square))
    }
}

/// Where the prototype's frequencies lie.
#[derive(Clone, Copy, Debug)]
enum Map {
    Lowpass { edge: f64 },
    Highpass { edge: f64 },
    Bandpass { square: f64, width: f64 },
    Bandstop { square: f64, width: f64 },
}

/// Family, order, ripple and stop attenuation.
type Kind = (Family, u32, Option<f64>, Option<f64>);

/// Prototypes that each thread remembers: those of a cascade while one figure after another is
/// turned.
const REMEMBERED: usize = 32;

thread_local! {
    static LATEST: RefCell<VecDeque<(Kind, Magnitude)>> = const { RefCell::new(VecDeque::new()) };
}

/// The magnitude of a prototype; `None` where there is none of this kind.
fn magnitude(kind: Kind) -> Option<Magnitude> {
    LATEST.with_borrow_mut(|latest| {
        if let Some((_, magnitude)) = latest.iter().find(|(own, _)| *own == kind) {
            return Some(magnitude.clone());
        }
        let made = prototype::approximate(kind.0, kind.1, kind.2, kind.3).ok()?;
        let magnitude = Magnitude::new(&made);
        latest.truncate(REMEMBERED - 1);
        latest.push_front((kind, magnitude.clone()));
        Some(magnitude)
    })
}

/// The attenuation of one pass.
#[derive(Clone, Debug)]
pub enum Curve {
    /// A prototype.
    Filter(Box<FilterCurve>),
    /// A notch: W0^2 and B^2.
    Notch {
        /// W0^2.
        square: f64,
        /// B^2.
        width_square: f64,
    },
}

/// A prototype and how its frequencies map.
#[derive(Clone, Debug)]
pub struct FilterCurve {
    magnitude: Magnitude,
    map: Map,
}

impl Curve {
    /// The curve of a recipe at `rate_hz`; `None` where there is no such filter.
    pub fn new(recipe: &Recipe, rate_hz: f64) -> Option<Curve> {
        let inside = |hz: f64| hz > 0.0 && hz < rate_hz / 2.0;
        match recipe {
            Recipe::Notch { center_hz, width_hz } => {
                if !(inside(*center_hz) && inside(*width_hz)) {
                    return None;
                }
                let square = prewarp(*center_hz, rate_hz) * prewarp(*center_hz, rate_hz);
                let width = (1.0 + square) * prewarp(*width_hz, rate_hz);
                Some(Curve::Notch { square, width_square: width * width })
            }
            Recipe::Filter(filter) => {
                let map = map(filter, rate_hz)?;
                let kind: Kind = (filter.family, filter.order, filter.ripple_db, filter.stop_db);
                Some(Curve::Filter(Box::new(FilterCurve { magnitude: magnitude(kind)?, map })))
            }
            Recipe::Equalizer(_) | Recipe::Weighting(_) | Recipe::Digital(_) | Recipe::Analog(_) => None,
        }
    }

    /// Attenuation at W = `at`, dB.
    #[cfg(test)]
    fn attenuation_db(&self, at: f64) -> f64 {
        attenuation_db(self.power(at))
    }

    /// |H|^2 at W = `at`, at least 1e-40.
    pub fn power(&self, at: f64) -> f64 {
        let power = match self {
            Curve::Notch { square, width_square } => {
                let off = (square - at * at) * (square - at * at);
                off / (off + width_square * at * at)
            }
            Curve::Filter(filter) => {
                let w = match filter.map {
                    Map::Lowpass { edge } => at / edge,
                    Map::Highpass { edge } => edge / at,
                    Map::Bandpass { square, width } => (square - at * at) / (width * at),
                    Map::Bandstop { square, width } => width * at / (square - at * at),
                };
                filter.magnitude.power(w.abs().min(FARTHEST_RAD))
            }
        };
        power.max(DEEPEST_POWER)
    }
}

/// The attenuation of a power, dB.
pub fn attenuation_db(power: f64) -> f64 {
    -10.0 * libm::log10(power)
}

fn map(filter: &FilterRecipe, rate_hz: f64) -> Option<Map> {
    let inside = |hz: f64| hz > 0.0 && hz < rate_hz / 2.0;
    let edges = match *filter.edges_hz {
        [edge] if inside(edge) => Edges::one(edge, rate_hz),
        [low, high] if inside(low) && inside(high) && low < high => Edges::two(low, high, rate_hz),
        _ => return None,
    };
    match (filter.kind, edges) {
        (FilterKind::Lowpass, Edges::One(edge)) => Some(Map::Lowpass { edge }),
        (FilterKind::Highpass, Edges::One(edge)) => Some(Map::Highpass { edge }),
        (FilterKind::Bandpass, Edges::Two { center_square, width }) => {
            Some(Map::Bandpass { square: center_square, width })
        }
        (FilterKind::Bandstop, Edges::Two { center_square, width }) => {
            Some(Map::Bandstop { square: center_square, width })
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::response;
    use crate::design::sections::from_prototype;

    #[test]
    fn it_is_the_attenuation_of_the_finished_sections() {
        let rate_hz = 48_000.0;
        let cases = [
            (FilterKind::Highpass, Family::Elliptic, 7, vec![40.0]),
            (FilterKind::Lowpass, Family::Chebyshev1, 6, vec![9_000.0]),
            (FilterKind::Lowpass, Family::Chebyshev2, 5, vec![15_000.0]),
            (FilterKind::Bandstop, Family::Elliptic, 4, vec![400.0, 500.0]),
            (FilterKind::Bandpass, Family::Butterworth, 3, vec![400.0, 5_000.0]),
            (FilterKind::Bandstop, Family::Bessel, 1, vec![400.0, 500.0]),
        ];
        for (kind, family, order, edges_hz) in cases {
            let (ripple_db, stop_db) = (family.takes_ripple().then_some(0.1), family.takes_stop().then_some(50.0));
            let made = prototype::new(family, order, ripple_db, stop_db).unwrap();
            let sections = from_prototype(&made, kind, &edges_hz, rate_hz).unwrap();
            let recipe = Recipe::Filter(FilterRecipe { kind, family, order, edges_hz, ripple_db, stop_db });
            let curve = Curve::new(&recipe, rate_hz).unwrap();
            for hz in [11.0, 41.0, 390.0, 431.0, 520.0, 4_000.0, 9_100.0, 17_000.0, 23_000.0] {
                let exact_db = -response::gain_db(&sections, hz, rate_hz);
                let curve_db = curve.attenuation_db(prewarp(hz, rate_hz));
                // The sections' rounding at the lowest edges.
                assert!(
                    (exact_db - curve_db).abs() < 1e-6 + 1e-8 * exact_db,
                    "{kind:?} {family:?} {hz}: {exact_db} {curve_db}"
                );
            }
        }
    }
}
