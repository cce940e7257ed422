//! The matched z transform z = e^(s / rate), with roots written as those of quadratics in
//! W = (z - 1) / (z + 1), where frequencies lie at j tan(pi f / rate).
//!
//! |Q|^2 of s^2 + `sum` s + `product` at W^2 = -t is (product - t)^2 + sum^2 t; a real root
//! at the analog frequency f goes to tanh(pi f / rate).

use crate::design::bilinear;
use crate::design::response;
use crate::design::sections::coefficients::{self, Rounding};
use crate::design::transform::Poles;
use crate::section::Section;
use core::f64::consts::PI;

/// s^2 + `sum` s + `product`: two roots with the signs turned, both figures 0 or above.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quadratic {
    sum: f64,
    product: f64,
}

impl Quadratic {
    /// Two roots at 0 Hz.
    pub const AT_0: Quadratic = Quadratic { sum: 0.0, product: 0.0 };

    /// The real roots -`a` and -`b`.
    pub fn real(a: f64, b: f64) -> Quadratic {
        Quadratic { sum: a + b, product: a * b }
    }

    /// Those of z = e^(`ln_radius` +- j `angle`), `ln_radius` below 0.
    pub fn pair(ln_radius: f64, angle: f64) -> Quadratic {
        // tanh((x + jy) / 2) = (sinh x + j sin y) / (cosh x + cos y)
        let sinh = libm::sinh(ln_radius / 2.0);
        let (sin, cos) = (libm::sin(angle / 2.0), libm::cos(angle / 2.0));
        let (low, high) = (sinh * sinh + sin * sin, sinh * sinh + cos * cos);
        Quadratic { sum: -libm::sinh(ln_radius) / high, product: low / high }
    }

    /// Size where W^2 = -`square`, over that of (s + 1)^2, dB.
    fn gain_db(self, square: f64) -> f64 {
        let (across, along) = (self.product - square, self.sum * self.sum * square);
        10.0 * libm::log10((across * across + along) / ((1.0 + square) * (1.0 + square)))
    }

    /// 1 + c1 z^-1 + c2 z^-2 with these roots.
    fn coefficients(self) -> [f64; 3] {
        let roots = Poles::Two { half_sum: (-0.5 * self.sum).into(), product: self.product.into() };
        coefficients::denominator(bilinear::denominator(roots), Rounding::Together)
    }
}

/// Where the real root of an analog frequency goes.
pub fn real_root(hz: f64, rate_hz: f64) -> f64 {
    libm::tanh(PI * (hz / rate_hz))
}

/// Size of s + `root` where W^2 = -`square`, over that of s + 1, dB.
pub fn root_db(root: f64, square: f64) -> f64 {
    10.0 * libm::log10((root * root + square) / (1.0 + square))
}

/// W^2 = -tan^2(pi f / rate), sign turned.
pub fn square(hz: f64, rate_hz: f64) -> f64 {
    let tan = libm::tan(PI * (hz / rate_hz));
    tan * tan
}

/// Zeros and poles of a section.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shape {
    /// Zeros.
    pub zeros: Quadratic,
    /// Poles.
    pub poles: Quadratic,
}

impl Shape {
    /// The section with these roots whose gain at `hz` is `gain`.
    pub fn section(self, hz: f64, gain: f64, rate_hz: f64) -> Section {
        let (b, a) = (self.zeros.coefficients(), self.poles.coefficients());
        let h = response::at(&[Section { b, a }], hz, rate_hz);
        let scale = gain / libm::hypot(h.re, h.im);
        Section { b: b.map(|b| b * scale), a }
    }

    /// Gain in dB where W^2 = -`square`, but for a constant.
    pub fn gain_db(self, square: f64) -> f64 {
        self.zeros.gain_db(square) - self.poles.gain_db(square)
    }
}
