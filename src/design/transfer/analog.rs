//! Polynomials and roots in s, through the bilinear transform, to factors in powers of z^-1.
//!
//! ```text
//! s = K (1 - z^-1) / (1 + z^-1)      K = 2 rate                                without match_hz
//!                                    K = 2 pi match_hz / tan(pi match_hz/rate)  with it
//! ```
//!
//! for s in rad/s; over 2 pi where s is counted in Hz. At the frequency f the digital response
//! is that of the transfer function at s = j K tan(pi f/rate). With p = s/K a factor becomes
//!
//! ```text
//! p + c          (1 + c) - (1 - c) z^-1                           over 1 + z^-1
//! p^2 + u p + v  (1 + u + v) - 2 (1 - v) z^-1 + (1 - u + v) z^-2   over (1 + z^-1)^2
//! ```
//!
//! and zeros at infinity go to z = -1.

use super::TransferError;
use super::digital::{counted, whole_gain};
use super::factor::{Factor, factor};
use super::terms::{Gain, Term, Terms, from_roots, values};
use crate::design::double::Double;
use crate::design::transform::prewarp;
use crate::spec::{AnalogStage, Coefficient, Root, RootUnit, Transfer};
use core::f64::consts::{PI, TAU};

/// What s is in, and where the transform holds.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Scale {
    /// K in the unit of the roots.
    pub k: f64,
    /// rad/s in one unit of s.
    pub rad_a_unit: f64,
}

impl Scale {
    /// # Errors
    /// [`TransferError::MatchHz`].
    pub fn new(stage: &AnalogStage, rate_hz: f64) -> Result<Scale, TransferError> {
        // Polynomials are in rad/s whatever the unit of roots would be.
        let hertz = stage.unit == RootUnit::Hertz && matches!(stage.transfer, Transfer::Roots { .. });
        let rad_a_unit = if hertz { TAU } else { 1.0 };
        let Some(match_hz) = stage.match_hz else {
            return Ok(Scale { k: if hertz { rate_hz / PI } else { 2.0 * rate_hz }, rad_a_unit });
        };
        if !(match_hz > 0.0 && match_hz < rate_hz / 2.0) {
            return Err(TransferError::MatchHz { match_hz, rate_hz });
        }
        let k = match_hz / prewarp(match_hz, rate_hz);
        Ok(Scale { k: if hertz { k } else { TAU * k }, rad_a_unit })
    }
}

/// A polynomial in p = s/K, highest power first, with its last digits.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Scaled {
    pub c: Vec<Double>,
    /// Half units of the last given digits.
    pub halves: Vec<f64>,
    /// What all are to be multiplied by: 2 to this power.
    pub exponent: i32,
}

/// The polynomial without its leading zeros.
pub(super) fn scaled(name: &'static str, coefficients: &[Coefficient], scale: Scale) -> Result<Scaled, TransferError> {
    let (all, all_halves) = values(name, coefficients)?;
    let first = all.iter().position(|c| !c.is_zero()).unwrap_or(0);
    let (c, halves) = (&all[first..], &all_halves[first..]);
    let powers: Vec<Gain> = (0..c.len())
        .rev()
        .map(|power| Gain::new(Double::from(scale.k)).power(i32::try_from(power).unwrap_or(0)))
        .collect();
    let exponents = c.iter().zip(&powers).filter(|(c, _)| !c.is_zero());
    let exponent = exponents.map(|(c, power)| libm::frexp(c.hi).1.saturating_add(power.exponent)).max().unwrap_or(0);
    let shifts: Vec<i32> = powers.iter().map(|power| power.exponent.saturating_sub(exponent)).collect();
    let each = c.iter().zip(&powers).zip(&shifts);
    let c: Vec<Double> = each.map(|((&c, power), &shift)| c.scaled(shift) * power.mantissa).collect();
    if c.iter().zip(&all[first..]).any(|(scaled, given)| scaled.is_zero() && !given.is_zero()) {
        return Err(TransferError::Range { what: name });
    }
    let each = halves.iter().zip(&powers).zip(&shifts);
    let halves = each.map(|((&half, power), &shift)| libm::scalbn(half, shift) * power.mantissa.hi).collect();
    Ok(Scaled { c, halves, exponent })
}

/// Factors in p, as far as they are given, and the rest.
pub(super) struct Plane {
    zeros: Vec<Factor>,
    poles: Vec<Factor>,
    gain: Gain,
}

/// Factors of a transfer function in s; the poles may lie anywhere.
pub(super) fn plane(stage: &AnalogStage, scale: Scale) -> Result<Plane, TransferError> {
    match &stage.transfer {
        Transfer::Polynomials { numerator, denominator } => polynomials(numerator, denominator, scale),
        Transfer::Roots { zeros, poles, gain } => roots(zeros, poles, *gain, scale),
    }
}

fn polynomials(numerator: &[Coefficient], denominator: &[Coefficient], scale: Scale) -> Result<Plane, TransferError> {
    if denominator.first().is_some_and(|c| c.value == 0.0) {
        return Err(TransferError::ZeroLeading {
            what: "denominator".to_owned(),
            repair: "the highest power of s comes first; take leading zeros out",
        });
    }
    let n = scaled("numerator", numerator, scale)?;
    let d = scaled("denominator", denominator, scale)?;
    if n.c.iter().all(|c| c.is_zero()) {
        return Err(TransferError::AllZero { what: "numerator".to_owned() });
    }
    if n.c.len() > d.c.len() {
        return Err(TransferError::Improper {
            what: format!("the numerator has degree {} in s and the denominator {}", n.c.len() - 1, d.c.len() - 1),
            repair: "the gain would grow without end towards high frequencies; add poles above the frequencies that \
                     matter",
        });
    }
    Ok(Plane {
        zeros: factors("numerator", &n)?,
        poles: factors("denominator", &d)?,
        gain: Gain::new(n.c[0]).over(d.c[0]).shifted(n.exponent.saturating_sub(d.exponent)),
    })
}

/// Roots at 0 exactly, the others as they are found.
fn factors(name: &'static str, polynomial: &Scaled) -> Result<Vec<Factor>, TransferError> {
    let last = polynomial.c.iter().rposition(|c| !c.is_zero()).unwrap_or(0);
    let mut factors = factor(name, &polynomial.c[..=last], &polynomial.halves[..=last])?;
    factors.extend(vec![Factor::Linear(Double::ZERO); polynomial.c.len() - 1 - last]);
    Ok(factors)
}

fn roots(zeros: &[Root], poles: &[Root], gain: Coefficient, scale: Scale) -> Result<Plane, TransferError> {
    let zero_factors = from_roots("zero", zeros)?;
    let pole_factors = from_roots("pole", poles)?;
    let gain = whole_gain(gain)?;
    if zeros.len() > poles.len() {
        return Err(TransferError::Improper {
            what: format!("it has {} and {}", counted(zeros.len(), "zero"), counted(poles.len(), "pole")),
            repair: "the gain would grow without end towards high frequencies; add poles above the frequencies that \
                     matter",
        });
    }
    let k = Double::from(scale.k);
    let over_k = |factors: Vec<Factor>| {
        let each = factors.into_iter().map(|factor| match factor {
            Factor::Linear(c) => Factor::Linear(c / k),
            Factor::Quadratic(u, v) => Factor::Quadratic(u / k, v / k / k),
        });
        each.collect::<Vec<_>>()
    };
    let excess = i32::try_from(poles.len() - zeros.len()).unwrap_or(0);
    let powers = Gain::new(k).power(-excess);
    let gain = gain.times(powers.mantissa).shifted(powers.exponent);
    Ok(Plane { zeros: over_k(zero_factors), poles: over_k(pole_factors), gain })
}

impl Plane {
    /// In z, with a first coefficient of 1 in every denominator.
    pub fn terms(self) -> Result<Terms, TransferError> {
        let mut gain = self.gain;
        let split = |factors: Vec<Factor>| factors.into_iter().flat_map(Factor::split).collect::<Vec<_>>();
        let (zero_factors, pole_factors) = (split(self.zeros), split(self.poles));
        let degree = |factors: &[Factor]| factors.iter().map(|f| f.degree()).sum::<usize>();
        let at_infinity = degree(&pole_factors).saturating_sub(degree(&zero_factors));
        let mut zeros: Vec<Term> = zero_factors.into_iter().map(term).collect();
        zeros.extend(vec![[Double::ONE, Double::ONE, Double::ZERO]; at_infinity]);
        let mut poles = Vec::with_capacity(pole_factors.len());
        for factor in pole_factors {
            let [c0, c1, c2] = term(factor);
            gain = gain.over(c0);
            poles.push([Double::ONE, c1 / c0, c2 / c0]);
        }
        if poles.iter().flatten().any(|c| !c.is_finite()) {
            return Err(TransferError::Range { what: "denominator" });
        }
        Ok(Terms { zeros, poles, gain })
    }

    /// The pole farthest right of the imaginary axis or on it, as its real and imaginary part
    /// in rad/s; `None` where all are left of it.
    pub fn right(&self, scale: Scale) -> Option<(f64, f64)> {
        let all = self.poles.iter().flat_map(|factor| factor.split());
        let found = all.filter_map(|factor| match factor {
            Factor::Linear(c) => (c <= Double::ZERO).then_some((-c.hi, 0.0)),
            Factor::Quadratic(u, v) => (u <= Double::ZERO).then(|| {
                let re = -0.5 * u.hi;
                (re, libm::sqrt((v.hi - re * re).max(0.0)))
            }),
        });
        let rad = scale.k * scale.rad_a_unit;
        // + 0.0 for a pole at -0.
        found.max_by(|a, b| a.0.total_cmp(&b.0)).map(|(re, im)| (re * rad + 0.0, im * rad))
    }
}

/// A factor in p as a numerator or denominator in z^-1, without the powers of 1 + z^-1.
fn term(factor: Factor) -> Term {
    match factor {
        Factor::Linear(c) => [Double::ONE + c, c - Double::ONE, Double::ZERO],
        Factor::Quadratic(u, v) => {
            let even = Double::ONE + v;
            [even + u, (v - Double::ONE).scaled(1), even - u]
        }
    }
}
