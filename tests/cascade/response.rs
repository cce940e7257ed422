//! From the impulse response to the frequency response, against formulas.

use crate::helpers::{random_sections, run_one};
use crate::rounding::{Errors, bound, impulse};
use bandproof::section::Section;

/// A complex number as (real, imaginary): this file's own, to depend on nothing it checks.
type Complex = (f64, f64);

fn multiply(a: Complex, b: Complex) -> Complex {
    (a.0 * b.0 - a.1 * b.1, a.0 * b.1 + a.1 * b.0)
}

fn divide(a: Complex, b: Complex) -> Complex {
    let square = b.0 * b.0 + b.1 * b.1;
    let (re, im) = multiply(a, (b.0, -b.1));
    (re / square, im / square)
}

/// The product of the sections' H(z) at z = e^(j angle).
fn analytic(sections: &[Section], angle: f64) -> Complex {
    let polynomial = |c: &[f64; 3]| {
        (
            c[0] + c[1] * libm::cos(angle) + c[2] * libm::cos(2.0 * angle),
            -c[1] * libm::sin(angle) - c[2] * libm::sin(2.0 * angle),
        )
    };
    sections.iter().fold((1.0, 0.0), |h, s| multiply(h, divide(polynomial(&s.b), polynomial(&s.a))))
}

/// The discrete-time Fourier transform of what the cascade makes of an impulse.
fn measured(response: &[f64], angle: f64) -> Complex {
    response[1..].iter().enumerate().fold((0.0, 0.0), |(re, im), (n, h)| {
        let phase = angle * n as f64;
        (re + h * libm::cos(phase), im - h * libm::sin(phase))
    })
}

fn decibels((re, im): Complex) -> f64 {
    10.0 * libm::log10(re * re + im * im)
}

/// ITU-R BS.1770 Annex 1 Tables 1 and 2, at 48 kHz.
fn k_weighting() -> [Section; 2] {
    [
        Section {
            b: [1.53512485958697, -2.69169618940638, 1.19839281085285],
            a: [1.0, -1.69065929318241, 0.73248077421585],
        },
        Section { b: [1.0, -2.0, 1.0], a: [1.0, -1.99004745483398, 0.99007225036621] },
    ]
}

#[test]
fn the_transform_of_the_impulse_response_is_the_analytic_response() {
    for (seed, count) in [(31, 1), (32, 4), (33, 11), (34, 16), (35, 21)] {
        // Poles within radius 0.99: 6000 frames hold the response down to e^-60.
        let sections: Vec<Section> = random_sections(seed, count)
            .into_iter()
            .map(|s| Section { a: [1.0, 0.99 * s.a[1], 0.99 * 0.99 * s.a[2]], ..s })
            .collect();
        let response = run_one(&sections, &impulse(6000));
        let size: f64 = response.iter().map(|h| h.abs()).sum();
        // Rounding in the cascade at every frame, and in the transform: a sum of
        // `size` with phases good to the unit roundoff of angle * n.
        let phase_error = std::f64::consts::PI * 6000.0 * f64::EPSILON;
        let tolerance = 6000.0_f64.sqrt() * bound(&sections, &impulse(6000), Errors::Independent) + size * phase_error;
        for step in 0..=50 {
            let angle = std::f64::consts::PI * f64::from(step) / 50.0;
            let (found, expected) = (measured(&response, angle), analytic(&sections, angle));
            let off = libm::hypot(found.0 - expected.0, found.1 - expected.1);
            assert!(off <= tolerance, "{count} sections at {angle}: {found:?}, {expected:?}, {off:e} > {tolerance:e}");
        }
    }
}

#[test]
fn the_k_weighting_has_its_published_response() {
    // ITU-R BS.1770 Annex 1; the table holds four decimals. 38 Hz poles have decayed
    // to e^-100 after 20000 frames.
    let stages = k_weighting();
    let impulse = impulse(20_000);
    let [first, second, both] = [&stages[..1], &stages[1..], &stages[..]].map(|stages| run_one(stages, &impulse));
    let table = include_str!("../reference/bs1770_k_48k_response.csv");
    let rows: Vec<Vec<f64>> = table
        .lines()
        .skip(2)
        .map(|line| line.split(',').map(|cell| cell.parse().expect("a number")).collect())
        .collect();
    assert_eq!(rows.len(), 19);
    for row in &rows {
        let angle = 2.0 * std::f64::consts::PI * row[0] / 48_000.0;
        for (response, expected) in [&first, &second, &both].into_iter().zip(&row[1..]) {
            let found = decibels(measured(response, angle));
            assert!((found - expected).abs() <= 0.5001e-4, "{} Hz: {found} dB, published {expected}", row[0]);
        }
    }
}

#[test]
fn the_k_weighting_gives_the_loudness_constant_at_997_hz() {
    // ITU-R BS.1770: a 0 dBFS sine at 997 Hz in one channel reads -3.01 LKFS, hence -0.691 dB.
    let response = run_one(&k_weighting(), &impulse(20_000));
    let found = decibels(measured(&response, 2.0 * std::f64::consts::PI * 997.0 / 48_000.0));
    assert!((found - 0.691).abs() < 0.0005, "{found}");
}
