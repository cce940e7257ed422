//! Polynomials and roots in z to factors in powers of z^-1.

use super::TransferError;
use super::factor::{Factor, factor};
use super::terms::{Gain, Term, Terms, from_roots, numerator, values};
use crate::design::double::Double;
use crate::spec::{Coefficient, Root, Transfer};
use core::f64::consts::TAU;

/// The delay z^-1.
const DELAY: Term = [Double::ZERO, Double::ONE, Double::ZERO];

/// Factors of a transfer function in z; the poles may lie anywhere.
pub(super) fn terms(transfer: &Transfer) -> Result<Terms, TransferError> {
    match transfer {
        Transfer::Polynomials { numerator, denominator } => polynomials(numerator, denominator),
        Transfer::Roots { zeros, poles, gain } => roots(zeros, poles, *gain),
    }
}

fn polynomials(numerators: &[Coefficient], denominators: &[Coefficient]) -> Result<Terms, TransferError> {
    let (b, b_halves) = values("numerator", numerators)?;
    let (a, a_halves) = values("denominator", denominators)?;
    if a[0].is_zero() {
        return Err(TransferError::ZeroLeading {
            what: "denominator".to_owned(),
            repair: "it belongs to the output sample itself; take leading zeros out of the denominator and as many \
                     samples of delay out of the numerator",
        });
    }
    let (Some(first), Some(last)) = (b.iter().position(|c| !c.is_zero()), b.iter().rposition(|c| !c.is_zero())) else {
        return Err(TransferError::AllZero { what: "numerator".to_owned() });
    };
    let poles_to = a.iter().rposition(|c| !c.is_zero()).unwrap_or(0);
    let poles = factor("denominator", &a[..=poles_to], &a_halves[..=poles_to])?;
    let (zeros, gain) = numerator("numerator", &b[first..=last], &b_halves[first..=last])?;
    let mut zeros: Vec<Term> = zeros.into_iter().flat_map(Factor::split).map(term).collect();
    zeros.extend(vec![DELAY; first]);
    Ok(Terms {
        zeros,
        poles: poles.into_iter().flat_map(Factor::split).map(term).collect(),
        gain: Gain::new(gain).over(a[0]),
    })
}

fn roots(zeros: &[Root], poles: &[Root], gain: Coefficient) -> Result<Terms, TransferError> {
    let zero_factors = from_roots("zero", zeros)?;
    let pole_factors = from_roots("pole", poles)?;
    let gain = whole_gain(gain)?;
    if zeros.len() > poles.len() {
        return Err(TransferError::Improper {
            what: format!("it has {} and {}", counted(zeros.len(), "zero"), counted(poles.len(), "pole")),
            repair: "the output would come before the input; add poles at 0, each of which delays by one sample",
        });
    }
    // Roots at 0 are whole powers of z^-1, which the delays below make up.
    let finite = |factors: Vec<Factor>| factors.into_iter().filter(|f| *f != Factor::Linear(Double::ZERO)).map(term);
    let mut zeros_of: Vec<Term> = finite(zero_factors).collect();
    zeros_of.extend(vec![DELAY; poles.len() - zeros.len()]);
    Ok(Terms { zeros: zeros_of, poles: finite(pole_factors).collect(), gain })
}

/// A gain that was given as such.
pub(super) fn whole_gain(gain: Coefficient) -> Result<Gain, TransferError> {
    if !gain.value.is_finite() {
        return Err(TransferError::NotFinite { what: "gain".to_owned(), value: gain.value });
    }
    if gain.value == 0.0 {
        return Err(TransferError::AllZero { what: "gain".to_owned() });
    }
    Ok(Gain::new(Double::from(gain.value)))
}

pub(super) fn counted(count: usize, what: &str) -> String {
    if count == 1 { format!("1 {what}") } else { format!("{count} {what}s") }
}

/// z + c and z^2 + u z + v over z and z^2.
fn term(factor: Factor) -> Term {
    match factor {
        Factor::Linear(c) => [Double::ONE, c, Double::ZERO],
        Factor::Quadratic(u, v) => [Double::ONE, u, v],
    }
}

/// Half the distance of 1 from the next f64: coefficients in f64 put no pole that near the
/// unit circle without putting it there.
const ON_CIRCLE: f64 = f64::EPSILON / 2.0;

/// A pole on or outside the unit circle.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Outside {
    /// 1 - radius; 0 where it is no more than rounding.
    pub distance: f64,
    pub at_hz: f64,
}

/// The pole farthest outside the unit circle or on it; `None` where all are inside. `poles`
/// have a first coefficient of 1.
pub(super) fn outside(poles: &[Term], rate_hz: f64) -> Option<Outside> {
    let found = poles.iter().filter_map(|&[_, u, v]| {
        // J. I. Jury's conditions.
        let inside = v.abs() < Double::ONE && u.abs() < Double::ONE + v;
        (!inside).then(|| outer(u, v, rate_hz))
    });
    found.min_by(|a, b| a.distance.total_cmp(&b.distance))
}

/// The outer root of z^2 + u z + v.
fn outer(u: Double, v: Double, rate_hz: f64) -> Outside {
    let told = |distance: Double| if distance.hi.abs() < ON_CIRCLE { 0.0 } else { distance.hi };
    let discriminant = u * u - v.scaled(2);
    if discriminant < Double::ZERO {
        let angle = libm::atan2(libm::sqrt(-discriminant.hi), -u.hi);
        return Outside { distance: told(Double::ONE - v.sqrt()), at_hz: angle / TAU * rate_hz };
    }
    let radius = (u.abs() + discriminant.sqrt()).scaled(-1);
    let at_hz = if u.hi <= 0.0 { 0.0 } else { rate_hz / 2.0 };
    Outside { distance: told(Double::ONE - radius), at_hz }
}
