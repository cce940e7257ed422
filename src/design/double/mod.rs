//! Numbers of twice the digits, for everything between a spec's figures and the
//! coefficients of sections, which alone are rounded to f64.
//!
//! A [`Double`] is the unevaluated sum of two f64 and good to about 2^-104 of itself.
//! Algorithms after M. Joldes, J.-M. Muller and V. Popescu, Tight and rigorous error
//! bounds for basic building blocks of double-word arithmetic, ACM Trans. Math. Softw.
//! 44, 2017 (from memory).

mod complex;
mod functions;
mod number;

use super::error_free::{quick_two_sum, two_product, two_sum};
pub use complex::{Complex, ComplexDouble};
use core::cmp::Ordering;
use core::ops::{Add, Div, Mul, Neg, Sub};
pub use number::Number;

/// `hi` + `lo`, where `hi` is the sum rounded to f64.
///
/// Holds from 1e-270 to 1e290; what is smaller or larger loses digits or is no number.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Double {
    /// The number rounded to f64.
    pub hi: f64,
    /// What rounding dropped.
    pub lo: f64,
}

impl Double {
    /// 0.
    pub const ZERO: Double = Double { hi: 0.0, lo: 0.0 };
    /// 1.
    pub const ONE: Double = Double { hi: 1.0, lo: 0.0 };
    /// pi.
    pub const PI: Double = Double { hi: core::f64::consts::PI, lo: 1.224_646_799_147_353_2e-16 };
    /// pi / 2.
    pub const FRAC_PI_2: Double = Double { hi: core::f64::consts::FRAC_PI_2, lo: 6.123_233_995_736_766e-17 };
    /// ln 2.
    pub const LN_2: Double = Double { hi: core::f64::consts::LN_2, lo: 2.319_046_813_846_299_6e-17 };
    /// ln 10.
    pub const LN_10: Double = Double { hi: core::f64::consts::LN_10, lo: -2.170_756_223_382_249_4e-16 };

    /// a - b of two f64, exact.
    pub fn difference(a: f64, b: f64) -> Double {
        let (hi, lo) = two_sum(a, -b);
        Double { hi, lo }
    }

    /// The square.
    pub fn square(self) -> Double {
        self * self
    }

    /// The square root of a number that is not negative.
    pub fn sqrt(self) -> Double {
        if self.hi <= 0.0 {
            return Double::ZERO;
        }
        let root = self.hi.sqrt();
        let (square, error) = two_product(root, root);
        let rest = self - Double { hi: square, lo: error };
        Double::normal(root, rest.hi / (2.0 * root))
    }

    /// The magnitude.
    pub fn abs(self) -> Double {
        if self.hi < 0.0 { -self } else { self }
    }

    /// Times 2^`exponent`, exactly unless it leaves the range of f64.
    pub fn scaled(self, exponent: i32) -> Double {
        Double { hi: libm::scalbn(self.hi, exponent), lo: libm::scalbn(self.lo, exponent) }
    }

    /// Whether it is 0.
    pub fn is_zero(self) -> bool {
        self.hi == 0.0
    }

    /// Whether both parts are finite.
    pub fn is_finite(self) -> bool {
        self.hi.is_finite() && self.lo.is_finite()
    }

    /// A sum whose first part is the larger, normalized.
    fn normal(larger: f64, smaller: f64) -> Double {
        let (hi, lo) = quick_two_sum(larger, smaller);
        Double { hi, lo }
    }
}

impl From<f64> for Double {
    fn from(hi: f64) -> Double {
        Double { hi, lo: 0.0 }
    }
}

impl PartialOrd for Double {
    fn partial_cmp(&self, other: &Double) -> Option<Ordering> {
        match self.hi.partial_cmp(&other.hi) {
            Some(Ordering::Equal) => self.lo.partial_cmp(&other.lo),
            order => order,
        }
    }
}

impl Neg for Double {
    type Output = Double;

    fn neg(self) -> Double {
        Double { hi: -self.hi, lo: -self.lo }
    }
}

impl Add for Double {
    type Output = Double;

    fn add(self, other: Double) -> Double {
        let (sum, error) = two_sum(self.hi, other.hi);
        let (low, low_error) = two_sum(self.lo, other.lo);
        let first = Double::normal(sum, error + low);
        Double::normal(first.hi, first.lo + low_error)
    }
}

impl Sub for Double {
    type Output = Double;

    fn sub(self, other: Double) -> Double {
        self + -other
    }
}

impl Mul for Double {
    type Output = Double;

    fn mul(self, other: Double) -> Double {
        let (product, error) = two_product(self.hi, other.hi);
        Double::normal(product, error + (self.hi * other.lo + self.lo * other.hi))
    }
}

impl Div for Double {
    type Output = Double;

    fn div(self, other: Double) -> Double {
        // Long division, a third digit for the last bits of the second.
        let first = self.hi / other.hi;
        let rest = self - other * Double::from(first);
        let second = rest.hi / other.hi;
        let rest = rest - other * Double::from(second);
        Double::normal(first, second) + Double::from(rest.hi / other.hi)
    }
}

/// The operators with an f64 on either side.
macro_rules! with_f64 {
    ($($operator:ident $function:ident),*) => {$(
        impl $operator<f64> for Double {
            type Output = Double;

            fn $function(self, other: f64) -> Double {
                self.$function(Double::from(other))
            }
        }

        impl $operator<Double> for f64 {
            type Output = Double;

            fn $function(self, other: Double) -> Double {
                Double::from(self).$function(other)
            }
        }
    )*};
}

with_f64!(Add add, Sub sub, Mul mul, Div div);

#[cfg(test)]
mod tests {
    use super::*;

    fn off(got: Double, want: Double) -> f64 {
        ((got - want) / want).hi.abs()
    }

    /// Each way back is right to a few parts in 2^104.
    #[test]
    fn operations_undo_each_other_in_doubled_precision() {
        let third = Double::ONE / Double::from(3.0);
        assert!(third.lo != 0.0 && off(third * Double::from(3.0), Double::ONE) < 1e-31);
        let tenth = Double::ONE / Double::from(10.0);
        assert!(off(third + tenth, Double::from(13.0) / Double::from(30.0)) < 1e-31);
        assert!(off((third - tenth) * Double::from(30.0), Double::from(7.0)) < 1e-30);
        assert!(off(third * tenth, Double::ONE / Double::from(30.0)) < 1e-31);
        assert!(third > tenth && -third < tenth && (-third).abs() == third);
    }
}
