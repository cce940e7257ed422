//! What prototypes and prewarped edges are calculated in.

use super::Double;
use core::f64::consts;
use core::ops::{Add, Div, Mul, Neg, Sub};

/// [`Double`] for designs that are built; f64 for searches, which ask for millions.
pub trait Number:
    Copy
    + PartialOrd
    + From<f64>
    + Neg<Output = Self>
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Add<f64, Output = Self>
    + Sub<f64, Output = Self>
    + Mul<f64, Output = Self>
    + Div<f64, Output = Self>
{
    /// 0.
    const ZERO: Self;
    /// 1.
    const ONE: Self;
    /// pi.
    const PI: Self;
    /// pi / 2.
    const FRAC_PI_2: Self;
    /// ln 10.
    const LN_10: Self;

    /// `hi` + `lo`.
    fn of_parts(hi: f64, lo: f64) -> Self;
    /// Rounded to f64.
    fn hi(self) -> f64;
    /// a - b of two f64.
    fn difference(a: f64, b: f64) -> Self;
    /// The square root of a number that is not negative.
    fn root(self) -> Self;
    /// e^x.
    fn exponential(self) -> Self;
    /// e^x - 1, accurate near 0 too.
    fn exponential_m1(self) -> Self;
    /// sinh x and cosh x.
    fn hyperbolic(self) -> (Self, Self);
    /// The inverse of sinh.
    fn area_sinh(self) -> Self;
    /// sin x and cos x.
    fn circular(self) -> (Self, Self);

    /// The square.
    fn squared(self) -> Self {
        self * self
    }

    /// The magnitude.
    fn size(self) -> Self {
        if self.hi() < 0.0 { -self } else { self }
    }
}

impl Number for f64 {
    const ZERO: f64 = 0.0;
    const ONE: f64 = 1.0;
    const PI: f64 = consts::PI;
    const FRAC_PI_2: f64 = consts::FRAC_PI_2;
    const LN_10: f64 = consts::LN_10;

    fn of_parts(hi: f64, _lo: f64) -> f64 {
        hi
    }

    fn hi(self) -> f64 {
        self
    }

    fn difference(a: f64, b: f64) -> f64 {
        a - b
    }

    fn root(self) -> f64 {
        libm::sqrt(self.max(0.0))
    }

    fn exponential(self) -> f64 {
        libm::exp(self)
    }

    fn exponential_m1(self) -> f64 {
        libm::expm1(self)
    }

    fn hyperbolic(self) -> (f64, f64) {
        (libm::sinh(self), libm::cosh(self))
    }

    fn area_sinh(self) -> f64 {
        libm::asinh(self)
    }

    fn circular(self) -> (f64, f64) {
        libm::sincos(self)
    }
}

impl Number for Double {
    const ZERO: Double = Double::ZERO;
    const ONE: Double = Double::ONE;
    const PI: Double = Double::PI;
    const FRAC_PI_2: Double = Double::FRAC_PI_2;
    const LN_10: Double = Double::LN_10;

    fn of_parts(hi: f64, lo: f64) -> Double {
        Double { hi, lo }
    }

    fn hi(self) -> f64 {
        self.hi
    }

    fn difference(a: f64, b: f64) -> Double {
        Double::difference(a, b)
    }

    fn root(self) -> Double {
        self.sqrt()
    }

    fn exponential(self) -> Double {
        self.exp()
    }

    fn exponential_m1(self) -> Double {
        self.exp_m1()
    }

    fn hyperbolic(self) -> (Double, Double) {
        self.sinh_cosh()
    }

    fn area_sinh(self) -> Double {
        self.asinh()
    }

    fn circular(self) -> (Double, Double) {
        self.sin_cos()
    }
}
