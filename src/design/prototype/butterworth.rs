//! Butterworth: maximally flat. |H(jw)|^2 = 1 / (1 + w^(2n)), half power at w = 1.

use super::{Prototype, on_ellipse};

/// Order 1 or more; poles evenly spread on the unit circle.
pub fn prototype(order: u32) -> Prototype {
    Prototype {
        zeros_rad: Vec::new(),
        poles: on_ellipse(order, 1.0, 1.0),
        real_pole: (order % 2 == 1).then_some(-1.0),
        dc_gain: 1.0,
    }
}
