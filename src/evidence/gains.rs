//! The response seen in a keep or observed band.
//!
//! ```text
//! gain            g  = |sum Sxy'| / sum Sxx
//! coherence       g2 = |sum Sxy'|^2 / (sum Sxx * sum Syy)
//! standard error     = sqrt((1 - g2) / (2 g2 n)),  n = segments * bins / 2.76
//! window error       = 4.94 d / sqrt(segments)
//! ```
//!
//! segments as far as they are independent, sums over the bins of a sub-band, Sxy' the
//! cross-spectrum turned by the sub-band's own best delay and phase. Both errors are relative to g (the first: J. S. Bendat and
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
//!
//! Of a pair that something else filtered a sub-band counts only if its output stands
//! above what the device adds, too (`incoherent`). One that does not still tells how high
//! its gain is at most: sqrt(sum Syy / sum Sxx), since noise is power on top.

use super::chance;
use super::db;
use super::delay::{Turned, turned};
use super::floors::{Floor, Side};
use super::incoherent;
use super::ranges::{Owned, sum};
use super::response::{Dip, Response, SubGain};
use super::subbands::{SubBand, divide, divide_finely};
use super::{Measured, Pairing};
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
pub const DB_PER_NEPER: f64 = 20.0 / std::f64::consts::LN_10;

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
    let mut eye = Eye { measured, before, after, bin_hz, gain, planner: FftPlanner::new() };
    let subs = match measured.pair {
        None => divide(own),
        Some(_) => divide_finely(own, measured.independent_segments),
    };
    let mut found =
        Response { of_pair: measured.pair.is_some(), tried: subs.len(), beyond: own.beyond, ..Response::default() };
    let mut counted = 0;
    for sub in subs {
        let bins: usize = sub.iter().map(ExactSizeIterator::len).sum();
        match eye.look(&sub, bins)? {
            Sight::Counts(gain) => {
                counted += bins;
                found.counting.push(gain);
                found.parts.push(sub);
            }
            Sight::Hidden { by, dip } => {
                found.dips.extend(dip);
                match by {
                    Veil::Leakage => found.hidden_by_leakage += bins,
                    Veil::Rounding => found.hidden_by_rounding += bins,
                    Veil::Device => found.hidden_by_device += bins,
                    Veil::Unclear => {
                        found.hidden_by_device += bins;
                        found.unclear += bins;
                    }
                }
            }
        }
    }
    let all = own.bins() + own.hidden + own.beyond;
    found.resolved = if all == 0 { 0.0 } else { db::rounded(counted as f64 / all as f64) };
    Some(found)
}

/// What comes of one sub-band.
enum Sight {
    Counts(SubGain),
    Hidden { by: Veil, dip: Option<Dip> },
}

/// What a sub-band that does not count is hidden by.
enum Veil {
    Leakage,
    Rounding,
    Device,
    Unclear,
}

/// What looks at sub-bands.
struct Eye<'a> {
    measured: &'a Measured<'a>,
    before: &'a Side<'a>,
    after: &'a Side<'a>,
    bin_hz: f64,
    gain: f64,
    planner: FftPlanner<f64>,
}

impl Eye<'_> {
    /// Looks at the sub-band `sub` of `bins` bins; `None` where no cross-spectrum was kept.
    fn look(&mut self, sub: &SubBand, bins: usize) -> Option<Sight> {
        let spectra = self.measured.spectra;
        let segments = self.measured.independent_segments.max(1) as f64;
        let sxx: f64 = sub.iter().map(|range| sum(&spectra.sxx, range)).sum();
        let syy: f64 = sub.iter().map(|range| sum(&spectra.syy, range)).sum();
        let independent = segments * bins as f64 / VARIANCE_BINS;
        // A bin beside the band may exceed its own mean by chance, and the band fall
        // short of its.
        let ambient = (1.0 + 3.0 / segments.sqrt()) * (1.0 + 2.0 / independent.sqrt());
        let [disturbing, leaking] = self.before.floors(sub, ambient * sxx / bins as f64);
        let (disturbs_in, leaks_in) = (disturbing.leakage, leaking.leakage);
        let [bare, leaking] = self.after.floors(sub, ambient * syy / bins as f64);
        let leaks_out = leaking.leakage;
        let low_by_db = -2.0 * db::ratio_db((1.0 - leaks_in / sxx).max(LEAST_SHARE));
        let (from, to) = (sub.first().map_or(0, |r| r.start), sub.last().map_or(0, |r| r.end));
        let (from_hz, to_hz) = (from as f64 * self.bin_hz, to as f64 * self.bin_hz);

        let early = match &self.measured.pair {
            Some(pair) => Some((pair, self.turn(sub)?)),
            None => None,
        };
        let device = early.map_or(0.0, |(_, turned)| incoherent::of_sub_band(self.measured, sub, &bare, &turned));
        let floor = Floor { device, ..bare };
        let input_stands = sxx > 0.0 && sxx >= STANDS_OUT * disturbs_in;
        if !(input_stands && syy > 0.0 && syy >= STANDS_OUT * floor.total()) {
            let leaky = floor.is_leakage() || (!input_stands && disturbs_in > 0.0);
            // Nothing at all counts as far below any limit.
            let at_most_db = db::rounded((db::ratio_db(syy / sxx) - 2.0 * db::ratio_db(self.gain)).max(-400.0));
            let dip = Dip { from_hz, to_hz, at_most_db, independent, low_by_db };
            let bounded = early.is_some() && input_stands && !at_most_db.is_nan();
            let by = if leaky {
                Veil::Leakage
            } else if floor.is_device() {
                // Seen from the bins together, a response that turns looks like noise.
                let told = early.is_some_and(|(pair, _)| self.tells_noise(pair));
                if told || syy < STANDS_OUT * bare.total() { Veil::Device } else { Veil::Unclear }
            } else {
                Veil::Rounding
            };
            return Some(Sight::Hidden { by, dip: bounded.then_some(dip) });
        }
        let turned = match early {
            Some((_, turned)) => turned,
            None => self.turn(sub)?,
        };
        let sxy = turned.sum;
        let seen = sxy / sxx;
        // Divided first: products of spectra may leave the range of f64.
        let coherence = (seen * (sxy / syy)).min(1.0);
        let error = ((1.0 - coherence) / (2.0 * coherence * independent)).sqrt();
        let gain_db = 2.0 * db::ratio_db(seen / self.gain);
        if !(gain_db.is_finite() && error.is_finite()) {
            // What came out has nothing to do with what went in.
            let by = if early.is_some() { Veil::Unclear } else { Veil::Rounding };
            return Some(Sight::Hidden { by, dip: None });
        }
        let window = WINDOW_SLOPE * turned.delay_share.abs() / segments.sqrt();
        // What leaks in may bias a gain whether it disturbs or not.
        let shared = (leaks_in * leaks_out).sqrt() / sxy;
        Some(Sight::Counts(SubGain {
            from_hz,
            to_hz,
            bins,
            gain_db: db::rounded(gain_db),
            exact_db: gain_db,
            error_db: db::rounded(DB_PER_NEPER * error),
            relative_error: error,
            independent,
            freedom: chance::freedom(independent),
            bias_db: DB_PER_NEPER * error * error,
            window_db: DB_PER_NEPER * window,
            low_by_db,
            high_by_db: -2.0 * db::ratio_db((1.0 - shared).max(LEAST_SHARE)),
        }))
    }

    fn turn(&mut self, sub: &SubBand) -> Option<Turned> {
        turned(self.measured.spectra, sub, &mut self.planner)
    }

    /// Whether noise is told from a response that turns within a sub-band.
    fn tells_noise(&self, pair: &Pairing<'_>) -> bool {
        pair.noise.is_some() || self.measured.independent_segments >= incoherent::FEWEST_SEGMENTS
    }
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
