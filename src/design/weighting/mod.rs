//! Standard curves at any sample rate.
//!
//! A curve's analog poles and zeros go to the z plane by the matched z transform,
//! z = e^(s / rate). The bilinear transform would bend the curve towards half the rate (A
//! at 48 kHz by 15.7 dB at 20 kHz); this leaves what the repetition of the response at the
//! sample rate makes of it, a smooth function of frequency. Few real zeros and poles
//! fitted to its magnitude (`correction`) take that out up to [`TOP`] of the rate.
//!
//! | curve | sections | fixed | fitted |
//! |---|---|---|---|
//! | A | 4 | 4 zeros at 0 Hz, 6 poles | 4 zeros, 2 poles |
//! | C | 3 | 2 zeros at 0 Hz, 4 poles | 4 zeros, 2 poles |
//! | riaa | 2 | 1 zero, 2 poles | 3 zeros, 2 poles |
//! | K at 48 kHz | 2 | as printed | - |
//! | K elsewhere | 2 or 3 | 4 zeros, 4 poles | none, or 2 zeros and 2 poles |
//!
//! All roots are inside the unit circle, zeros at 0 Hz apart: the filters are stable and
//! of minimum phase, as the analog ones are. How far the finished coefficients are off the
//! curve is measured on each design ([`deviation()`]), not assumed; where it is more than
//! [`HELD_WITHIN_DB`] the rate is refused.

mod bs1770;
mod correction;
mod deviation;
mod formula;
mod matched;
mod remarks;

use super::wording::figure;
use crate::section::Section;
use crate::spec::Curve;
use core::ops::RangeInclusive;
use correction::Roots;
pub use deviation::{Deviation, deviation};
use formula::{Formula, ZERO_DB_HZ};
use matched::{Quadratic, Shape};
pub use remarks::remarks;

/// A curve is held up to this part of the sample rate.
pub const TOP: f64 = 0.45;

/// Most that a design may be off its curve, dB.
pub const HELD_WITHIN_DB: f64 = 0.01;

/// The sample rates that are taken, Hz. Below, the curves are nothing but a slope; above, the
/// poles of A and C at 20.6 Hz lie so near z = 1 that rounding moves the response by 1e-4 dB.
pub const RATES_HZ: RangeInclusive<f64> = 100.0..=5e7;

/// K needs no correction where it is off by no more than this without one, dB.
const CLOSE_ENOUGH_DB: f64 = 0.001;

/// Why a curve can't be had at a sample rate.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum WeightingError {
    /// Not in [`RATES_HZ`].
    #[error(
        "curve {} is made for sample rates from {} to {} Hz, not for {} Hz; resample the recording, or leave the stage out",
        curve.name(),
        figure(*RATES_HZ.start()),
        figure(*RATES_HZ.end()),
        figure(*rate_hz)
    )]
    Rate {
        /// Which curve.
        curve: Curve,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// Off by more than [`HELD_WITHIN_DB`].
    #[error(
        "curve {} at a sample rate of {} Hz would be off by {} dB at {} Hz, and no more than {HELD_WITHIN_DB} dB is \
         taken for the curve; use a higher sample rate, or leave the stage out",
        curve.name(),
        figure(*rate_hz),
        figure(deviation.largest_db),
        figure(deviation.at_hz)
    )]
    NotHeld {
        /// Which curve.
        curve: Curve,
        /// Sample rate, Hz.
        rate_hz: f64,
        /// How far it is off.
        deviation: Deviation,
    },
}

/// The sections of `curve` at `rate_hz`, whose gain at [`anchor_hz`] is that of the curve.
///
/// # Errors
/// The curve can't be had at this rate.
pub fn sections(curve: Curve, rate_hz: f64) -> Result<Vec<Section>, WeightingError> {
    if !RATES_HZ.contains(&rate_hz) {
        return Err(WeightingError::Rate { curve, rate_hz });
    }
    let reference = Reference::of(curve);
    let anchor = Anchor::new(curve, &reference, rate_hz);
    let sections = match &reference {
        Reference::Formula(formula) => from_formula(curve, formula, anchor),
        Reference::Bs1770 if rate_hz == bs1770::RATE_HZ => bs1770::SECTIONS.to_vec(),
        Reference::Bs1770 => k_at_another_rate(&reference, anchor),
    };
    let deviation = deviation::of_reference(&reference, &sections, rate_hz);
    if deviation.largest_db <= HELD_WITHIN_DB {
        Ok(sections)
    } else {
        Err(WeightingError::NotHeld { curve, rate_hz, deviation })
    }
}

/// The frequency at which a design has exactly the gain of `curve`, Hz: 1000, of K 997, or a
/// quarter of the rate where that lies above [`TOP`] of it.
pub fn anchor_hz(curve: Curve, rate_hz: f64) -> f64 {
    let usual_hz = if curve == Curve::K { bs1770::ANCHOR_HZ } else { ZERO_DB_HZ };
    if usual_hz <= TOP * rate_hz { usual_hz } else { rate_hz / 4.0 }
}

/// The gain of `curve` at `hz`, dB: of K that of its coefficients at 48 kHz, which from
/// 24 kHz on stays what it is there.
pub fn curve_db(curve: Curve, hz: f64) -> f64 {
    Reference::of(curve).gain_db(hz)
}

/// What a design is held against.
enum Reference {
    Formula(Formula),
    Bs1770,
}

impl Reference {
    fn of(curve: Curve) -> Reference {
        match curve {
            Curve::A => Reference::Formula(Formula::a_weighting()),
            Curve::C => Reference::Formula(Formula::c_weighting()),
            Curve::Riaa => Reference::Formula(Formula::riaa()),
            Curve::K => Reference::Bs1770,
        }
    }

    fn gain_db(&self, hz: f64) -> f64 {
        match self {
            Reference::Formula(formula) => formula.gain_db(hz),
            Reference::Bs1770 => bs1770::gain_db(hz),
        }
    }

    /// `rate_hz`, or the rate to whose half the curve is known, where that is less.
    fn known_rate_hz(&self, rate_hz: f64) -> f64 {
        match self {
            Reference::Formula(_) => rate_hz,
            Reference::Bs1770 => rate_hz.min(bs1770::RATE_HZ),
        }
    }
}

/// Where a design's gain is set.
#[derive(Clone, Copy)]
struct Anchor {
    hz: f64,
    /// The curve's gain there.
    gain_db: f64,
    rate_hz: f64,
}

impl Anchor {
    fn new(curve: Curve, reference: &Reference, rate_hz: f64) -> Anchor {
        let hz = anchor_hz(curve, rate_hz);
        Anchor { hz, gain_db: reference.gain_db(hz), rate_hz }
    }

    /// Sections with the gain in the first, the others at 0 dB where the whole is anchored.
    fn sections(self, shapes: &[Shape]) -> Vec<Section> {
        let gains = [libm::pow(10.0, self.gain_db / 20.0)].into_iter().chain(core::iter::repeat(1.0));
        shapes.iter().zip(gains).map(|(shape, gain)| shape.section(self.hz, gain, self.rate_hz)).collect()
    }
}

/// Where the fit for A and C begins: its outcome where the rate is far above all poles.
const START_FALLING: ([f64; 4], [f64; 2]) = ([0.997, 1.51, 2.73, 6.72], [2.08, 5.73]);

/// The same for riaa, which falls half as fast.
const START_RIAA: ([f64; 3], [f64; 2]) = ([1.11, 1.91, 5.09], [1.57, 4.56]);

/// The same for K at rates below a few times its shelf.
const START_K: ([f64; 2], [f64; 2]) = ([1.8, 4.8], [1.85, 4.85]);

fn from_formula(curve: Curve, formula: &Formula, anchor: Anchor) -> Vec<Section> {
    let root = |hz: &f64| matched::real_root(*hz, anchor.rate_hz);
    let poles: Vec<f64> = formula.poles_hz.iter().map(root).collect();
    let zeros: Vec<f64> = (0..formula.zeros_at_0).map(|_| 0.0).chain(formula.zeros_hz.iter().map(root)).collect();
    let start = if curve == Curve::Riaa { roots(START_RIAA) } else { roots(START_FALLING) };
    let missing_db = |hz: f64| {
        let square = matched::square(hz, anchor.rate_hz);
        let of = |roots: &[f64]| roots.iter().map(|&root| matched::root_db(root, square)).sum::<f64>();
        formula.gain_db(hz) - of(&zeros) + of(&poles)
    };
    let fitted = correction::fit(start, missing_db, anchor.hz, anchor.rate_hz);
    // The fixed roots first, so that the low ones share sections.
    let zeros: Vec<f64> = zeros.into_iter().chain(fitted.zeros).collect();
    let poles: Vec<f64> = poles.into_iter().chain(fitted.poles).collect();
    let pairs = zeros.chunks_exact(2).zip(poles.chunks_exact(2));
    let shapes: Vec<Shape> = pairs
        .map(|(zeros, poles)| Shape {
            zeros: Quadratic::real(zeros[0], zeros[1]),
            poles: Quadratic::real(poles[0], poles[1]),
        })
        .collect();
    anchor.sections(&shapes)
}

fn k_at_another_rate(reference: &Reference, anchor: Anchor) -> Vec<Section> {
    let mut shapes = bs1770::shapes(anchor.rate_hz).to_vec();
    let plain = anchor.sections(&shapes);
    if deviation::of_reference(reference, &plain, anchor.rate_hz).largest_db <= CLOSE_ENOUGH_DB {
        return plain;
    }
    let missing_db = |hz: f64| {
        let square = matched::square(hz, anchor.rate_hz);
        reference.gain_db(hz) - shapes.iter().map(|shape| shape.gain_db(square)).sum::<f64>()
    };
    let fitted = correction::fit(roots(START_K), missing_db, anchor.hz, anchor.rate_hz);
    if let (&[low_zero, high_zero], &[low_pole, high_pole]) = (&fitted.zeros[..], &fitted.poles[..]) {
        shapes.push(Shape { zeros: Quadratic::real(low_zero, high_zero), poles: Quadratic::real(low_pole, high_pole) });
    }
    anchor.sections(&shapes)
}

fn roots<const ZEROS: usize, const POLES: usize>((zeros, poles): ([f64; ZEROS], [f64; POLES])) -> Roots {
    Roots { zeros: zeros.to_vec(), poles: poles.to_vec() }
}
