//! The response seen in a keep or observed band.
//!
//! ```text
//! gain            g  = |sum Sxy'| / sum Sxx
//! coherence       g2 = |sum Sxy'|^2 / (sum Sxx * sum Syy)
//! standard error     = sqrt((1 - g2) / (2 g2 n)),  n = segments * bins / 2.76
//! window error       = 4.94 d / sqrt(segments)
//! ```
//!
//! segments as far as they are independent, sums over the bins of a sub-band, Sxy' the cross-spectrum turned by the sub-band's
//! own best delay and phase. Both errors are relative to g (the first: J. S. Bendat and
//! A. G. Piersol, Random Data, chapter 9). One segment will do, since many bins
//! are taken together; of this window's bins 2.76 count as one.
//!
//! The window error is for sounds shorter than a segment. What the filter delays stands
//! under another part of the window than what went in, so a gain reads high or low by
//! the window's relative slope there times the delay. d is that delay, the one found
//! above, as a share of the segment's length, and 4.94 the root of the mean square of the
//! relative slope over a segment, weighted by the window's power. For steady sound there
//! is no such error, and which sound is steady the sums do not tell: so it speaks
//! against a verdict, never for one.

use super::Measured;
use super::db;
use super::delay::best_turned;
use super::floors::Side;
use super::ranges::{Owned, cross_slice, sum};
use super::subbands::divide;
use crate::spectrum::VARIANCE_BINS;
use rustfft::FftPlanner;

/// A sub-band counts if its output stands this power ratio (10 dB) above its floor and
/// its input above what leaks into it; then noise raises its gain by less than 0.5 dB.
const STANDS_OUT: f64 = 10.0;

/// The bias by leakage is bounded by what is left of a gain; at most 60 dB.
const LEAST_SHARE: f64 = 1e-3;

/// Root of `integral w'^2 / integral w^2` of the 4-term Blackman-Harris window over a
/// segment of length 1: `w'` has the amplitudes 2 pi k a_k.
const WINDOW_SLOPE: f64 = 4.94;

/// Decibels of a small relative change of amplitude, 20/ln 10.
const DB_PER_NEPER: f64 = 20.0 / std::f64::consts::LN_10;

/// The gain of one sub-band that counts. Figures are rounded as shown.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SubGain {
    /// Lower edge, Hz.
    pub from_hz: f64,
    /// Upper edge, Hz.
    pub to_hz: f64,
    /// Gain, dB.
    pub gain_db: f64,
    /// Its standard error, dB.
    pub error_db: f64,
    /// Its window error, dB: how far off it may be, as a root of a mean square, if
    /// the sounds are short against a segment.
    pub window_db: f64,
    /// How much higher the gain may be: the input's share that leaked in from outside
    /// the band need not have come out again. dB, at least 0.
    pub low_by_db: f64,
    /// How much lower it may be: leakage that is in both spectra passes for gain.
    /// dB, at least 0.
    pub high_by_db: f64,
}

/// What was seen of a band's response.
#[derive(Clone, Debug, PartialEq)]
pub struct Response {
    /// The sub-bands that count, rising.
    pub counting: Vec<SubGain>,
    /// Share of the band's bins in them, 0 to 1, rounded.
    pub resolved: f64,
    /// Bins of the sub-bands that do not count because of what leaks into them.
    pub hidden_by_leakage: usize,
    /// Bins of those that do not count because of rounding.
    pub hidden_by_rounding: usize,
}

impl Response {
    /// Width of the widest sub-band that counts, Hz: a dip narrower than this may hide.
    pub fn resolution_hz(&self) -> Option<f64> {
        self.counting.iter().map(|sub| sub.to_hz - sub.from_hz).max_by(f64::total_cmp)
    }

    /// The sub-band of the lowest gain.
    pub fn lowest(&self) -> Option<&SubGain> {
        self.counting.iter().min_by(|a, b| a.gain_db.total_cmp(&b.gain_db))
    }

    /// The sub-band of the highest gain.
    pub fn highest(&self) -> Option<&SubGain> {
        self.counting.iter().max_by(|a, b| a.gain_db.total_cmp(&b.gain_db))
    }
}

/// Looks at the response in the bins `own`. `gain` is the linear gain in force, by
/// which the figures are taken back. `None` where no cross-spectrum was kept.
pub fn response(
    measured: &Measured<'_>,
    before: &Side<'_>,
    after: &Side<'_>,
    own: &Owned,
    bin_hz: f64,
    gain: f64,
) -> Option<Response> {
    let mut planner = FftPlanner::new();
    let mut counting = Vec::new();
    let mut counted = 0;
    let (mut hidden_by_leakage, mut hidden_by_rounding) = (0, 0);
    let spectra = measured.spectra;
    let segments = measured.independent_segments.max(1) as f64;
    for sub in divide(own) {
        let bins: usize = sub.iter().map(ExactSizeIterator::len).sum();
        let sxx: f64 = sub.iter().map(|range| sum(&spectra.sxx, range)).sum();
        let syy: f64 = sub.iter().map(|range| sum(&spectra.syy, range)).sum();
        let independent = segments * bins as f64 / VARIANCE_BINS;
        // A bin beside the band may exceed its own mean by chance, and the band fall
        // short of its.
        let ambient = (1.0 + 3.0 / segments.sqrt()) * (1.0 + 2.0 / independent.sqrt());
        let [disturbing, leaking] = before.floors(&sub, ambient * sxx / bins as f64);
        let (disturbs_in, leaks_in) = (disturbing.leakage, leaking.leakage);
        let [floor, leaking] = after.floors(&sub, ambient * syy / bins as f64);
        let leaks_out = leaking.leakage;
        let input_stands = sxx > 0.0 && sxx >= STANDS_OUT * disturbs_in;
        if !(input_stands && syy > 0.0 && syy >= STANDS_OUT * floor.total()) {
            let leaky = floor.is_leakage() || (!input_stands && disturbs_in > 0.0);
            *(if leaky { &mut hidden_by_leakage } else { &mut hidden_by_rounding }) += bins;
            continue;
        }
        let mut stretches = Vec::with_capacity(sub.len());
        for range in &sub {
            stretches.push((range.start, cross_slice(spectra, range.clone())?));
        }
        let turned = best_turned(&stretches, &mut planner);
        let sxy = turned.sum;
        let seen = sxy / sxx;
        // Divided first: products of spectra may leave the range of f64.
        let coherence = (seen * (sxy / syy)).min(1.0);
        let error = ((1.0 - coherence) / (2.0 * coherence * independent)).sqrt();
        let gain_db = 2.0 * db::ratio_db(seen / gain);
        if !(gain_db.is_finite() && error.is_finite()) {
            // What came out has nothing to do with what went in.
            hidden_by_rounding += bins;
            continue;
        }
        let window = WINDOW_SLOPE * turned.delay_share.abs() / segments.sqrt();
        // What leaks in may bias a gain whether it disturbs or not.
        let shared = (leaks_in * leaks_out).sqrt() / sxy;
        let (from, to) = (sub.first().map_or(0, |r| r.start), sub.last().map_or(0, |r| r.end));
        counted += bins;
        counting.push(SubGain {
            from_hz: from as f64 * bin_hz,
            to_hz: to as f64 * bin_hz,
            gain_db: db::rounded(gain_db),
            error_db: db::rounded(DB_PER_NEPER * error),
            window_db: DB_PER_NEPER * window,
            low_by_db: -2.0 * db::ratio_db((1.0 - leaks_in / sxx).max(LEAST_SHARE)),
            high_by_db: -2.0 * db::ratio_db((1.0 - shared).max(LEAST_SHARE)),
        });
    }
    let all = own.bins() + own.hidden;
    let resolved = if all == 0 { 0.0 } else { db::rounded(counted as f64 / all as f64) };
    Some(Response { counting, resolved, hidden_by_leakage, hidden_by_rounding })
}

#[cfg(test)]
mod tests {
    use super::WINDOW_SLOPE;
    use crate::spectrum::window::COEFFICIENTS;
    use std::f64::consts::TAU;

    #[test]
    fn the_slope_is_that_of_the_window() {
        // Parseval: a cosine of amplitude a has mean square a^2/2, the constant a^2.
        let (mut slope, mut power) = (0.0, COEFFICIENTS[0] * COEFFICIENTS[0]);
        for (k, a) in (1..).zip(&COEFFICIENTS[1..]) {
            slope += 0.5 * (TAU * f64::from(k) * a) * (TAU * f64::from(k) * a);
            power += 0.5 * a * a;
        }
        assert!(((slope / power).sqrt() - WINDOW_SLOPE).abs() < 0.005, "{}", (slope / power).sqrt());
    }
}
