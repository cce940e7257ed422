//! All roots of a real polynomial at once, as starting points for real factors.
//!
//! Method of Ehrlich and Aberth (L. W. Ehrlich, Comm. ACM 10, 1967; O. Aberth, Math. Comp.
//! 27, 1973), the polynomial evaluated in doubled precision, from starting points on circles
//! whose radii are those of the Newton polygon (D. A. Bini, Numer. Algorithms 13, 1996).

use crate::design::double::{ComplexDouble, Double};
use core::f64::consts::TAU;
use num_complex::Complex64;

/// Passes over all roots at most; 20 to 60 are usual, multiple roots take the most.
const SWEEPS: usize = 250;

/// A value of the polynomial below this part of the sum of its terms is rounding.
const ROUNDING: f64 = 1e-30;

/// The roots of the monic c\[0\] t^n + ... + c\[n\], c\[0\] = 1, c\[n\] not 0; finite coefficients.
pub(super) fn roots(c: &[Double]) -> Vec<ComplexDouble> {
    let mut roots = starts(c);
    let mut settled = vec![false; roots.len()];
    for _ in 0..SWEEPS {
        for i in 0..roots.len() {
            if settled[i] {
                continue;
            }
            let Some(newton) = correction(c, roots[i]) else {
                settled[i] = true;
                continue;
            };
            let mut repulsion = Complex64::new(0.0, 0.0);
            for (j, other) in roots.iter().enumerate() {
                let apart = Complex64::new((roots[i].re - other.re).hi, (roots[i].im - other.im).hi);
                if j != i && apart != Complex64::new(0.0, 0.0) {
                    repulsion += 1.0 / apart;
                }
            }
            let step = newton / (Complex64::new(1.0, 0.0) - newton * repulsion);
            if !(step.re.is_finite() && step.im.is_finite()) {
                settled[i] = true;
                continue;
            }
            roots[i] = roots[i] + ComplexDouble::new(-step.re, -step.im);
            settled[i] = libm::hypot(step.re, step.im) <= ROUNDING * roots[i].magnitude();
        }
        if settled.iter().all(|&settled| settled) {
            break;
        }
    }
    roots
}

/// p/p' at `t`; `None` where p is nothing but rounding.
fn correction(c: &[Double], t: ComplexDouble) -> Option<Complex64> {
    let inside = t.magnitude() <= 1.0;
    // Outside the unit circle in powers of 1/t, which can't overflow.
    let x = if inside { t } else { t.reciprocal() };
    let size = x.magnitude();
    let (mut value, mut slope, mut terms) = (ComplexDouble::ZERO, ComplexDouble::ZERO, 0.0);
    let mut add = |coefficient: &Double| {
        slope = slope * x + value;
        value = value * x + ComplexDouble { re: *coefficient, im: Double::ZERO };
        terms = terms * size + coefficient.hi.abs();
    };
    if inside {
        c.iter().for_each(&mut add);
    } else {
        c.iter().rev().for_each(&mut add);
    }
    if value.magnitude() <= ROUNDING * terms {
        return None;
    }
    let (value, slope) = (single(value), single(slope));
    let x = single(x);
    Some(if inside {
        value / slope
    } else {
        let degree = (c.len() - 1) as f64;
        1.0 / (x * (Complex64::new(degree, 0.0) - x * slope / value))
    })
}

fn single(z: ComplexDouble) -> Complex64 {
    Complex64::new(z.re.hi, z.im.hi)
}

/// One starting point a root.
fn starts(c: &[Double]) -> Vec<ComplexDouble> {
    let degree = c.len() - 1;
    // log2 |coefficient of t^power|.
    let log2 = |power: usize| {
        let coefficient = c[degree - power].hi.abs();
        if coefficient == 0.0 { f64::NEG_INFINITY } else { libm::log2(coefficient) }
    };
    // Upper hull of the points (power, log2), from the left.
    let mut hull = vec![0];
    let mut from = 0;
    while from < degree {
        let slope = |to: usize| (log2(to) - log2(from)) / (to - from) as f64;
        // The farthest of the steepest.
        let steepest = (from + 1..=degree).max_by(|&a, &b| slope(a).total_cmp(&slope(b))).unwrap_or(degree);
        hull.push(steepest);
        from = steepest;
    }
    let mut starts = Vec::with_capacity(degree);
    for (number, edge) in hull.windows(2).enumerate() {
        let count = edge[1] - edge[0];
        let radius = libm::exp2((log2(edge[0]) - log2(edge[1])) / count as f64);
        for k in 0..count {
            // Turned off the axes, and from edge to edge, so that no symmetry holds roots apart.
            let angle = TAU * k as f64 / count as f64 + 0.7 + 0.9 * number as f64;
            starts.push(ComplexDouble::new(radius * libm::cos(angle), radius * libm::sin(angle)));
        }
    }
    starts
}
