//! Butterworth: maximally flat. |H(jw)|^2 = 1 / (1 + w^(2n)), half power at w = 1.

use super::{Prototype, on_ellipse};
use crate::design::double::Number;

/// Order 1 or more; poles evenly spread on the unit circle.
pub fn prototype<N: Number>(order: u32) -> Prototype<N> {
    Prototype {
        zeros_rad: Vec::new(),
        poles: on_ellipse(order, N::ONE, N::ONE),
        real_pole: (order % 2 == 1).then_some(-N::ONE),
        dc_gain: N::ONE,
    }
}
