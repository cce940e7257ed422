//! Gains of a pair as a reference, and against a design.

use super::delay::{Stretch, best_turned};
use super::ranges::{Owned, shows_gains, sum};
use super::subbands::SubBand;
use super::view::{Channel, View};
use super::{BandTask, Measured, db};
use crate::spec::Requirement;
use num_complex::Complex64;
use rustfft::FftPlanner;

/// The gain farthest from what the design would show.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Deviation {
    /// Gain seen less gain of the design, dB, rounded.
    pub db: f64,
    /// One standard error of the gain seen, dB, rounded.
    pub error_db: f64,
    /// Center of the sub-band, Hz, rounded.
    pub at_hz: f64,
}

impl Deviation {
    /// How far it is once two standard errors are granted, dB; negative where chance
    /// alone may account for it.
    pub fn beyond_chance_db(&self) -> f64 {
        self.db.abs() - 2.0 * self.error_db
    }
}

/// Gain of the whole reference band, linear: by how much everything after is taken back.
/// `None` where nothing of the band stands out of its floor.
///
/// The mean in dB of its sub-bands that count, by their width, whatever gain is in force
/// in `measured`: so neither a loud part of the excitation nor a part of the band that
/// happens to be free of noise speaks for the rest. Judged with that gain in force, a band
/// of one sub-band reads 0.000 dB, and those of any other balance to 0 dB.
pub fn reference_gain(measured: &Measured<'_>, band: &BandTask) -> Option<f64> {
    let measured = Measured { gain: 1.0, ..*measured };
    let channel = Channel::new(&measured);
    let own = reachable(&channel, band);
    let response = View::new(&channel, &own, &Requirement::Observe).response()?;
    let bins: usize = response.counting.iter().map(|sub| sub.bins).sum();
    if bins == 0 {
        return None;
    }
    let sum_db: f64 = response.counting.iter().map(|sub| sub.bins as f64 * sub.exact_db).sum();
    Some(db::ratio(sum_db / bins as f64).sqrt())
}

/// The gain farthest from what `response` (complex, at a frequency in Hz) would show in
/// the sub-bands of the keep and observed bands that count. `None` where none does.
///
/// What the design would show is computed as the gain itself is: `Sxy = H Sxx` in each bin
/// of the sub-band, turned by its own best delay and phase. Two standard errors are granted
/// to each before the farthest is chosen: of a thousand sub-bands some are far off by
/// chance, and a real deviation must not hide behind them.
pub fn deviation(
    measured: &Measured<'_>,
    bands: &[BandTask],
    response: &dyn Fn(f64) -> Complex64,
) -> Option<Deviation> {
    let channel = Channel::new(measured);
    let mut planner = FftPlanner::new();
    let mut farthest: Option<Deviation> = None;
    for band in bands.iter().filter(|band| shows_gains(&band.requirement)) {
        let own = reachable(&channel, band);
        let Some(seen) = View::new(&channel, &own, &band.requirement).response() else { continue };
        for (gain, part) in seen.counting.iter().zip(&seen.parts) {
            let Some(designed_db) = designed_db(measured, part, channel.bin_hz(), response, &mut planner) else {
                continue;
            };
            let found = Deviation {
                db: db::rounded(gain.exact_db - designed_db),
                error_db: gain.error_db,
                at_hz: db::rounded(0.5 * (gain.from_hz + gain.to_hz)),
            };
            if farthest.is_none_or(|farthest| found.beyond_chance_db() > farthest.beyond_chance_db()) {
                farthest = Some(found);
            }
        }
    }
    farthest
}

/// The bins of `band` that have their levels.
fn reachable(channel: &Channel<'_>, band: &BandTask) -> Owned {
    let own = channel.own(band);
    match channel.measured.pair {
        Some(pair) if pair.falls_short_of(band, channel.measured.rate_hz) => {
            own.below(pair.reaches_hz, channel.bin_hz())
        }
        _ => own,
    }
}

/// The gain that `response` would show in a sub-band, dB; `None` unless finite.
fn designed_db(
    measured: &Measured<'_>,
    part: &SubBand,
    bin_hz: f64,
    response: &dyn Fn(f64) -> Complex64,
    planner: &mut FftPlanner<f64>,
) -> Option<f64> {
    let sxx = &measured.spectra.sxx;
    let power = |bin: usize| sxx.get(bin).copied().unwrap_or(0.0);
    let crosses: Vec<Vec<Complex64>> = part
        .iter()
        .map(|range| range.clone().map(|bin| response(bin as f64 * bin_hz) * power(bin)).collect())
        .collect();
    let stretches: Vec<Stretch<'_>> =
        part.iter().zip(&crosses).map(|(range, values)| (range.start, values.as_slice())).collect();
    let all: f64 = part.iter().map(|range| sum(sxx, range)).sum();
    let designed_db = 2.0 * db::ratio_db(best_turned(&stretches, planner).sum / all);
    designed_db.is_finite().then_some(designed_db)
}
