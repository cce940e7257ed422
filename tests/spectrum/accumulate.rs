//! Sums over segments: unpacking, scaling, levels.

use crate::support::{level_dbfs, sine, spectra, white};
use bandproof::spectrum::{Accumulator, MAIN_LOBE_BINS, Transform, VARIANCE_BINS, band_bins, window};
use num_complex::Complex64;
use proptest::prelude::*;

/// The DFT by its definition, of the windowed signal.
fn naive(signal: &[f64], k: usize) -> Complex64 {
    let frames = signal.len();
    let w = window::blackman_harris(frames);
    (0..frames)
        .map(|n| {
            let angle = -std::f64::consts::TAU * ((k * n) % frames) as f64 / frames as f64;
            Complex64::new(angle.cos(), angle.sin()) * (w[n] * signal[n])
        })
        .sum()
}

#[test]
fn one_packed_transform_gives_both_spectra_and_their_product() {
    for frames in [2usize, 4, 6, 8, 10, 12, 16, 18, 20, 24, 30, 50, 96] {
        let (before, after) = (white(1, frames), white(2, frames));
        let got = spectra(frames, &before, &after);
        let sum_of_squares: f64 = frames as f64 * window::MEAN_SQUARE;
        let scale = got.sxx.iter().chain(&got.syy).fold(0.0, |a: f64, b| a.max(*b));
        for k in 0..=frames / 2 {
            let (x, y) = (naive(&before, k), naive(&after, k));
            let sides = if k == 0 || k == frames / 2 { 1.0 } else { 2.0 };
            let norm = sides / (frames as f64 * sum_of_squares);
            // Rounding of the naive sum: frames times 1e-16.
            let bound = 1e-13 * scale;
            assert!((got.sxx[k] - x.norm_sqr() * norm).abs() < bound, "L = {frames}, bin {k}");
            assert!((got.syy[k] - y.norm_sqr() * norm).abs() < bound, "L = {frames}, bin {k}");
            let cross = got.sxy[k] - x.conj() * y * norm;
            assert!(cross.norm_sqr().sqrt() < bound, "L = {frames}, bin {k}");
        }
    }
}

proptest! {
    /// Parseval: the bins add up to the windowed signal's mean square. (At most 40 dB
    /// between the two: the louder one's rounding, 1e-16, counts against the quieter.)
    #[test]
    fn bins_add_up_to_the_mean_square(half in 4usize..600, seed: u64, quiet_db in 0.0f64..40.0) {
        let frames = 2 * half;
        let gain = 10f64.powf(-quiet_db / 20.0);
        let before = white(seed, frames);
        let after: Vec<f64> = white(!seed, frames).iter().map(|v| v * gain).collect();
        let got = spectra(frames, &before, &after);
        let w = window::blackman_harris(frames);
        for (signal, spectrum) in [(&before, &got.sxx), (&after, &got.syy)] {
            let power = signal.iter().zip(&w).map(|(v, w)| (v * w).powi(2)).sum::<f64>();
            let expected = power / (frames as f64 * window::MEAN_SQUARE);
            prop_assert!((spectrum.iter().sum::<f64>() / expected - 1.0).abs() < 1e-12);
        }
    }

    /// A sine reads its level wherever it lies between bins, at any phase.
    #[test]
    fn a_sine_reads_its_level(bin in 20.0f64..480.0, level in -120.0f64..0.0, phase in 0.0f64..6.3) {
        let (rate, frames) = (48000.0, 1000);
        let signal = sine(level, bin * rate / frames as f64, rate, phase, 4 * frames);
        let got = spectra(frames, &signal, &signal);
        let lobe = (bin - MAIN_LOBE_BINS as f64).ceil() as usize..(bin + MAIN_LOBE_BINS as f64).floor() as usize + 1;
        // What the side lobes hold and what the negative frequency's add is below 1e-4.
        prop_assert!((level_dbfs(&got.sxx, lobe) - level).abs() < 0.001);
    }
}

#[test]
fn a_sine_at_and_between_bin_centers_reads_its_level() {
    for tenths in 0..=10 {
        let bin = 200.0 + f64::from(tenths) / 10.0;
        let signal = sine(-26.0, bin * 48.0, 48000.0, 0.3, 5000);
        let got = spectra(1000, &signal, &signal);
        let level = level_dbfs(&got.syy, 196..206);
        assert!((level + 26.0).abs() < 0.001, "{bin}: {level}");
    }
}

#[test]
fn white_noise_reads_its_power_whatever_the_band() {
    let (frames, segments) = (1000, 201);
    let noise: Vec<f64> = white(3, frames / 2 * (segments + 1)).iter().map(|v| v * 0.01).collect();
    let got = spectra(frames, &noise, &noise);
    for (from, to) in [(5, 500), (5, 50), (100, 120), (400, 500)] {
        let bins = (to - from) as f64;
        let ratio = got.sxx[from..to].iter().sum::<f64>() / (1e-4 * bins / 500.0);
        // Half-overlapped segments of this window are almost independent (3.8 %
        // correlation, F. J. Harris 1978). Four standard errors.
        let error = (VARIANCE_BINS / (bins * segments as f64)).sqrt();
        assert!((ratio - 1.0).abs() < 4.0 * error, "bins {from} to {to}: {ratio}, error {error}");
    }
}

/// Mean and spread of band powers of many independent segments of white noise.
#[test]
fn the_scatter_of_a_band_of_noise_is_what_variance_bins_says() {
    let (frames, count) = (1000, 2000);
    let noise = white(11, frames * count);
    let transform = Transform::new(frames);
    let powers: Vec<f64> = noise
        .chunks(frames)
        .map(|segment| {
            let mut sums = Accumulator::new(transform.clone(), Vec::new());
            sums.add(segment, segment);
            sums.finish().sxx[100..400].iter().sum()
        })
        .collect();
    let mean = powers.iter().sum::<f64>() / count as f64;
    let variance = powers.iter().map(|p| (p - mean).powi(2)).sum::<f64>() / (count - 1) as f64;
    let seen = variance / (mean * mean) * 300.0;
    // A variance from 2000 values has a standard error of sqrt(2/2000) = 3.2 %; four of them.
    assert!((seen / VARIANCE_BINS - 1.0).abs() < 0.13, "{seen}");
}

#[test]
fn a_loud_signal_before_does_not_show_in_a_quiet_one_after() {
    let frames = 48000;
    let loud = sine(0.0, 1000.3, 48000.0, 0.0, frames);
    let got = spectra(frames, &loud, &vec![0.0; frames]);
    let total: f64 = got.sxx.iter().sum();
    // The floor the evidence counts on is -280 dB of the segment's power, for all bins together.
    let leaked: f64 = got.syy.iter().sum();
    assert!(leaked < 1e-29 * total, "{:.1} dB", 10.0 * (leaked / total).log10());
    let got = spectra(frames, &vec![0.0; frames], &loud);
    assert!(got.sxx.iter().sum::<f64>() < 1e-29 * total);
    // And a quiet line beside it keeps its level.
    let quiet = sine(-200.0, 7000.0, 48000.0, 0.0, frames);
    let got = spectra(frames, &loud, &quiet);
    assert!((level_dbfs(&got.syy, 6990..7011) + 200.0).abs() < 0.001);
}

#[test]
fn an_offset_stays_below_the_first_band_bin() {
    let got = spectra(4800, &vec![0.5; 9600], &vec![0.5; 9600]);
    let total: f64 = got.sxx.iter().sum();
    assert!((total - 0.25).abs() < 1e-12);
    assert!(got.sxx[4..].iter().all(|p| *p < 1e-28 * total));
}

#[test]
fn equal_signals_have_equal_spectra_bit_for_bit() {
    let noise = white(5, 5000);
    let got = spectra(1000, &noise, &noise);
    // Before and after enter the packed transform as real and imaginary parts, so equal
    // signals differ by rounding only.
    for k in 0..=500 {
        assert!((got.sxx[k] - got.syy[k]).abs() <= 1e-12 * got.sxx[k]);
        assert!((got.sxy[k].re - got.sxx[k]).abs() <= 1e-12 * got.sxx[k]);
    }
}

#[test]
fn the_cross_spectrum_is_kept_for_the_bins_asked_for() {
    let (before, after) = (white(7, 256), white(8, 256));
    let all = spectra(256, &before, &after);
    let mut sums = Accumulator::new(Transform::new(256), vec![0..2, 10..13, 20..20, 120..500]);
    sums.add(&before, &after);
    let some = sums.finish();
    assert_eq!(some.cross_bins, [0..2, 10..13, 120..129]);
    let expected: Vec<_> = some.cross_bins.iter().flat_map(|r| all.sxy[r.clone()].to_vec()).collect();
    assert_eq!(some.sxy, expected);
}

#[test]
fn what_a_transform_did_before_leaves_no_trace() {
    let transform = Transform::new(480);
    let (a, b) = (white(1, 480), white(2, 480));
    let fresh = |before: &[f64], after: &[f64]| {
        let mut sums = Accumulator::new(transform.clone(), vec![5..50, 60..100]);
        sums.add(before, after);
        sums.finish()
    };
    let (first, second) = (fresh(&a, &b), fresh(&b, &a));
    let mut both = Accumulator::new(transform.clone(), vec![5..50, 60..100]);
    both.add(&a, &b);
    both.add(&b, &a);
    let both = both.finish();
    assert_eq!(both.segments, 2);
    for k in 0..=240 {
        let mean = (first.sxx[k] + second.sxx[k]) / 2.0;
        assert!((both.sxx[k] - mean).abs() <= 1e-15 * mean);
    }
}

#[test]
fn no_segment_gives_zeros_not_nan() {
    let got = Accumulator::new(Transform::new(256), Vec::new()).finish();
    assert_eq!((got.segments, got.sxx, got.syy), (0, vec![0.0; 129], vec![0.0; 129]));
}

#[test]
fn accumulators_move_between_threads_and_transforms_are_shared() {
    fn check<T: Send + Sync>() {}
    check::<Accumulator>();
    check::<Transform>();
}

#[test]
fn a_band_owns_its_bins_half_open() {
    // 0.1 Hz bins.
    assert_eq!(band_bins(48000, 480_000, 49.5, 50.5), 495..505);
    assert_eq!(band_bins(48000, 480_000, 49.49, 50.51), 495..506);
    // Bins 0 to 4 belong to no band.
    assert_eq!(band_bins(48000, 480_000, 0.0, 1.0), 5..10);
    assert_eq!(band_bins(48000, 480_000, 0.0, 0.3), 5..5);
    // Up to half the rate, without its bin; above it, with it and nothing more.
    assert_eq!(band_bins(48000, 1000, 20000.0, 24000.0), 417..500);
    assert_eq!(band_bins(48000, 1000, 20000.0, 1e9), 417..501);
    assert_eq!(band_bins(48000, 1000, 30000.0, 40000.0), 501..501);
    // Nonsense gives nothing.
    assert!(band_bins(48000, 1000, 200.0, 100.0).is_empty());
    assert!(band_bins(48000, 1000, f64::NAN, f64::NAN).is_empty());
    assert!(band_bins(0, 0, 100.0, 200.0).is_empty());
}
