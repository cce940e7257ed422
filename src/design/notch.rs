//! The notch: one second-order section with its zeros on the unit circle.
//!
//! ```text
//!            1 - 2 cos(w0) z^-1 + z^-2
//! H(z) = g ---------------------------------------,    g = 1 / (1 + tan(dw/2))
//!          1 - 2 g cos(w0) z^-1 + (2 g - 1) z^-2
//! ```
//!
//! with w0 the center and dw the width in radians a sample: the bilinear transform of
//! (s^2 + W0^2) / (s^2 + B s + W0^2) with W0 = tan(w0/2) and B = (1 + W0^2) tan(dw/2).
//! Center and -3 dB width are those of the digital filter, exactly; the gain is 1 at
//! DC and at half the rate. (The usual sin(w0)/(2Q) in place of the tangent is right
//! only for w0 and dw near 0.) S. J. Orfanidis, Introduction to Signal Processing,
//! 11.3, from memory.

use super::double::Double;
use super::transform::{Analog, Poles, Reference, Zeros, warped};

/// The notch at `center_hz`, `width_hz` wide between its half-power points; both
/// above 0 and below half of `rate_hz`.
pub fn analog(center_hz: f64, width_hz: f64, rate_hz: f64) -> Analog {
    let (center, width): (Double, Double) = (warped(center_hz, rate_hz), warped(width_hz, rate_hz));
    let square = center.square();
    let half_sum = (square + 1.0) * width * -0.5;
    Analog {
        poles: vec![Poles::Two { half_sum, product: square }],
        zeros: vec![Zeros::Pair { square }],
        reference: Reference::far_from(square),
        reference_gain: Double::ONE,
    }
}
