//! The exact response of finished sections.
//!
//! With w = 2 pi f / rate, a second-order polynomial is evaluated as
//!
//! ```text
//! P(z) z = (p0 + p1 + p2) - 2 sin^2(w/2) (p0 + p2) + j (p0 - p2) sin w     w <= pi/2
//!        = 2 cos^2(w/2) (p0 + p2) - (p0 - p1 + p2) + j (p0 - p2) sin w     w >  pi/2
//! ```
//!
//! with z = e^jw. A pole or zero near z = 1 makes p0 + p1 + p2 a small difference of
//! numbers near 2; it is summed without rounding, so what comes out is the response
//! of the coefficients as they stand, not of the evaluation. In terms of cos w the
//! same quantity would lose (1/w)^2 of its digits. Near a zero on the unit circle the
//! error is that of a frequency moved by a few parts in 10^16.
//!
//! A first-order polynomial is evaluated as
//! P(z) z^(1/2) = (p0 + p1) cos(w/2) + j (p0 - p1) sin(w/2).

use super::error_free::two_sum;
use crate::section::Section;
use core::f64::consts::PI;
use num_complex::Complex64;

/// H at `frequency_hz` (0 to half of `rate_hz`, both in Hz); 1 for no sections.
pub fn at(sections: &[Section], frequency_hz: f64, rate_hz: f64) -> Complex64 {
    let point = Point::new(frequency_hz, rate_hz);
    sections.iter().fold(Complex64::new(1.0, 0.0), |product, section| {
        let numerator = Polynomial::new(section.b);
        let denominator = Polynomial::new(section.a);
        let mut ratio = numerator.value(&point) / denominator.value(&point);
        // The two were turned by half an angle for each of their degrees; where the
        // degrees differ, H has to be turned back.
        let half_turn = Complex64::new(point.half_cos, point.half_sin);
        for _ in numerator.degree..denominator.degree {
            ratio *= half_turn;
        }
        for _ in denominator.degree..numerator.degree {
            ratio *= half_turn.conj();
        }
        product * ratio
    })
}

/// 20 log10 |H|, dB; negative infinity at a zero on the unit circle, 0 for no sections.
///
/// Never underflows: the magnitudes of a long cascade are gathered in logarithms.
pub fn gain_db(sections: &[Section], frequency_hz: f64, rate_hz: f64) -> f64 {
    gain_db_at(sections, &Point::new(frequency_hz, rate_hz))
}

/// [`gain_db`] at a point.
pub(super) fn gain_db_at(sections: &[Section], point: &Point) -> f64 {
    let (mut log10_sum, mut product) = (0.0, 1.0);
    for section in sections {
        product *= power_at(section.b, section.a, point);
        if !(1e-150..=1e150).contains(&product) {
            if product == 0.0 {
                return f64::NEG_INFINITY;
            }
            log10_sum += libm::log10(product);
            product = 1.0;
        }
    }
    10.0 * (log10_sum + libm::log10(product))
}

/// Group delay, -d(arg H)/dw, in seconds.
///
/// At a frequency where H is zero on the unit circle the jump of the phase is left
/// out: the value is the limit from either side.
pub fn group_delay_s(sections: &[Section], frequency_hz: f64, rate_hz: f64) -> f64 {
    let point = Point::new(frequency_hz, rate_hz);
    let frames: f64 = sections
        .iter()
        .map(|section| {
            Polynomial::new(section.b).delay_frames(&point) - Polynomial::new(section.a).delay_frames(&point)
        })
        .sum();
    frames / rate_hz
}

/// arg H, radians, continuous from 0 Hz on, where it is 0 for a positive gain; NaN where H
/// is 0.
///
/// A zero on the unit circle turns it by pi upward, as the limit of zeros inside does.
pub fn phase_rad(sections: &[Section], frequency_hz: f64, rate_hz: f64) -> f64 {
    let point = Point::new(frequency_hz, rate_hz);
    let angle = 2.0 * PI * (frequency_hz / rate_hz);
    let of = |p: [f64; 3]| Polynomial::new(p).phase(&point, angle);
    sections.iter().map(|section| of(section.b) - of(section.a)).sum()
}

/// |B/A|^2 at one point.
pub(super) fn power_at(b: [f64; 3], a: [f64; 3], point: &Point) -> f64 {
    magnitude_squared(Polynomial::new(b).value(point)) / magnitude_squared(Polynomial::new(a).value(point))
}

/// |v|^2, floored at the smallest normal number unless v is zero: what is nearer to
/// a zero than 1e-154 is nothing but rounding of the frequency.
fn magnitude_squared(v: Complex64) -> f64 {
    let squared = v.re * v.re + v.im * v.im;
    if squared < f64::MIN_POSITIVE && (v.re != 0.0 || v.im != 0.0) { f64::MIN_POSITIVE } else { squared }
}

/// The trigonometry of one frequency.
pub(super) struct Point {
    /// sin(w/2) and cos(w/2), each to its last digits.
    pub(super) half_sin: f64,
    pub(super) half_cos: f64,
    /// sin w and cos w.
    sin: f64,
    cos: f64,
    /// Whether w <= pi/2.
    low: bool,
}

impl Point {
    pub(super) fn new(frequency_hz: f64, rate_hz: f64) -> Point {
        // rate/2 - f is exact in the upper half of the range, so cos(w/2) keeps its
        // digits up to half the rate, as sin(w/2) does down to 0.
        let low = frequency_hz <= rate_hz / 4.0;
        let (half_sin, half_cos) = if low {
            let half_angle = PI * (frequency_hz / rate_hz);
            (libm::sin(half_angle), libm::cos(half_angle))
        } else {
            let from_half_rate = PI * ((rate_hz / 2.0 - frequency_hz) / rate_hz);
            (libm::cos(from_half_rate), libm::sin(from_half_rate))
        };
        Point::from_half_angle(half_sin, half_cos)
    }

    /// From sin(w/2) and cos(w/2).
    pub(super) fn from_half_angle(half_sin: f64, half_cos: f64) -> Point {
        let low = half_sin <= half_cos;
        let cos = if low { 1.0 - 2.0 * half_sin * half_sin } else { 2.0 * half_cos * half_cos - 1.0 };
        Point { half_sin, half_cos, sin: 2.0 * half_sin * half_cos, cos, low }
    }
}

/// p0 + p1 z^-1 + p2 z^-2 with its true degree.
pub(super) struct Polynomial {
    p: [f64; 3],
    degree: u32,
}

impl Polynomial {
    pub(super) fn new(p: [f64; 3]) -> Polynomial {
        let degree = if p[2] != 0.0 {
            2
        } else if p[1] != 0.0 {
            1
        } else {
            0
        };
        Polynomial { p, degree }
    }

    /// P(z) z^(degree/2).
    fn value(&self, point: &Point) -> Complex64 {
        let [p0, p1, p2] = self.p;
        match self.degree {
            0 => Complex64::new(p0, 0.0),
            1 => Complex64::new((p0 + p1) * point.half_cos, (p0 - p1) * point.half_sin),
            _ => {
                let (outer, outer_error) = two_sum(p0, p2);
                // Subtract the larger parts first, the rounding errors last: the
                // difference is exact where it is small.
                let re = if point.low {
                    let (sum, sum_error) = two_sum(outer, p1);
                    (sum - 2.0 * point.half_sin * point.half_sin * outer) + (sum_error + outer_error)
                } else {
                    let (sum, sum_error) = two_sum(outer, -p1);
                    (2.0 * point.half_cos * point.half_cos * outer - sum) - (sum_error + outer_error)
                };
                Complex64::new(re, (p0 - p2) * point.sin)
            }
        }
    }

    /// arg P at `angle`. The imaginary part of P(z) z^(degree/2) has one sign between both
    /// ends or is 0, so its argument has no jumps but those at zeros.
    fn phase(&self, point: &Point, angle: f64) -> f64 {
        let value = self.value(point);
        if value.re == 0.0 && value.im == 0.0 {
            return f64::NAN;
        }
        libm::atan2(value.im, value.re) - 0.5 * f64::from(self.degree) * angle
    }

    /// Re(z^-k / P) for k = 0, 1, 2: what a small change of each coefficient adds to
    /// ln |P|. Not finite at a zero; for coefficients that P has.
    pub(super) fn log_weights(&self, point: &Point) -> [f64; 3] {
        let value = self.value(point);
        // Turned by as many half angles as the value.
        let turned = match self.degree {
            0 => [(1.0, 0.0), (1.0, 0.0), (1.0, 0.0)],
            1 => [(point.half_cos, point.half_sin), (point.half_cos, -point.half_sin), (0.0, 0.0)],
            _ => [(point.cos, point.sin), (1.0, 0.0), (point.cos, -point.sin)],
        };
        turned.map(|(re, im)| (re * value.re + im * value.im) / magnitude_squared(value))
    }

    /// What the polynomial adds to the group delay, in frames: -d(arg P)/dw.
    fn delay_frames(&self, point: &Point) -> f64 {
        let [p0, p1, p2] = self.p;
        let turned = 0.5 * f64::from(self.degree);
        // Re V dIm V/dw - Im V dRe V/dw of V = P z^(degree/2), brought to forms
        // without cancellation.
        let slope = match self.degree {
            0 => return 0.0,
            1 => 0.5 * (p0 + p1) * (p0 - p1),
            _ => {
                let outer = p0 + p2;
                let sum = if point.low {
                    exact_sum(p0, p1, p2) * point.cos + 2.0 * point.half_sin * point.half_sin * outer
                } else {
                    -exact_sum(p0, -p1, p2) * point.cos + 2.0 * point.half_cos * point.half_cos * outer
                };
                (p0 - p2) * sum
            }
        };
        // Zeros on the unit circle turn the phase nowhere but at themselves.
        if slope == 0.0 {
            return turned;
        }
        turned - slope / magnitude_squared(self.value(point))
    }
}

/// p0 + p1 + p2, rounded once.
fn exact_sum(p0: f64, p1: f64, p2: f64) -> f64 {
    let (outer, outer_error) = two_sum(p0, p2);
    let (sum, sum_error) = two_sum(outer, p1);
    sum + (sum_error + outer_error)
}

#[cfg(test)]
mod tests {
    use super::*;

    const DELAY: Section = Section { b: [0.0, 0.0, 1.0], a: [1.0, 0.0, 0.0] };

    #[test]
    fn a_delay_has_gain_one_and_its_own_group_delay() {
        for frequency_hz in [0.0, 1.0, 11_999.0, 12_001.0, 23_999.0, 24_000.0] {
            assert!(gain_db(&[DELAY], frequency_hz, 48_000.0).abs() < 1e-14);
            assert!((group_delay_s(&[DELAY], frequency_hz, 48_000.0) * 48_000.0 - 2.0).abs() < 1e-14);
            let w = 2.0 * PI * frequency_hz / 48_000.0;
            let h = at(&[DELAY], frequency_hz, 48_000.0);
            assert!((h.re - libm::cos(2.0 * w)).abs() < 1e-14 && (h.im + libm::sin(2.0 * w)).abs() < 1e-14);
        }
    }

    #[test]
    fn agrees_with_plain_complex_arithmetic_at_mid_frequencies() {
        let section = Section { b: [0.3, -0.2, 0.7], a: [1.0, -0.4, 0.5] };
        let first = Section { b: [0.3, 0.9, 0.0], a: [1.0, 0.25, 0.0] };
        let mixed = Section { b: [0.3, 0.9, 0.0], a: [1.0, -0.4, 0.5] };
        let gain_only = Section { b: [0.5, 0.0, 0.0], a: [1.0, -0.4, 0.0] };
        let sections = [section, first, mixed, gain_only];
        for frequency_hz in [500.0, 1_900.0, 2_000.0, 2_100.0, 3_900.0] {
            let plain = |f: f64| {
                let w = 2.0 * PI * f / 8_000.0;
                let z1 = Complex64::new(libm::cos(w), -libm::sin(w));
                sections
                    .iter()
                    .map(|s| (s.b[0] + z1 * (s.b[1] + z1 * s.b[2])) / (s.a[0] + z1 * (s.a[1] + z1 * s.a[2])))
                    .fold(Complex64::new(1.0, 0.0), |a, b| a * b)
            };
            let (want, got) = (plain(frequency_hz), at(&sections, frequency_hz, 8_000.0));
            assert!((got - want).l1_norm() < 1e-14, "{frequency_hz} Hz: {got} for {want}");
            let want_db = 20.0 * libm::log10(libm::hypot(want.re, want.im));
            assert!((gain_db(&sections, frequency_hz, 8_000.0) - want_db).abs() < 1e-13);
            // Central difference over 1 Hz: its own error is of second order.
            let turn = plain(frequency_hz + 0.5) / plain(frequency_hz - 0.5);
            let want_s = -libm::atan2(turn.im, turn.re) / (2.0 * PI);
            let got_s = group_delay_s(&sections, frequency_hz, 8_000.0);
            assert!((got_s - want_s).abs() < 1e-9, "{frequency_hz} Hz: {got_s} s for {want_s} s");
        }
    }

    #[test]
    fn a_zero_on_the_unit_circle_is_no_trouble_for_gain_or_delay() {
        let notch = Section { b: [1.0, 0.0, 1.0], a: [1.0, 0.0, 0.81] };
        // sin^2(pi/4) rounds, so here the zero is met to a part in 10^16 only.
        assert!(gain_db(&[notch], 12_000.0, 48_000.0) < -290.0);
        let (at_zero, beside) =
            (group_delay_s(&[notch], 12_000.0, 48_000.0), group_delay_s(&[notch], 12_000.1, 48_000.0));
        assert!((at_zero / beside - 1.0).abs() < 1e-6);
        let dc_block = Section { b: [1.0, -1.0, 0.0], a: [1.0, -0.9, 0.0] };
        assert_eq!(gain_db(&[dc_block], 0.0, 48_000.0), f64::NEG_INFINITY);
        assert!(group_delay_s(&[dc_block], 0.0, 48_000.0).is_finite());
    }

    /// The argument but for whole turns, and its slope is the group delay, in which jumps of
    /// half a turn at zeros on the circle do not count.
    #[test]
    fn the_phase_is_the_argument_and_its_slope_the_group_delay() {
        let resonance = Section { b: [0.3, -0.2, 0.7], a: [1.0, -1.8, 0.97] };
        let notch = Section { b: [1.0, -1.2, 1.0], a: [1.0, -1.1, 0.81] };
        let dc_block = Section { b: [1.0, -1.0, 0.0], a: [1.0, -0.9, 0.0] };
        let twice = Section { b: [1.0, -2.0, 1.0], a: [1.0, 0.4, 0.0] };
        let sections = [resonance, notch, dc_block, twice, DELAY];
        for i in 1..400 {
            let hz = 10.0 * f64::from(i) - 5.0;
            let (phase, h) = (phase_rad(&sections, hz, 8_000.0), at(&sections, hz, 8_000.0));
            let turns = (phase - libm::atan2(h.im, h.re)) / (2.0 * PI);
            assert!((turns - turns.round()).abs() < 1e-12, "{hz} Hz: {turns}");
            // Central difference over 0.02 Hz.
            let [below, above] = [hz - 0.01, hz + 0.01].map(|hz| phase_rad(&sections, hz, 8_000.0));
            let delay_s = -(above - below) / (2.0 * PI * 0.02);
            assert!((delay_s - group_delay_s(&sections, hz, 8_000.0)).abs() < 1e-8, "{hz} Hz");
        }
        // Two zeros at 0 Hz: half a turn there; the third a quarter.
        assert!((phase_rad(&[twice], 1e-6, 8_000.0) - PI).abs() < 1e-8);
        assert!((phase_rad(&[dc_block], 1e-9, 8_000.0) - PI / 2.0).abs() < 1e-8);
        assert!(phase_rad(&[dc_block], 0.0, 8_000.0).is_nan());
    }

    #[test]
    fn a_long_cascade_does_not_underflow() {
        let tiny = Section { b: [1e-20, 0.0, 0.0], a: [1.0, 0.0, 0.0] };
        assert!((gain_db(&[tiny; 40], 1_000.0, 48_000.0) + 16_000.0).abs() < 1e-9);
    }
}
