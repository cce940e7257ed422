//! Laws of segment lengths and places.

use bandproof::spectrum::{
    MAX_SEGMENT_FRAMES, MIN_SEGMENT_FRAMES, SegmentPlan, TransformCache, band_bins, segment_frames,
};
use proptest::prelude::*;
use std::sync::Arc;

fn is_even_product(frames: usize) -> bool {
    let mut rest = frames;
    for p in [2usize, 3, 5] {
        while rest.is_multiple_of(p) {
            rest /= p;
        }
    }
    rest == 1 && frames.is_multiple_of(2)
}

proptest! {
    #[test]
    fn segments_cover_the_settled_part(half in 1u64..300_000, from in 0u64..1 << 40, slack in 0u64..20_000_000) {
        let frames = 2 * half;
        let settled = from..from + frames + slack;
        let plan = SegmentPlan::spread(frames as usize, settled.clone());
        prop_assert_eq!(plan.starts.first(), Some(&settled.start));
        prop_assert_eq!(plan.starts.last().map(|s| s + frames), Some(settled.end));
        for pair in plan.starts.windows(2) {
            prop_assert!(pair[0] < pair[1]);
            prop_assert!(pair[1] - pair[0] <= half, "overlap below one half: {:?}", pair);
        }
        // No more than the overlap asks for, and evenly spread.
        prop_assert_eq!(plan.starts.len() as u64, slack.div_ceil(half) + 1);
        let hops: Vec<u64> = plan.starts.windows(2).map(|p| p[1] - p[0]).collect();
        let (min, max) = (hops.iter().min(), hops.iter().max());
        prop_assert!(max.zip(min).is_none_or(|(max, min)| max - min <= 1));
    }

    #[test]
    fn nothing_is_spread_over_less_than_a_segment(half in 1u64..10_000, from in 0u64..1000, missing in 1u64..20_000) {
        let len = (2 * half).saturating_sub(missing);
        prop_assert!(SegmentPlan::spread(2 * half as usize, from..from + len).starts.is_empty());
    }

    #[test]
    fn lengths_are_even_products_and_resolve_the_narrowest_band(
        rate in prop::sample::select(vec![8000u32, 22050, 44100, 48000, 96000, 192_000, 250_000, 384_000]),
        width in 0.5f64..5000.0,
        center_share in 0.01f64..0.4,
        settled in 0u64..100_000_000,
    ) {
        let chosen = segment_frames(rate, Some(width), settled);
        if settled < MIN_SEGMENT_FRAMES as u64 {
            prop_assert_eq!(chosen, None);
            return Ok(());
        }
        let frames = chosen.unwrap();
        prop_assert!(is_even_product(frames));
        prop_assert!(frames as u64 <= settled);
        prop_assert!(frames >= MIN_SEGMENT_FRAMES);
        let wanted = (10.0 * f64::from(rate) / width).max(f64::from(rate)).ceil();
        prop_assert!(frames as f64 <= 1.1 * wanted);
        let center = center_share * f64::from(rate);
        let bins = band_bins(rate, frames, center - width / 2.0, center + width / 2.0);
        if settled as f64 >= 1.1 * wanted {
            prop_assert!(frames as f64 >= wanted);
            prop_assert!(center - width / 2.0 < 5.0 || bins.len() >= 10, "{:?}", bins);
        }
    }

    #[test]
    fn bins_of_neighboring_bands_meet_without_gap_or_overlap(
        half in 128usize..300_000, rate in 8000u32..400_000, a in 0.0f64..0.6, b in 0.0f64..0.6, c in 0.0f64..0.6,
    ) {
        let mut edges = [a, b, c].map(|e| e * f64::from(rate));
        edges.sort_by(f64::total_cmp);
        let [from, middle, to] = edges;
        let (low, high) = (band_bins(rate, 2 * half, from, middle), band_bins(rate, 2 * half, middle, to));
        prop_assert_eq!(low.end, high.start);
        for k in low.clone().chain(high.clone()).take(1000) {
            let hz = k as f64 * f64::from(rate) / (2 * half) as f64;
            prop_assert!(from <= hz && hz < to && k >= 5 && k <= half);
            prop_assert_eq!(low.contains(&k), hz < middle);
        }
    }
}

#[test]
fn a_length_that_the_recording_caps_is_rounded_down() {
    // 10 bins in 1 Hz at 48 kHz are 480000 frames.
    assert_eq!(segment_frames(48000, Some(1.0), 480_000), Some(480_000));
    assert_eq!(segment_frames(48000, Some(1.0), 479_999), Some(472_392));
    assert_eq!(segment_frames(48000, Some(1.0), 257), Some(256));
    assert_eq!(segment_frames(48000, Some(1.0), 255), None);
}

#[test]
fn cheap_lengths_are_preferred_to_the_first_that_fits() {
    // 497664 = 2^11 3^5 took 3.5 ns a frame, 491520 = 2^15 3 5 3.8, 480000 = 2^8 3 5^4 4.2.
    assert_eq!(segment_frames(48000, Some(1.0), u64::MAX), Some(497_664));
    assert_eq!(segment_frames(48000, Some(1.0), 495_000), Some(491_520));
    assert_eq!(segment_frames(48000, Some(1.0), 485_000), Some(480_000));
}

#[test]
fn without_a_narrow_band_bins_are_one_hertz_or_less() {
    for width in [None, Some(5910.0), Some(f64::INFINITY), Some(f64::NAN), Some(-1.0), Some(0.0)] {
        let frames = segment_frames(48000, width, 10_000_000).unwrap();
        assert!((48000..=52800).contains(&frames), "{width:?}: {frames}");
    }
    assert_eq!(segment_frames(0, None, 1000), None);
}

#[test]
fn a_width_beyond_all_memory_gets_the_longest_segment() {
    let frames = segment_frames(384_000, Some(1e-9), u64::MAX).unwrap();
    assert_eq!(frames, MAX_SEGMENT_FRAMES);
}

#[test]
fn a_settled_part_turned_around_holds_nothing() {
    #[expect(clippy::reversed_empty_ranges, reason = "the case under test")]
    let plan = SegmentPlan::spread(256, 1000..10);
    assert!(plan.starts.is_empty());
    assert!(SegmentPlan::spread(0, 0..1000).starts.is_empty());
    assert!(SegmentPlan::spread(1, 0..1000).starts.is_empty());
}

#[test]
fn a_cache_hands_out_one_transform_a_length() {
    let cache = TransformCache::new();
    let first = cache.get(480);
    assert!(Arc::ptr_eq(&first, &cache.get(480)));
    for frames in [500, 512, 540, 576] {
        assert_eq!(cache.get(frames).segment_frames(), frames);
    }
    // Four lengths later the first has fallen out; whoever holds it keeps it.
    assert!(!Arc::ptr_eq(&first, &cache.get(480)));
    assert_eq!(first.window().len(), 480);
}

#[test]
fn segments_that_share_their_frames_count_once() {
    let count = |slack: u64| SegmentPlan::spread(1000, 7..1007 + slack).independent_segments();
    assert_eq!(SegmentPlan::spread(1000, 7..900).independent_segments(), 0);
    assert_eq!(count(0), 1);
    // Two that differ by a few frames are one; half overlapped they are two.
    assert_eq!((count(1), count(30), count(250)), (1, 1, 1));
    assert_eq!(count(500), 2);
    // Three of which neighbors share nearly three quarters: 3/(1 + 2 * 2/3 * 0.21).
    assert_eq!(count(502), 2);
    assert_eq!(count(1000), 3);
    assert_eq!(count(100 * 500), 101);
}

#[test]
fn overlapping_windows_are_correlated_as_the_tables_say() {
    // Harris 1978, Table I, the -92 dB window: 46.0 % at 75 % overlap, 3.8 % at 50 %
    // (from memory).
    use bandproof::spectrum::window::overlap_correlation;
    assert!((overlap_correlation(0.25) - 0.460).abs() < 0.0005, "{}", overlap_correlation(0.25));
    assert!((overlap_correlation(0.5) - 0.038).abs() < 0.0005, "{}", overlap_correlation(0.5));
    assert!((overlap_correlation(0.0) - 1.0).abs() < 1e-9);
    assert_eq!(overlap_correlation(1.0), 0.0);
}
