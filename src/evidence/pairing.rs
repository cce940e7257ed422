//! Pairs of recordings that something else filtered: what is known of them.

use super::BandTask;

/// What is known of a pair of recordings that something else filtered.
///
/// With it, what is not coherent with the recording before counts as a floor, a keep band
/// must be resolved to 0.9, and sub-bands are as many as ten bins each allow.
#[derive(Clone, Copy, Debug)]
pub struct Pairing<'a> {
    /// The idle device; then it stands in place of what is not coherent.
    pub noise: Option<Idle<'a>>,
    /// How far the delay wanders about its straight line, seconds, root of the mean square.
    pub delay_scatter_s: f64,
    /// Whether no other delay fits as well, or this one was given: if not, gains that are off
    /// may be those of a wrong delay, and no keep band is missed.
    pub delay_certain: bool,
    /// Frequency up to which the recording after has its levels, Hz: half the rate, or less
    /// where it was interpolated.
    pub reaches_hz: f64,
}

/// A recording of the idle device, for one channel.
#[derive(Clone, Copy, Debug)]
pub struct Idle<'a> {
    /// Its one-sided power spectrum in the scaling of [`crate::spectrum::Spectra::syy`],
    /// same segment length.
    pub spectrum: &'a [f64],
    /// Segments averaged, as far as they are independent; 0 counts as 1.
    pub independent_segments: usize,
    /// Mean square of its own rounding error, full scale 1.0, white: that part is not the
    /// device's.
    pub rounding_power: f64,
}

/// Largest scatter of the delay with which a gain at the highest frequency of a band can
/// be told, as a share of that frequency's period: phases that scatter by
/// 2 pi 0.02 = 0.126 rad lower a gain by 0.126^2/2, 0.07 dB.
const SCATTER_OF_PERIOD: f64 = 0.02;

impl Pairing<'_> {
    /// The scatter of the delay that `band` allows, seconds, where this one exceeds it.
    pub fn wanders_beyond(&self, band: &BandTask, rate_hz: u32) -> Option<f64> {
        let allowed_s = SCATTER_OF_PERIOD / highest_hz(band, rate_hz);
        (self.delay_scatter_s > allowed_s).then_some(allowed_s)
    }

    /// Whether `band` reaches above what interpolation leaves alone.
    pub fn falls_short_of(&self, band: &BandTask, rate_hz: u32) -> bool {
        highest_hz(band, rate_hz) > self.reaches_hz
    }
}

/// Upper edge of `band`, or half the rate.
fn highest_hz(band: &BandTask, rate_hz: u32) -> f64 {
    band.to_hz.min(f64::from(rate_hz) / 2.0)
}
