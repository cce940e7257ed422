//! The exponential sweep.

use super::Fade;
use core::f64::consts::TAU;

/// A sine whose frequency rises by the same factor in every second:
///
/// ```text
/// x(t) = P sin(2 pi f1 T / ln R (R^(t/T) - 1)),   R = f2/f1
/// f(t) = f1 R^(t/T)
/// ```
///
/// for t from 0 to T (A. Farina, "Simultaneous measurement of impulse response and
/// distortion with a swept-sine technique", 108th AES Convention, 2000; formula from
/// memory). It spends the same time in every octave, so its power density falls as 1/f,
/// like that of pink noise.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sweep {
    /// Frequency it starts at, Hz.
    pub from_hz: f64,
    /// Frequency it ends at, Hz.
    pub to_hz: f64,
    /// Length, frames.
    pub frames: u64,
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Peak, full scale 1.
    pub peak: f64,
}

impl Sweep {
    /// Length, seconds.
    pub fn seconds(&self) -> f64 {
        self.frames as f64 / f64::from(self.rate_hz)
    }

    /// ln R.
    fn log_ratio(&self) -> f64 {
        libm::log(self.to_hz / self.from_hz)
    }

    /// Seconds in which it rises by an octave.
    pub fn octave_s(&self) -> f64 {
        self.seconds() * core::f64::consts::LN_2 / self.log_ratio()
    }

    /// Frequency at a time after its start, Hz.
    pub fn frequency_hz(&self, seconds: f64) -> f64 {
        self.from_hz * libm::exp(self.log_ratio() * seconds / self.seconds())
    }

    /// The sample at `frame` after its start, before any fade, full scale 1.
    pub(super) fn sample(&self, frame: u64) -> f64 {
        let log_ratio = self.log_ratio();
        let part = frame as f64 / self.frames as f64;
        let turns = self.from_hz * self.seconds() / log_ratio * libm::expm1(log_ratio * part);
        // Whole turns away: millions of them would cost the sine its last digits.
        self.peak * libm::sin(TAU * (turns - libm::floor(turns)))
    }

    /// Its energy between two frequencies, (full scale)^2 times seconds: half the square of
    /// the peak for as long as it stays between them. Fades, which touch only its ends, are
    /// not taken off.
    pub fn energy(&self, from_hz: f64, to_hz: f64) -> f64 {
        let (low, high) = (from_hz.max(self.from_hz), to_hz.min(self.to_hz));
        if low >= high {
            return 0.0;
        }
        0.5 * self.peak * self.peak * self.seconds() * libm::log(high / low) / self.log_ratio()
    }

    /// Mean square over its length with `fade` at both ends, (full scale)^2.
    pub fn mean_square(&self, fade: Fade) -> f64 {
        0.5 * self.peak * self.peak * fade.share(self.frames)
    }
}
