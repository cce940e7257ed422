//! Elementary functions of twice the digits, each by its Taylor series near 0.

use super::Double;

/// Halvings of the argument of the exponential, undone by as many doublings.
const EXP_HALVINGS: i32 = 9;

/// Terms of its series: 0.35 / 2^9 to the 11th over 11! is 2^-140.
const EXP_TERMS: u32 = 10;

/// Where the exponential counts as 0.
const LOWEST: f64 = -650.0;

/// Largest argument of the series of sine and cosine.
const SERIES_UP_TO: f64 = 0.8;

/// Terms of these series: 0.8^29 / 29! is 2^-112.
const SINE_TERMS: u32 = 14;

impl Double {
    /// e^x - 1, accurate near 0 too.
    pub fn exp_m1(self) -> Double {
        let (above_one, scale) = self.reduced_exp_m1();
        if scale == 1.0 { above_one } else { (above_one + 1.0) * scale - 1.0 }
    }

    /// e^x; 0 below `LOWEST`.
    pub fn exp(self) -> Double {
        let (above_one, scale) = self.reduced_exp_m1();
        (above_one + 1.0) * scale
    }

    /// y and a power of two s with e^x = (1 + y) s.
    fn reduced_exp_m1(self) -> (Double, f64) {
        if self.hi < LOWEST {
            return (Double::ZERO, 0.0);
        }
        let exponent = libm::round(self.hi / Double::LN_2.hi);
        let x = (self - Double::LN_2 * exponent) * (1.0 / f64::from(1 << EXP_HALVINGS));
        let mut sum = Double::ONE;
        for n in (2..=EXP_TERMS).rev() {
            sum = x * sum / f64::from(n) + 1.0;
        }
        let mut above_one = x * sum;
        for _ in 0..EXP_HALVINGS {
            // (1 + y)^2 - 1
            above_one = above_one * (above_one + 2.0);
        }
        (above_one, libm::exp2(exponent))
    }

    /// sinh x and cosh x.
    pub fn sinh_cosh(self) -> (Double, Double) {
        let above = self.abs().exp_m1();
        let below = above / (above + 1.0); // 1 - e^-x
        let sinh = (above + below) * 0.5;
        (if self.hi < 0.0 { -sinh } else { sinh }, above * below * 0.5 + 1.0)
    }

    /// The inverse of sinh: one step of Newton's from the f64, which doubles its digits.
    pub fn asinh(self) -> Double {
        let near = Double::from(libm::asinh(self.hi));
        let (sinh, cosh) = near.sinh_cosh();
        near + (self - sinh) / cosh
    }

    /// sin x and cos x: sin x to its own last digits up to 0.8, beyond that, as cos x
    /// everywhere, to 2^-100 of 1 or so; a few turns at most. NaN of what is not finite.
    pub fn sin_cos(self) -> (Double, Double) {
        // Half of infinity is no smaller.
        if !self.hi.is_finite() {
            return (Double::from(f64::NAN), Double::from(f64::NAN));
        }
        let mut halvings = 0;
        let mut x = self;
        while x.hi.abs() > SERIES_UP_TO {
            x = x * 0.5;
            halvings += 1;
        }
        let square = -x.square();
        let (mut sin, mut cos) = (Double::ONE, Double::ONE);
        for n in (1..=SINE_TERMS).rev() {
            let n = f64::from(2 * n);
            sin = square * sin / (n * (n + 1.0)) + 1.0;
            cos = square * cos / (n * (n - 1.0)) + 1.0;
        }
        sin = x * sin;
        for _ in 0..halvings {
            (sin, cos) = (sin * cos * 2.0, 1.0 - sin.square() * 2.0);
        }
        (sin, cos)
    }
}
