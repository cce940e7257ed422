//! Chebyshev II: flat at DC, equal ripple in the stop band.
//!
//! |H(jw)|^2 = 1 / (1 + (10^(stop/10) - 1) / T_n(1/w)^2); the stop band begins at
//! w = 1. The poles are the reciprocals of those of a Chebyshev I with
//! e^2 = 1 / (10^(stop/10) - 1), the zeros those of T_n(1/w).

use super::{Prototype, angle_sin, on_ellipse, power_ratio_minus_one};
use crate::design::double::{Complex, Number};

/// Order 1 or more, `stop_db` > 0.
pub fn prototype<N: Number>(order: u32, stop_db: f64) -> Prototype<N> {
    let v = power_ratio_minus_one(N::from(stop_db)).root().area_sinh() / f64::from(order);
    let (a, b): (N, N) = v.hyperbolic();
    Prototype {
        zeros_rad: (1..=order / 2).map(|k| N::ONE / angle_sin::<N>(order - (2 * k - 1), order)).collect(),
        poles: on_ellipse(order, a, b).into_iter().map(|p| Complex { re: p.re, im: -p.im }.reciprocal()).collect(),
        real_pole: (order % 2 == 1).then_some(-N::ONE / a),
        dc_gain: N::ONE,
    }
}
