//! Sounds that can be heard at any moment, through any device, exactly.

use crate::fixtures::Noise;
use num_complex::Complex64;
use rustfft::FftPlanner;
use std::f64::consts::TAU;

/// How much finer than the sample rate a sound is tabulated.
const FINER: usize = 8;

/// A periodic sound of random phases, tabulated [`FINER`] times as fine as its rate:
/// between entries eight of them are interpolated, which for content up to 0.45 of the
/// rate is off by less than -120 dB (the remainder of Lagrange's formula,
/// (0.28 * 2 pi / 5)^8 / 8! times (3.5 * 2.5 * 1.5 * 0.5)^2, is 3e-7).
pub struct Sound {
    rate_hz: f64,
    table: Vec<f64>,
}

impl Sound {
    /// A sound of `seconds` with the amplitude density that `response` gives at each
    /// frequency (1: white, RMS about 0.1), up to 0.45 of the rate. Equal seeds give equal
    /// sounds but for their response: the same excitation through different devices.
    pub fn new(rate_hz: u32, seconds: f64, seed: u64, response: impl Fn(f64) -> Complex64) -> Self {
        let rate_hz = f64::from(rate_hz);
        let frames = (rate_hz * seconds) as usize;
        let mut noise = Noise(seed);
        let mut bins = vec![Complex64::new(0.0, 0.0); frames * FINER];
        let scale = 0.1 / (0.45 * frames as f64).sqrt();
        for (k, bin) in bins.iter_mut().enumerate().take((0.45 * frames as f64) as usize).skip(1) {
            let phase = std::f64::consts::PI * noise.next();
            *bin = response(k as f64 * rate_hz / frames as f64) * Complex64::from_polar(scale, phase);
        }
        FftPlanner::new().plan_fft_inverse(bins.len()).process(&mut bins);
        Sound { rate_hz, table: bins.into_iter().map(|value| value.re * 2f64.sqrt()).collect() }
    }

    /// The sound at a moment, in frames; periodic.
    pub fn at(&self, frame: f64) -> f64 {
        let place = frame * FINER as f64;
        let base = place.floor();
        let share = place - base;
        let points = self.table.len() as i64;
        let mut sum = 0.0;
        for i in -3i64..=4 {
            let mut weight = 1.0;
            for j in (-3i64..=4).filter(|&j| j != i) {
                weight *= (share - j as f64) / (i - j) as f64;
            }
            sum += weight * self.table[(base as i64 + i).rem_euclid(points) as usize];
        }
        sum
    }

    /// `frames` frames from `first` on, each `step` further.
    pub fn samples(&self, first: f64, step: f64, frames: usize) -> Vec<f64> {
        (0..frames).map(|n| self.at(first + step * n as f64)).collect()
    }

    /// A line of amplitude `amplitude` at `hz` over the same frames.
    pub fn line(&self, hz: f64, amplitude: f64, frames: usize) -> Vec<f64> {
        (0..frames).map(|n| amplitude * (TAU * hz * n as f64 / self.rate_hz).sin()).collect()
    }
}

/// The sum of two signals.
pub fn mixed(one: &[f64], other: &[f64]) -> Vec<f64> {
    one.iter().zip(other).map(|(a, b)| a + b).collect()
}

/// A device that takes `depth_db` out of `from_hz..to_hz` and leaves all else alone.
pub fn stop(from_hz: f64, to_hz: f64, depth_db: f64) -> impl Fn(f64) -> Complex64 {
    move |hz| {
        let inside = (from_hz..to_hz).contains(&hz);
        Complex64::new(if inside { 10f64.powf(-depth_db / 20.0) } else { 1.0 }, 0.0)
    }
}

/// A device that does nothing.
pub fn straight(_hz: f64) -> Complex64 {
    Complex64::new(1.0, 0.0)
}
