//! What the window lets through from elsewhere.

use super::window;
use std::sync::OnceLock;

/// Share of a line's power that shows in a bin some whole number of bins away.
///
/// For a line at an unknown place within its bin, the expected share is the
/// window's power transform averaged over one bin,
///
/// `P(k) = integral over d from -1/2 to 1/2 of |W(k + d)|^2 / integral over all d of |W(d)|^2`,
///
/// with W the transform of the window over a segment, offsets in bins. The sum of
/// `P(k)` over all k is 1 by construction. By Parseval the denominator is the mean of
/// w^2. The values at whole bins, `|W(k)|^2`, would not do: a periodic 4-term window
/// has exact zeros there beyond 3 bins and would show no side lobes at all.
///
/// W is taken in the limit of large L. A segment of L frames lets through more, since
/// the window's edge repeats with the sample rate: up to `1 + 25000/L^2` times the
/// tabulated share (1.4 dB at L = 256, 0.03 dB at 2000) and `0.02/L^2` beside it (-125 dB
/// at L = 256), which counts only around 22 bins, where the share has a minimum.
///
/// All values are dimensionless power ratios.
#[derive(Clone, Copy, Debug)]
pub struct LeakageKernel {
    /// `P(k)` for k from 0 to 64; the kernel is even.
    pub within: [f64; LeakageKernel::REACH + 1],
    /// Bound on the share in any bin beyond 64 bins, for every L this module uses.
    pub beyond: f64,
}

impl LeakageKernel {
    /// Largest tabulated distance, in bins.
    pub const REACH: usize = 64;

    /// Share at a distance of `bins` bins: tabulated to [`Self::REACH`], the bound beyond.
    pub fn share(&self, bins: usize) -> f64 {
        self.within.get(bins).copied().unwrap_or(self.beyond)
    }
}

/// The window's leakage kernel, computed once.
pub fn leakage_kernel() -> &'static LeakageKernel {
    static KERNEL: OnceLock<LeakageKernel> = OnceLock::new();
    KERNEL.get_or_init(|| LeakageKernel {
        within: core::array::from_fn(|k| power_over_bin(k as f64) / window::MEAN_SQUARE),
        beyond: beyond(),
    })
}

/// Bound on `|W(x)|^2 / mean of w^2` for x from 64.5 bins to L/2.
///
/// That far out `W(x) = sinc(x) (e + r/x^2 + ...)` with e = 6e-5 the window's edge and
/// r < 0 smaller against it the further out, so `|W(x)| < e / (pi x)`. In a segment of
/// L frames `pi x` becomes `L sin(pi x/L)`, which is at least `2 x` up to half the
/// rate: `|W(x)| < e / (2 * 64.5)`.
fn beyond() -> f64 {
    let amplitude = window::EDGE / (2.0 * (LeakageKernel::REACH as f64 + 0.5));
    amplitude * amplitude / window::MEAN_SQUARE
}

/// Integral of `|W|^2` over the bin around `center`, offsets in bins.
///
/// Gauss-Legendre with 8 nodes on 8 panels: W is a smooth function that swings once
/// in two bins, and the quadrature's error is below rounding.
fn power_over_bin(center: f64) -> f64 {
    // Abramowitz and Stegun, Handbook of Mathematical Functions, Table 25.4, n = 8.
    const NODES: [(f64, f64); 4] = [
        (0.183434642495650, 0.362683783378362),
        (0.525532409916329, 0.313706645877887),
        (0.796666477413627, 0.222381034453374),
        (0.960289856497536, 0.101228536290376),
    ];
    const PANELS: usize = 8;
    let half = 0.5 / PANELS as f64;
    let mut sum = 0.0;
    for panel in 0..PANELS {
        let middle = center - 0.5 + half * (2 * panel + 1) as f64;
        for (node, weight) in NODES {
            let (left, right) =
                (window::transform_at(middle - half * node), window::transform_at(middle + half * node));
            sum += weight * (left * left + right * right);
        }
    }
    sum * half
}
