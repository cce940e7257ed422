//! Sections with fewer decimal digits.

use crate::section::Section;

/// Digits that carry any f64 in full.
pub const MOST_DIGITS: u32 = 17;

/// `section` with every coefficient rounded to `digits` significant decimal digits, 1 to 17;
/// the decimal nearest to the coefficient, and the f64 nearest to that.
///
/// Zeros at z = 1 and z = -1 stay where they are, and so do those on the unit circle keep
/// to it: equal coefficients stay equal, and `b[1]` stays twice `b[0]` where it is that.
pub fn to_digits(section: &Section, digits: u32) -> Section {
    if digits >= MOST_DIGITS {
        return *section;
    }
    let round = |value: f64| decimal(value, digits);
    let mut b = section.b.map(round);
    if has_double_zero_at_end(section) {
        // Twice a number that begins with 5 or more may have a digit more, half of what
        // then begins with 1 has not: the one of the two that needs no other digit is rounded.
        if round(2.0 * b[0]) == 2.0 * b[0] {
            b[1] = f64::copysign(2.0 * b[0], section.b[1]);
        } else {
            b[0] = f64::copysign(0.5 * b[1], section.b[0]);
            b[2] = f64::copysign(b[0], section.b[2]);
        }
    }
    Section { b, a: section.a.map(round) }
}

/// Whether the numerator is `b[0]` (1 +- z^-1)^2.
pub(super) fn has_double_zero_at_end(section: &Section) -> bool {
    let [b0, b1, b2] = section.b;
    b2 == b0 && b1.abs() == 2.0 * b0.abs()
}

fn decimal(value: f64, digits: u32) -> f64 {
    let places = digits.saturating_sub(1) as usize;
    format!("{value:.places$e}").parse().unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn digits_of(value: f64) -> usize {
        let text = format!("{value:e}");
        text.split('e').next().unwrap().chars().filter(char::is_ascii_digit).count()
    }

    #[test]
    fn decimals_are_the_nearest() {
        for (value, digits, expected) in [
            (1.0 / 3.0, 3, 0.333),
            (-1.995_973_219_799_734_4, 4, -1.996),
            (9.996, 3, 10.0),
            (6.693_176_412_483_662e-11, 2, 6.7e-11),
            (0.0, 5, 0.0),
        ] {
            assert_eq!(decimal(value, digits), expected);
        }
    }

    #[test]
    fn a_double_zero_stays_at_its_end_with_no_digit_more_than_asked_for() {
        for gain in [0.987_654_321, 0.123_456_789, 1.986_364_381_199_748_7, 0.5, 4.999_96, 5.000_04, 6.7e-11] {
            for sign in [-2.0, 2.0] {
                for digits in 1..=17 {
                    let section = Section { b: [gain, sign * gain, gain], a: [1.0, -1.5, 0.75] };
                    let Section { b, .. } = to_digits(&section, digits);
                    assert_eq!((b[1], b[2]), (sign * b[0], b[0]), "{gain} with {digits} digits");
                    let most = b.map(digits_of).into_iter().max().unwrap();
                    assert!(most <= digits as usize, "{b:?} with {digits} digits");
                    // Half of a unit in the last digit of b[0] or b[1].
                    let unit = libm::exp10(1.0 - f64::from(digits));
                    assert!((b[0] / gain - 1.0).abs() <= 0.5 * unit, "{b:?} with {digits} digits");
                }
            }
        }
    }

    #[test]
    fn zeros_on_the_unit_circle_keep_to_it() {
        let section = Section { b: [0.983_055_240_857_154, 0.938_146_8, 0.983_055_240_857_154], a: [1.0, 0.9, 0.96] };
        for digits in 1..=17 {
            let rounded = to_digits(&section, digits);
            assert_eq!(rounded.b[0], rounded.b[2]);
        }
    }
}
