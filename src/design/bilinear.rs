//! The bilinear transform s = (z - 1) / (z + 1) of quadratics, with coefficients that
//! are rounded as one.
//!
//! A pole pair s^2 - 2 h s + m (h half the sum, m the product) becomes
//!
//! ```text
//! a1 = -2 + 4 (m - h) / D = 2 - 4 (1 - h) / D,   a2 = 1 + 4 h / D,   D = 1 - 2 h + m
//! ```
//!
//! and a zero pair at +-jW the numerator 1, b1 = -2 + 4 m / (1 + m), 1 with m = W^2.
//!
//! # Rounding
//! At 20 Hz and 384 kHz 1 + a1 + a2 = 4 m / D is 1e-7, and it decides where the poles
//! are: the last digit of a1 moves them by a part in 10^9. Rounding each coefficient
//! for itself costs up to 2e-5 dB at the edges of a narrow band there. So
//!
//! * a1 and a2 are chosen together, among the f64 next to their exact values, so that
//!   the denominator is right at the poles' frequency. There a1 and a2 nearly make up
//!   for each other, and the damping that a2 alone decides has digits to spare.
//! * the first coefficient of a zero pair moves by up to a part in 10^9, so that the
//!   middle one falls on an f64 and the zeros are where they belong.

use super::error_free::two_sum;
use super::transform::{Poles, Zeros};

/// The denominator [1, a1, a2].
pub fn denominator(poles: Poles) -> [f64; 3] {
    match poles {
        Poles::Two { half_sum, product } => {
            let d = 1.0 - 2.0 * half_sum + product;
            let a1 = if product <= 1.0 {
                two_sum(-2.0, 4.0 * (product - half_sum) / d)
            } else {
                two_sum(2.0, -4.0 * (1.0 - half_sum) / d)
            };
            // Towards -1 (one pole far below, one far above W = 1) from that end.
            let a2 = if 1.0 + product >= -2.0 * half_sum {
                two_sum(1.0, 4.0 * half_sum / d)
            } else {
                two_sum(-1.0, 2.0 * (1.0 + product) / d)
            };
            let [a1, a2] = round_together(a1, a2, (1.0 - product) / (1.0 + product));
            [1.0, a1, a2]
        }
        // -(1 + p) / (1 - p) from the end that is nearer.
        Poles::One { pole } => {
            let a1 = if pole >= -1.0 { -1.0 - 2.0 * pole / (1.0 - pole) } else { 1.0 - 2.0 / (1.0 - pole) };
            [1.0, a1, 0.0]
        }
    }
}

/// The f64 near a1 and a2, each given as a sum of two, that make the error of
/// (1 + a1 z^-1 + a2 z^-2) z least where cos w is `cos`.
fn round_together(a1: (f64, f64), a2: (f64, f64), cos: f64) -> [f64; 2] {
    let (mut best, mut least) = ([a1.0, a2.0], f64::INFINITY);
    for near1 in [a1.0, a1.0.next_down(), a1.0.next_up()] {
        let error1 = (near1 - a1.0) - a1.1;
        let (down, up) = (a2.0.next_down(), a2.0.next_up());
        for near2 in [a2.0, down, up, down.next_down(), up.next_up()] {
            let error2 = (near2 - a2.0) - a2.1;
            // |error1 + error2 e^-jw|^2
            let error = error1 * error1 + error2 * error2 + 2.0 * cos * error1 * error2;
            if error < least {
                (best, least) = ([near1, near2], error);
            }
        }
    }
    best
}

/// The numerator of the zeros that go with `poles`. Its first coefficient is `gain`, or
/// differs by up to the part `leeway` of it where that keeps zeros in their place.
pub fn numerator(zeros: Zeros, poles: Poles, gain: f64, leeway: f64) -> [f64; 3] {
    let single = matches!(poles, Poles::One { .. });
    match zeros {
        Zeros::AtInfinity if single => [gain, gain, 0.0],
        Zeros::AtZero if single => [gain, -gain, 0.0],
        Zeros::AtInfinity => [gain, 2.0 * gain, gain],
        Zeros::AtZero => [gain, -2.0 * gain, gain],
        Zeros::AtBoth => [gain, 0.0, -gain],
        Zeros::Pair { square } => {
            // b1 = b0 (end + from_end), from_end with all its digits.
            let (end, from_end) =
                if square <= 1.0 { (-2.0, 4.0 * square / (1.0 + square)) } else { (2.0, -4.0 / (1.0 + square)) };
            let mut first = gain;
            // A second time in case the middle coefficient crossed a power of two, where
            // the distance between f64 changes.
            for _ in 0..2 {
                let (_, error) = two_sum(end * first, from_end * first);
                // This moves end b0 by whole f64 and from_end b0 by the error.
                let moved = first - error / from_end;
                if (moved - gain).abs() <= leeway * gain {
                    first = moved;
                }
            }
            [first, end * first + from_end * first, first]
        }
    }
}

/// How far zeros are from z = 1 and z = -1, where rounding moves them most: the lesser
/// of |b0 + b1 + b2| and |b0 - b1 + b2| for b0 = 1; infinite for zeros exactly there.
pub fn distance_from_ends(zeros: Zeros) -> f64 {
    match zeros {
        Zeros::Pair { square } => 4.0 * square.min(1.0) / (1.0 + square),
        Zeros::AtInfinity | Zeros::AtZero | Zeros::AtBoth => f64::INFINITY,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const ANY: Poles = Poles::Two { half_sum: -1.0, product: 1.0 };

    /// b0 + b1 + b2 of a pair at W = `w` is 4 w^2 / (1 + w^2) of b0: with the gain as it
    /// is to 1e-16 / that, with leeway to 1e-15 at any frequency. (Sum and difference
    /// below are exact.)
    #[test]
    fn leeway_puts_low_zeros_where_they_belong() {
        for i in 1..400 {
            let square = 1e-10 * libm::pow(1.05, f64::from(i));
            for gain in [1.0, 0.75, 1.3e-5] {
                let want = 4.0 * square / (1.0 + square);
                let [b0, b1, b2] = numerator(Zeros::Pair { square }, ANY, gain, 1e-3);
                assert_eq!(b0, b2);
                assert!((b0 / gain - 1.0).abs() <= 5e-16 / want);
                assert!((((b0 + b1) + b2) / b0 / want - 1.0).abs() < 1e-15, "W^2 = {square:e}");
            }
        }
    }

    #[test]
    fn without_leeway_the_gain_stays() {
        assert_eq!(numerator(Zeros::Pair { square: 1e-8 }, ANY, 0.3, 0.0)[0], 0.3);
    }

    /// The sum that puts the poles where they are is right to half of 2^-53, the
    /// smallest step it can take.
    #[test]
    fn low_poles_are_off_by_no_more_than_half_a_step() {
        for i in 1..400 {
            let w = 1e-6 * libm::pow(1.02, f64::from(i));
            for damping in [0.7, 0.1, 1e-3] {
                let (half_sum, product) = (-damping * w, w * w);
                let [_, a1, a2] = denominator(Poles::Two { half_sum, product });
                let want = 4.0 * product / (1.0 - 2.0 * half_sum + product);
                let got = (1.0 + a1) + a2;
                assert!((got - want).abs() <= 0.5 * f64::EPSILON / 2.0 * 1.01, "W = {w:e}, damping {damping}");
            }
        }
    }
}
