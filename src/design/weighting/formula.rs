//! Curves that a standard gives as poles and zeros in s, all of them real.
//!
//! ```text
//!                    prod(1 + (f / zero)^2)
//! |H|^2 = f^(2 n)  --------------------------   over its value at 1 kHz
//!                    prod(1 + (f / pole)^2)
//! ```

use core::f64::consts::PI;

/// Where every curve here is 0 dB, Hz.
pub const ZERO_DB_HZ: f64 = 1000.0;

/// A curve.
#[derive(Clone, Debug, PartialEq)]
pub struct Formula {
    /// Number of zeros at 0 Hz.
    pub zeros_at_0: u32,
    /// The other zeros, Hz.
    pub zeros_hz: Vec<f64>,
    /// Poles, Hz, double ones twice.
    pub poles_hz: Vec<f64>,
}

impl Formula {
    /// IEC 61672-1:2013, Annex E: f1 and f4 twice, f2, f3, and four zeros at 0 Hz.
    pub fn a_weighting() -> Formula {
        let [f1, f2, f3, f4] = iec_poles_hz();
        Formula { zeros_at_0: 4, zeros_hz: Vec::new(), poles_hz: vec![f1, f1, f2, f3, f4, f4] }
    }

    /// IEC 61672-1:2013, Annex E: f1 and f4 twice, and two zeros at 0 Hz.
    pub fn c_weighting() -> Formula {
        let [f1, _, _, f4] = iec_poles_hz();
        Formula { zeros_at_0: 2, zeros_hz: Vec::new(), poles_hz: vec![f1, f1, f4, f4] }
    }

    /// IEC 60098, playback: (1 + 318 us s) / ((1 + 3180 us s)(1 + 75 us s)).
    pub fn riaa() -> Formula {
        let corner_hz = |microseconds: f64| 1e6 / (2.0 * PI * microseconds);
        Formula { zeros_at_0: 0, zeros_hz: vec![corner_hz(318.0)], poles_hz: vec![corner_hz(3180.0), corner_hz(75.0)] }
    }

    /// Gain at `hz`, dB; negative infinity at a zero.
    pub fn gain_db(&self, hz: f64) -> f64 {
        self.raw_db(hz) - self.raw_db(ZERO_DB_HZ)
    }

    fn raw_db(&self, hz: f64) -> f64 {
        let corner_db = |corner_hz: &f64| 10.0 * libm::log10(1.0 + (hz / corner_hz) * (hz / corner_hz));
        let zeros_db: f64 = self.zeros_hz.iter().map(corner_db).sum();
        let poles_db: f64 = self.poles_hz.iter().map(corner_db).sum();
        let at_0_db = if self.zeros_at_0 == 0 { 0.0 } else { 20.0 * f64::from(self.zeros_at_0) * libm::log10(hz) };
        at_0_db + zeros_db - poles_db
    }
}

/// f1 to f4 of Annex E in closed form: C is at half of its power at 10^1.5 and 10^3.9 Hz,
/// and A's other two poles lie at (3 -+ sqrt 5) / 2 times 10^2.45 Hz.
fn iec_poles_hz() -> [f64; 4] {
    let (reference, low, high) = (ZERO_DB_HZ, libm::pow(10.0, 1.5), libm::pow(10.0, 3.9));
    let middle = libm::pow(10.0, 2.45);
    let (reference, low, high) = (reference * reference, low * low, high * high);
    let root_half = libm::sqrt(0.5);
    let b = (reference + low * high / reference - root_half * (low + high)) / (1.0 - root_half);
    let c = low * high;
    let f4_square = 0.5 * (libm::sqrt(b * b - 4.0 * c) - b);
    // The product of the two is c; their difference would cancel.
    let f1_square = c / f4_square;
    let root_five = libm::sqrt(5.0);
    [libm::sqrt(f1_square), (3.0 - root_five) / 2.0 * middle, (3.0 + root_five) / 2.0 * middle, libm::sqrt(f4_square)]
}
