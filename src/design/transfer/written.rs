//! A transfer function as it was written, evaluated on the frequency axis in doubled
//! precision, with how far its digits may move it.
//!
//! # What half a unit in the last given digit comes to
//! Let P(w) = sum of c_i e_i(w) be a polynomial of the transfer function, e_i = z^-i or powers of
//! s, and let each c_i be off by at most d_i (half a unit of its last digit; 0 where it is
//! exact). The error of P is a sum of real multiples of the e_i, so in the direction of P
//! itself and across it at most
//!
//! ```text
//! along  = sum of d_i |Re(e_i P*)| / |P|        across = sum of d_i |Im(e_i P*)| / |P|
//! |P| - along  <=  |P + error|  <=  sqrt((|P| + along)^2 + across^2)
//! ```
//!
//! Bounds for any errors of that size, not to first order only; to first order they are the
//! absolute sensitivities |dP/dc_i| d_i added up. Whether P may be 0 is looked at in other
//! directions as well, not in that of P alone: where none keeps it from 0, a zero may lie at
//! that frequency. Of roots the factor x - root takes the place of P, with the errors of real
//! and imaginary part; bounds of all parts are multiplied.

use super::analog::{Scale, scaled};
use super::terms::{half, values};
use super::{GainBounds, TransferError};
use crate::design::double::{ComplexDouble, Double};
use crate::design::response::Point;
use crate::spec::{AnalogStage, Coefficient, DigitalFilter, Root, Transfer};
use num_complex::Complex64;

/// A polynomial, a root, or the gain.
enum Ingredient {
    /// sum of c_i a^(n-i) b^i, see [`Basis`].
    Polynomial { c: Vec<Double>, digits: Vec<f64>, floors: Vec<f64> },
    /// a - root b in z, or in s/K.
    Root { at: Complex64, digits: Complex64, floors: Complex64 },
    /// A number.
    Constant { size: f64, digits: f64, floor: f64 },
}

/// A written transfer function.
pub(super) struct Written {
    /// With whether it stands in the denominator.
    ingredients: Vec<(Ingredient, bool)>,
    /// In s; in z otherwise.
    analog: bool,
    /// Degree of the denominator over that of the numerator in s, and log10 of what is not in
    /// the ingredients.
    excess: f64,
    constant_log10: f64,
}

/// What P + error is at least in one direction: size less the errors.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Support {
    size: f64,
    /// For half a unit in the last given digits.
    digits: f64,
    /// For the rounding of what was given to f64.
    floor: f64,
}

impl Support {
    fn least(self, shrink: f64) -> f64 {
        self.size - self.floor - shrink * self.digits
    }
}

/// A real multiple of `basis` by which P may be off.
#[derive(Clone, Copy, Debug)]
struct Doubt {
    basis: Complex64,
    digits: f64,
    floor: f64,
}

/// One ingredient at one frequency.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Part {
    pub in_denominator: bool,
    pub size: f64,
    /// In the direction of P first; where that leaves room for a zero, across every term too.
    supports: Vec<Support>,
    /// The error across P.
    across: Support,
}

impl Part {
    fn new(value: Complex64, doubts: &[Doubt], in_denominator: bool) -> Part {
        let size = libm::hypot(value.re, value.im);
        // Where P is 0 any direction is as good.
        let direction = if size > 0.0 { value / size } else { 1.0.into() };
        let support = |direction: Complex64| {
            let along = |basis: Complex64| (basis * direction.conj()).re.abs();
            Support {
                size: (value * direction.conj()).re,
                digits: doubts.iter().map(|doubt| doubt.digits * along(doubt.basis)).sum(),
                floor: doubts.iter().map(|doubt| doubt.floor * along(doubt.basis)).sum(),
            }
        };
        let mut supports = vec![support(direction)];
        if supports[0].least(1.0) <= 0.0 {
            // All that P can be is a polygon with sides along the terms: if it does not hold 0,
            // one of the sides has 0 on its other hand.
            let moved = doubts.iter().filter(|doubt| doubt.digits + doubt.floor > 0.0);
            for basis in moved.map(|doubt| doubt.basis) {
                let length = libm::hypot(basis.re, basis.im);
                if length > 0.0 {
                    let side = Complex64::new(-basis.im / length, basis.re / length);
                    supports.extend([support(side), support(-side)]);
                }
            }
        }
        let across = support(Complex64::new(-direction.im, direction.re));
        Part { in_denominator, size, supports, across }
    }

    /// Least and largest size, `shrink` times the half units being in doubt.
    fn bounds(&self, shrink: f64) -> (f64, f64) {
        let least = self.supports.iter().map(|support| support.least(shrink)).fold(0.0, f64::max);
        let Support { digits, floor, .. } = self.supports[0];
        let (along, across) = (digits * shrink + floor, self.across.digits * shrink + self.across.floor);
        (least, libm::hypot(self.size + along, across))
    }

    /// Whether a zero of this part may lie at this frequency.
    pub fn may_vanish(&self, shrink: f64) -> bool {
        self.bounds(shrink).0 <= 0.0
    }
}

/// A written transfer function at one frequency.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct At {
    pub parts: Vec<Part>,
    constant_db: f64,
}

impl At {
    /// `shrink` is 1 for the digits as given, 0.1 for one more.
    pub fn bounds(&self, shrink: f64) -> GainBounds {
        let decibel = |size: f64| 20.0 * libm::log10(size);
        let (mut low_db, mut level_db, mut high_db) = (self.constant_db, self.constant_db, self.constant_db);
        let (mut may_be_zero, mut may_be_endless) = (false, false);
        for part in &self.parts {
            let (least, largest) = part.bounds(shrink);
            if part.in_denominator {
                may_be_endless |= least <= 0.0;
                low_db -= decibel(largest);
                level_db -= decibel(part.size);
                high_db -= decibel(least);
            } else {
                may_be_zero |= least <= 0.0;
                low_db += decibel(least);
                level_db += decibel(part.size);
                high_db += decibel(largest);
            }
        }
        GainBounds {
            low_db: if may_be_zero { f64::NEG_INFINITY } else { low_db },
            level_db,
            high_db: if may_be_endless { f64::INFINITY } else { high_db },
        }
    }
}

/// a and b of the forms sum of c_i a^(n-i) b^i, with their powers: 1 and z^-1 (polynomials) in z;
/// j sin and cos of half the angle in s/K, which is j tan.
struct Basis {
    a: Vec<ComplexDouble>,
    b: Vec<ComplexDouble>,
    /// What roots are subtracted from, and with which factor: z and 1, j sin and cos.
    root: (Complex64, f64),
}

const MOST_POWERS: usize = super::terms::HIGHEST + 1;

impl Basis {
    /// From sine and cosine of half the angle.
    fn new(analog: bool, half_sin: f64, half_cos: f64) -> Basis {
        // On the unit circle to doubled precision: the error of the squares halved.
        let (sin, cos) = (Double::from(half_sin), Double::from(half_cos));
        let excess = (sin * sin + cos * cos - Double::ONE).scaled(-1);
        let (sin, cos) = (sin - sin * excess, cos - cos * excess);
        let (a, b) = if analog {
            (ComplexDouble { re: Double::ZERO, im: sin }, ComplexDouble { re: cos, im: Double::ZERO })
        } else {
            let half = ComplexDouble { re: cos, im: -sin };
            (ComplexDouble::ONE, half * half)
        };
        let root =
            if analog { (Complex64::new(0.0, sin.hi), cos.hi) } else { (Complex64::new(b.re.hi, -b.im.hi), 1.0) };
        Basis { a: powers(a), b: powers(b), root }
    }

    fn part(&self, ingredient: &Ingredient, in_denominator: bool) -> Part {
        match ingredient {
            Ingredient::Polynomial { c, digits, floors } => {
                let last = c.len() - 1;
                let each: Vec<ComplexDouble> = (0..=last).map(|i| self.a[last - i] * self.b[i]).collect();
                let value = each.iter().zip(c).fold(ComplexDouble::ZERO, |sum, (basis, c)| sum + basis.times(*c));
                let doubts = each.iter().zip(digits).zip(floors).map(|((basis, &digits), &floor)| {
                    let basis = Complex64::new(basis.re.hi, basis.im.hi);
                    Doubt { basis, digits, floor }
                });
                Part::new(Complex64::new(value.re.hi, value.im.hi), &doubts.collect::<Vec<_>>(), in_denominator)
            }
            Ingredient::Root { at, digits, floors } => {
                let (point, factor) = self.root;
                let doubts = [
                    Doubt { basis: factor.into(), digits: digits.re, floor: floors.re },
                    Doubt { basis: Complex64::new(0.0, factor), digits: digits.im, floor: floors.im },
                ];
                Part::new(point - at * factor, &doubts, in_denominator)
            }
            Ingredient::Constant { size, digits, floor } => {
                let doubt = Doubt { basis: 1.0.into(), digits: *digits, floor: *floor };
                Part::new((*size).into(), &[doubt], in_denominator)
            }
        }
    }
}

fn powers(x: ComplexDouble) -> Vec<ComplexDouble> {
    let mut power = ComplexDouble::ONE;
    let mut next = || {
        let this = power;
        power = power * x;
        this
    };
    (0..MOST_POWERS).map(|_| next()).collect()
}

impl Written {
    /// # Errors
    /// Those of the coefficients themselves.
    pub fn digital(stage: &DigitalFilter) -> Result<Written, TransferError> {
        let mut ingredients = Vec::new();
        match stage {
            DigitalFilter::Transfer(Transfer::Polynomials { numerator, denominator }) => {
                ingredients.push((polynomial("numerator", numerator)?, false));
                ingredients.push((polynomial("denominator", denominator)?, true));
            }
            DigitalFilter::Transfer(Transfer::Roots { zeros, poles, gain }) => {
                ingredients = roots(zeros, poles, gain, 1.0);
            }
            DigitalFilter::Sections(sections) => {
                for section in sections {
                    ingredients.push((polynomial("numerator", &section.b)?, false));
                    ingredients.push((polynomial("denominator", &section.a)?, true));
                }
            }
        }
        Ok(Written { ingredients, analog: false, excess: 0.0, constant_log10: 0.0 })
    }

    /// # Errors
    /// Those of the coefficients themselves.
    pub fn analog(stage: &AnalogStage, scale: Scale) -> Result<Written, TransferError> {
        match &stage.transfer {
            Transfer::Polynomials { numerator, denominator } => {
                let (n, d) = (scaled("numerator", numerator, scale)?, scaled("denominator", denominator, scale)?);
                let excess = d.c.len() as f64 - n.c.len() as f64;
                let constant_log10 = f64::from(n.exponent.saturating_sub(d.exponent)) * core::f64::consts::LOG10_2;
                let one = |polynomial: super::analog::Scaled| {
                    let floors = floors(&polynomial.c, &polynomial.halves);
                    Ingredient::Polynomial { c: polynomial.c, digits: polynomial.halves, floors }
                };
                Ok(Written { ingredients: vec![(one(n), false), (one(d), true)], analog: true, excess, constant_log10 })
            }
            Transfer::Roots { zeros, poles, gain } => {
                let excess = poles.len() as f64 - zeros.len() as f64;
                let constant_log10 = -excess * libm::log10(scale.k);
                Ok(Written { ingredients: roots(zeros, poles, gain, scale.k), analog: true, excess, constant_log10 })
            }
        }
    }

    /// At the digital frequency `hz`.
    pub fn at(&self, hz: f64, rate_hz: f64) -> At {
        let point = Point::new(hz, rate_hz);
        self.at_angle(point.half_sin, point.half_cos)
    }

    /// At half the angle whose tangent is s/jK.
    pub fn at_angle(&self, half_sin: f64, half_cos: f64) -> At {
        let basis = Basis::new(self.analog, half_sin, half_cos);
        let parts = self.ingredients.iter().map(|(ingredient, in_denominator)| basis.part(ingredient, *in_denominator));
        let infinite = if self.excess == 0.0 { 0.0 } else { self.excess * libm::log10(half_cos) };
        At { parts: parts.collect(), constant_db: 20.0 * (self.constant_log10 + infinite) }
    }
}

/// Half a unit in the last place of every number that is not exact.
fn floors(c: &[Double], halves: &[f64]) -> Vec<f64> {
    c.iter().zip(halves).map(|(c, &half)| floor(c.hi, half)).collect()
}

fn floor(value: f64, half: f64) -> f64 {
    if half > 0.0 { value.abs() * f64::EPSILON / 2.0 } else { 0.0 }
}

fn polynomial(name: &'static str, coefficients: &[Coefficient]) -> Result<Ingredient, TransferError> {
    let (c, digits) = values(name, coefficients)?;
    let floors = floors(&c, &digits);
    Ok(Ingredient::Polynomial { c, digits, floors })
}

/// Roots, and the gain, with lengths over `k`.
fn roots(zeros: &[Root], poles: &[Root], gain: &Coefficient, k: f64) -> Vec<(Ingredient, bool)> {
    let one = |root: &Root| Ingredient::Root {
        at: Complex64::new(root.re.value / k, root.im.value / k),
        digits: Complex64::new(half(&root.re) / k, half(&root.im) / k),
        floors: Complex64::new(floor(root.re.value, half(&root.re)) / k, floor(root.im.value, half(&root.im)) / k),
    };
    let gain =
        Ingredient::Constant { size: gain.value.abs(), digits: half(gain), floor: floor(gain.value, half(gain)) };
    let zeros = zeros.iter().map(|root| (one(root), false));
    let poles = poles.iter().map(|root| (one(root), true));
    [(gain, false)].into_iter().chain(zeros).chain(poles).collect()
}
