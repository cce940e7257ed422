//! Factors in powers of z^-1 to sections: which zeros go with which poles, the order of the
//! sections and the gain of each, after the rules of [`crate::design::sections::arrange`].
//!
//! Every pole pair, the least damped first, takes the zero pair nearest to it. Real roots are
//! put together one from either end: of poles at 0.999 and 0.99 and -0.5 the first and last,
//! which leave 1 + a1 + a2 its digits; zeros at 1 and -1 as the 1 - z^-2 of a band-pass.

use super::TransferError;
use super::terms::{Term, Terms};
use crate::design::double::Double;
use crate::design::extrema::Profile;
use crate::design::response::Point;
use crate::design::rounding::Rounded;
use crate::design::sections::arrange::{Order, exponents, log2_power, order};
use crate::design::sections::coefficients::{self, Rounding};
use crate::section::Section;

/// What is left where terms of size 1 cancel in doubled precision.
const ROUNDING: f64 = 1e-28;

/// A section before it has its gain.
struct Unit {
    zeros: Term,
    poles: Term,
}

/// The sections of stable factors, in the order they run.
///
/// # Errors
/// [`TransferError::Range`].
pub(super) fn sections(terms: Terms) -> Result<Vec<Rounded>, TransferError> {
    let gain = terms.gain;
    let units = pair(terms);
    let unscaled: Vec<Section> =
        units.iter().map(|unit| Section { b: leveled(unit.zeros).map(|c| c.hi), a: denominator(unit.poles) }).collect();
    // One sample is the unit of time here.
    let profile = Profile::new(&unscaled, 1.0, &[]);
    let points: Vec<Point> = profile.points().iter().map(|point| Point::new(point.hz, 1.0)).collect();
    let powers = unscaled.iter().map(|s| points.iter().map(|point| log2_power(s.b, s.a, point)).collect()).collect();
    let Order { indices, peaks } = order(powers);

    // What the numerators were leveled by belongs to the gain.
    let whole_exponent = units.iter().fold(gain.exponent, |sum, unit| sum.saturating_add(level(unit.zeros)));
    let whole = f64::from(whole_exponent) + libm::log2(gain.mantissa.hi.abs());
    let fitted =
        (0..indices.len()).max_by(|&i, &j| ease(&unscaled[indices[i]]).total_cmp(&ease(&unscaled[indices[j]])));
    let exponents = exponents(&peaks, whole, fitted);
    let each = indices.iter().zip(exponents).enumerate().map(|(i, (&index, exponent))| {
        let mantissa = if Some(i) == fitted { gain.mantissa } else { Double::ONE };
        let shift = exponent as i32;
        let zeros = leveled(units[index].zeros);
        let exact = [zeros.map(|c| (c * mantissa).scaled(shift)), units[index].poles];
        let b = exact[0].map(|c| c.hi);
        let lost = (0..3).any(|k| !b[k].is_finite() || (b[k] == 0.0) != zeros[k].is_zero());
        if lost {
            Err(TransferError::Range { what: "gain" })
        } else {
            Ok(Rounded::of(exact, Section { b, a: unscaled[index].a }))
        }
    });
    each.collect()
}

/// How far a numerator is from a zero at z = 1 or z = -1, where rounding is felt most.
fn ease(section: &Section) -> f64 {
    let [b0, b1, b2] = section.b;
    let sum = b0.abs() + b1.abs() + b2.abs();
    let ends = [(b0 + b2) + b1, (b0 + b2) - b1].map(f64::abs);
    // Exactly there it is not felt at all.
    ends.into_iter().filter(|&end| end > 0.0).fold(sum, f64::min) / sum
}

/// Exponent of the numerator's largest coefficient.
fn level(zeros: Term) -> i32 {
    let largest = zeros.iter().map(|c| c.hi.abs()).fold(0.0, f64::max);
    libm::frexp(largest).1 - 1
}

/// With a largest coefficient from 1 to 2, and without what is nothing but rounding beside it.
fn leveled(zeros: Term) -> Term {
    let level = level(zeros);
    zeros.map(|c| c.scaled(-level)).map(|c| if c.hi.abs() < ROUNDING { Double::ZERO } else { c })
}

/// Denominator in f64, right at the poles' frequency above all.
fn denominator([_, u, v]: Term) -> [f64; 3] {
    coefficients::denominator([u, v], Rounding::Together)
}

const ONE: Term = [Double::ONE, Double::ZERO, Double::ZERO];

fn times(a: Term, b: Term) -> Term {
    [a[0] * b[0], a[0] * b[1] + a[1] * b[0], a[0] * b[2] + a[1] * b[1] + a[2] * b[0]]
}

/// Sections as few as hold all poles and zeros; one for a gain alone.
fn pair(terms: Terms) -> Vec<Unit> {
    let (pole_pairs, real_poles) = parted(terms.poles);
    let (mut zero_pairs, mut real_zeros) = parted(terms.zeros);
    let mut poles = pole_pairs;
    let mut real_poles = Reals::new(real_poles);
    while real_poles.left.len() > 1 {
        poles.push(real_poles.two());
    }
    // The least damped first, by the product of its roots and, of real ones, by the outer.
    poles.sort_by(|a, b| radius(b).total_cmp(&radius(a)));
    poles.extend(real_poles.left.pop());
    let sections = poles.len().max(zero_pairs.len() + real_zeros.len().div_ceil(2)).max(1);
    poles.resize(sections, ONE);
    let mut real_zeros = Reals::new(std::mem::take(&mut real_zeros));
    let mut units = Vec::with_capacity(sections);
    for (i, poles) in poles.iter().enumerate() {
        let single = poles[2].is_zero() && !poles[1].is_zero();
        let after = sections - 1 - i;
        let nearest = (0..zero_pairs.len())
            .min_by(|&a, &b| apart(&zero_pairs[a], poles).total_cmp(&apart(&zero_pairs[b], poles)));
        // A single pole leaves pairs to others while these have room for them.
        let nearest = nearest.filter(|_| !single || zero_pairs.len() > after);
        let zeros = match nearest {
            Some(nearest) => zero_pairs.remove(nearest),
            None if single && real_zeros.left.len() % 2 == 1 => real_zeros.left.pop().unwrap_or(ONE),
            None => real_zeros.two(),
        };
        units.push(Unit { zeros, poles: *poles });
    }
    units
}

/// Pairs and single ones.
fn parted(terms: Vec<Term>) -> (Vec<Term>, Vec<Term>) {
    terms.into_iter().partition(|term| !term[2].is_zero())
}

/// Real roots, smallest z first, and then delays.
struct Reals {
    left: Vec<Term>,
}

impl Reals {
    fn new(mut left: Vec<Term>) -> Reals {
        // c0 = 0 is a zero at infinity, whatever the sign of c1.
        let place = |term: &Term| if term[0].is_zero() { f64::INFINITY } else { -term[1].hi / term[0].hi };
        left.sort_by(|a, b| place(a).total_cmp(&place(b)));
        Reals { left }
    }

    /// One from either end, as far as there are any; delays with what is left.
    fn two(&mut self) -> Term {
        let delays = self.left.iter().filter(|term| term[0].is_zero()).count();
        let finite = self.left.len() - delays;
        match (finite, self.left.len()) {
            (_, 0) => ONE,
            (2.., _) => {
                let high = self.left.remove(finite - 1);
                times(self.left.remove(0), high)
            }
            _ => {
                let first = self.left.remove(0);
                if self.left.is_empty() { first } else { times(first, self.left.remove(0)) }
            }
        }
    }
}

/// Radius of the outer root.
fn radius([_, u, v]: &Term) -> f64 {
    let discriminant = u.hi * u.hi - 4.0 * v.hi;
    if discriminant < 0.0 { libm::sqrt(v.hi) } else { 0.5 * (u.hi.abs() + libm::sqrt(discriminant)) }
}

/// Distance of a zero pair from poles in the z-plane.
fn apart(zeros: &Term, poles: &Term) -> f64 {
    let place = |[c0, c1, c2]: &Term| {
        let (half_sum, product) = (-0.5 * c1.hi / c0.hi, c2.hi / c0.hi);
        (half_sum, libm::sqrt((product - half_sum * half_sum).max(0.0)))
    };
    let ((zero_re, zero_im), (pole_re, pole_im)) = (place(zeros), place(poles));
    libm::hypot(zero_re - pole_re, zero_im - pole_im)
}
