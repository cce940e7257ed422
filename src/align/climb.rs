//! The maximum of a correlation given by its spectrum, to the last digits.

use super::spectra::{BINS_PER_INDEPENDENT, Turn};
use num_complex::Complex64;

/// Values over bins: `f(t) = sum over k of Re(v[k] exp(i (first + step k) t))`.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bins<'a> {
    pub(super) values: &'a [Complex64],
    /// Radians a frame of the first bin.
    pub(super) first: f64,
    /// Radians a frame from bin to bin.
    pub(super) step: f64,
}

/// Where a climb ended.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Top {
    /// t, frames.
    pub(super) lag: f64,
    /// f(t).
    pub(super) height: f64,
    /// Variance of t, frames^2, from what is left of the phases there.
    pub(super) variance: f64,
}

/// Newton's method on f from `start`, in steps of at most half a frame.
///
/// The variance is that of an estimate that solves f' = 0, from the scatter of its own
/// terms: `sum (w v sin)^2 / (sum w^2 v cos)^2`, w the angle, v the value's magnitude.
pub(super) fn climb(bins: Bins<'_>, start: f64, steps: usize) -> Top {
    let mut lag = start;
    for _ in 0..steps {
        let [_, slope, curve, _] = sums(bins, lag);
        let step = if curve < 0.0 { -slope / curve } else { 0.5 * slope.signum() };
        if slope == 0.0 || !step.is_finite() {
            break;
        }
        lag += step.clamp(-0.5, 0.5);
        if step.abs() < 1e-9 {
            break;
        }
    }
    let [height, _, curve, scatter] = sums(bins, lag);
    let variance = BINS_PER_INDEPENDENT * scatter / (curve * curve);
    Top { lag, height, variance: if curve < 0.0 && variance.is_finite() { variance } else { f64::MAX } }
}

/// f, f', f'' and the sum of the squared terms of f'.
fn sums(bins: Bins<'_>, lag: f64) -> [f64; 4] {
    // The turns of four bins side by side, each four steps on from round to round.
    let mut turn = Turn::new(bins.first * lag, bins.step * lag);
    let starts: [Complex64; 4] = std::array::from_fn(|_| turn.next_wide());
    let on = Turn::new(4.0 * bins.step * lag, 0.0).next_wide();
    let (mut re, mut im) = (starts.map(|z| z.re), starts.map(|z| z.im));
    let mut angle: [f64; 4] = std::array::from_fn(|lane| bins.first + bins.step * lane as f64);
    let mut sums = [[0.0; 4]; 4];
    let (fours, rest) = bins.values.as_chunks::<4>();
    let mut last = [Complex64::default(); 4];
    last[..rest.len()].copy_from_slice(rest);
    for values in fours.iter().chain(Some(&last)) {
        for lane in 0..4 {
            let value = values[lane];
            let turned = value.re * re[lane] - value.im * im[lane];
            let slope = -angle[lane] * (value.re * im[lane] + value.im * re[lane]);
            sums[0][lane] += turned;
            sums[1][lane] += slope;
            sums[2][lane] -= angle[lane] * angle[lane] * turned;
            sums[3][lane] += slope * slope;
            (re[lane], im[lane]) = (re[lane] * on.re - im[lane] * on.im, re[lane] * on.im + im[lane] * on.re);
            angle[lane] += 4.0 * bins.step;
        }
    }
    sums.map(|lanes| lanes.iter().sum())
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    fn delayed(lag: f64) -> Vec<Complex64> {
        (0..500)
            .map(|k| {
                let angle = -lag * (0.02 + f64::from(k) * PI / 512.0);
                Complex64::new(angle.cos(), angle.sin()) * (1.0 + 0.5 * (0.3 * f64::from(k)).sin())
            })
            .collect()
    }

    #[test]
    fn a_pure_delay_is_found_to_rounding() {
        for lag in [0.0, 1e-6, 0.3, -0.49] {
            let values = delayed(lag);
            let top = climb(Bins { values: &values, first: 0.02, step: PI / 512.0 }, 0.0, 12);
            assert!((top.lag - lag).abs() < 1e-12, "{lag}: {top:?}");
            assert!(top.variance < 1e-20);
        }
    }
}
