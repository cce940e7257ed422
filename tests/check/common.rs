//! Sections from closed forms, bands, and the plain difference equation.

use bandproof::design::check::check;
use bandproof::design::{BandDesign, Placed};
use bandproof::section::Section;
use bandproof::spec::{Band, Extent, Requirement};
use std::f64::consts::PI;

/// The notch whose -3 dB points lie exactly `width_hz` apart. With t = tan(pi width/rate),
/// u = (cos w - cos w0)/sin w: |H|^2 = u^2/(u^2 + t^2). (Bilinear transform of
/// (s^2 + 1)/(s^2 + B s + 1); common practice, no source. [`notch_edge_hz`] inverts it.)
pub fn notch(center_hz: f64, width_hz: f64, rate_hz: f64) -> Section {
    let t = libm::tan(PI * width_hz / rate_hz);
    let c = libm::cos(2.0 * PI * center_hz / rate_hz);
    let g = 1.0 / (1.0 + t);
    Section { b: [g, -2.0 * c * g, g], a: [1.0, -2.0 * c * g, (1.0 - t) * g] }
}

/// Where [`notch`] attenuates by `attenuation_db`, below (`side` -1) or above (+1).
pub fn notch_edge_hz(center_hz: f64, width_hz: f64, rate_hz: f64, attenuation_db: f64, side: f64) -> f64 {
    let t = libm::tan(PI * width_hz / rate_hz);
    let u = -side * t / libm::sqrt(libm::pow(10.0, attenuation_db / 10.0) - 1.0);
    // cos w - u sin w = sqrt(1 + u^2) cos(w + atan u) = cos w0
    let c = libm::cos(2.0 * PI * center_hz / rate_hz);
    (libm::acos(c / libm::sqrt(1.0 + u * u)) - libm::atan(u)) * rate_hz / (2.0 * PI)
}

/// Butterworth of even order by the bilinear transform, prewarped at the edge.
/// Quadratics s^2 + d s + 1 with d = 2 sin((2k - 1) pi / 2n) as in any filter handbook.
pub fn butterworth(order: u32, edge_hz: f64, rate_hz: f64, highpass: bool) -> Vec<Section> {
    let k = libm::tan(PI * edge_hz / rate_hz);
    (1..=order / 2)
        .map(|pair| {
            let d = 2.0 * libm::sin(f64::from(2 * pair - 1) * PI / f64::from(2 * order));
            let norm = 1.0 + d * k + k * k;
            let (b0, sign) = if highpass { (1.0 / norm, -1.0) } else { (k * k / norm, 1.0) };
            Section { b: [b0, sign * 2.0 * b0, b0], a: [1.0, 2.0 * (k * k - 1.0) / norm, (1.0 - d * k + k * k) / norm] }
        })
        .collect()
}

/// Attenuation of [`butterworth`], dB: |H|^2 = 1/(1 + v^(2n)), v the ratio of tangents.
pub fn butterworth_db(order: u32, edge_hz: f64, rate_hz: f64, highpass: bool, hz: f64) -> f64 {
    let v = libm::tan(PI * hz / rate_hz) / libm::tan(PI * edge_hz / rate_hz);
    let v = if highpass { 1.0 / v } else { v };
    10.0 * libm::log10(1.0 + libm::pow(v, 2.0 * f64::from(order)))
}

pub fn band(name: &str, from_hz: f64, to_hz: f64, requirement: Requirement) -> Band {
    Band { name: name.to_owned(), extent: Extent::Range { from_hz, to_hz }, requirement }
}

pub fn reduce(reduce_db: f64) -> Requirement {
    Requirement::Reduce { reduce_db }
}

pub fn keep(keep_db: f64, except: &[&str]) -> Requirement {
    Requirement::Keep { keep_db, except: except.iter().map(|name| (*name).to_owned()).collect() }
}

pub fn placed(bands: &[Band]) -> Placed {
    Placed { stages: Vec::new(), bands: bands.iter().flat_map(Band::named).collect(), left_out: Vec::new() }
}

/// The design check of `bands` with nothing for settling.
pub fn checked(bands: &[Band], sections: &[Section], rate_hz: f64) -> Vec<BandDesign> {
    check(&placed(bands), sections, 1, rate_hz, 0.0)
}

/// The difference equation of `Section`, section by section, from rest.
pub fn run(sections: &[Section], input: impl IntoIterator<Item = f64>) -> Vec<f64> {
    let mut signal: Vec<f64> = input.into_iter().collect();
    for section in sections {
        let (mut x1, mut x2, mut y1, mut y2) = (0.0, 0.0, 0.0, 0.0);
        for sample in &mut signal {
            let x = *sample;
            let y = section.b[0] * x + section.b[1] * x1 + section.b[2] * x2 - section.a[1] * y1 - section.a[2] * y2;
            (x2, x1, y2, y1) = (x1, x, y1, y);
            *sample = y;
        }
    }
    signal
}

#[track_caller]
pub fn close(what: &str, got: f64, want: f64, tolerance: f64) {
    assert!((got - want).abs() <= tolerance, "{what}: {got}, expected {want} within {tolerance:e}");
}
