//! Complex functions on plain arithmetic and `sqrt`, so that a design has the same
//! bits on every machine, with real and imaginary parts accurate each for itself.

use num_complex::Complex64;

/// 1/p, each part to its last digits.
pub fn reciprocal(p: Complex64) -> Complex64 {
    let squared = p.re * p.re + p.im * p.im;
    Complex64::new(p.re / squared, -p.im / squared)
}

/// The square root of p^2 - 4c for c > 0, with the signs of its parts those of `p`
/// (or zero), so that p plus the root cancels in neither part. `p` is not real.
pub fn discriminant_root(p: Complex64, c: f64) -> Complex64 {
    let half_width = 2.0 * libm::sqrt(c);
    // (|re| - 2 sqrt c)(|re| + 2 sqrt c) - im^2: the first factor is exact where it
    // is small.
    let re = (p.re.abs() - half_width) * (p.re.abs() + half_width) - p.im * p.im;
    let im = 2.0 * p.re * p.im;
    let size = libm::hypot(re, im);
    // The larger part from a sum, the smaller from their product re(root) im(root) =
    // re(p) im(p).
    let product = (p.re * p.im).abs();
    let larger = libm::sqrt((size + re.abs()) / 2.0);
    let smaller = product / larger;
    let (root_re, root_im) = if re >= 0.0 { (larger, smaller) } else { (smaller, larger) };
    Complex64::new(root_re.copysign(p.re), root_im.copysign(p.im))
}
