//! Roots that lie on top of one another.
//!
//! Arithmetic of any precision scatters a root of multiplicity m by the m-th root of its
//! rounding. But it is a simple root of the derivative of order m - 1, and from there it comes
//! with all digits (Z. Zeng, Math. Comp. 74, 2005, has the general theory). Whether such roots
//! are those of the polynomial, its backward error tells.

use super::factor::Factor;
use crate::design::double::{ComplexDouble, Double};
use num_complex::Complex64;

/// Newton's steps at most; each doubles the digits.
const STEPS: usize = 30;

/// A step below this part of the root is rounding.
const ROUNDING: f64 = 1e-31;

/// Factors of the monic `c` in which the `roots` that lie within `reach` (relative) of one
/// another are one root; `None` where they do not come in conjugates.
pub(super) fn gathered(roots: &[ComplexDouble], c: &[Double], reach: f64) -> Option<Vec<Factor>> {
    let is_real = |root: &ComplexDouble| root.im.hi.abs() <= reach * root.magnitude();
    let real: Vec<ComplexDouble> = roots.iter().copied().filter(is_real).collect();
    let upper: Vec<ComplexDouble> = roots.iter().copied().filter(|root| !is_real(root) && root.im.hi > 0.0).collect();
    if real.len() + 2 * upper.len() != roots.len() {
        return None;
    }
    let mut factors = Vec::new();
    for (center, count) in clusters(upper, reach) {
        let root = polished(center, count, c);
        let factor = Factor::Quadratic(-root.re.scaled(1), root.re * root.re + root.im * root.im);
        factors.extend(vec![factor; count]);
    }
    for (center, count) in clusters(real, reach) {
        let start = ComplexDouble { re: center.re, im: Double::ZERO };
        factors.extend(vec![Factor::Linear(-polished(start, count, c).re); count]);
    }
    Some(factors)
}

/// Centers and sizes of groups in which each root is within `reach` of another.
fn clusters(mut left: Vec<ComplexDouble>, reach: f64) -> Vec<(ComplexDouble, usize)> {
    let mut clusters = Vec::new();
    while let Some(first) = left.pop() {
        let mut members = vec![first];
        let mut looked_at = 0;
        while looked_at < members.len() {
            let here = members[looked_at];
            let near = |other: &ComplexDouble| {
                let apart = libm::hypot((other.re - here.re).hi, (other.im - here.im).hi);
                apart <= reach * here.magnitude()
            };
            let (close, far): (Vec<_>, Vec<_>) = left.into_iter().partition(near);
            members.extend(close);
            left = far;
            looked_at += 1;
        }
        let sum = members.iter().fold(ComplexDouble::ZERO, |sum, &root| sum + root);
        let share = Double::ONE / Double::from(members.len() as f64);
        clusters.push((sum.times(share), members.len()));
    }
    clusters
}

/// The root of the derivative of order `count` - 1 next to `start`.
fn polished(start: ComplexDouble, count: usize, c: &[Double]) -> ComplexDouble {
    let mut derivative = c.to_vec();
    for _ in 1..count {
        let degree = derivative.len() - 1;
        derivative.truncate(degree);
        for (i, c) in derivative.iter_mut().enumerate() {
            *c = *c * (degree - i) as f64;
        }
    }
    let mut root = start;
    for _ in 0..STEPS {
        let (mut value, mut slope) = (ComplexDouble::ZERO, ComplexDouble::ZERO);
        for &c in &derivative {
            slope = slope * root + value;
            value = value * root + ComplexDouble { re: c, im: Double::ZERO };
        }
        let step = Complex64::new(value.re.hi, value.im.hi) / Complex64::new(slope.re.hi, slope.im.hi);
        if !(step.re.is_finite() && step.im.is_finite()) {
            break;
        }
        root = root + ComplexDouble::new(-step.re, -step.im);
        if libm::hypot(step.re, step.im) <= ROUNDING * root.magnitude() {
            break;
        }
    }
    root
}
