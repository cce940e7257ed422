//! Sections as integers.

use super::rounding::has_double_zero_at_end;
use crate::section::Section;

/// A second-order section whose coefficients are integers:
///
/// ```text
///        (b[0] + b[1] z^-1 + b[2] z^-2) / 2^b_q_bits
/// H(z) = -------------------------------------------      a[0] = 2^a_q_bits
///        (a[0] + a[1] z^-1 + a[2] z^-2) / 2^a_q_bits
/// ```
///
/// The denominator, whose coefficients lie within 2, has two bits before the binary point in
/// every section. A numerator may be 10^-10 or 100: it has as many bits behind the point as
/// let |`b[0]`| + |`b[1]`| + |`b[2]`| fit into a word, so that no sum of products of words
/// leaves two words.
///
/// A word for each output is coarse where poles lie near the unit circle: 1/A(z) raises the
/// rounding error of each output by 80 dB and more for hum filters. So what rounding cut off
/// goes into the next two outputs, times `error_feedback`, the integers nearest to a\[1\] and
/// a\[2\]: the errors then pass (1 + e1 z^-1 + e2 z^-2)/A(z), in which near poles at 0 Hz,
/// half the rate or between two such lines little is left (error feedback; common
/// practice, no source).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Integers {
    /// Numerator, constant term first.
    pub b: [i64; 3],
    /// Denominator, constant term first.
    pub a: [i64; 3],
    /// What of the last two rounding errors is taken off the next output.
    pub error_feedback: [i64; 2],
    /// Bits of the numerator behind the binary point; negative where it has none.
    pub b_q_bits: i32,
    /// Bits of the denominator behind the binary point: the word length less 2.
    pub a_q_bits: i32,
}

impl Integers {
    /// The section that the integers stand for, exactly.
    pub fn section(&self) -> Section {
        let value = |integer: i64, q_bits: i32| libm::scalbn(integer as f64, -q_bits);
        Section { b: self.b.map(|b| value(b, self.b_q_bits)), a: self.a.map(|a| value(a, self.a_q_bits)) }
    }
}

/// `section` in words of `bits` bits (8 to 32), each coefficient rounded to the nearest.
///
/// Zeros at z = 1 and z = -1 stay where they are, and zeros on the unit circle keep to it.
pub fn to_integers(section: &Section, bits: u32) -> Integers {
    let word = bits.cast_signed() - 1;
    let (low, high) = (-(1_i64 << word), (1_i64 << word) - 1);
    let a_q_bits = word - 1;
    let a = section.a.map(|a| nearest(a, a_q_bits).clamp(low, high));
    let error_feedback = [section.a[1], section.a[2]].map(|a| nearest(a, 0));
    let magnitude = section.b.iter().map(|b| b.abs()).fold(0.0, |sum, b| sum + b);
    if magnitude == 0.0 {
        return Integers { b: [0; 3], a, error_feedback, b_q_bits: a_q_bits, a_q_bits };
    }
    // The sum is at least 2^ilogb and below twice that.
    let mut b_q_bits = word - libm::ilogb(magnitude);
    loop {
        let b = numerator(section, b_q_bits);
        if b.iter().map(|b| b.abs()).sum::<i64>() <= high {
            return Integers { b, a, error_feedback, b_q_bits, a_q_bits };
        }
        b_q_bits -= 1;
    }
}

fn numerator(section: &Section, q_bits: i32) -> [i64; 3] {
    let mut b = section.b.map(|b| nearest(b, q_bits));
    if has_double_zero_at_end(section) {
        let twice = 2 * b[0].abs();
        b[1] = if section.b[1] < 0.0 { -twice } else { twice };
    }
    b
}

fn nearest(value: f64, q_bits: i32) -> i64 {
    libm::round(libm::scalbn(value, q_bits)) as i64
}

#[cfg(test)]
mod tests {
    use super::*;

    const SECTIONS: [Section; 5] = [
        Section { b: [0.5, -1.0, 0.5], a: [1.0, -1.995_973_219_799_734_4, 0.996_000_580_481_827_6] },
        Section { b: [6.693e-11, 1.3386e-10, 6.693e-11], a: [1.0, -1.9, 0.91] },
        Section { b: [100.0, 0.25, -3.0], a: [1.0, 1.999, 0.9995] },
        Section { b: [1.0, -1.0, 0.0], a: [1.0, -0.9, 0.0] },
        Section { b: [0.3, 0.1, 0.3], a: [1.0, 0.0, -0.99] },
    ];

    #[test]
    fn words_hold_them_and_stand_for_the_nearest() {
        for section in SECTIONS {
            for bits in 8..=32_u32 {
                let word = 1_i64 << (bits - 1);
                let integers = to_integers(&section, bits);
                let sum: i64 = integers.b.iter().map(|b| b.abs()).sum();
                assert!(sum < word && 4 * sum >= word - 16, "{integers:?} in {bits} bits");
                assert!(integers.a.iter().all(|a| (-word..word).contains(a)), "{integers:?} in {bits} bits");
                assert_eq!(integers.a[0], word / 2);
                let back = integers.section();
                let (b_step, a_step) = (libm::scalbn(1.0, -integers.b_q_bits), libm::scalbn(1.0, -integers.a_q_bits));
                // A double zero's middle coefficient is twice a rounded one.
                let steps = back.b.iter().zip(section.b).map(|(back, b)| (back - b).abs() / b_step);
                assert!(steps.fold(0.0, f64::max) <= 1.0, "{back:?} in {bits} bits");
                // 1.999 does not fit into a short word.
                let steps = back.a.iter().zip(section.a).map(|(back, a)| (back - a).abs() / a_step);
                assert!(steps.fold(0.0, f64::max) <= 1.0, "{back:?} in {bits} bits");
            }
        }
    }

    #[test]
    fn zeros_that_lie_on_the_circle_stay_on_it() {
        for bits in 8..=32 {
            let double = to_integers(&SECTIONS[0], bits).b;
            assert_eq!((double[1], double[2]), (-2 * double[0], double[0]));
            let first = to_integers(&SECTIONS[3], bits).b;
            assert_eq!((first[1], first[2]), (-first[0], 0));
            let pair = to_integers(&SECTIONS[4], bits).b;
            assert_eq!(pair[0], pair[2]);
        }
    }
}
