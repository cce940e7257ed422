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
//!   them). The section whose zeros feel rounding least has the fraction, computed from
//!   all the rounded coefficients, so that the gain at the reference frequency is exact.

use super::pairing::Unit;
use crate::design::bilinear;
use crate::design::response::{Point, power_at};
use crate::design::transform::{Analog, Poles, Reference};
use crate::section::Section;

/// How far a section's gain may move for the sake of its zeros where the fitted one
/// makes up for it.
const FREE_LEEWAY: f64 = 1e-3;
/// The same for the fitted section: 2e-7 dB. What is needed is 1e-9 at 20 Hz and
/// 384 kHz, and falls with the square of the frequency.
const FITTED_LEEWAY: f64 = 2e-8;

/// The sections of one stage in the order they run.
pub(super) fn arrange(units: &[Unit], analog: &Analog) -> Vec<Section> {
    let reference = point_at(analog.reference);
    let points = grid(units, analog.reference);
    let candidates: Vec<Candidate> = units.iter().map(|unit| Candidate::new(unit, &points)).collect();
    let Order { candidates, peaks } = order(candidates);

    let at_reference: f64 = candidates.iter().map(|c| log2_power(c.b, c.a, &reference)).sum();
    let whole_gain = libm::log2(analog.reference_gain) - at_reference / 2.0;
    let fraction = whole_gain - libm::floor(whole_gain);
    let ease = |c: &Candidate| bilinear::distance_from_ends(c.unit.zeros);
    let fitted = (0..candidates.len()).max_by(|&i, &j| ease(&candidates[i]).total_cmp(&ease(&candidates[j])));

    // log2 of the gain up to each cut: whole numbers, plus the fraction from the fitted
    // section on.
    let mut sections = Vec::with_capacity(candidates.len());
    let mut exponent_so_far = 0.0;
    for (i, Candidate { unit, a, .. }) in candidates.iter().enumerate() {
        let after_fitted = fitted.is_some_and(|fitted| i >= fitted);
        let highest = whole_gain + (peaks[candidates.len() - 1] - peaks[i]) / 2.0;
        // The slack keeps the last section, where the two are equal, from falling a
        // step short by rounding.
        let exponent = libm::floor(highest - if after_fitted { fraction } else { 0.0 } + 1e-9);
        let gain = libm::exp2(exponent - exponent_so_far);
        exponent_so_far = exponent;
        let b = bilinear::numerator(unit.zeros, unit.poles, gain, FREE_LEEWAY);
        sections.push(Section { b, a: *a });
    }

    let power: f64 = sections.iter().map(|s| power_at(s.b, s.a, &reference)).product();
    if let Some(i) = fitted {
        let gain = sections[i].b[0] * analog.reference_gain / libm::sqrt(power);
        let Unit { zeros, poles } = candidates[i].unit;
        sections[i].b = bilinear::numerator(zeros, poles, gain, FITTED_LEEWAY);
    }
    sections
}

/// Sections in the order they run.
struct Order {
    candidates: Vec<Candidate>,
    /// log2 of the largest |H|^2 of the product up to each, with their gains as they
    /// come.
    peaks: Vec<f64>,
}

fn order(mut left: Vec<Candidate>) -> Order {
    let mut rest = sum(&left);
    let mut before = vec![0.0; rest.len()];
    let mut done = Order { candidates: Vec::with_capacity(left.len()), peaks: Vec::with_capacity(left.len()) };
    while let Some(next) = best(&left, &before, &rest) {
        let candidate = left.remove(next);
        for ((before, rest), own) in before.iter_mut().zip(&mut rest).zip(&candidate.log2_power) {
            *before += own;
            *rest -= own;
        }
        done.peaks.push(peak(&before));
        done.candidates.push(candidate);
    }
    done
}

/// A section that has no place yet.
struct Candidate {
    unit: Unit,
    b: [f64; 3],
    a: [f64; 3],
    /// log2 |H|^2 on the grid.
    log2_power: Vec<f64>,
}

impl Candidate {
    fn new(unit: &Unit, points: &[Point]) -> Candidate {
        let b = bilinear::numerator(unit.zeros, unit.poles, 1.0, FREE_LEEWAY);
        let a = bilinear::denominator(unit.poles);
        Candidate { unit: *unit, b, a, log2_power: points.iter().map(|point| log2_power(b, a, point)).collect() }
    }
}

/// Index of the section that should run next; `None` when none is left. `rest` is the
/// sum of all that are left.
fn best(left: &[Candidate], before: &[f64], rest: &[f64]) -> Option<usize> {
    let cost = |candidate: &Candidate| {
        let (mut front, mut back) = (f64::NEG_INFINITY, f64::NEG_INFINITY);
        for ((before, rest), own) in before.iter().zip(rest).zip(&candidate.log2_power) {
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
            Poles::Two { product, .. } => libm::sqrt(product),
            Poles::One { pole } => -pole,
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
            let w = libm::sqrt(product);
            let damping = -half_sum / w;
            if damping < 0.1 {
                warped.extend([-1.0, -0.5, 0.5, 1.0].map(|side| w * (1.0 + side * damping)));
            }
        }
    }
    let mut points: Vec<Point> = warped.into_iter().map(|w| point_at(Reference::At(w))).collect();
    points.extend([Reference::Dc, Reference::HalfRate, reference].map(point_at));
    points
}

fn point_at(reference: Reference) -> Point {
    match reference {
        Reference::Dc => Point::from_half_angle(0.0, 1.0),
        Reference::HalfRate => Point::from_half_angle(1.0, 0.0),
        Reference::At(w) => {
            let secant = libm::hypot(1.0, w);
            Point::from_half_angle(w / secant, 1.0 / secant)
        }
    }
}

/// log2 |B/A|^2; far below anything that matters, but finite, at a zero.
fn log2_power(b: [f64; 3], a: [f64; 3], point: &Point) -> f64 {
    libm::log2(power_at(b, a, point)).max(-2000.0)
}

fn sum(candidates: &[Candidate]) -> Vec<f64> {
    let points = candidates.first().map_or(0, |c| c.log2_power.len());
    (0..points).map(|i| candidates.iter().map(|c| c.log2_power[i]).sum()).collect()
}

fn peak(values: &[f64]) -> f64 {
    values.iter().copied().fold(f64::NEG_INFINITY, f64::max)
}
