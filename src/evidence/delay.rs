//! The delay and phase that a run of a cross-spectrum agrees with best.

use super::ranges::cross_slice;
use crate::spectrum::Spectra;
use num_complex::Complex64;
use rustfft::FftPlanner;
use std::f64::consts::TAU;
use std::ops::Range;

/// A stretch of the cross-spectrum: its first bin and its values.
pub type Stretch<'a> = (usize, &'a [Complex64]);

/// A cross-spectrum after the turn that fits it best.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Turned {
    /// Magnitude of the sum over its bins.
    pub sum: f64,
    /// The delay it was turned by, as a share of the segment's length, -1/2 to 1/2.
    pub delay_share: f64,
}

/// The averaged cross-spectrum of `parts` after the turn that fits it best; `None` where
/// it was not kept.
pub fn turned(spectra: &Spectra, parts: &[Range<usize>], planner: &mut FftPlanner<f64>) -> Option<Turned> {
    let mut stretches = Vec::with_capacity(parts.len());
    for range in parts {
        stretches.push((range.start, cross_slice(spectra, range.clone())?));
    }
    Some(best_turned(&stretches, planner))
}

/// Largest `|sum over k of S[k] exp(i t k)|` over all t: the sum after the turn by the
/// delay t L/(2 pi) frames that fits best in the sense of least squares (the phase that
/// fits best is then that of the sum itself).
///
/// A transform over the bins tries every delay from -L/2 to L/2 frames on a grid of at
/// most half a resolution step, so no start value can lead astray; Newton's method
/// takes the best of them to its maximum.
pub fn best_turned(stretches: &[Stretch<'_>], planner: &mut FftPlanner<f64>) -> Turned {
    let Some(bins) = extent(stretches) else { return Turned::default() };
    let points = (2 * bins.len()).next_power_of_two().max(16);
    let mut delays = vec![Complex64::new(0.0, 0.0); points];
    for (first, values) in stretches {
        for (slot, value) in delays.iter_mut().skip(first - bins.start).zip(*values) {
            *slot = *value;
        }
    }
    planner.plan_fft_forward(points).process(&mut delays);
    let best = (0..points).max_by(|a, b| delays[*a].norm_sqr().total_cmp(&delays[*b].norm_sqr())).unwrap_or(0);
    let turn = -TAU * best as f64 / points as f64;
    refine(stretches, turn, 0.5 * (bins.start + bins.end) as f64, TAU / points as f64)
}

fn extent(stretches: &[Stretch<'_>]) -> Option<Range<usize>> {
    let start = stretches.iter().map(|(first, _)| *first).min()?;
    let end = stretches.iter().map(|(first, values)| first + values.len()).max()?;
    (start < end).then_some(start..end)
}

/// Newton's method on |G(t)|^2 from `turn`, in steps of at most `grid`.
fn refine(stretches: &[Stretch<'_>], mut turn: f64, center: f64, grid: f64) -> Turned {
    let (mut best, mut best_turn) = (0.0, turn);
    for _ in 0..8 {
        let [sum, first, second] = moments(stretches, turn, center);
        if sum.norm_sqr() > best {
            (best, best_turn) = (sum.norm_sqr(), turn);
        }
        // With G' = i first and G'' = -second.
        let slope = 2.0 * (sum.re * -first.im + sum.im * first.re);
        let curve = 2.0 * (first.norm_sqr() - (sum.re * second.re + sum.im * second.im));
        let step = if curve < 0.0 { -slope / curve } else { slope.signum() * grid };
        let step = step.clamp(-grid, grid);
        if !step.is_finite() || step.abs() < 1e-9 * grid {
            break;
        }
        turn += step;
    }
    let share = best_turn / TAU;
    Turned { sum: best.sqrt(), delay_share: share - share.round() }
}

/// Sums over k of `S[k] exp(i t (k - c)) (k - c)^p`, p = 0, 1, 2.
fn moments(stretches: &[Stretch<'_>], turn: f64, center: f64) -> [Complex64; 3] {
    let mut sums = [Complex64::new(0.0, 0.0); 3];
    for (start, values) in stretches {
        for (index, value) in values.iter().enumerate() {
            let k = (start + index) as f64 - center;
            let (sin, cos) = libm::sincos(turn * k);
            let turned = value * Complex64::new(cos, sin);
            sums[0] += turned;
            sums[1] += turned * k;
            sums[2] += turned * (k * k);
        }
    }
    sums
}

#[cfg(test)]
mod tests {
    use super::*;

    fn delayed(bins: Range<usize>, turn: f64) -> Vec<Complex64> {
        bins.map(|k| {
            let (sin, cos) = libm::sincos(0.7 - turn * k as f64);
            Complex64::new(cos, sin) * (1.0 + 0.5 * libm::cos(k as f64))
        })
        .collect()
    }

    #[test]
    fn any_delay_is_found_to_the_last_digits() {
        let truth: f64 = (100..137).map(|k| 1.0 + 0.5 * libm::cos(f64::from(k))).sum();
        for turn in [0.0, 1e-4, 0.31, -0.31, 3.0, -3.1] {
            let values = delayed(100..137, turn);
            let found = best_turned(&[(100, &values)], &mut FftPlanner::new());
            assert!((found.sum - truth).abs() < 1e-12 * truth, "{turn}: {found:?} {truth}");
            // At its maximum the sum is flat: the delay keeps half as many digits.
            assert!((found.delay_share - turn / TAU).abs() < 1e-7, "{turn}: {found:?}");
        }
    }

    #[test]
    fn stretches_share_one_delay() {
        let (low, high) = (delayed(40..60, 0.2), delayed(90..100, 0.2));
        let truth: f64 = (40..60).chain(90..100).map(|k| 1.0 + 0.5 * libm::cos(f64::from(k))).sum();
        let found = best_turned(&[(40, &low), (90, &high)], &mut FftPlanner::new());
        assert!((found.sum - truth).abs() < 1e-12 * truth);
    }

    #[test]
    fn nothing_sums_to_nothing() {
        assert_eq!(best_turned(&[], &mut FftPlanner::new()), Turned::default());
        assert_eq!(best_turned(&[(7, &[])], &mut FftPlanner::new()), Turned::default());
        assert_eq!(best_turned(&[(7, &[Complex64::new(0.0, 0.0); 12])], &mut FftPlanner::new()).sum, 0.0);
    }
}
