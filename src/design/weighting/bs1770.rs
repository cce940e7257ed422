//! The K weighting of ITU-R BS.1770.
//!
//! The Recommendation prints coefficients for 48 kHz and asks for the same response at
//! other rates. There the roots go to s = 48000 Hz ln z and on by the matched z transform.

use super::matched::{Quadratic, Shape};
use crate::design::response;
use crate::section::Section;

/// The rate of the printed coefficients, Hz.
pub const RATE_HZ: f64 = 48_000.0;

/// The frequency whose gain, +0.691 dB, the Recommendation takes off again, Hz.
pub const ANCHOR_HZ: f64 = 997.0;

/// Annex 1, Tables 1 and 2.
pub const SECTIONS: [Section; 2] = [
    Section {
        b: [1.53512485958697, -2.69169618940638, 1.19839281085285],
        a: [1.0, -1.69065929318241, 0.73248077421585],
    },
    Section { b: [1.0, -2.0, 1.0], a: [1.0, -1.99004745483398, 0.99007225036621] },
];

/// Gain at `hz`, dB: that of the printed coefficients, and above half of their rate what it
/// is there. (It comes in level at half the rate, so the two meet without a kink.)
pub fn gain_db(hz: f64) -> f64 {
    response::gain_db(&SECTIONS, hz.min(RATE_HZ / 2.0), RATE_HZ)
}

/// Zeros and poles of the two sections at another rate.
pub fn shapes(rate_hz: f64) -> [Shape; 2] {
    let [shelf, highpass] = SECTIONS;
    let moved = |polynomial| moved(polynomial, RATE_HZ / rate_hz);
    [Shape { zeros: moved(shelf.b), poles: moved(shelf.a) }, Shape { zeros: Quadratic::AT_0, poles: moved(highpass.a) }]
}

/// The conjugate roots of a polynomial in z^-1 to the power `ratio`.
fn moved([p0, p1, p2]: [f64; 3], ratio: f64) -> Quadratic {
    let ln_radius = 0.5 * libm::log(p2 / p0);
    let angle = libm::atan2(libm::sqrt(4.0 * p0 * p2 - p1 * p1), -p1);
    Quadratic::pair(ln_radius * ratio, angle * ratio)
}
