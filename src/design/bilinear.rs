//! The bilinear transform s = (z - 1) / (z + 1) of quadratics.
//!
//! A pole pair s^2 - 2 h s + m (h half the sum, m the product) becomes
//!
//! ```text
//! a1 = 2 (m - 1) / D,   a2 = (1 + 2 h + m) / D,   D = 1 - 2 h + m
//! ```
//!
//! and a zero pair at +-jW the numerator 1, 2 (m - 1) / (1 + m), 1 with m = W^2.

use super::double::Double;
use super::transform::{Poles, Zeros};

/// A section before rounding, but for its gain: 1 + b1 z^-1 + b2 z^-2 over
/// 1 + a1 z^-1 + a2 z^-2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quadratics {
    /// b1 and b2.
    pub b: [Double; 2],
    /// a1 and a2.
    pub a: [Double; 2],
}

/// The section of `poles` and the zeros that go with them.
pub fn quadratics(zeros: Zeros, poles: Poles) -> Quadratics {
    let whole = |b1: f64, b2: f64| [b1.into(), b2.into()];
    let b = match (zeros, poles) {
        (Zeros::AtInfinity, Poles::One { .. }) => whole(1.0, 0.0),
        (Zeros::AtZero, Poles::One { .. }) => whole(-1.0, 0.0),
        (Zeros::AtInfinity, _) => whole(2.0, 1.0),
        (Zeros::AtZero, _) => whole(-2.0, 1.0),
        (Zeros::AtBoth, _) => whole(0.0, -1.0),
        (Zeros::Pair { square }, _) => [(square - 1.0) * 2.0 / (square + 1.0), Double::ONE],
    };
    Quadratics { b, a: denominator(poles) }
}

/// a1 and a2 of `poles`.
pub fn denominator(poles: Poles) -> [Double; 2] {
    match poles {
        Poles::Two { half_sum, product } => {
            let d = product - half_sum * 2.0 + 1.0;
            [(product - 1.0) * 2.0 / d, (product + half_sum * 2.0 + 1.0) / d]
        }
        Poles::One { pole } => [(pole + 1.0) / (pole - 1.0), Double::ZERO],
    }
}

/// How far zeros are from z = 1 and z = -1, where rounding moves them most: the lesser
/// of |b0 + b1 + b2| and |b0 - b1 + b2| for b0 = 1; infinite for zeros exactly there.
pub fn distance_from_ends(zeros: Zeros) -> f64 {
    match zeros {
        Zeros::Pair { square } => 4.0 * square.hi.min(1.0) / (1.0 + square.hi),
        Zeros::AtInfinity | Zeros::AtZero | Zeros::AtBoth => f64::INFINITY,
    }
}
