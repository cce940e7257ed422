//! How far finished sections are off their curve.

use super::{Reference, TOP};
use crate::design::{golden, response};
use crate::section::Section;
use crate::spec::Curve;

/// Lowest frequency that is looked at, Hz, or in parts of the highest where that is less:
/// below it no curve here has a pole or zero but at 0 Hz.
const LOWEST: (f64, f64) = (1.0, 1e-3);

/// Steps of the grid on a linear scale, fine where the correction's error swings: about
/// seven times up to the highest frequency, the narrowest swing a fortieth of that.
const LINEAR: u32 = 400;

/// Steps of the grid on a logarithmic scale, fine around poles at low frequencies.
const LOGARITHMIC: u32 = 200;

/// The largest deviation from a curve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Deviation {
    /// Without sign, dB.
    pub largest_db: f64,
    /// Where, Hz.
    pub at_hz: f64,
    /// The highest frequency that was looked at, Hz: [`TOP`] of the rate; of K of 48 kHz,
    /// where that is less.
    pub up_to_hz: f64,
}

/// How far `sections` are off `curve` at `rate_hz`.
pub fn deviation(curve: Curve, sections: &[Section], rate_hz: f64) -> Deviation {
    of_reference(&Reference::of(curve), sections, rate_hz)
}

pub(super) fn of_reference(reference: &Reference, sections: &[Section], rate_hz: f64) -> Deviation {
    let up_to_hz = TOP * reference.known_rate_hz(rate_hz);
    let off_db = |hz: f64| (response::gain_db(sections, hz, rate_hz) - reference.gain_db(hz)).abs();
    let lowest_hz = LOWEST.0.min(LOWEST.1 * up_to_hz);
    let span = libm::log(up_to_hz / lowest_hz);
    let part = |i: u32, of: u32| f64::from(i) / f64::from(of);
    let mut grid: Vec<f64> = (0..LOGARITHMIC).map(|i| lowest_hz * libm::exp(span * part(i, LOGARITHMIC))).collect();
    grid.extend((1..=LINEAR).map(|i| up_to_hz * part(i, LINEAR)));
    grid.sort_by(f64::total_cmp);
    let offs: Vec<f64> = grid.iter().map(|&hz| off_db(hz)).collect();
    let worst = (0..grid.len()).max_by(|&i, &j| offs[i].total_cmp(&offs[j])).unwrap_or(0);
    let (low, high) = (worst.saturating_sub(1), (worst + 1).min(grid.len() - 1));
    let (at_hz, largest_db) = golden::maximum(grid[low], grid[high], 0.0, off_db);
    // Golden section comes near an end of its interval, not to it.
    let (at_hz, largest_db) = if offs[worst] >= largest_db { (grid[worst], offs[worst]) } else { (at_hz, largest_db) };
    Deviation { largest_db, at_hz, up_to_hz }
}
