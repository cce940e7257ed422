//! `scipy.signal.welch` and `csd` with the same window and segments
//! (values and versions in tests/reference/spectrum_welch.py).

use crate::support::spectra;
use bandproof::spectrum::SegmentPlan;
use serde::Deserialize;

#[derive(Deserialize)]
struct Reference {
    cases: Vec<Case>,
}

#[derive(Deserialize)]
struct Case {
    segment_frames: usize,
    segments: usize,
    sxx: Vec<f64>,
    syy: Vec<f64>,
    sxy_re: Vec<f64>,
    sxy_im: Vec<f64>,
}

/// The signals of the script: exact in both languages.
fn signals(frames: usize) -> (Vec<f64>, Vec<f64>) {
    let n = |f: fn(i64) -> i64| (0..frames as i64).map(move |n| f(n) as f64 / 1024.0);
    let before: Vec<f64> = n(|n| (7919 * n + 31 * n * n) % 1009 - 504).collect();
    let delayed = std::iter::once(0.0).chain(before.iter().copied());
    let other = n(|n| (104729 * n + 17 * n * n) % 997 - 498);
    let after = before.iter().zip(delayed).zip(other).map(|((b, d), o)| 0.5 * b - 0.25 * d + 0.125 * o).collect();
    (before, after)
}

/// Largest difference relative to the largest value.
fn worst(ours: impl Iterator<Item = f64>, theirs: &[f64], scale: f64) -> f64 {
    let ours: Vec<f64> = ours.collect();
    assert_eq!(ours.len(), theirs.len());
    ours.iter().zip(theirs).map(|(a, b)| (a - b).abs() / scale).fold(0.0, f64::max)
}

#[test]
fn power_and_cross_spectra_agree_with_scipy() {
    let reference: Reference = serde_json::from_str(include_str!("../reference/spectrum_welch.json")).unwrap();
    assert_eq!(reference.cases.len(), 3);
    for case in reference.cases {
        let length = case.segment_frames;
        let frames = length + (case.segments - 1) * length / 2;
        let (before, after) = signals(frames);
        let starts: Vec<u64> = (0..case.segments).map(|i| (i * length / 2) as u64).collect();
        assert_eq!(SegmentPlan::spread(length, 0..frames as u64).starts, starts);
        let got = spectra(length, &before, &after);
        assert_eq!(got.segments, case.segments);
        // Relative bin by bin: a bin of this noise is never far below its neighbors, and
        // rounding is 1e-16 of the largest.
        for (name, ours, theirs) in [("sxx", &got.sxx, &case.sxx), ("syy", &got.syy, &case.syy)] {
            for (k, (a, b)) in ours.iter().zip(theirs).enumerate() {
                assert!((a - b).abs() <= 1e-10 * b, "{name}[{k}] of L = {length}: {a} and {b}");
            }
            assert_eq!(ours.len(), theirs.len());
        }
        let scale = got.sxy.iter().map(|c| c.re.hypot(c.im)).fold(0.0, f64::max);
        assert!(worst(got.sxy.iter().map(|c| c.re), &case.sxy_re, scale) < 1e-12);
        assert!(worst(got.sxy.iter().map(|c| c.im), &case.sxy_im, scale) < 1e-12);
    }
}
