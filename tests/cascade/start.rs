//! The steady-state start: as if the first sample had been there for ever.

use crate::helpers::{noise, run_one};
use crate::rounding::{Errors, bound};
use bandproof::section::Section;

/// H(1) of a cascade.
fn gain_at_zero(sections: &[Section]) -> f64 {
    sections.iter().map(|s| (s.b[0] + s.b[1] + s.b[2]) / (1.0 + s.a[1] + s.a[2])).product()
}

/// A second-order Butterworth high-pass (`sign` -1) or low-pass (`sign` 1) by the
/// bilinear transform (handbook formula, from memory).
fn butterworth(edge_hz: f64, rate_hz: f64, sign: f64) -> Section {
    let k = libm::tan(std::f64::consts::PI * edge_hz / rate_hz);
    let denominator = 1.0 + std::f64::consts::SQRT_2 * k + k * k;
    let gain = if sign > 0.0 { k * k / denominator } else { 1.0 / denominator };
    let a1 = 2.0 * (k * k - 1.0) / denominator;
    Section {
        b: [gain, sign * 2.0 * gain, gain],
        a: [1.0, a1, (1.0 - std::f64::consts::SQRT_2 * k + k * k) / denominator],
    }
}

fn notch(center_hz: f64, width_hz: f64, rate_hz: f64) -> Section {
    let half = libm::tan(std::f64::consts::PI * width_hz / rate_hz);
    let gain = 1.0 / (1.0 + half);
    let middle = -2.0 * gain * libm::cos(2.0 * std::f64::consts::PI * center_hz / rate_hz);
    Section { b: [gain, middle, gain], a: [1.0, middle, gain * (1.0 - half)] }
}

/// Frames until the slowest pole of `sections` has decayed by e^-60, below all rounding.
fn settled(sections: &[Section]) -> usize {
    let radius = sections.iter().fold(0.0, |radius: f64, s| {
        let [_, a1, a2] = s.a;
        let root = a1 * a1 - 4.0 * a2;
        radius.max(if root > 0.0 { (a1.abs() + root.sqrt()) / 2.0 } else { a2.sqrt() })
    });
    (60.0 / (1.0 - radius)) as usize
}

fn cases() -> Vec<(&'static str, Vec<Section>)> {
    vec![
        ("low-pass 1 kHz", vec![butterworth(1000.0, 48e3, 1.0); 3]),
        ("high-pass 90 Hz, notches", {
            let notches = (1..=8).map(|line| notch(50.0 * f64::from(line), 2.0, 48e3));
            [butterworth(90.0, 48e3, -1.0)].into_iter().chain(notches).collect()
        }),
        ("notches before a low-pass, 20 sections", {
            let notches = (1..=19).map(|line| notch(60.0 * f64::from(line), 5.0, 48e3));
            notches.chain([butterworth(30.0, 48e3, 1.0)]).collect()
        }),
        ("low-pass 1 Hz at 384 kHz", vec![butterworth(1.0, 384e3, 1.0)]),
        ("high-pass 1 Hz at 384 kHz", vec![butterworth(1.0, 384e3, -1.0)]),
        ("notch 5 Hz at 192 kHz", vec![notch(5.0, 1.0, 192e3)]),
    ]
}

#[test]
fn a_constant_makes_no_step() {
    for (name, sections) in cases() {
        for level in [0.5, -0.7, 1e-3] {
            let input = vec![level; 20_000];
            let expected = level * gain_at_zero(&sections);
            let tolerance = bound(&sections, &input, Errors::Alike);
            for (frame, y) in run_one(&sections, &input).iter().enumerate() {
                let off = (y - expected).abs();
                assert!(off <= tolerance, "{name}, frame {frame}: {y:e}, expected {expected:e} within {tolerance:e}");
            }
        }
    }
}

#[test]
fn a_high_pass_turns_a_constant_into_exact_zeros() {
    for section in [butterworth(40.0, 48e3, -1.0), butterworth(1.0, 384e3, -1.0)] {
        for level in [0.5, -0.7, 1e-3, 1.0 / 3.0] {
            let output = run_one(&[section, notch(50.0, 2.0, 48e3), section], &vec![level; 3000]);
            assert!(output.iter().all(|&y| y == 0.0), "{level}");
        }
    }
}

#[test]
fn the_start_equals_a_long_warm_up() {
    for (name, sections) in cases() {
        // Starts at rest: the frame before the constant is 0.
        let level = 0.7;
        let warm_up = settled(&sections);
        let signal: Vec<f64> = [level].into_iter().chain(noise(5, 2000)).collect();
        let long: Vec<f64> =
            [0.0].into_iter().chain(std::iter::repeat_n(level, warm_up)).chain(signal.iter().copied()).collect();
        let warmed = &run_one(&sections, &long)[warm_up + 1..];
        // Both round, and the constant rounds the same way for long.
        let tolerance = 2.0 * bound(&sections, &long, Errors::Alike);
        assert!(tolerance < 1e-3, "{name}: a bound that says something, not {tolerance:e}");
        for (frame, (found, expected)) in run_one(&sections, &signal).iter().zip(warmed).enumerate() {
            let off = (found - expected).abs();
            assert!(off <= tolerance, "{name}, frame {frame}: {found:e}, warmed up {expected:e}, {tolerance:e}");
        }
    }
}

#[test]
fn a_pole_at_z_1_starts_from_rest() {
    let sum = Section { b: [1.0, 0.0, 0.0], a: [1.0, -1.0, 0.0] };
    let gain = Section { b: [3.0, 0.0, 0.0], a: [1.0, 0.0, 0.0] };
    assert_eq!(run_one(&[gain, sum], &[1.0; 5]), [3.0, 6.0, 9.0, 12.0, 15.0]);
}
