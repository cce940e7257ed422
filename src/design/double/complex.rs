//! Complex numbers of twice the digits, or of those of f64.

use super::{Double, Number};
use core::ops::{Add, Mul};

/// A complex number.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Complex<N> {
    /// Real part.
    pub re: N,
    /// Imaginary part.
    pub im: N,
}

/// A complex number of two [`Double`].
pub type ComplexDouble = Complex<Double>;

impl<N: Number> Complex<N> {
    /// 1.
    pub const ONE: Complex<N> = Complex { re: N::ONE, im: N::ZERO };
    /// 0.
    pub const ZERO: Complex<N> = Complex { re: N::ZERO, im: N::ZERO };

    /// From an f64 each.
    pub fn new(re: f64, im: f64) -> Complex<N> {
        Complex { re: re.into(), im: im.into() }
    }

    /// A real number.
    pub fn real(re: N) -> Complex<N> {
        Complex { re, im: N::ZERO }
    }

    /// |p| to the digits of f64.
    pub fn magnitude(self) -> f64 {
        libm::hypot(self.re.hi(), self.im.hi())
    }

    /// |p|^2.
    pub fn squared_magnitude(self) -> N {
        self.re.squared() + self.im.squared()
    }

    /// p times a real number.
    pub fn times(self, factor: N) -> Complex<N> {
        Complex { re: self.re * factor, im: self.im * factor }
    }

    /// 1/p, each part to its last digits.
    pub fn reciprocal(self) -> Complex<N> {
        let squared = self.squared_magnitude();
        Complex { re: self.re / squared, im: -self.im / squared }
    }

    /// The square root of p^2 - 4c for c > 0, with the signs of its parts those of `p`
    /// (or zero), so that p plus the root cancels in neither part. `p` is not real.
    pub fn discriminant_root(self, c: N) -> Complex<N> {
        let half_width = c.root() * 2.0;
        // (|re| - 2 sqrt c)(|re| + 2 sqrt c) - im^2: the first factor is exact where it
        // is small.
        let re = (self.re.size() - half_width) * (self.re.size() + half_width) - self.im.squared();
        let im = self.re * self.im * 2.0;
        let size = (re.squared() + im.squared()).root();
        // The larger part from a sum, the smaller from their product re(root) im(root) =
        // re(p) im(p).
        let product = (self.re * self.im).size();
        let larger = ((size + re.size()) * 0.5).root();
        let smaller = product / larger;
        let (root_re, root_im) = if re.hi() >= 0.0 { (larger, smaller) } else { (smaller, larger) };
        let signed = |size: N, of: N| if of.hi() < 0.0 { -size } else { size };
        Complex { re: signed(root_re, self.re), im: signed(root_im, self.im) }
    }
}

impl<N: Number> Add for Complex<N> {
    type Output = Complex<N>;

    fn add(self, other: Complex<N>) -> Complex<N> {
        Complex { re: self.re + other.re, im: self.im + other.im }
    }
}

impl<N: Number> Mul for Complex<N> {
    type Output = Complex<N>;

    fn mul(self, other: Complex<N>) -> Complex<N> {
        Complex { re: self.re * other.re - self.im * other.im, im: self.re * other.im + self.im * other.re }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// z / z is right to a few parts in 2^104.
    #[test]
    fn a_number_times_its_reciprocal_is_one() {
        let z = ComplexDouble { re: Double::ONE / 3.0, im: Double::ONE / -10.0 };
        let one = z * z.reciprocal();
        assert!((one.re - 1.0).hi.abs() < 1e-30 && one.im.hi.abs() < 1e-31, "{one:?}");
    }
}
