//! Real zeros and poles that make up for what a design lacks.
//!
//! What the matched z transform leaves is a smooth function of x = sin^2(pi f / rate) whose
//! nearest singularity is its kink at half the rate, x = 1: a few real roots on the far side
//! of z = 0 come close to it. They are fitted to the gain in dB, at frequencies that crowd
//! towards the upper end as those of a Chebyshev interpolation do, by damped Gauss-Newton
//! steps (K. Levenberg, Quart. Appl. Math. 2, 1944; D. W. Marquardt, J. SIAM 11, 1963) on
//! the logarithms of the roots. So every root stays inside the unit circle, whatever
//! the steps do; their number is fixed.

use super::TOP;
use super::matched::square;
use core::f64::consts::{FRAC_PI_2, LN_10};

/// Real roots on the W axis with their signs turned: above 0, which is inside the unit
/// circle; 1 is z = 0.
#[derive(Clone, Debug, PartialEq)]
pub struct Roots {
    /// Zeros.
    pub zeros: Vec<f64>,
    /// Poles.
    pub poles: Vec<f64>,
}

/// Most roots that are fitted together.
const MOST: usize = 6;

/// Frequencies at which the gain is looked at: ten for each root.
const POINTS: u32 = 64;

/// Steps. From the starts that are used here all but flat valleys are found in 10.
const STEPS: u32 = 40;

/// Largest change of a root's logarithm in a step.
const LONGEST: f64 = 0.5;

/// Damping of the first step, and the least of all, in parts of the diagonal.
const DAMPING: (f64, f64) = (1e-3, 1e-14);

type Vector = [f64; MOST];

/// Moves the roots of `start` until their gain comes as near to `missing_db` (of a frequency
/// in Hz) as it does, up to [`TOP`] of the rate. Only the course of the two counts: both are
/// taken from their value at `anchor_hz`.
pub fn fit(start: Roots, missing_db: impl Fn(f64) -> f64, anchor_hz: f64, rate_hz: f64) -> Roots {
    let problem = Problem::new(&start, missing_db, anchor_hz, rate_hz);
    let mut logs = [0.0; MOST];
    for (log, root) in logs.iter_mut().zip(start.zeros.iter().chain(&start.poles)) {
        *log = libm::log(*root);
    }
    let (mut here, mut damping) = (problem.look(&logs), DAMPING.0);
    for _ in 0..STEPS {
        let step = here.step(damping, problem.signs.len());
        let mut tried = logs;
        for (log, change) in tried.iter_mut().zip(step) {
            *log += change.clamp(-LONGEST, LONGEST);
        }
        let there = problem.look(&tried);
        if there.cost < here.cost {
            (logs, here) = (tried, there);
            damping = (damping / 10.0).max(DAMPING.1);
        } else {
            damping *= 10.0;
        }
    }
    let mut roots = logs.iter().map(|&log| libm::exp(log));
    let zeros = roots.by_ref().take(start.zeros.len()).collect();
    Roots { zeros, poles: roots.take(start.poles.len()).collect() }
}

struct Problem {
    /// 1 for each zero, -1 for each pole.
    signs: Vec<f64>,
    /// tan^2(pi f / rate) at each frequency, and the gain in dB that is missing there.
    points: Vec<(f64, f64)>,
    /// tan^2(pi f / rate) of the anchor.
    anchor: f64,
}

/// Cost and its derivatives at one place.
struct View {
    /// Sum of the squares of what is still missing, dB^2.
    cost: f64,
    /// Half the slope of `-cost`.
    slope: Vector,
    /// Half of its curvature, the part that first derivatives make up.
    curvature: [Vector; MOST],
}

impl Problem {
    fn new(start: &Roots, missing_db: impl Fn(f64) -> f64, anchor_hz: f64, rate_hz: f64) -> Problem {
        let anchor_db = missing_db(anchor_hz);
        let point = |i: u32| {
            let hz = TOP * rate_hz * libm::sin(FRAC_PI_2 * (f64::from(i) + 0.5) / f64::from(POINTS));
            (square(hz, rate_hz), missing_db(hz) - anchor_db)
        };
        let signs = start.zeros.iter().map(|_| 1.0).chain(start.poles.iter().map(|_| -1.0));
        Problem {
            signs: signs.take(MOST).collect(),
            points: (0..POINTS).map(point).collect(),
            anchor: square(anchor_hz, rate_hz),
        }
    }

    fn look(&self, logs: &Vector) -> View {
        let anchor = self.gain(logs, self.anchor);
        let mut view = View { cost: 0.0, slope: [0.0; MOST], curvature: [[0.0; MOST]; MOST] };
        for &(square, wanted_db) in &self.points {
            let (gain_db, mut slopes) = self.gain(logs, square);
            let missing_db = wanted_db - (gain_db - anchor.0);
            for (slope, at_anchor) in slopes.iter_mut().zip(anchor.1) {
                *slope -= at_anchor;
            }
            view.cost += missing_db * missing_db;
            for (i, slope) in slopes.iter().enumerate() {
                view.slope[i] += slope * missing_db;
                for (j, other) in slopes.iter().enumerate() {
                    view.curvature[i][j] += slope * other;
                }
            }
        }
        view
    }

    /// Gain where W^2 = -`square`, dB, and its derivatives by the roots' logarithms.
    fn gain(&self, logs: &Vector, square: f64) -> (f64, Vector) {
        let (mut gain_db, mut slopes) = (0.0, [0.0; MOST]);
        for ((sign, log), slope) in self.signs.iter().zip(logs).zip(&mut slopes) {
            let root_square = libm::exp(2.0 * log);
            gain_db += sign * 10.0 * libm::log10((root_square + square) / (1.0 + square));
            *slope = sign * 20.0 / LN_10 * root_square / (root_square + square);
        }
        (gain_db, slopes)
    }
}

impl View {
    /// The solution of (curvature + damping diagonal) step = slope for the first `count`
    /// roots, by Cholesky's decomposition; nothing where that fails.
    fn step(&self, damping: f64, count: usize) -> Vector {
        let mut lower = [[0.0; MOST]; MOST];
        for i in 0..count {
            for j in 0..=i {
                let own = if i == j { 1.0 + damping } else { 1.0 };
                let known: f64 = (0..j).map(|k| lower[i][k] * lower[j][k]).sum();
                let rest = own * self.curvature[i][j] - known;
                lower[i][j] = if i == j { libm::sqrt(rest) } else { rest / lower[j][j] };
            }
            if lower[i][i].is_nan() || lower[i][i] <= 0.0 {
                return [0.0; MOST];
            }
        }
        let mut step = self.slope;
        for i in 0..count {
            let known: f64 = (0..i).map(|k| lower[i][k] * step[k]).sum();
            step[i] = (step[i] - known) / lower[i][i];
        }
        for i in (0..count).rev() {
            let known: f64 = (i + 1..count).map(|k| lower[k][i] * step[k]).sum();
            step[i] = (step[i] - known) / lower[i][i];
        }
        step
    }
}

#[cfg(test)]
mod tests {
    use super::super::matched::root_db;
    use super::*;

    /// Gain of roots at `hz`, dB.
    fn gain_db(roots: &Roots, hz: f64, rate_hz: f64) -> f64 {
        let of = |roots: &[f64]| roots.iter().map(|&root| root_db(root, square(hz, rate_hz))).sum::<f64>();
        of(&roots.zeros) - of(&roots.poles)
    }

    /// What can be reached exactly is: the roots that made the gain come out again. They
    /// stand apart, so that each is a well-posed unknown.
    #[test]
    fn roots_are_found_again_from_their_gain() {
        let made = Roots { zeros: vec![1.2, 3.0], poles: vec![0.4, 9.0] };
        let start = Roots { zeros: vec![1.0, 2.0], poles: vec![0.6, 4.0] };
        let found = fit(start, |hz| 7.0 + gain_db(&made, hz, 48_000.0), 1_000.0, 48_000.0);
        for (got, want) in found.zeros.iter().chain(&found.poles).zip(made.zeros.iter().chain(&made.poles)) {
            assert!((got / want - 1.0).abs() < 1e-9, "{found:?}");
        }
    }

    /// Nothing to fit, or nothing that can be fitted: the roots stay finite and inside.
    #[test]
    fn a_hopeless_fit_keeps_its_roots_inside() {
        let start = Roots { zeros: vec![1.0, 2.0], poles: vec![0.6, 4.0] };
        for missing_db in [|_: f64| 0.0, |hz: f64| 1e6 * libm::sin(hz), |_: f64| f64::NAN, |_: f64| f64::INFINITY] {
            let found = fit(start.clone(), missing_db, 1_000.0, 48_000.0);
            assert!(found.zeros.iter().chain(&found.poles).all(|root| root.is_finite() && *root > 0.0), "{found:?}");
        }
    }
}
