//! From exact quadratics to f64 coefficients.
//!
//! At 20 Hz and 384 kHz 1 + a1 + a2 is 1e-7, and it decides where the poles are: the
//! last digit of a1 moves them by a part in 10^9. Rounding each coefficient for itself
//! costs up to 2e-5 dB at the edges of a narrow band there. So, as a rule,
//!
//! * a1 and a2 are chosen together, among the f64 next to their exact values, so that
//!   the denominator is right at the poles' frequency. There a1 and a2 nearly make up
//!   for each other, and the damping that a2 alone decides has digits to spare.
//! * the first coefficient of a zero pair moves by up to a part in 10^3, so that the
//!   middle one falls on an f64 and the zeros are where they belong; the gain of
//!   another section makes up for it. Where that section has a zero pair itself, its
//!   first coefficient moves by much less, or by a few f64 only.

use crate::design::double::Double;

/// How coefficients become f64.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(in crate::design) enum Rounding {
    /// Those of a polynomial together.
    Together,
    /// Each for itself, to the nearest.
    Each,
}

/// How far the first coefficient of a zero pair may move where another section's gain
/// makes up for it.
const FREE_LEEWAY: f64 = 1e-3;

/// The same where none does: 2e-7 dB. What is needed is 1e-9 at 20 Hz and 384 kHz, and
/// falls with the square of the frequency.
const FITTED_LEEWAY: f64 = 2e-8;

/// How many f64 up and down the first coefficient moves otherwise: 1.2e-13 dB.
const NEIGHBORS: u32 = 64;

/// The denominator [1, a1, a2].
pub(in crate::design) fn denominator([a1, a2]: [Double; 2], rounding: Rounding) -> [f64; 3] {
    if rounding == Rounding::Each || a2 == Double::ZERO {
        return [1.0, a1.hi, a2.hi];
    }
    // Of the frequency W^2 = the product of the poles.
    let cos = -a1.hi / (1.0 + a2.hi);
    let (mut best, mut least) = ([a1.hi, a2.hi], f64::INFINITY);
    for near1 in [a1.hi, a1.hi.next_down(), a1.hi.next_up()] {
        let error1 = (near1 - a1.hi) - a1.lo;
        let (down, up) = (a2.hi.next_down(), a2.hi.next_up());
        for near2 in [a2.hi, down, up, down.next_down(), up.next_up()] {
            let error2 = (near2 - a2.hi) - a2.lo;
            // |error1 + error2 e^-jw|^2, that of (1 + a1 z^-1 + a2 z^-2) z.
            let error = error1 * error1 + error2 * error2 + 2.0 * cos * error1 * error2;
            if error < least {
                (best, least) = ([near1, near2], error);
            }
        }
    }
    [1.0, best[0], best[1]]
}

/// The numerator `gain` (1 + b1 z^-1 + b2 z^-2) of a section whose gain is free: `gain`
/// moves where that keeps zeros in their place.
pub(super) fn numerator(b: [Double; 2], gain: f64, rounding: Rounding) -> [f64; 3] {
    let first = if rounding == Rounding::Together { moved(b[0], gain, FREE_LEEWAY) } else { gain };
    from_first(b, first)
}

/// The numerator of the section that sets the gain of the whole.
pub(super) fn fitted_numerator(b: [Double; 2], gain: Double, leeway: bool) -> [f64; 3] {
    if leeway {
        return from_first(b, moved(b[0], gain.hi, FITTED_LEEWAY));
    }
    let error = |first: f64| (b[0] * first).lo.abs();
    let (mut best, mut least) = (gain.hi, error(gain.hi));
    let (mut below, mut above) = (gain.hi, gain.hi);
    for _ in 0..NEIGHBORS {
        (below, above) = (below.next_down(), above.next_up());
        for near in [below, above] {
            if error(near) < least {
                (best, least) = (near, error(near));
            }
        }
    }
    from_first(b, best)
}

/// The first coefficient for which the middle one falls on an f64, at most the part
/// `leeway` away from `gain`.
fn moved(b1: Double, gain: f64, leeway: f64) -> f64 {
    let mut first = gain;
    let from_end = b1.abs() - 2.0;
    // A second time in case the middle coefficient crossed a power of two, where the
    // distance between f64 changes.
    for _ in 0..2 {
        // This moves twice the first by whole f64, and the middle one by the error.
        let moved = first - (b1.abs() * first).lo / from_end.hi;
        if (moved - gain).abs() <= leeway * gain {
            first = moved;
        }
    }
    first
}

fn from_first([b1, b2]: [Double; 2], first: f64) -> [f64; 3] {
    [first, (b1 * first).hi, b2.hi * first]
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::bilinear::quadratics;
    use crate::design::error_free::two_sum;
    use crate::design::transform::{Poles, Zeros};

    fn pair(square: f64) -> [Double; 2] {
        let any = Poles::Two { half_sum: (-1.0).into(), product: Double::ONE };
        quadratics(Zeros::Pair { square: square.into() }, any).b
    }

    /// b0 + b1 + b2 of a pair at W = `w` is 4 w^2 / (1 + w^2) of b0: with the gain as it
    /// is to 1e-16 / that, with leeway to 1e-15 at any frequency. (Sum and difference
    /// below are exact.)
    #[test]
    fn leeway_puts_low_zeros_where_they_belong() {
        for i in 1..400 {
            let square = 1e-10 * libm::pow(1.05, f64::from(i));
            for gain in [1.0, 0.75, 1.3e-5] {
                let want = 4.0 * square / (1.0 + square);
                let [b0, b1, b2] = numerator(pair(square), gain, Rounding::Together);
                assert_eq!(b0, b2);
                assert!((b0 / gain - 1.0).abs() <= 5e-16 / want);
                assert!((((b0 + b1) + b2) / b0 / want - 1.0).abs() < 1e-15, "W^2 = {square:e}");
            }
        }
    }

    /// Of 129 roundings, spread evenly over one step, the least error is a 64th of the worst,
    /// or a little more by bad luck; near both ends, where neighbors round alike, it is at
    /// least none the worse.
    #[test]
    fn a_fitted_gain_moves_by_64_f64_at_most_and_leaves_zeros_nearer() {
        let error = |b: [Double; 2], b0: f64, b1: f64| (b[0] - Double::from(b1) / b0).hi.abs();
        let (mut near, mut seen) = (0, 0);
        for i in 1..500 {
            let square = 1e-10 * libm::pow(1.05, f64::from(i));
            let (b, gain) = (pair(square), Double::ONE / 3.0);
            let [b0, b1, _] = fitted_numerator(b, gain, false);
            assert!((b0 / gain.hi - 1.0).abs() <= 64.0 * f64::EPSILON);
            assert!(error(b, b0, b1) <= error(b, gain.hi, (b[0] * gain.hi).hi));
            if square > 0.05 {
                seen += 1;
                near += u32::from(error(b, b0, b1) < f64::EPSILON / 32.0);
            }
        }
        assert!(seen > 80 && near * 10 > seen * 9, "{near} of {seen}");
    }

    /// The sum that puts the poles where they are is right to half of 2^-53, the
    /// smallest step it can take.
    #[test]
    fn low_poles_are_off_by_no_more_than_half_a_step() {
        for i in 1..400 {
            let w = 1e-6 * libm::pow(1.02, f64::from(i));
            for damping in [0.7, 0.1, 1e-3] {
                let (half_sum, product) = (-damping * w, w * w);
                let poles = Poles::Two { half_sum: half_sum.into(), product: product.into() };
                let [_, a1, a2] = denominator(quadratics(Zeros::AtZero, poles).a, Rounding::Together);
                let want = 4.0 * product / (1.0 - 2.0 * half_sum + product);
                let (outer, error) = two_sum(1.0, a2);
                let got = (outer + a1) + error;
                assert!((got - want).abs() <= 0.5 * f64::EPSILON / 2.0 * 1.01, "W = {w:e}, damping {damping}");
            }
        }
    }
}
