//! Chebyshev I: equal ripple in the pass band.
//!
//! |H(jw)|^2 = 1 / (1 + e^2 T_n(w)^2) with e^2 = 10^(ripple/10) - 1; the ripple ends
//! at w = 1. The poles lie on an ellipse with half axes sinh v and cosh v,
//! v = asinh(1/e) / n.

use super::{Prototype, on_ellipse, power_ratio_minus_one};
use crate::design::double::Number;

/// Order 1 or more, `ripple_db` > 0. An even order has the ripple's floor at DC.
pub fn prototype<N: Number>(order: u32, ripple_db: f64) -> Prototype<N> {
    let epsilon = power_ratio_minus_one(N::from(ripple_db)).root();
    let v = (N::ONE / epsilon).area_sinh() / f64::from(order);
    let (a, b) = v.hyperbolic();
    Prototype {
        zeros_rad: Vec::new(),
        poles: on_ellipse(order, a, b),
        real_pole: (order % 2 == 1).then_some(-a),
        dc_gain: dc_gain(order, ripple_db),
    }
}

/// The gain at DC of a pass band that ripples between 0 and `-ripple_db`.
pub(super) fn dc_gain<N: Number>(order: u32, ripple_db: f64) -> N {
    if order.is_multiple_of(2) { (N::LN_10 * -ripple_db / 20.0).exponential() } else { N::ONE }
}
