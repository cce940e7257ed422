//! No frequency of a band is beyond the extremes that the design check gives it.

use crate::common::{band, butterworth, butterworth_db, checked, close, notch, notch_edge_hz, reduce};
use bandproof::design::extrema::Profile;
use bandproof::design::response;
use bandproof::section::Section;
use bandproof::spec::Requirement;
use proptest::prelude::*;
use std::f64::consts::{PI, TAU};

#[test]
fn a_notch_has_its_extremes_at_its_center_and_at_the_farther_end() {
    for (center_hz, width_hz, rate_hz) in [(50.0, 1.0, 48_000.0), (50.0, 0.1, 384_000.0), (15_800.0, 263.0, 44_100.0)] {
        let sections = [notch(center_hz, width_hz, rate_hz)];
        let from_hz = notch_edge_hz(center_hz, width_hz, rate_hz, 20.0, -1.0);
        let to_hz = notch_edge_hz(center_hz, width_hz, rate_hz, 12.0, 1.0);
        let found = &checked(&[band("x", from_hz, to_hz, reduce(10.0))], &sections, rate_hz)[0];
        // The cosine of the center rounds by some 4e-16, here and in the section: that
        // shifts the notch by 4e-16/w0 against an end that lies u = t/sqrt(10^1.2 - 1) off.
        let (w0, t) = (TAU * center_hz / rate_hz, libm::tan(PI * width_hz / rate_hz));
        let shift = 4e-16 / libm::sin(w0) / (t / libm::sqrt(libm::pow(10.0, 1.2) - 1.0));
        close("at the farther end", found.attenuation_min_db, 12.0, 8.7 * shift);
        assert_eq!(found.attenuation_max_db, 180.0, "{center_hz} Hz at {rate_hz} Hz");
    }
}

#[test]
fn a_butterworth_filter_has_its_extremes_at_the_ends() {
    for (order, highpass) in [(2, false), (4, true), (8, false), (12, true)] {
        let sections = butterworth(order, 1_000.0, 8_000.0, highpass);
        let found = &checked(&[band("x", 200.0, 3_000.0, Requirement::Observe)], &sections, 8_000.0)[0];
        let ends = [200.0, 3_000.0].map(|hz| butterworth_db(order, 1_000.0, 8_000.0, highpass, hz));
        close("least", found.attenuation_min_db, ends[0].min(ends[1]), 1e-10);
        close("largest", found.attenuation_max_db, ends[0].max(ends[1]).min(180.0), 1e-10);
    }
}

#[test]
fn the_ends_may_be_zero_and_half_the_rate() {
    let sections = butterworth(4, 1_000.0, 8_000.0, true);
    let found = &checked(&[band("all", 0.0, 4_000.0, Requirement::Observe)], &sections, 8_000.0)[0];
    assert_eq!(found.attenuation_max_db, 180.0);
    close("least", found.attenuation_min_db, 0.0, 1e-12);
    let sections = butterworth(4, 1_000.0, 8_000.0, false);
    let found = &checked(&[band("all", 0.0, 4_000.0, Requirement::Observe)], &sections, 8_000.0)[0];
    assert_eq!(found.attenuation_max_db, 180.0);
}

#[test]
fn a_resonance_narrower_than_any_even_grid_is_found() {
    // Radius 1 - 1e-8: 0.08 mHz wide at 48 kHz, in a band of 20 kHz.
    let (radius, w0) = (1.0 - 1e-8, 1.234_567);
    let sections = [Section { b: [1e-8, 0.0, -1e-8], a: [1.0, -2.0 * radius * libm::cos(w0), radius * radius] }];
    let found = &checked(&[band("x", 100.0, 20_000.0, Requirement::Observe)], &sections, 48_000.0)[0];
    // At resonance |A| = (1 - r) |1 - r e^(-2jw0)|, |B| = 1e-8 * 2 sin w0: gain 1; a2
    // rounds by 1e-16 of a 1 - r of 1e-8.
    close("at resonance", found.attenuation_min_db, 0.0, 1e-6);
}

#[test]
fn a_zero_nearer_to_its_own_image_than_to_anything_else_is_found() {
    // Zeros at +-0.17 Hz and, mirrored, as near to half the rate of 10 kHz.
    for sign in [-1.0, 1.0] {
        let sections = [Section { b: [1.0, sign * 1.999_999_988_7, 1.0], a: [1.0, 0.2, 0.04] }];
        let found = &checked(&[band("x", 0.0, 5_000.0, Requirement::Observe)], &sections, 10_000.0)[0];
        assert_eq!(found.attenuation_max_db, 180.0);
    }
}

#[test]
fn a_resonance_nearer_to_its_own_image_than_to_anything_else_is_found() {
    // Poles at +-0.17 Hz, 16 uHz inside the unit circle, and as near to half the rate.
    let (radius, angle) = (1.0 - 1e-8, 1.06e-4);
    for sign in [-1.0, 1.0] {
        let a = [1.0, sign * 2.0 * radius * libm::cos(angle), radius * radius];
        let sections = [Section { b: [1e-12, 0.0, 0.0], a }];
        let found = &checked(&[band("x", 0.0, 5_000.0, Requirement::Observe)], &sections, 10_000.0)[0];
        let at_hz = if sign < 0.0 { angle / TAU * 10_000.0 } else { 5_000.0 - angle / TAU * 10_000.0 };
        let peak_db = response::gain_db(&sections, at_hz, 10_000.0);
        // Rounding moves the poles by 1e-16/angle, a ten thousandth of the width.
        assert!(peak_db > response::gain_db(&sections, if sign < 0.0 { 0.0 } else { 5_000.0 }, 10_000.0) + 40.0);
        assert!(-found.attenuation_min_db >= peak_db, "{} for {peak_db}", -found.attenuation_min_db);
    }
}

/// A section from a pole pair and a zero pair, each as (1 - radius, angle).
fn section((pole_depth, pole_angle): (f64, f64), (zero_depth, zero_angle): (f64, f64)) -> Section {
    let polynomial = |depth: f64, angle: f64| {
        let radius = 1.0 - depth;
        [1.0, -2.0 * radius * libm::cos(angle), radius * radius]
    };
    Section { b: polynomial(zero_depth, zero_angle), a: polynomial(pole_depth, pole_angle) }
}

/// Sections with poles from far inside the unit circle to 1e-6 of it, zeros on,
/// inside or outside it, many close to the pole of the same section.
fn any_section() -> impl Strategy<Value = Section> {
    let angle = || prop_oneof![4 => 0.0..PI, 1 => 0.0..0.05, 1 => Just(0.0), 1 => Just(PI)];
    let depth = || (-6.0..-0.1).prop_map(|log: f64| libm::exp10(log));
    let zero =
        prop_oneof![Just(None), (prop_oneof![Just(0.0), depth(), depth().prop_map(|d| -d)], angle()).prop_map(Some)];
    let beside = (prop_oneof![Just(0.0), depth(), depth().prop_map(|d| -d)], -5.0..5.0);
    (depth(), angle(), zero, beside).prop_map(|(depth, angle, zero, (beside_depth, widths))| {
        let beside: (f64, f64) = (beside_depth, f64::clamp(angle + widths * depth, 0.0, PI));
        let zero = zero.unwrap_or(beside);
        section((depth, angle), zero)
    })
}

/// Far more places than the search looks at: an even grid, and for each landmark
/// ladders that close in on it, 60 rungs a decade.
fn brute_force_hz(sections: &[Section], rate_hz: f64) -> Vec<f64> {
    let mut places: Vec<f64> = (0..=4_000).map(|k| rate_hz / 2.0 * f64::from(k) / 4_000.0).collect();
    for section in sections {
        for p in [section.a, section.b] {
            let cosine = (-p[1] / (2.0 * libm::sqrt(p[2]))).clamp(-1.0, 1.0);
            let hz = libm::acos(cosine) * rate_hz / TAU;
            places.push(hz);
            for rung in 0..480 {
                let distance = rate_hz * libm::exp10(-8.0 + f64::from(rung) / 60.0);
                places.extend([hz - distance, hz + distance]);
            }
        }
    }
    places.retain(|hz| (0.0..=rate_hz / 2.0).contains(hz));
    places
}

/// What two turning points within one grid step may hide, dB. Over 20000 random
/// cascades of this kind nothing was hidden above 1e-8.
const HIDDEN_DB: f64 = 1e-6;

proptest! {
    #![proptest_config(ProptestConfig::with_cases(100))]

    #[test]
    fn no_frequency_tried_by_brute_force_is_beyond_the_extremes(
        sections in prop::collection::vec(any_section(), 1..8),
        ends in (0.0..1.0, 0.0..1.0),
    ) {
        let rate_hz = 10_000.0;
        let (from_hz, to_hz) = (5_000.0 * f64::min(ends.0, ends.1), 5_000.0 * f64::max(ends.0, ends.1) + 1e-3);
        let to_hz = to_hz.min(5_000.0);
        let found = &checked(&[band("x", from_hz, to_hz, Requirement::Observe)], &sections, rate_hz)[0];
        for hz in brute_force_hz(&sections, rate_hz).into_iter().filter(|hz| (from_hz..=to_hz).contains(hz)) {
            let db = (-response::gain_db(&sections, hz, rate_hz)).clamp(-180.0, 180.0);
            prop_assert!(db >= found.attenuation_min_db - HIDDEN_DB, "{} dB at {} Hz, least {}", db, hz, found.attenuation_min_db);
            prop_assert!(db <= found.attenuation_max_db + HIDDEN_DB, "{} dB at {} Hz, largest {}", db, hz, found.attenuation_max_db);
        }
    }

    #[test]
    fn between_neighboring_points_of_the_chain_the_gain_is_between_theirs(
        sections in prop::collection::vec(any_section(), 1..6),
    ) {
        let rate_hz = 10_000.0;
        let profile = Profile::new(&sections, rate_hz, &[]);
        let points = profile.points();
        prop_assert_eq!((points[0].hz, points[points.len() - 1].hz), (0.0, 5_000.0));
        for two in points.windows(2) {
            let (low, high) = (two[0].gain_db.min(two[1].gain_db), two[0].gain_db.max(two[1].gain_db));
            for part in [0.25, 0.5, 0.75] {
                let db = profile.gain_db(two[0].hz + part * (two[1].hz - two[0].hz));
                // At depths beyond the cap it is all rounding.
                prop_assert!(db < -180.0 || (low - HIDDEN_DB..=high + HIDDEN_DB).contains(&db), "{:?}: {} dB between", two, db);
            }
        }
    }
}
