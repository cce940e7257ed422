//! What a device adds of its own: the part of the floor after that is `device`.
//!
//! With n independent segments, in each bin
//!
//! ```text
//! C = |Sxy|^2/Sxx - R/(n - 1),   R = Syy - |Sxy|^2/Sxx,   Syy - C = R n/(n - 1)
//! ```
//!
//! is, but for chance, what the output holds that has nothing to do with the input: noise
//! passes for coherent by R/(n - 1) on average (J. S. Bendat and A. G. Piersol, Random
//! Data, chapter 9). Summed over a band's bins from 8 segments up. Below, the bins are
//! taken together, turned by the delay and phase that fit best,
//!
//! ```text
//! R = sum Syy - |sum Sxy'|^2 / sum Sxx,   device = R m/(m - 3/2),   m = n bins / 2.76
//! ```
//!
//! which counts as incoherent, too, what a response that turns within the band does. That
//! is for narrow bands and for sub-bands only, and keeps noise from being taken for a
//! residue; in the level of a wide band there is no such part then.
//!
//! What is measured so holds the output's rounding and dither already: only what exceeds
//! them is the device's, so that the floor, the sum of its parts, holds them once. Of a
//! recording of the idle device its own rounding is taken off for the same reason.
//!
//! **Not the device's, and counted all the same**: what the response delays by d frames
//! stands under another part of the window, and a share (4.94 d/L)^2 of it is not coherent
//! with what went in (`gains` has the 4.94). At 2 ms in 10 s that is -60 dB; it matters
//! where a filter rings for a fiftieth of a segment and more (1 % of the level, more than
//! leaks into a band of 100 bins). The floor is then too high by it, which speaks for
//! `unproven`.
//!
//! A steady hum of the device under a steady line of the same frequency is coherent: only
//! a recording of the idle device tells it.

use super::chance;
use super::delay::{Turned, turned};
use super::floors::Floor;
use super::line::{is_peak, lobe, stands_out};
use super::pairing::Idle;
use super::ranges::{Owned, cross_slice, sum};
use super::{Measured, shows_gains};
use crate::spec::Requirement;
use crate::spectrum::{MAIN_LOBE_BINS, Spectra, VARIANCE_BINS};
use rustfft::FftPlanner;
use std::ops::Range;

/// From this many independent segments up coherence is told bin by bin.
pub const FEWEST_SEGMENTS: usize = 8;

/// How long a recording, in seconds, holds so many segments of this length.
pub fn enough_s(measured: &Measured<'_>) -> f64 {
    let segments = (FEWEST_SEGMENTS + 1) as f64 / 2.0;
    segments * measured.spectra.segment_frames as f64 / f64::from(measured.rate_hz.max(1))
}

/// How the device's part of a floor is known.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub enum Known {
    /// It is not.
    #[default]
    Not,
    /// From the coherence of each bin.
    Coherence,
    /// From the coherence of the whole band.
    Pooled {
        /// Share of the band's level after that certainly came from the input, 0 to 1.
        certain_share: f64,
    },
    /// From a recording of the idle device.
    Idle {
        /// Its independent segments.
        segments: usize,
        /// Power of its steady lines in the band, in the scaling of the floor. The floor is
        /// cut to its level, this is not: a line that hum cancels leaves no level at all.
        steady: f64,
    },
}

impl Known {
    /// The same for powers times `factor`.
    pub fn scaled(self, factor: f64) -> Self {
        match self {
            Known::Idle { segments, steady } => Known::Idle { segments, steady: steady * factor },
            other => other,
        }
    }
}

/// The device's part of a band's floor, not taken back by any gain, and how it is known.
/// `bare` is the floor without it, `judged_bins` the fewest bins that can be missed.
pub fn of_band(
    measured: &Measured<'_>,
    own: &Owned,
    requirement: &Requirement,
    bare: &Floor,
    judged_bins: usize,
) -> (f64, Known) {
    let Some(pair) = measured.pair else { return (0.0, Known::Not) };
    let (spectra, segments) = (measured.spectra, measured.independent_segments);
    if let Some(idle) = pair.noise {
        let steady = own.pieces.iter().map(|piece| steady(&idle, piece)).sum();
        return (of_idle(&idle, &own.pieces), Known::Idle { segments: idle.independent_segments.max(1), steady });
    }
    if segments >= FEWEST_SEGMENTS {
        return match bin_by_bin(spectra, segments, &own.pieces) {
            Some(power) => (beyond_rounding(power, bare), Known::Coherence),
            None => (0.0, Known::Not),
        };
    }
    if shows_gains(requirement) || own.bins() < judged_bins {
        return (0.0, Known::Not);
    }
    let Some(turned) = turned(spectra, &own.pieces, &mut FftPlanner::new()) else { return (0.0, Known::Not) };
    let pooled = Pooled::of(spectra, segments, &own.pieces, &turned);
    (beyond_rounding(pooled.power, bare), Known::Pooled { certain_share: pooled.certain_share() })
}

/// The device's part of a sub-band's floor, turned as `turned`.
pub fn of_sub_band(measured: &Measured<'_>, parts: &[Range<usize>], bare: &Floor, turned: &Turned) -> f64 {
    let Some(pair) = measured.pair else { return 0.0 };
    let (spectra, segments) = (measured.spectra, measured.independent_segments);
    if let Some(idle) = pair.noise {
        return of_idle(&idle, parts);
    }
    let pooled = || Pooled::of(spectra, segments, parts, turned).power;
    let by_bin = (segments >= FEWEST_SEGMENTS).then(|| bin_by_bin(spectra, segments, parts)).flatten();
    beyond_rounding(by_bin.unwrap_or_else(pooled), bare)
}

fn beyond_rounding(power: f64, bare: &Floor) -> f64 {
    (power - bare.rounding - bare.arithmetic).max(0.0)
}

/// Sum of R n/(n - 1) over the bins.
fn bin_by_bin(spectra: &Spectra, segments: usize, parts: &[Range<usize>]) -> Option<f64> {
    let mut rest = 0.0;
    for range in parts {
        let cross = cross_slice(spectra, range.clone())?;
        let powers = spectra.sxx.get(range.clone())?.iter().zip(spectra.syy.get(range.clone())?);
        for (sxy, (sxx, syy)) in cross.iter().zip(powers) {
            // Divided first: products of spectra may leave the range of f64.
            let coherent = if *sxx > 0.0 { sxy.norm_sqr() / sxx } else { 0.0 };
            rest += (syy - coherent).max(0.0);
        }
    }
    let n = segments as f64;
    Some(rest * n / (n - 1.0).max(1.0))
}

/// Coherence of several bins together.
struct Pooled {
    coherence: f64,
    independent: f64,
    /// What is not coherent.
    power: f64,
}

impl Pooled {
    fn of(spectra: &Spectra, segments: usize, parts: &[Range<usize>], turned: &Turned) -> Self {
        let bins: usize = parts.iter().map(ExactSizeIterator::len).sum();
        let sxx: f64 = parts.iter().map(|range| sum(&spectra.sxx, range)).sum();
        let syy: f64 = parts.iter().map(|range| sum(&spectra.syy, range)).sum();
        let independent = segments.max(1) as f64 * bins as f64 / VARIANCE_BINS;
        let coherence = ((turned.sum / sxx) * (turned.sum / syy)).min(1.0);
        let coherence = if coherence > 0.0 { coherence } else { 0.0 };
        let rest = syy * (1.0 - coherence) * independent / chance::freedom(independent);
        Pooled { coherence, independent, power: if rest.is_finite() { rest.min(syy) } else { syy } }
    }

    /// Share of the output that came from the input, less the most that noise adds to it
    /// by chance (`chance`).
    fn certain_share(&self) -> f64 {
        let spread = chance::spread(chance::ONE_SIDE, chance::freedom(self.independent)) - 1.0;
        let radius = (spread * (1.0 - self.coherence) / self.coherence).sqrt();
        let least = if radius < 1.0 { 1.0 - radius } else { 0.0 };
        self.coherence * least * least
    }
}

/// What the idle device holds in `parts` beyond its own rounding.
fn of_idle(idle: &Idle<'_>, parts: &[Range<usize>]) -> f64 {
    let half = idle.spectrum.len().saturating_sub(1).max(1) as f64;
    let held: f64 =
        parts.iter().map(|part| sum(idle.spectrum, part) - idle.rounding_power * part.len() as f64 / half).sum();
    if held.is_finite() { held.max(0.0) } else { 0.0 }
}

/// Power of the steady lines of the idle device in `part`: main lobes around peaks that
/// stand out of what is around them, as far as they lie within.
fn steady(idle: &Idle<'_>, part: &Range<usize>) -> f64 {
    let mut found = 0.0;
    let mut bin = part.start;
    while bin < part.end {
        if is_peak(idle.spectrum, bin) && stands_out(idle.spectrum, bin, idle.independent_segments) {
            let lobe = lobe(bin);
            found += sum(idle.spectrum, &(lobe.start.max(part.start)..lobe.end.min(part.end)));
            bin += MAIN_LOBE_BINS;
        }
        bin += 1;
    }
    found
}
