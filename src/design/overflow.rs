//! Whether anything on the way through a cascade can overflow.
//!
//! What comes out of a section is the input times the gain of all sections up to it. Where
//! that is far above anything a recording needs, f64 ends: an impulse response of infinities
//! and differences of infinities has no tail that falls, no norm and no level.

use super::response::{self, Point};
use super::roots;
use crate::section::Section;
use core::f64::consts::{PI, TAU};

/// Largest gain of a cascade up to any of its sections, dB: 10^50, of which two passes make
/// 10^100. Figures take squares of it, and f64 ends at 10^308.
pub const MOST_GAIN_DB: f64 = 1_000.0;

/// Largest gain of a section alone, dB: beyond 3080 dB its square is not in f64.
const MOST_OWN_DB: f64 = 3_000.0;

/// Frequencies looked at beside those of the poles, even steps from 0 to half the rate, both
/// and the middle among them. At one of these three a numerator is at least as large as each
/// of its coefficients: the mean of |B|^2 over 1, j, -1 and -j is the sum of their squares.
const EVEN_STEPS: u32 = 64;

/// Numerators larger than this are brought down before they are squared.
const LARGE: f64 = 1e100;

/// A gain that is too large.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TooLarge {
    /// Index of the first section at which it is.
    pub section: usize,
    /// Gain of the cascade up to that section, or of that section alone if that is larger, dB.
    pub gain_db: f64,
    /// Where it is largest of the frequencies looked at, Hz.
    pub at_hz: f64,
}

/// The first section up to which the gain exceeds [`MOST_GAIN_DB`]; of finite sections whose
/// poles lie inside the unit circle.
///
/// Between the frequencies looked at the gain may be higher by some decibels a section; for
/// an overflow 5000 dB would be missing.
pub fn first(sections: &[Section], rate_hz: f64) -> Option<TooLarge> {
    let even = (0..=EVEN_STEPS).map(|i| PI * f64::from(i) / f64::from(EVEN_STEPS));
    let angles: Vec<f64> = even.chain(roots::poles(sections).map(|pole| pole.angle)).collect();
    let of = |angle: &f64| Point::from_half_angle(libm::sin(angle / 2.0), libm::cos(angle / 2.0));
    let points: Vec<Point> = angles.iter().map(of).collect();
    let mut gains_db = vec![0.0; points.len()];
    for (number, section) in sections.iter().enumerate() {
        let mut largest = (f64::NEG_INFINITY, 0.0);
        for ((gain_db, point), angle) in gains_db.iter_mut().zip(&points).zip(&angles) {
            let own_db = own_gain_db(section, point);
            *gain_db += own_db;
            let judged_db = if own_db > MOST_OWN_DB { gain_db.max(own_db) } else { *gain_db };
            if judged_db > largest.0 {
                largest = (judged_db, *angle);
            }
        }
        if largest.0 > MOST_GAIN_DB {
            return Some(TooLarge { section: number, gain_db: largest.0, at_hz: largest.1 / TAU * rate_hz });
        }
    }
    None
}

/// Gain of a section at a point, dB, whatever the size of its numerator; negative infinity at
/// a zero.
fn own_gain_db(section: &Section, point: &Point) -> f64 {
    let size = section.b.iter().fold(0.0, |size: f64, b| size.max(b.abs()));
    let scale = if size > LARGE { size } else { 1.0 };
    let power = response::power_at(section.b.map(|b| b / scale), section.a, point);
    if scale == 1.0 { 10.0 * libm::log10(power) } else { 10.0 * libm::log10(power) + 20.0 * libm::log10(scale) }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE_HZ: f64 = 48_000.0;

    fn gain(b0: f64) -> Section {
        Section { b: [b0, 0.0, 0.0], a: [1.0, 0.0, 0.0] }
    }

    #[test]
    fn the_limit_is_on_the_gain_up_to_each_section() {
        // 30 times 33 dB is 990 dB, 31 times 1023 dB.
        let step = gain(libm::exp10(33.0 / 20.0));
        assert_eq!(first(&[step; 30], RATE_HZ), None);
        let found = first(&[step; 40], RATE_HZ).unwrap();
        assert!(found.section == 30 && (found.gain_db - 1_023.0).abs() < 1e-9, "{found:?}");
        // What went down before may come up as far again.
        let down = gain(libm::exp10(-33.0 / 20.0));
        assert_eq!(first(&[[down; 40], [step; 40]].concat(), RATE_HZ), None);
        assert_eq!(first(&[[step, down]; 100].concat(), RATE_HZ), None);
        assert_eq!(first(&[gain(f64::MIN_POSITIVE); 9], RATE_HZ), None);
        assert_eq!(first(&[], RATE_HZ), None);
    }

    #[test]
    fn the_largest_coefficients_have_their_gain() {
        // 2 MAX at half the rate: 20 log10(1.797e308) = 6165.1 dB, and 6.0 dB.
        let difference = Section { b: [f64::MAX, -f64::MAX, 0.0], a: [1.0, 0.0, 0.0] };
        let found = first(&[difference], RATE_HZ).unwrap();
        assert!((found.gain_db - 6_171.1).abs() < 0.1 && (found.at_hz - 24_000.0).abs() < 1e-9, "{found:?}");
        // Brought down before, and still more than can be squared.
        assert!(first(&[gain(1e-200), gain(1e200)], RATE_HZ).unwrap().gain_db > 3_999.0);
    }

    #[test]
    fn the_gain_on_a_narrow_peak_counts() {
        // 1 / (1 - r) = 1e9 at 1 kHz, some 6 Hz / 1e6 wide: 180 dB each, and with 1 / |1 - r e^2jw|
        // of about 3.8 (11.7 dB) the sixth is beyond.
        let (r, w) = (1.0 - 1e-9, TAU * 1_000.0 / RATE_HZ);
        let peak = Section { b: [1.0, 0.0, 0.0], a: [1.0, -2.0 * r * libm::cos(w), r * r] };
        let found = first(&[peak; 9], RATE_HZ).unwrap();
        assert!(found.section == 5 && (found.at_hz - 1_000.0).abs() < 1e-3, "{found:?}");
    }
}
