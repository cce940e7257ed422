//! The lag of each chunk relative to the response of all the others.
//!
//! What lies between both sides turns the phase of every chunk alike, so it drops out
//! when a chunk's cross-spectrum is held against the sum of the others', however much a
//! filter's delay varies over frequency. What is left is what the clock did.

use super::climb::{Bins, Top, climb};
use super::spectra::Spectra;
use num_complex::{Complex32, Complex64};

/// Standard errors by which the phases of a chunk must agree with those of the others.
/// More than four, as the best of several lags is taken.
const NEEDED_AGREEMENT: f64 = 5.0;

/// Coherence from which on bins can't agree by chance, however few they are.
const PURE: f64 = 0.8;

/// Share of the weights that must then agree: a tone has but a few bins.
const NEEDED_SHARE: f64 = 0.8;

/// Share of the mean power of a bin, at the chunk's loudness, below which only what leaks
/// into it is there: 20 dB. A sweep's chunks have hardly a bin in common above it.
const SKIRT: f64 = 0.01;

/// Share of a chunk's power that the others must hold too, of what comes through at all:
/// the ends at which the chunks of a sweep touch say nothing.
const NEEDED_POWER: f64 = 0.25;

/// Lags below this are rounding, frames.
const SMALLEST_ERROR: f64 = 1e-6;

/// One chunk against the others.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Relative {
    /// Its lag beyond the line, frames, but for a constant that all chunks share.
    pub(super) lag: f64,
    /// Variance, frames^2.
    pub(super) variance: f64,
    /// Whether its phases agree with those of the others.
    pub(super) matches: bool,
}

/// The chunk at `index` against all others, climbing from `start`. When `strict`, whether
/// it matches is judged with weights that the others alone have set: the common ones prefer
/// bins in which all agree, if only by chance.
pub(super) fn relative(spectra: &Spectra<'_>, weights: &[f64], index: usize, start: f64, strict: bool) -> Relative {
    let (first, step) = (spectra.first_angle(), spectra.angle_step());
    let values = agreement(spectra, weights, index);
    let Top { lag, height, variance } = climb(Bins { values: &values, first, step }, start, 6);
    let magnitudes = |values: &[Complex64]| values.iter().map(|v| v.norm_sqr().sqrt()).sum::<f64>();
    let sum = magnitudes(&values);
    let pure = spectra.coherence.iter().zip(&values).map(|(c, v)| c * v.norm_sqr().sqrt()).sum::<f64>() / sum;
    let few = pure >= PURE && height >= NEEDED_SHARE * sum;
    let stands_out = |values: &[Complex64], height: f64| {
        let squares: f64 = values.iter().map(Complex64::norm_sqr).sum();
        height > NEEDED_AGREEMENT * (0.5 * spectra.bins_per_independent(index) * squares).sqrt()
    };
    let agrees = few
        || if strict {
            let fair = agreement(spectra, &spectra.weights_without(index), index);
            stands_out(&fair, climb(Bins { values: &fair, first, step }, lag, 0).height)
        } else {
            stands_out(&values, height)
        };
    let matches = agrees && shared(spectra, &values, weights, index) >= NEEDED_POWER;
    Relative { lag, variance: variance.max(SMALLEST_ERROR * SMALLEST_ERROR), matches }
}

/// Share of the chunk's power that lies in bins which the others hold too. Bins in which
/// nothing is coherent don't count: a narrow band-pass leaves few.
fn shared(spectra: &Spectra<'_>, values: &[Complex64], weights: &[f64], index: usize) -> f64 {
    let coherent = spectra.power[index].iter().zip(weights).zip(values).filter(|((_, weight), _)| **weight > 0.0);
    let (held, all) = coherent.fold((0.0, 0.0), |(held, all), ((power, _), value)| {
        let power = f64::from(*power);
        (held + if value.norm_sqr() > 0.0 { power } else { 0.0 }, all + power)
    });
    held / all
}

/// Phase differences of one chunk from the others as unit phasors times weights: the
/// signal over noise of the bin, less where this chunk or the others hold little there.
fn agreement(spectra: &Spectra<'_>, weights: &[f64], index: usize) -> Vec<Complex64> {
    let count = spectra.power.len() as f64;
    let (cross, power) = (&spectra.cross[index], &spectra.power[index]);
    // How loud the chunk is on the whole: bins that hold far less of it are its skirts.
    let loudness = power.iter().map(|p| f64::from(*p)).sum::<f64>() / spectra.total_power.iter().sum::<f64>() * count;
    let rows = cross.iter().zip(power).zip(spectra.total.iter().zip(&spectra.total_power)).zip(weights);
    rows.map(|(((cross, power), (total, total_power)), weight)| {
        let (power, cross) = (f64::from(*power), wide(*cross));
        let mean = total_power / count;
        let others = (total_power - power) / (count - 1.0);
        if power < SKIRT * loudness * mean || others < SKIRT * mean {
            return Complex64::default();
        }
        let held = (power / mean).min(1.0) * (others / mean).clamp(0.0, 1.0);
        let product = cross * (total - cross).conj();
        let scale = weight * held / product.norm_sqr().sqrt();
        if scale.is_finite() { product * scale } else { Complex64::default() }
    })
    .collect()
}

fn wide(value: Complex32) -> Complex64 {
    Complex64::new(f64::from(value.re), f64::from(value.im))
}
