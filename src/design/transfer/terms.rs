//! A transfer function as factors in powers of z^-1, in doubled precision.

use super::TransferError;
use super::factor::{Factor, factor, product};
use crate::design::double::Double;
use crate::spec::{Coefficient, Root, conjugates};

/// Highest degree of a polynomial.
pub(super) const HIGHEST: usize = 63;

/// Most roots of one kind.
const MOST_ROOTS: usize = 64;

/// c0 + c1 z^-1 + c2 z^-2.
pub(super) type Term = [Double; 3];

/// gain times the product of `zeros` over that of `poles`.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Terms {
    /// Numerators of degree 1 and 2, the latter with complex roots; a first coefficient of 0
    /// is a delay.
    pub zeros: Vec<Term>,
    /// Denominators likewise, with a first coefficient of 1.
    pub poles: Vec<Term>,
    /// The gain.
    pub gain: Gain,
}

/// mantissa 2^exponent, the mantissa's size from 1 to 2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Gain {
    pub mantissa: Double,
    pub exponent: i32,
}

impl Gain {
    pub fn new(value: Double) -> Gain {
        Gain { mantissa: value, exponent: 0 }.normalized()
    }

    pub fn times(self, value: Double) -> Gain {
        let value = Gain::new(value);
        Gain { mantissa: self.mantissa * value.mantissa, exponent: self.exponent.saturating_add(value.exponent) }
            .normalized()
    }

    pub fn over(self, value: Double) -> Gain {
        let value = Gain::new(value);
        Gain { mantissa: self.mantissa / value.mantissa, exponent: self.exponent.saturating_sub(value.exponent) }
            .normalized()
    }

    pub fn shifted(self, exponent: i32) -> Gain {
        Gain { exponent: self.exponent.saturating_add(exponent), ..self }
    }

    /// To the power of `power`, by repetition: at most 63 steps.
    pub fn power(self, power: i32) -> Gain {
        let mut result = Gain::new(Double::ONE);
        for _ in 0..power.abs() {
            result = if power > 0 { result.times(self.mantissa) } else { result.over(self.mantissa) };
        }
        result.shifted(self.exponent.saturating_mul(power))
    }

    fn normalized(self) -> Gain {
        if self.mantissa.is_zero() || !self.mantissa.is_finite() {
            return self;
        }
        // frexp gives 0.5 to 1.
        let exponent = libm::frexp(self.mantissa.hi).1 - 1;
        Gain { mantissa: self.mantissa.scaled(-exponent), exponent: self.exponent.saturating_add(exponent) }
    }
}

/// The values of coefficients and half a unit of their last digits.
pub(super) fn values(
    name: &'static str,
    coefficients: &[Coefficient],
) -> Result<(Vec<Double>, Vec<f64>), TransferError> {
    if coefficients.is_empty() {
        return Err(TransferError::Empty { what: name });
    }
    if coefficients.len() > HIGHEST + 1 {
        return Err(TransferError::Degree { what: name, degree: coefficients.len() - 1, highest: HIGHEST });
    }
    if let Some((i, bad)) = coefficients.iter().enumerate().find(|(_, c)| !c.value.is_finite()) {
        return Err(TransferError::NotFinite { what: format!("coefficient {} of {name}", i + 1), value: bad.value });
    }
    Ok((coefficients.iter().map(|c| Double::from(c.value)).collect(), coefficients.iter().map(half).collect()))
}

/// Half a unit of the last given digit; 0 for exact numbers.
pub(super) fn half(coefficient: &Coefficient) -> f64 {
    if coefficient.unit.is_finite() { coefficient.unit.abs() / 2.0 } else { 0.0 }
}

/// Roots as factors of x - root: conjugates put together, which within their digits are one
/// another's exactly.
pub(super) fn from_roots(what: &'static str, roots: &[Root]) -> Result<Vec<Factor>, TransferError> {
    let plural = if what == "zero" { "zeros" } else { "poles" };
    if roots.len() > MOST_ROOTS {
        return Err(TransferError::Degree { what: plural, degree: roots.len(), highest: MOST_ROOTS });
    }
    for (i, root) in roots.iter().enumerate() {
        if let Some(value) = [root.re.value, root.im.value].into_iter().find(|value| !value.is_finite()) {
            return Err(TransferError::NotFinite { what: format!("{what} {}", i + 1), value });
        }
    }
    let mut factors = Vec::new();
    for (index, (root, mate)) in roots.iter().zip(conjugates(roots)).enumerate() {
        match mate {
            None => {
                let (re, im) = (root.re.value, root.im.value);
                return Err(TransferError::Unpaired { what, index: index + 1, re, im });
            }
            Some(own) if own == index => factors.push(Factor::Linear(-Double::from(root.re.value))),
            Some(mate) if mate > index => {
                let other = roots[mate];
                let re = between(root.re, other.re.value, other.re.unit);
                let im = between(root.im, -other.im.value, other.im.unit);
                factors.push(Factor::Quadratic(-re.scaled(1), re * re + im * im));
            }
            Some(_) => {}
        }
    }
    Ok(factors)
}

/// The finer given of two, or their mean.
fn between(one: Coefficient, other: f64, other_unit: f64) -> Double {
    if one.unit < other_unit {
        Double::from(one.value)
    } else if one.unit > other_unit {
        Double::from(other)
    } else {
        (Double::from(one.value) + Double::from(other)).scaled(-1)
    }
}

/// The factors of a polynomial in z whose coefficients are c, with what is left as the gain:
/// zeros at z = 1 and z = -1, however many, are found without rounding.
pub(super) fn numerator(
    name: &'static str,
    c: &[Double],
    halves: &[f64],
) -> Result<(Vec<Factor>, Double), TransferError> {
    let (mut factors, rest, rest_halves) = without_ends(c, halves);
    // All at -1: where the gain is largest it has all its digits.
    let gain = if rest.len() == 1 && factors.iter().all(|&f| f == Factor::Linear(Double::ONE)) {
        let sum = c.iter().fold(Double::ZERO, |sum, &c| sum + c);
        sum.scaled(1 - i32::try_from(c.len()).unwrap_or(0))
    } else {
        rest[0]
    };
    factors.extend(factor(name, &rest, &rest_halves)?);
    Ok((factors, gain))
}

/// Takes out the roots at 1 and -1 that the coefficients have within the rounding of f64.
fn without_ends(c: &[Double], halves: &[f64]) -> (Vec<Factor>, Vec<Double>, Vec<f64>) {
    let total: f64 = c.iter().map(|c| c.hi.abs()).sum();
    let mut most = usize::MAX;
    loop {
        let (mut factors, mut rest) = (Vec::new(), c.to_vec());
        for root in [1.0, -1.0] {
            let count = multiplicity(&rest, root).min(most - factors.len().min(most));
            for _ in 0..count {
                rest = divided(&rest, root).0;
                factors.push(Factor::Linear(Double::from(-root)));
            }
        }
        if factors.is_empty() {
            return (factors, rest, halves.to_vec());
        }
        mirror(c, &mut rest);
        let back = factors.iter().fold(rest.clone(), |back, f| match f {
            Factor::Linear(c) => product(&back, &[Double::ONE, *c]),
            Factor::Quadratic(..) => back,
        });
        let fits = |i: usize| (back[i] - c[i]).hi.abs() <= halves[i].max(2.0 * f64::EPSILON * total);
        if (0..c.len()).all(fits) {
            // What is left was computed, not given: it counts as exact.
            let exact = vec![0.0; rest.len()];
            return (factors, rest, exact);
        }
        most = factors.len() - 1;
    }
}

/// A polynomial that reads the same from both ends, but for the sign, leaves such a one: its
/// roots stay on the unit circle.
fn mirror(c: &[Double], rest: &mut [Double]) {
    let reads = |sign: f64| c.iter().zip(c.iter().rev()).all(|(a, b)| a.hi == sign * b.hi);
    if !(reads(1.0) || reads(-1.0)) {
        return;
    }
    let last = rest.len() - 1;
    let sign = if rest[0].hi * rest[last].hi < 0.0 { -1.0 } else { 1.0 };
    for i in 0..=last / 2 {
        let mean = (rest[i] + rest[last - i] * sign).scaled(-1);
        rest[i] = mean;
        rest[last - i] = mean * sign;
    }
}

/// How often `root` (1 or -1) is a root within the rounding of the coefficients: the Taylor
/// coefficients there are no larger than half a unit in the last place of each coefficient
/// can make them.
fn multiplicity(c: &[Double], root: f64) -> usize {
    let (mut rest, mut sizes) = (c.to_vec(), c.iter().map(|c| c.abs()).collect::<Vec<_>>());
    let mut count = 0;
    while rest.len() > 1 {
        let (quotient, remainder) = divided(&rest, root);
        let (size_quotient, size) = divided(&sizes, 1.0);
        if remainder.hi.abs() > f64::EPSILON / 2.0 * size.hi {
            break;
        }
        (rest, sizes) = (quotient, size_quotient);
        count += 1;
    }
    count
}

/// Quotient and remainder of the division by t - `root`.
fn divided(c: &[Double], root: f64) -> (Vec<Double>, Double) {
    let mut carry = Double::ZERO;
    let mut quotient: Vec<Double> = c
        .iter()
        .map(|&c| {
            carry = carry * root + c;
            carry
        })
        .collect();
    let remainder = quotient.pop().unwrap_or(Double::ZERO);
    (quotient, remainder)
}
