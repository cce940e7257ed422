//! The 4-term Blackman-Harris window and its figures.
//!
//! F. J. Harris, "On the Use of Windows for Harmonic Analysis with the Discrete
//! Fourier Transform", Proc. IEEE 66(1), 1978, Table I: highest side lobe -92 dB,
//! noise bandwidth 2.00 bins, scalloping loss 0.83 dB. In its periodic form
//!
//! `w[n] = a0 - a1 cos(2 pi n/L) + a2 cos(4 pi n/L) - a3 cos(6 pi n/L)`
//!
//! it is a sum of seven DFT lines, so every mean below has a closed form that holds
//! for each L above the highest line involved.

/// `a0` to `a3` of the window, dimensionless (Harris 1978, the -92 dB set).
pub const COEFFICIENTS: [f64; 4] = [0.35875, 0.48829, 0.14128, 0.01168];

/// Half the width of the main lobe, in bins: the first zero of the window's
/// transform. A steady line shows in the bins less than this far from it.
pub const MAIN_LOBE_BINS: usize = 4;

/// The window as a Fourier series: `c[m + 3]` is the amplitude of
/// `exp(2 pi i m n / L)`, m from -3 to 3.
const LINES: [f64; 7] = {
    let a = COEFFICIENTS;
    [-a[3] / 2.0, a[2] / 2.0, -a[1] / 2.0, a[0], -a[1] / 2.0, a[2] / 2.0, -a[3] / 2.0]
};

/// Mean of w^2 over the window, dimensionless: 0.25796. `sum w^2 = L * MEAN_SQUARE`
/// for L of at least 7.
pub const MEAN_SQUARE: f64 = sum_of_squares(&LINES);

/// Mean of w^4 over the window, dimensionless, for L of at least 13.
pub const MEAN_FOURTH: f64 = sum_of_squares(&self_convolution(&LINES));

/// Equivalent noise bandwidth, `L sum w^2 / (sum w)^2`, in bins: 2.0044.
/// White noise shows in one bin as though it came from this many.
pub const NOISE_BANDWIDTH_BINS: f64 = MEAN_SQUARE / (COEFFICIENTS[0] * COEFFICIENTS[0]);

/// Bins that count as one independent value in a sum over bins of a noise
/// spectrum, `L sum w^4 / (sum w^2)^2`: 2.76. Neighboring bins of a windowed segment
/// are correlated; the variance of the mean over m bins of one segment is the
/// squared mean times this over m, for m well above the main lobe's width.
pub const VARIANCE_BINS: f64 = MEAN_FOURTH / (MEAN_SQUARE * MEAN_SQUARE);

/// The periodic window of `frames` values, dimensionless, 6e-5 at n = 0, 1 at n = L/2.
///
/// One cosine a value: those of the multiples of an angle stand in the same table.
pub fn blackman_harris(frames: usize) -> Vec<f64> {
    let [a0, a1, a2, a3] = COEFFICIENTS;
    let step = core::f64::consts::TAU / frames as f64;
    // Only the first half circle is computed, so the window is exactly symmetric.
    let half: Vec<f64> = (0..=frames / 2).map(|n| libm::cos(step * n as f64)).collect();
    let cosine = |n: usize| half[n.min(frames - n)];
    (0..frames).map(|n| a0 - a1 * cosine(n) + a2 * cosine((2 * n) % frames) - a3 * cosine((3 * n) % frames)).collect()
}

/// Transform of the window at `offset_bins` bins from a line, divided by L, in the
/// limit of large L, taken about the window's center so that it is real.
/// At 0 it is `a0`; beyond 4 bins it stays below -92 dB of that.
pub fn transform_at(offset_bins: f64) -> f64 {
    let x = offset_bins.abs();
    let [a0, a1, a2, a3] = COEFFICIENTS;
    if x < MAIN_LOBE_BINS as f64 {
        // Each cosine is a pair of lines; the signs of the series turn positive
        // when the window's center becomes the origin.
        let pair = |m: f64| sinc(x - m) + sinc(x + m);
        return a0 * sinc(x) + 0.5 * (a1 * pair(1.0) + a2 * pair(2.0) + a3 * pair(3.0));
    }
    // The same sum over a common factor: sinc(x - m) + sinc(x + m) is
    // 2 (-1)^m sinc(x) x^2/(x^2 - m^2), and x^2/(x^2 - m^2) = 1 + m^2/(x^2 - m^2).
    // So the large terms cancel once, exactly, not at every point.
    let square = x * x;
    let lines = a2 * 4.0 / (square - 4.0) - a1 / (square - 1.0) - a3 * 9.0 / (square - 9.0);
    sinc(x) * (EDGE + lines)
}

/// The window's value at n = 0, `a0 - a1 + a2 - a3`: the jump at a segment's ends
/// that the far side lobes come from.
pub(super) const EDGE: f64 = 6e-5;

/// `sin(pi x) / (pi x)`.
fn sinc(x: f64) -> f64 {
    if x == 0.0 {
        return 1.0;
    }
    // Reduced to the nearest integer first: the zeros stay exact far out.
    let nearest = libm::round(x);
    let sine = libm::sin(core::f64::consts::PI * (x - nearest));
    let sign = if libm::fmod(nearest, 2.0) == 0.0 { 1.0 } else { -1.0 };
    sign * sine / (core::f64::consts::PI * x)
}

const fn sum_of_squares<const N: usize>(values: &[f64; N]) -> f64 {
    let mut sum = 0.0;
    let mut i = 0;
    while i < N {
        sum += values[i] * values[i];
        i += 1;
    }
    sum
}

/// The Fourier series of w^2.
const fn self_convolution(values: &[f64; 7]) -> [f64; 13] {
    let mut out = [0.0; 13];
    let mut i = 0;
    while i < 7 {
        let mut j = 0;
        while j < 7 {
            out[i + j] += values[i] * values[j];
            j += 1;
        }
        i += 1;
    }
    out
}
/// Correlation of two windows `shift` segment lengths apart (0 to 1), 1 at no shift:
/// `sum w[n] w[n + shift L] / sum w[n]^2` for large L.
pub fn overlap_correlation(shift: f64) -> f64 {
    // The product is smooth and vanishes with the window's edges: the midpoint rule on
    // this many points is good to 1e-6.
    const POINTS: u32 = 512;
    let at = |place: f64| {
        let [a0, a1, a2, a3] = COEFFICIENTS;
        let turn = core::f64::consts::TAU * place;
        a0 - a1 * libm::cos(turn) + a2 * libm::cos(2.0 * turn) - a3 * libm::cos(3.0 * turn)
    };
    let common = (1.0 - shift).clamp(0.0, 1.0);
    let step = common / f64::from(POINTS);
    let sum: f64 = (0..POINTS)
        .map(|point| {
            let place = (f64::from(point) + 0.5) * step;
            at(place) * at(place + shift)
        })
        .sum();
    sum * step / MEAN_SQUARE
}
