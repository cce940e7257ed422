//! What the tests of curves have in common.

use bandproof::design::roots::{poles, zeros};
use bandproof::design::{response, weighting};
use bandproof::section::Section;
use bandproof::spec::Curve;

/// The sample rates that recordings have, Hz.
pub const RATES_HZ: [f64; 13] = [
    8_000.0, 11_025.0, 16_000.0, 22_050.0, 24_000.0, 32_000.0, 44_100.0, 48_000.0, 88_200.0, 96_000.0, 192_000.0,
    256_000.0, 384_000.0,
];

pub const CURVES: [Curve; 4] = [Curve::A, Curve::C, Curve::K, Curve::Riaa];

/// The curve at a rate.
pub struct Made {
    pub curve: Curve,
    pub rate_hz: f64,
    pub sections: Vec<Section>,
}

pub fn made(curve: Curve, rate_hz: f64) -> Made {
    let sections = weighting::sections(curve, rate_hz).unwrap_or_else(|error| panic!("{error}"));
    Made { curve, rate_hz, sections }
}

impl Made {
    pub fn gain_db(&self, hz: f64) -> f64 {
        response::gain_db(&self.sections, hz, self.rate_hz)
    }

    pub fn top_hz(&self) -> f64 {
        weighting::TOP * self.rate_hz
    }

    /// Largest difference from `wanted_db` up to `up_to_hz`, dB.
    pub fn worst_db(&self, up_to_hz: f64, wanted_db: impl Fn(f64) -> f64) -> f64 {
        let linear = (1..=2_000).map(|i| up_to_hz * f64::from(i) / 2_000.0);
        let logarithmic = (0..1_000).map(|i| up_to_hz * 10f64.powf(-4.0 * f64::from(i) / 1_000.0));
        linear.chain(logarithmic).map(|hz| (self.gain_db(hz) - wanted_db(hz)).abs()).fold(0.0, f64::max)
    }

    /// Poles inside the unit circle, zeros inside it or at z = 1.
    pub fn assert_minimum_phase(&self) {
        for pole in poles(&self.sections) {
            assert!(pole.depth > 0.0, "{:?} at {} Hz: pole {pole:?}", self.curve, self.rate_hz);
        }
        for zero in zeros(&self.sections) {
            let at_0_hz = zero.depth == 0.0 && zero.angle == 0.0;
            assert!(zero.depth > 0.0 || at_0_hz, "{:?} at {} Hz: zero {zero:?}", self.curve, self.rate_hz);
        }
    }
}

/// The rows of a table of figures; a cell that holds none, `inf` and `-inf` apart, is NaN.
pub fn rows(text: &str) -> Vec<Vec<f64>> {
    let lines = text.lines().filter(|line| !line.starts_with('#')).skip(1);
    lines.map(|line| line.split(',').map(|cell| cell.parse().unwrap_or(f64::NAN)).collect()).collect()
}

/// What half a unit in the last place of 2 in numerator and denominator of a section comes to
/// at `hz`, dB, and a few units of the gain's own.
pub fn unavoidable_db(section: &Section, hz: f64, rate_hz: f64) -> f64 {
    let size = |p: [f64; 3]| response::at(&[Section { b: p, a: [1.0, 0.0, 0.0] }], hz, rate_hz).norm();
    let scale = section.b[0].abs().max(1.0);
    20.0 / std::f64::consts::LN_10 * 2f64.powi(-53) * (scale / size(section.b) + 1.0 / size(section.a)) + 2e-14
}
