//! The dither is the documented function, and has the statistics that make rounding
//! harmless: S. P. Lipshitz, R. A. Wannamaker, J. Vanderkooy, "Quantization and
//! dither: a theoretical survey", J. Audio Eng. Soc. 40 (5), 1992: with triangular
//! dither of two steps peak to peak, mean and variance of the total error are 0 and
//! step^2/4 whatever the signal.
//!
//! The values are fixed, so these tests give the same result every time; bounds are
//! five (where thousands of values are tried, six) standard errors of a true random
//! sequence of that length.

use bandproof::output::{DITHER_NAME, Output, OutputPlan, triangular};
use bandproof::wave::{Encoding, SampleFormat};
use rustfft::FftPlanner;
use rustfft::num_complex::Complex;

const N: usize = 1 << 20;

fn sequence(channel: usize, from: u64, count: usize) -> Vec<f64> {
    (0..count as u64).map(|k| triangular(channel, from + k)).collect()
}

fn mean(values: impl Iterator<Item = f64>, count: usize) -> f64 {
    values.sum::<f64>() / count as f64
}

#[test]
fn the_function_is_the_documented_one() {
    // Made by triangular_1.py, from the documentation alone.
    let table = include_str!("../reference/triangular_1.csv");
    let mut rows = 0;
    for row in table.lines().skip(1) {
        let fields: Vec<i64> = row.split(',').map(|f| f.parse().unwrap()).collect();
        let value = triangular(fields[0] as usize, fields[1] as u64);
        assert_eq!(value, fields[2] as f64 / 4_294_967_296.0, "{row}");
        rows += 1;
    }
    assert_eq!(rows, 40);
    assert_eq!(DITHER_NAME, "triangular-1");
}

#[test]
fn shaping_silence_adds_exactly_the_documented_function() {
    // Silence plus dither, rounded: what `triangular` gives, by frame and channel.
    let format = SampleFormat::full(Encoding::Pcm24);
    let mut output = Output::new(OutputPlan { format, dither: true, gain: 1.0, identity: false }, 3);
    let mut planes = vec![vec![0.0; 5000]; 3];
    output.shape(&mut planes);
    for (channel, plane) in planes.iter().enumerate() {
        for (frame, &value) in plane.iter().enumerate() {
            assert_eq!(value, triangular(channel, frame as u64).round_ties_even() * format.step());
        }
    }
}

#[test]
fn values_are_triangular_with_mean_0_and_variance_one_sixth() {
    let values = sequence(0, 0, N);
    assert!(values.iter().all(|v| v.abs() < 1.0));
    // Sum of two uniforms of width 1: variance 1/6, fourth moment 3/36 - 2/120 = 1/15.
    let n = N as f64;
    assert!(mean(values.iter().copied(), N).abs() < 5.0 * (1.0 / 6.0 / n).sqrt());
    let variance = mean(values.iter().map(|v| v * v), N);
    assert!((variance - 1.0 / 6.0).abs() < 5.0 * ((1.0 / 15.0 - 1.0 / 36.0) / n).sqrt(), "{variance}");
    // Counts in 64 classes against the triangle, chi square with 63 degrees of freedom
    // (mean 63, variance 126).
    let mut counts = [0.0f64; 64];
    for v in &values {
        counts[((v + 1.0) * 32.0) as usize] += 1.0;
    }
    let below = |x: f64| if x < 0.0 { (1.0 + x) * (1.0 + x) / 2.0 } else { 1.0 - (1.0 - x) * (1.0 - x) / 2.0 };
    let chi_square: f64 = (0..64)
        .map(|k| {
            let from = f64::from(k) / 32.0 - 1.0;
            let expected = (below(from + 1.0 / 32.0) - below(from)) * n;
            (counts[k as usize] - expected) * (counts[k as usize] - expected) / expected
        })
        .sum();
    assert!((chi_square - 63.0).abs() < 5.0 * 126.0f64.sqrt(), "{chi_square}");
}

#[test]
fn values_are_spectrally_white() {
    // Averaged power of 1024-frame segments; per bin exponential, so its standard
    // error is the mean over the root of the number of segments.
    let fft = FftPlanner::new().plan_fft_forward(1024);
    for channel in [0, 1] {
        let values = sequence(channel, 0, N);
        let mut power = vec![0.0; 512];
        for segment in values.chunks_exact(1024) {
            let mut buffer: Vec<Complex<f64>> = segment.iter().map(|&v| Complex::new(v, 0.0)).collect();
            fft.process(&mut buffer);
            for (sum, bin) in power.iter_mut().zip(&buffer) {
                *sum += bin.norm_sqr() / 1024.0;
            }
        }
        let segments = N as f64 / 1024.0;
        for (bin, sum) in power.iter().enumerate().skip(1) {
            let relative = sum / segments / (1.0 / 6.0);
            assert!((relative - 1.0).abs() < 6.0 / segments.sqrt(), "bin {bin}: {relative}");
        }
    }
}

#[test]
fn neighbors_channels_and_squares_are_uncorrelated() {
    let covariance = |a: &[f64], b: &[f64], center: f64| {
        mean(a.iter().zip(b).map(|(x, y)| (x - center) * (y - center)), a.len().min(b.len()))
    };
    let square = |v: &[f64]| v.iter().map(|x| x * x).collect::<Vec<_>>();
    let (left, right) = (sequence(0, 0, N), sequence(1, 0, N));
    let (left_squared, right_squared) = (square(&left), square(&right));
    // Standard errors: variance over the root of the count.
    let bound = 6.0 * (1.0 / 6.0) / (N as f64).sqrt();
    let bound_squared = 6.0 * (1.0 / 15.0 - 1.0 / 36.0) / (N as f64).sqrt();
    for lag in 0..64 {
        let until = N - lag;
        if lag > 0 {
            assert!(covariance(&left[..until], &left[lag..], 0.0).abs() < bound, "lag {lag}");
            let own = covariance(&left_squared[..until], &left_squared[lag..], 1.0 / 6.0);
            assert!(own.abs() < bound_squared, "squares, lag {lag}: {own}");
        }
        assert!(covariance(&left[..until], &right[lag..], 0.0).abs() < bound, "channels, lag {lag}");
        assert!(covariance(&right[..until], &left[lag..], 0.0).abs() < bound, "channels, lag -{lag}");
        let cross = covariance(&left_squared[..until], &right_squared[lag..], 1.0 / 6.0);
        assert!(cross.abs() < bound_squared, "squares of channels, lag {lag}: {cross}");
    }
}

#[test]
fn total_error_has_mean_0_and_variance_a_quarter_step_whatever_the_signal() {
    // The fourth moment, which sets the standard error of the variance, does depend on
    // the signal. It is largest in silence, where the error is -1, 0, 1 steps with
    // probabilities 1/8, 3/4, 1/8: 1/4. So the square varies by at most 1/4 - 1/16.
    let format = SampleFormat::full(Encoding::Pcm16);
    let step = format.step();
    let count = 1 << 18;
    type Signal = (&'static str, fn(usize) -> f64);
    let signals: [Signal; 9] = [
        ("silence", |_| 0.0),
        ("an eighth", |_| 0.125),
        ("a quarter", |_| 0.25),
        ("a third", |_| 1.0 / 3.0),
        ("half", |_| 0.5),
        ("three quarters", |_| 0.75),
        ("ramp", |k| k as f64 * 1e-4),
        ("square", |k| if k % 100 < 50 { 0.4 } else { -0.3 }),
        ("loud", |k| 20_000.0 * libm::sin(k as f64 * 0.01)),
    ];
    for (name, signal) in signals {
        let mut output = Output::new(OutputPlan { format, dither: true, gain: 1.0, identity: false }, 1);
        let exact: Vec<f64> = (0..count).map(signal).collect();
        let mut planes = [exact.iter().map(|x| x * step).collect::<Vec<_>>()];
        output.shape(&mut planes);
        let error = || planes[0].iter().zip(&exact).map(|(y, x)| y / step - x);
        let n = count as f64;
        let bias = mean(error(), count);
        assert!(bias.abs() < 5.0 * 0.5 / n.sqrt(), "{name}: mean {bias}");
        let variance = mean(error().map(|e| e * e), count);
        let bound = 5.0 * (1.0 / 4.0 - 1.0 / 16.0f64).sqrt() / n.sqrt();
        assert!((variance - 0.25).abs() < bound, "{name}: variance {variance}");
        // What is reported is what is there.
        let reported = output.figures().rounding_power[0] / (step * step);
        assert!((reported - 0.25).abs() < 1e-15, "{name}: {reported}");
    }
}

#[test]
fn without_dither_a_quiet_signal_would_vanish_and_with_it_its_mean_survives() {
    // The reason for all of it: a third of a step.
    let format = SampleFormat::full(Encoding::Pcm16);
    let shaped = |dither| {
        let mut planes = [vec![format.step() / 3.0; 100_000]];
        Output::new(OutputPlan { format, dither, gain: 1.0, identity: false }, 1).shape(&mut planes);
        mean(planes[0].iter().map(|x| x / format.step()), 100_000)
    };
    assert_eq!(shaped(false), 0.0);
    assert!((shaped(true) - 1.0 / 3.0).abs() < 5.0 * 0.5 / 100_000.0f64.sqrt());
}
