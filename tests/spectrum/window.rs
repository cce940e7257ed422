//! The window and its figures.

use bandproof::spectrum::{LeakageKernel, MAIN_LOBE_BINS, NOISE_BANDWIDTH_BINS, VARIANCE_BINS, leakage_kernel, window};

/// Transform of the sampled window at `x` bins, over L, by its definition.
fn sampled_transform(w: &[f64], x: f64) -> f64 {
    let (mut re, mut im) = (0.0, 0.0);
    let frames = w.len() as f64;
    for (n, w) in w.iter().enumerate() {
        let angle = std::f64::consts::TAU * x * n as f64 / frames;
        re += w * angle.cos();
        im -= w * angle.sin();
    }
    re.hypot(im) / frames
}

#[test]
fn means_match_sums_over_the_sampled_window() {
    for frames in [16, 100, 256, 4800] {
        let w = window::blackman_harris(frames);
        let mean = |p: i32| w.iter().map(|v| v.powi(p)).sum::<f64>() / frames as f64;
        assert!((mean(1) - window::COEFFICIENTS[0]).abs() < 1e-14);
        assert!((mean(2) - window::MEAN_SQUARE).abs() < 1e-14);
        assert!((mean(4) - window::MEAN_FOURTH).abs() < 1e-14);
    }
}

/// Figures of F. J. Harris, Proc. IEEE 66(1), 1978, Table I, to its digits: noise
/// bandwidth 2.00 bins, highest side lobe -92 dB, scalloping loss 0.83 dB, correlation of
/// half-overlapped segments 3.8 %, 3 dB width 1.90 bins.
#[test]
fn figures_are_those_of_the_table() {
    assert!((NOISE_BANDWIDTH_BINS - 2.00).abs() < 0.005);
    let peak = window::transform_at(0.0);
    let db = |x: f64| 20.0 * (window::transform_at(x).abs() / peak).log10();
    assert!((db(0.5) + 0.83).abs() < 0.005);
    assert!((db(0.95) + 3.0).abs() < 0.05);
    let side_lobe = (4000..64000).map(|i| db(f64::from(i) / 1000.0)).fold(f64::MIN, f64::max);
    assert!((side_lobe + 92.0).abs() < 0.05, "{side_lobe}");
    let w = window::blackman_harris(4000);
    let overlap: f64 = w.iter().zip(&w[2000..]).map(|(a, b)| a * b).sum::<f64>() / (4000.0 * window::MEAN_SQUARE);
    assert!((overlap - 0.038).abs() < 0.0005);
}

/// From the sampled window of 4800 values by numpy 2.4.6:
/// `4800*sum(w**2)/sum(w)**2` and `4800*sum(w**4)/sum(w**2)**2`.
#[test]
fn noise_bandwidth_and_variance_bins_to_more_digits() {
    assert!((NOISE_BANDWIDTH_BINS - 2.0043529382170537).abs() < 1e-14, "{NOISE_BANDWIDTH_BINS}");
    assert!((VARIANCE_BINS - 2.7632146887351845).abs() < 1e-13, "{VARIANCE_BINS}");
}

#[test]
fn the_window_is_periodic_and_symmetric() {
    for frames in [2, 6, 30, 256, 4800] {
        let w = window::blackman_harris(frames);
        assert_eq!(w.len(), frames);
        assert!((w[0] - 6e-5).abs() < 1e-16);
        assert!((w[frames / 2] - 1.0).abs() < 1e-15);
        assert!((1..frames).all(|n| w[n] == w[frames - n]));
    }
}

#[test]
fn the_analytic_transform_is_that_of_a_long_sampled_window() {
    let w = window::blackman_harris(20_000);
    for i in 0..1300 {
        let x = f64::from(i) * 0.05;
        let (exact, sampled) = (window::transform_at(x).abs(), sampled_transform(&w, x));
        // Aliases of the window's edge, 6e-5/L, and rounding of the sum.
        assert!((exact - sampled).abs() < 6e-5 / 20_000.0 * 1.1 + 1e-14, "{x}: {exact} and {sampled}");
    }
}

#[test]
fn zeros_of_the_transform_are_at_whole_bins_beyond_three() {
    assert!(window::transform_at(3.0).abs() > 0.005);
    for k in MAIN_LOBE_BINS..2000 {
        assert_eq!(window::transform_at(k as f64), 0.0);
    }
}

/// A midpoint sum over the transform, independent of the quadrature in use.
#[test]
fn the_kernel_is_the_power_over_one_bin() {
    let kernel = leakage_kernel();
    for k in 0..=LeakageKernel::REACH {
        let steps = 4000;
        let power: f64 = (0..steps)
            .map(|i| window::transform_at(k as f64 - 0.5 + (f64::from(i) + 0.5) / f64::from(steps)).powi(2))
            .sum();
        let expected = power / f64::from(steps) / window::MEAN_SQUARE;
        // The midpoint rule is good to (pi/4000)^2/6.
        assert!((kernel.share(k) / expected - 1.0).abs() < 1e-6, "{k}: {} and {expected}", kernel.share(k));
    }
}

#[test]
fn the_kernel_adds_up_to_one() {
    let kernel = leakage_kernel();
    let sum: f64 = kernel.within[0] + 2.0 * kernel.within[1..].iter().sum::<f64>();
    // What lies beyond: the edge's side lobes, (6e-5)^2/(2 pi^2 x^2) a bin on each side,
    // less what the inner lobes take from them, (1 - 471/x^2)^2, which is 0.92 on average.
    let beyond = 0.92 * 6e-5f64.powi(2) / (std::f64::consts::PI.powi(2) * 64.5 * window::MEAN_SQUARE);
    assert!((1.0 - sum - beyond).abs() < 0.02 * beyond, "{:e} and {beyond:e}", 1.0 - sum);
}

#[test]
fn the_kernel_bounds_what_sampled_windows_leak() {
    let kernel = leakage_kernel();
    for frames in [256usize, 480, 1000, 5000] {
        let w = window::blackman_harris(frames);
        for k in (0..=frames / 2).filter(|k| *k <= 70 || k % 7 == 0 || *k == frames / 2) {
            let steps = 64;
            let power: f64 = (0..steps)
                .map(|i| sampled_transform(&w, k as f64 - 0.5 + (f64::from(i) + 0.5) / f64::from(steps)).powi(2))
                .sum();
            let seen = power / f64::from(steps) / window::MEAN_SQUARE;
            // The documented excess over the limit of large L.
            let inverse_square = 1.0 / (frames * frames) as f64;
            let allowed = match k {
                0..=LeakageKernel::REACH => kernel.share(k) * (1.0 + 25000.0 * inverse_square) + 0.02 * inverse_square,
                _ => kernel.beyond,
            };
            assert!(seen < allowed, "L = {frames}, {k} bins: {seen:e} above {allowed:e}");
        }
    }
}
