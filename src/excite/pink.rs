//! The pink noise.

use crate::output::{GOLDEN, mix};
use core::f64::consts::PI;

/// Name and version of the generator. Any change to a sample needs a new version.
pub const GENERATOR_NAME: &str = "pink-octaves-1";

/// Where the counter of the hash starts: the generator's name, so that the noise has
/// nothing in common with any dither made from the same hash.
const START: u64 = u64::from_be_bytes(*b"pink-oct");

/// Amplitude of the two fastest sources. All others have 1. An endless row of sources of
/// equal amplitude would be pink; what those above half the sample rate would have added
/// below it is made up for by these two.
const FAST: f64 = 1.14;

/// Number of sources with the amplitude [`FAST`].
const FAST_SOURCES: u32 = 2;

/// `f / rate` times the density of [`Pink::density`], per source of amplitude 1, in the
/// middle of its ripple.
const LEVEL: f64 = 2.0 * 0.7244;

/// Most sources: a hash has 64 bits, and the slowest of these changes once in 11 years
/// at 384 kHz.
const MOST_OCTAVES: u32 = 48;

/// Noise whose power density falls as 1/f: a sum of random square waves, one an octave.
///
/// Source k (from 0) is +1 or -1, chosen anew every 2^k frames by one bit of a hash of
/// the frame's number. Sources take turns (R. F. Voss, J. Clarke, J. Acoust. Soc. Am. 63,
/// 1978, describe the sum; taking turns is common practice; both from memory): source
/// 0 may change at each frame, source k > 0 at the odd multiples of 2^(k-1), so at most
/// two change at once.
///
/// A source of amplitude w that holds its value for H frames has the power density,
/// one-sided, per Hz,
///
/// ```text
/// S(f) = 2 w^2 / (rate H) (sin(pi f H/rate) / sin(pi f/rate))^2
/// ```
///
/// (the transform of one hold squared: values are independent). The sum over octaves
/// lies within [`Self::TOLERANCE_DB`] of a straight 1/f line from [`Self::lowest_hz`] to half
/// the rate, and levels off below.
///
/// The sum of bounded sources is bounded: its peak is the sum of the amplitudes, its mean
/// square the sum of their squares. For 15 sources that is a crest factor of 11.8 dB,
/// reached about once in 2^15 frames; Gaussian noise filtered to the same spectrum has no
/// bound at all.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pink {
    /// Number of sources.
    pub octaves: u32,
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Peak, full scale 1: no sample is larger, and it is reached sooner or later.
    pub peak: f64,
}

impl Pink {
    /// Largest distance of the density from a straight 1/f line, dB.
    pub const TOLERANCE_DB: f64 = 0.55;

    /// Noise that is pink from `lowest_hz` or below.
    pub(super) fn new(rate_hz: u32, lowest_hz: f64, peak: f64) -> Self {
        let mut octaves = FAST_SOURCES;
        let mut reaches_hz = lowest_of(rate_hz, octaves);
        while reaches_hz > lowest_hz && octaves < MOST_OCTAVES {
            octaves += 1;
            reaches_hz *= 0.5;
        }
        Pink { octaves, rate_hz, peak }
    }

    /// Frequency down to which it is pink, Hz: where the slowest source has held its value
    /// for two periods.
    pub fn lowest_hz(&self) -> f64 {
        lowest_of(self.rate_hz, self.octaves)
    }

    /// Amplitude of a source, full scale 1.
    fn amplitude(&self) -> f64 {
        self.peak / (f64::from(self.octaves - FAST_SOURCES) + f64::from(FAST_SOURCES) * FAST)
    }

    /// Mean square without fades, (full scale)^2.
    pub fn mean_square(&self) -> f64 {
        let squares = f64::from(self.octaves - FAST_SOURCES) + f64::from(FAST_SOURCES) * FAST * FAST;
        self.amplitude() * self.amplitude() * squares
    }

    /// Power density at a frequency between 0 and half the rate, one-sided,
    /// (full scale)^2 per Hz: expectation of the samples, see the type.
    pub fn density(&self, hz: f64) -> f64 {
        let place = hz / f64::from(self.rate_hz);
        let sine = libm::sin(PI * place);
        let mut sum = 0.0;
        let mut hold = 1.0;
        for source in 0..self.octaves {
            let square = if source < FAST_SOURCES { FAST * FAST } else { 1.0 };
            // Doubling is exact, so the turns are those of the frequency itself.
            let turns = place * hold;
            let held = libm::sin(PI * (turns - libm::floor(turns))) / sine;
            // 0 Hz: the quotient's limit.
            let held = if sine > 0.0 { held * held / hold } else { hold };
            sum += square * held;
            hold *= 2.0;
        }
        2.0 * self.amplitude() * self.amplitude() * sum / f64::from(self.rate_hz)
    }

    /// The straight line that [`Self::density`] stays near, level below
    /// [`Self::lowest_hz`], (full scale)^2 per Hz.
    pub fn line(&self, hz: f64) -> f64 {
        LEVEL * self.amplitude() * self.amplitude() / hz.max(self.lowest_hz())
    }

    /// Mean square between two frequencies, (full scale)^2: the density summed over
    /// points evenly spaced in the logarithm, or, from 0 Hz, evenly.
    pub fn power(&self, from_hz: f64, to_hz: f64) -> f64 {
        const POINTS: u32 = 256;
        let mut sum = 0.0;
        let ratio = to_hz / from_hz;
        for point in 0..POINTS {
            let place = (f64::from(point) + 0.5) / f64::from(POINTS);
            let (hz, width_hz) = if from_hz > 0.0 {
                let hz = from_hz * libm::pow(ratio, place);
                (hz, hz * libm::log(ratio))
            } else {
                (to_hz * place, to_hz)
            };
            sum += self.density(hz) * width_hz;
        }
        sum / f64::from(POINTS)
    }

    /// The samples, full scale 1, from the first on.
    pub(super) fn samples(&self) -> PinkSamples {
        let first = mix(START);
        let slow = self.octaves - FAST_SOURCES;
        PinkSamples {
            octaves: self.octaves,
            amplitude: self.amplitude(),
            // Bit k stands for source k.
            up: first,
            slow_sum: 2 * i64::from((first >> FAST_SOURCES & low_bits(slow)).count_ones()) - i64::from(slow),
            frame: 0,
        }
    }
}

/// Frequency down to which `octaves` sources are pink, Hz.
fn lowest_of(rate_hz: u32, octaves: u32) -> f64 {
    2.0 * f64::from(rate_hz) / libm::ldexp(1.0, octaves as i32)
}

/// The lowest `count` bits set, fewer than 64.
fn low_bits(count: u32) -> u64 {
    (1 << count) - 1
}

/// A [`Pink`] while it runs.
#[derive(Clone, Debug)]
pub(super) struct PinkSamples {
    octaves: u32,
    amplitude: f64,
    up: u64,
    /// Sum of the sources of amplitude 1: an integer, so nothing is lost however long it
    /// runs.
    slow_sum: i64,
    frame: u64,
}

impl PinkSamples {
    /// The next sample.
    pub(super) fn next(&mut self) -> f64 {
        if self.frame > 0 {
            let hash = mix(START.wrapping_add(self.frame.wrapping_mul(GOLDEN)));
            self.set(0, hash >> 63 == 1);
            // At odd frames source 1, at odd multiples of 2 source 2, and so on.
            let turn = self.frame.trailing_zeros() + 1;
            if turn < self.octaves {
                self.set(turn, hash >> 62 & 1 == 1);
            }
        }
        self.frame += 1;
        let fast = (self.up & low_bits(FAST_SOURCES)).count_ones();
        let fast_sum = 2.0 * f64::from(fast) - f64::from(FAST_SOURCES);
        self.amplitude * (FAST * fast_sum + self.slow_sum as f64)
    }

    fn set(&mut self, source: u32, up: bool) {
        let was_up = self.up >> source & 1 == 1;
        if was_up != up {
            self.up ^= 1 << source;
            if source >= FAST_SOURCES {
                self.slow_sum += if up { 2 } else { -2 };
            }
        }
    }
}
