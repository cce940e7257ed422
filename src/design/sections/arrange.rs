//! The order of a stage's sections and the gain of each.
//!
//! What rounding and overload see of a cascade is, for every cut between two sections,
//! the largest gain of the part before it and of the part after it. Their product does
//! not depend on how the gain is spread, so:
//!
//! * Order: from the front, always the section that makes (largest gain before the
//!   cut) times (largest gain after it) least. Lightly damped poles end up beside the
//!   sections that flatten them.
//! * Gain: every part before a cut gets the largest gain, in steps of 2, at which it
//!   does not exceed the whole on a grid of frequencies (by less than 1 dB between
//!   them). The section whose zeros feel rounding least has the fraction.
//!
//! Then the coefficients are rounded in several ways, and of these the one stays whose
//! response is nearest the exact one: as a rule coefficients together, and the fraction
//! so that the gain of the rounded sections is exact at the reference frequency.

use super::coefficients::{self, Rounding};
use super::pairing::Unit;
use super::plain;
use crate::design::bilinear::{self, Quadratics};
use crate::design::double::Double;
use crate::design::response::{Point, power_at};
use crate::design::rounding::{Rounded, Sensitivity};
use crate::design::transform::{Analog, Poles, Reference};
use crate::section::Section;

/// Where the gain of the whole is that of the exact filter.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Fit {
    /// At the reference, as the rounded sections come out.
    AtReference,
    /// At frequencies that the rounding of poles and zeros does not reach.
    Elsewhere,
}

/// How coefficients are rounded and the gain is set.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Way {
    rounding: Rounding,
    fit: Fit,
    /// Whether the fitted section's gain may move for the sake of its zeros.
    leeway: bool,
}

impl Way {
    /// All, in the order they are tried.
    fn all() -> impl Iterator<Item = Way> {
        let fits = [Rounding::Together, Rounding::Each]
            .into_iter()
            .flat_map(|rounding| [Fit::AtReference, Fit::Elsewhere].map(|fit| (rounding, fit)));
        fits.flat_map(|(rounding, fit)| [true, false].map(|leeway| Way { rounding, fit, leeway }))
    }
}

/// Down to this level, dB, the error counts by which a way is chosen.
const DEEPEST_DB: f64 = -120.0;

/// A later way must have an error this much smaller than the best before it.
const MUST_GAIN: f64 = 0.7;

/// The sections of one stage in the order they run.
pub(super) fn arrange(units: &[Unit], analog: &Analog) -> Vec<Rounded> {
    let points = grid(units, analog.reference);
    let candidates: Vec<Candidate> = units.iter().map(|unit| Candidate::new(unit, &points)).collect();
    let Order { indices, peaks } = order(candidates.iter().map(|c| c.log2_power.clone()).collect());
    let candidates: Vec<&Candidate> = indices.iter().map(|&index| &candidates[index]).collect();
    let draft = Draft::new(&candidates, &peaks, analog);
    let (mut best, mut least_db) = (Vec::new(), f64::INFINITY);
    let mut sensitivity = None;
    for way in Way::all() {
        let sections = draft.rounded(way);
        let error_db =
            sensitivity.get_or_insert_with(|| Sensitivity::new(&plain(&sections), DEEPEST_DB)).largest(&sections).db;
        if error_db < MUST_GAIN * least_db {
            (best, least_db) = (sections, error_db);
        }
    }
    best
}

/// Everything about the sections of a stage but the rounding of their coefficients.
struct Draft {
    quadratics: Vec<Quadratics>,
    /// Gain of each, a power of two but for the fitted one.
    gains: Vec<f64>,
    /// Which section sets the gain of the whole.
    fitted: Option<usize>,
    reference: [Double; 2],
    reference_gain: Double,
    /// Product of the gains of all sections without rounding.
    whole_gain: Double,
}

impl Draft {
    fn new(candidates: &[&Candidate], peaks: &[f64], analog: &Analog) -> Draft {
        let quadratics: Vec<Quadratics> = candidates.iter().map(|c| c.quadratics).collect();
        let reference = cos_sin(analog.reference);
        let at_reference = quadratics.iter().fold(Double::ONE, |product, q| {
            product * magnitude([Double::ONE, q.a[0], q.a[1]], reference)
                / magnitude([Double::ONE, q.b[0], q.b[1]], reference)
        });
        let whole_gain = analog.reference_gain * at_reference;
        let ease = |c: &Candidate| bilinear::distance_from_ends(c.unit.zeros);
        let fitted = (0..candidates.len()).max_by(|&i, &j| ease(candidates[i]).total_cmp(&ease(candidates[j])));
        let exponents = exponents(peaks, libm::log2(whole_gain.hi), fitted);
        let gains = exponents.into_iter().map(libm::exp2).collect();
        Draft { quadratics, gains, fitted, reference, reference_gain: analog.reference_gain, whole_gain }
    }

    fn rounded(&self, Way { rounding, fit, leeway }: Way) -> Vec<Rounded> {
        let mut sections: Vec<Section> = self
            .quadratics
            .iter()
            .zip(&self.gains)
            .map(|(q, &gain)| Section {
                b: coefficients::numerator(q.b, gain, rounding),
                a: coefficients::denominator(q.a, rounding),
            })
            .collect();
        let others = |sections: &[Section]| {
            let others = sections.iter().enumerate().filter(|(i, _)| Some(*i) != self.fitted);
            others.fold(Double::ONE, |product, (_, section)| product * section.b[0])
        };
        let exact_gain = self.whole_gain / others(&sections);
        if let Some(fitted) = self.fitted {
            let gain = match fit {
                Fit::Elsewhere => exact_gain,
                Fit::AtReference => {
                    let at_reference = sections.iter().fold(Double::ONE, |product, section| {
                        product * magnitude(section.b.map(Double::from), self.reference)
                            / magnitude(section.a.map(Double::from), self.reference)
                    });
                    self.reference_gain / at_reference * sections[fitted].b[0]
                }
            };
            sections[fitted].b = coefficients::fitted_numerator(self.quadratics[fitted].b, gain, leeway);
        }
        let with_rest = |(i, section): (usize, Section)| {
            let q = &self.quadratics[i];
            let gain = if Some(i) == self.fitted { exact_gain } else { section.b[0].into() };
            Rounded::of([[gain, gain * q.b[0], gain * q.b[1]], [Double::ONE, q.a[0], q.a[1]]], section)
        };
        sections.into_iter().enumerate().map(with_rest).collect()
    }
}

/// cos w and sin w of a reference.
fn cos_sin(reference: Reference) -> [Double; 2] {
    match reference {
        Reference::Dc => [Double::ONE, Double::ZERO],
        Reference::HalfRate => [-Double::ONE, Double::ZERO],
        Reference::At(w) => {
            let secant_square = w.square() + 1.0;
            [(1.0 - w.square()) / secant_square, w * 2.0 / secant_square]
        }
    }
}

/// |p0 + p1 z^-1 + p2 z^-2|.
fn magnitude([p0, p1, p2]: [Double; 3], [cos, sin]: [Double; 2]) -> Double {
    (((p0 + p2) * cos + p1).square() + ((p0 - p2) * sin).square()).sqrt()
}

/// log2 of the gain of each section in the order they run: whole numbers, of which the part
/// up to each cut has the largest at which it does not exceed the whole. `peaks` are those of
/// [`Order`], `whole_gain` is log2 of the gain of all together, whose fraction the section
/// `fitted` has on top.
pub(in crate::design) fn exponents(peaks: &[f64], whole_gain: f64, fitted: Option<usize>) -> Vec<f64> {
    let fraction = whole_gain - libm::floor(whole_gain);
    let last = peaks.last().copied().unwrap_or(0.0);
    let mut exponent_so_far = 0.0;
    let each = peaks.iter().enumerate().map(|(i, peak)| {
        let after_fitted = fitted.is_some_and(|fitted| i >= fitted);
        let highest = whole_gain + (last - peak) / 2.0;
        // The slack keeps the last section, where the two are equal, from falling a
        // step short by rounding.
        let exponent = libm::floor(highest - if after_fitted { fraction } else { 0.0 } + 1e-9);
        let own = exponent - exponent_so_far;
        exponent_so_far = exponent;
        own
    });
    each.collect()
}

/// The order in which sections run.
pub(in crate::design) struct Order {
    /// Their indices.
    pub indices: Vec<usize>,
    /// log2 of the largest |H|^2 of the product up to each, with their gains as they
    /// come.
    pub peaks: Vec<f64>,
}

/// The order of sections whose log2 |H|^2 on one grid of frequencies is given.
pub(in crate::design) fn order(log2_powers: Vec<Vec<f64>>) -> Order {
    let mut rest = sum(&log2_powers);
    let mut before = vec![0.0; rest.len()];
    let mut left: Vec<(usize, Vec<f64>)> = log2_powers.into_iter().enumerate().collect();
    let mut done = Order { indices: Vec::with_capacity(left.len()), peaks: Vec::with_capacity(left.len()) };
    while let Some(next) = best(&left, &before, &rest) {
        let (index, log2_power) = left.remove(next);
        for ((before, rest), own) in before.iter_mut().zip(&mut rest).zip(&log2_power) {
            *before += own;
            *rest -= own;
        }
        done.peaks.push(peak(&before));
        done.indices.push(index);
    }
    done
}

/// A section that has no place yet.
struct Candidate {
    unit: Unit,
    quadratics: Quadratics,
    /// log2 |H|^2 on the grid.
    log2_power: Vec<f64>,
}

impl Candidate {
    fn new(unit: &Unit, points: &[Point]) -> Candidate {
        let quadratics = bilinear::quadratics(unit.zeros, unit.poles);
        let b = coefficients::numerator(quadratics.b, 1.0, Rounding::Together);
        let a = coefficients::denominator(quadratics.a, Rounding::Together);
        let log2_power = points.iter().map(|point| log2_power(b, a, point)).collect();
        Candidate { unit: *unit, quadratics, log2_power }
    }
}

/// Index of the section that should run next; `None` when none is left. `rest` is the
/// sum of all that are left.
fn best(left: &[(usize, Vec<f64>)], before: &[f64], rest: &[f64]) -> Option<usize> {
    let cost = |(_, log2_power): &(usize, Vec<f64>)| {
        let (mut front, mut back) = (f64::NEG_INFINITY, f64::NEG_INFINITY);
        for ((before, rest), own) in before.iter().zip(rest).zip(log2_power) {
            front = front.max(before + own);
            back = back.max(rest - own);
        }
        front + back
    };
    let costs: Vec<f64> = left.iter().map(cost).collect();
    (0..left.len()).min_by(|&a, &b| costs[a].total_cmp(&costs[b]))
}

/// How far beyond the outermost poles to look.
const BEYOND: [f64; 9] = [1.04, 1.08, 1.14, 1.22, 1.33, 1.5, 1.8, 2.5, 4.0];

/// Where partial products may peak: at the poles' frequencies, between and beyond them,
/// at both ends and at the reference.
fn grid(units: &[Unit], reference: Reference) -> Vec<Point> {
    let mut warped: Vec<f64> = units
        .iter()
        .map(|unit| match unit.poles {
            Poles::Two { product, .. } => libm::sqrt(product.hi),
            Poles::One { pole } => -pole.hi,
        })
        .collect();
    warped.sort_by(f64::total_cmp);
    let mut between = Vec::new();
    for pair in warped.windows(2) {
        // Steps of 1.12, but no more than 8 a gap.
        let log_ratio = libm::log(pair[1] / pair[0]);
        let steps = libm::ceil(log_ratio / 0.11).clamp(1.0, 8.0);
        let step = libm::exp(log_ratio / steps);
        let mut w = pair[0] * step;
        while w < pair[1] * 0.999 {
            between.push(w);
            w *= step;
        }
    }
    if let (Some(&lowest), Some(&highest)) = (warped.first(), warped.last()) {
        warped.extend(BEYOND.map(|ratio| highest * ratio));
        warped.extend(BEYOND.map(|ratio| lowest / ratio));
    }
    warped.extend(between);
    for unit in units {
        // Zeros close by push the peak of a pole pair aside by about its half width.
        if let Poles::Two { half_sum, product } = unit.poles {
            let w = libm::sqrt(product.hi);
            let damping = -half_sum.hi / w;
            if damping < 0.1 {
                warped.extend([-1.0, -0.5, 0.5, 1.0].map(|side| w * (1.0 + side * damping)));
            }
        }
    }
    let mut points: Vec<Point> = warped.into_iter().map(|w| point_at(Reference::At(w.into()))).collect();
    points.extend([Reference::Dc, Reference::HalfRate, reference].map(point_at));
    points
}

fn point_at(reference: Reference) -> Point {
    match reference {
        Reference::Dc => Point::from_half_angle(0.0, 1.0),
        Reference::HalfRate => Point::from_half_angle(1.0, 0.0),
        Reference::At(w) => {
            let secant = libm::hypot(1.0, w.hi);
            Point::from_half_angle(w.hi / secant, 1.0 / secant)
        }
    }
}

/// log2 |B/A|^2; far below anything that matters, but finite, at a zero.
pub(in crate::design) fn log2_power(b: [f64; 3], a: [f64; 3], point: &Point) -> f64 {
    libm::log2(power_at(b, a, point)).max(-2000.0)
}

fn sum(log2_powers: &[Vec<f64>]) -> Vec<f64> {
    let points = log2_powers.first().map_or(0, Vec::len);
    (0..points).map(|i| log2_powers.iter().map(|log2_power| log2_power[i]).sum()).collect()
}

fn peak(values: &[f64]) -> f64 {
    values.iter().copied().fold(f64::NEG_INFINITY, f64::max)
}
