//! The window's leakage kernel as floors use it, summed over runs of bins.

use crate::spectrum::{LeakageKernel, MAIN_LOBE_BINS, leakage_kernel};
use std::sync::OnceLock;

/// Distance in bins to which the kernel is tabulated.
pub const REACH: usize = LeakageKernel::REACH;

/// A steady line half-way between two bins leaks this much more than the kernel's
/// average over a bin: sin^2 is 1 there, 1/2 on average.
///
/// Tried with lines at 21 places within a bin, one whole bin and more outside bands of 1
/// to 30 bins (`tests/reference/evidence_trials.py`): with the plain average the floor
/// lies up to 2.9 dB under the leakage, with this factor never.
const BETWEEN_BINS: f64 = 2.0;

/// Bound on what a source leaks into `bins` bins in a row, as far as they lie beyond
/// [`REACH`]; the nearest of them lies `distance` to `distance + slack` bins away.
///
/// From the flat bound at 64.5 bins on the window's transform falls as 1/x (only its
/// edge is left), so the bound on the power falls as 1/x^2. That matters where segments
/// are long: in the 7000 bins of a sub-band the flat bound alone would sum to -82 dB,
/// in those of an ultrasonic one to -65 dB, and hide what is there to be seen. The sum
/// over 1/x^2 lies below the integral from half a bin before to half a bin after.
///
/// The factor 2: the image of a source on the other side of 0 Hz, which may lie hardly
/// further away, leaks as well.
pub fn beyond(distance: usize, slack: usize, bins: usize) -> f64 {
    const IMAGES: f64 = 2.0;
    let edge = REACH as f64 + 0.5;
    let count = bins.min((distance + slack + bins).saturating_sub(REACH + 1));
    let first = distance.max(REACH + 1) as f64 - 0.5;
    let last = first + count as f64;
    IMAGES * leakage_kernel().beyond * edge * edge * (1.0 / first - 1.0 / last)
}

/// The kernel summed over the distances `from..to`, those beyond [`REACH`] left out.
pub fn between(from: isize, to: isize) -> f64 {
    let sums = cumulative();
    let at = |distance: isize| {
        let index = (distance + REACH as isize).clamp(0, 2 * REACH as isize + 1);
        // The clamp keeps it in range and not negative.
        sums[index.unsigned_abs()]
    };
    at(to) - at(from)
}

/// `cumulative()[i]`: the kernel summed over the distances from -REACH to i - REACH - 1.
fn cumulative() -> &'static [f64; 2 * REACH + 2] {
    static SUMS: OnceLock<[f64; 2 * REACH + 2]> = OnceLock::new();
    SUMS.get_or_init(|| {
        let kernel = leakage_kernel();
        let mut sums = [0.0; 2 * REACH + 2];
        for index in 0..=2 * REACH {
            let distance = index.abs_diff(REACH);
            let factor = if distance > MAIN_LOBE_BINS { BETWEEN_BINS } else { 1.0 };
            sums[index + 1] = sums[index] + factor * kernel.share(distance);
        }
        sums
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn all_distances_together_hold_the_whole_power() {
        // Side lobes count twice, but they are 100 dB down.
        assert!((between(-64, 65) - 1.0).abs() < 1e-8);
        assert_eq!(between(65, 900), 0.0);
        assert_eq!(between(-900, -64), 0.0);
    }

    #[test]
    fn the_far_bound_starts_at_the_flat_one_and_falls_with_the_square() {
        let flat = leakage_kernel().beyond;
        // (64.5)^2/(64.5 * 65.5): the flat bound holds from 64.5 bins on.
        assert!((beyond(65, 0, 1) / (2.0 * flat) - 64.5 / 65.5).abs() < 1e-12);
        assert!((beyond(650, 0, 1) / beyond(65, 0, 1) - 0.0098).abs() < 3e-4);
        assert_eq!(beyond(1, 0, 64), 0.0);
        assert!((beyond(1, 0, 65) - beyond(65, 0, 1)).abs() < 1e-25);
        let apart: f64 = (100..200).map(|distance| beyond(distance, 0, 1)).sum();
        assert!((beyond(100, 0, 100) / apart - 1.0).abs() < 1e-12);
    }

    #[test]
    fn one_distance_is_the_kernel_itself() {
        let share = |k: usize| leakage_kernel().share(k);
        // Differences of sums near 1 carry their rounding, a few 1e-16.
        assert!((between(1, 2) - share(1)).abs() < 1e-15);
        assert!((between(-3, -2) - share(3)).abs() < 1e-15);
    }
}
