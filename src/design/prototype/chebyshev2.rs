//! Chebyshev II: flat at DC, equal ripple in the stop band.
//!
//! |H(jw)|^2 = 1 / (1 + (10^(stop/10) - 1) / T_n(1/w)^2); the stop band begins at
//! w = 1. The poles are the reciprocals of those of a Chebyshev I with
//! e^2 = 1 / (10^(stop/10) - 1), the zeros those of T_n(1/w).

use super::{Prototype, angle_sin, on_ellipse, power_ratio_minus_one};
use crate::design::complex::reciprocal;

/// Order 1 or more, `stop_db` > 0.
pub fn prototype(order: u32, stop_db: f64) -> Prototype {
    let v = libm::asinh(libm::sqrt(power_ratio_minus_one(stop_db))) / f64::from(order);
    let (a, b) = (libm::sinh(v), libm::cosh(v));
    Prototype {
        zeros_rad: (1..=order / 2).map(|k| 1.0 / angle_sin(order - (2 * k - 1), order)).collect(),
        poles: on_ellipse(order, a, b).into_iter().map(|p| reciprocal(p).conj()).collect(),
        real_pole: (order % 2 == 1).then_some(-1.0 / a),
        dc_gain: 1.0,
    }
}
