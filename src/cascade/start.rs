//! The state in which a section starts.

use crate::section::Section;

/// The steady state of one section under a constant input.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Steady {
    /// The constant output, the input times H(1).
    pub(super) output: f64,
    /// First state of the transposed direct form II.
    pub(super) s1: f64,
    /// Second state of the transposed direct form II.
    pub(super) s2: f64,
}

/// The steady state of `section` under the constant `input`: at rest where a pole
/// at z = 1 leaves none.
pub(super) fn steady(section: &Section, input: f64) -> Steady {
    let [b0, b1, b2] = section.b;
    let [_, a1, a2] = section.a;
    let denominator = sum(1.0, a1, a2);
    if denominator == 0.0 {
        return Steady { output: 0.0, s1: 0.0, s2: 0.0 };
    }
    let output = sum(b0, b1, b2) / denominator * input;
    // s1 from y = b0 x + s1, so that the first sample out is `output` itself; the
    // equation of s1 would return it with an error that the section rings out.
    Steady { output, s1: output - b0 * input, s2: b2 * input - a2 * output }
}

/// a + b + c as if computed with twice the digits. For poles near z = 1 the terms
/// 1, a1 and a2 cancel to about (2 pi f / rate)^2, 2.7e-10 for 1 Hz at 384 kHz, and
/// a rounded partial sum would show in H(1) with that divisor's weight. The numerator
/// of a high-pass cancels to exactly zero.
fn sum(a: f64, b: f64, c: f64) -> f64 {
    let (partial, first) = two_sum(a, b);
    let (total, second) = two_sum(partial, c);
    total + (first + second)
}

/// The rounded sum and its rounding error, exactly (D. E. Knuth, The Art of
/// Computer Programming 2, section 4.2.2).
fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let b_part = sum - a;
    (sum, (a - (sum - b_part)) + (b - b_part))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The coefficients are SciPy 1.17.1's (`butter`, `iirnotch`), the states those of
    /// the exact steady state under the constant 0.7, from mpmath 1.4.1 at 50 digits.
    const CASES: [(&str, Section, Steady); 4] = [
        (
            "high-pass of order 2 at 1 Hz, 384 kHz",
            Section {
                b: [0.9999884300592808, -1.9999768601185617, 0.9999884300592808],
                a: [1.0, -1.999976859984698, 0.9999768602524252],
            },
            Steady { output: 0.0, s1: -0.6999919010414966, s2: 0.6999919010414966 },
        ),
        (
            "low-pass of order 2 at 1 Hz, 384 kHz",
            Section {
                b: [6.693176412483662e-11, 1.3386352824967323e-10, 6.693176412483662e-11],
                a: [1.0, -1.999976859984698, 0.9999768602524252],
            },
            Steady { output: 0.6999999836790237, s1: 0.6999999836321714, s2: -0.6999837858092467 },
        ),
        (
            "notch at 1 Hz, Q 2, 384 kHz",
            Section {
                b: [0.9999959094012987, -1.9999918185348684, 0.9999959094012987],
                a: [1.0, -1.9999918185348684, 0.9999918188025974],
            },
            Steady { output: 0.7, s1: 2.8634190909260226e-06, s2: 2.8634190909260226e-06 },
        ),
        (
            "low-pass of order 2 at 1 kHz, 48 kHz",
            Section {
                b: [0.003916126660547369, 0.007832253321094738, 0.003916126660547369],
                a: [1.0, -1.815341082704568, 0.8310055893467575],
            },
            Steady { output: 0.6999999999999968, s1: 0.6972587113376137, s2: -0.5789626238803445 },
        ),
    ];

    #[test]
    fn the_steady_state_is_exact_to_the_last_digits_down_to_low_edges() {
        for (name, section, expected) in CASES {
            let found = steady(&section, 0.7);
            // The output takes a sum, a quotient and a product, the states three more
            // roundings of terms no larger than 1.
            let close = |found: f64, expected: f64| (found - expected).abs() <= 4.0 * f64::EPSILON;
            assert!(close(found.output, expected.output), "{name}: {found:?}, expected {expected:?}");
            assert!(close(found.s1, expected.s1), "{name}: {found:?}, expected {expected:?}");
            assert!(close(found.s2, expected.s2), "{name}: {found:?}, expected {expected:?}");
        }
    }

    #[test]
    fn the_first_output_is_the_steady_one() {
        for (name, section, _) in CASES {
            for input in [0.7, -0.3, 1e-9] {
                let start = steady(&section, input);
                let first = section.b[0] * input + start.s1;
                assert!((first - start.output).abs() <= f64::EPSILON * input.abs(), "{name}, {input}");
            }
        }
    }

    #[test]
    fn sums_keep_what_cancels() {
        assert_eq!(sum(1.0, -2.0, 1.0), 0.0);
        assert_eq!(sum(1e16, 1.0, -1e16), 1.0);
        assert_eq!(sum(0.1, -0.2, 0.1), 0.0);
        assert_eq!(sum(1.0, 1e-17, -1.0), 1e-17);
    }
}
