//! `guaranteed`, `depends` and `impossible`, and what is said about them.

use crate::common::{band, butterworth, checked, close, keep, notch, notch_edge_hz, reduce};
use bandproof::design::settling::startup_frames;
use bandproof::design::{Check, Design};
use bandproof::section::Section;
use bandproof::spec::{Band, Requirement};

const RATE_HZ: f64 = 48_000.0;

fn one(band: Band, sections: &[Section]) -> bandproof::design::BandDesign {
    checked(&[band], sections, RATE_HZ).remove(0)
}

fn sentences(bands: &[Band], sections: &[Section]) -> Vec<String> {
    let design = Design {
        passes: 1,
        rate_hz: 48_000,
        left_out: Vec::new(),
        stages: Vec::new(),
        sections: sections.to_vec(),
        max_pole_radius: 0.0,
        rounding_db: 0.0,
        rounding_at_hz: 0.0,
        settling_s: 0.0,
        settling_frames: 0,
        bands: checked(bands, sections, RATE_HZ),
    };
    design.impossible()
}

#[test]
fn a_reduction_is_guaranteed_as_far_as_the_notch_is_wide_and_depends_beyond() {
    let sections = [notch(1_000.0, 40.0, RATE_HZ)];
    let edge = |side| notch_edge_hz(1_000.0, 40.0, RATE_HZ, 20.0, side);
    let cases = [(0.0, Check::Guaranteed), (1e-3, Check::Guaranteed), (-1e-3, Check::Depends)];
    for (inward_hz, want) in cases {
        let (from_hz, to_hz) = (edge(-1.0) + inward_hz, edge(1.0) - inward_hz);
        let found = one(band("hum", from_hz, to_hz, reduce(20.0)), &sections);
        assert_eq!(found.check, Some(want), "{inward_hz} Hz inside");
        let reaches = found.reaches_hz.unwrap();
        close("reaches from", reaches.0, edge(-1.0), 1e-9 * 1_000.0);
        close("reaches to", reaches.1, edge(1.0), 1e-9 * 1_000.0);
    }
}

#[test]
fn a_band_beside_the_notch_is_impossible_at_its_deepest_point() {
    let sections = [notch(1_000.0, 40.0, RATE_HZ)];
    let from_hz = notch_edge_hz(1_000.0, 40.0, RATE_HZ, 6.0, 1.0);
    let bands = [band("hum", from_hz, 1_200.0, reduce(20.0))];
    let found = &checked(&bands, &sections, RATE_HZ)[0];
    assert_eq!((found.check, found.reaches_hz, found.startup_s), (Some(Check::Impossible), None, None));
    let violation = found.violation.unwrap();
    assert_eq!(violation.at_hz, from_hz);
    close("gain", violation.gain_db, -6.0, 1e-9);
    let sentence = &sentences(&bands, &sections)[0];
    for part in ["\"hum\"", "48000 Hz", "reduce_db = 20", "6 dB", "1011.65", "stop_db", "order"] {
        assert!(sentence.contains(part), "{part} in: {sentence}");
    }
}

#[test]
fn a_reach_ends_at_the_ends_of_the_frequency_axis() {
    let highpass = butterworth(4, 1_000.0, RATE_HZ, true);
    let found = one(band("rumble", 0.0, 100.0, reduce(20.0)), &highpass);
    assert_eq!((found.check, found.reaches_hz.unwrap().0), (Some(Check::Guaranteed), 0.0));
    // v^8 = 99 at 20 dB: see butterworth_db.
    let tangent = libm::tan(std::f64::consts::PI * 1_000.0 / RATE_HZ) / libm::pow(99.0, 0.125);
    close("to", found.reaches_hz.unwrap().1, libm::atan(tangent) * RATE_HZ / std::f64::consts::PI, 1e-6);
    let lowpass = butterworth(4, 1_000.0, RATE_HZ, false);
    let found = one(band("hiss", 10_000.0, 24_000.0, reduce(60.0)), &lowpass);
    assert_eq!((found.check, found.reaches_hz.unwrap().1), (Some(Check::Guaranteed), 24_000.0));
}

#[test]
fn of_several_zeros_in_a_band_the_one_nearest_the_center_is_its_deepest_point() {
    let sections = [notch(900.0, 10.0, RATE_HZ), notch(1_010.0, 10.0, RATE_HZ), notch(1_100.0, 10.0, RATE_HZ)];
    let found = one(band("x", 850.0, 1_150.0, reduce(40.0)), &sections);
    let (from_hz, to_hz) = found.reaches_hz.unwrap();
    assert!(from_hz < 1_010.0 && 1_010.0 < to_hz && to_hz - from_hz < 1.0);
}

#[test]
fn a_keep_band_is_judged_up_to_its_ends_with_nothing_for_rounding_to_spoil() {
    let sections = butterworth(4, 100.0, RATE_HZ, true);
    // 3 dB at the edge of any Butterworth filter: 10 log10 2.
    let three_db = 10.0 * libm::log10(2.0);
    let found = one(band("calls", 100.0, 20_000.0, keep(three_db, &[])), &sections);
    assert_eq!((found.check, found.violation), (Some(Check::Guaranteed), None));
    let bands = [band("calls", 100.0, 20_000.0, keep(3.0, &[]))];
    let violation = checked(&bands, &sections, RATE_HZ)[0].violation.unwrap();
    assert_eq!(violation.at_hz, 100.0);
    close("gain", violation.gain_db, -three_db, 1e-9);
    let sentence = &sentences(&bands, &sections)[0];
    for part in ["\"calls\"", "48000 Hz", "keep_db = 3 ", "-3.01 dB at 100 Hz", "raise keep_db", "except"] {
        assert!(sentence.contains(part), "{part} in: {sentence}");
    }
}

#[test]
fn a_gain_that_is_too_high_violates_a_keep_band_as_well() {
    let sections = [Section { b: [1.2, 0.0, 0.0], a: [1.0, 0.0, 0.0] }];
    let bands = [band("calls", 100.0, 200.0, keep(1.0, &[]))];
    close("gain", checked(&bands, &sections, RATE_HZ)[0].violation.unwrap().gain_db, 20.0 * libm::log10(1.2), 1e-12);
    let sentence = &sentences(&bands, &sections)[0];
    assert!(sentence.contains("1.584 dB") && !sentence.contains("except"), "{sentence}");
}

#[test]
fn the_identity_keeps_everything_and_reduces_nothing() {
    let bands = [
        band("hum", 49.0, 51.0, reduce(1.0)),
        band("calls", 0.0, 24_000.0, keep(0.001, &[])),
        band("whine", 15_000.0, 16_000.0, Requirement::Residual { residual_dbfs: -90.0 }),
        band("seen", 15_000.0, 16_000.0, Requirement::Observe),
    ];
    let found = checked(&bands, &[], RATE_HZ);
    let checks: Vec<_> = found.iter().map(|band| band.check).collect();
    assert_eq!(checks, [Some(Check::Impossible), Some(Check::Guaranteed), Some(Check::Depends), None]);
    for band in &found {
        assert_eq!((band.attenuation_min_db, band.attenuation_max_db), (0.0, 0.0));
    }
    let delays: Vec<_> = found.iter().map(|band| band.group_delay_s).collect();
    assert_eq!(delays, [None, Some(0.0), None, Some(0.0)]);
    let sentences = sentences(&bands, &[]);
    assert_eq!(sentences.len(), 1);
    assert!(sentences[0].contains("no stage"), "{}", sentences[0]);
}

#[test]
fn a_residual_band_says_where_the_response_alone_suffices() {
    let sections = [notch(1_000.0, 40.0, RATE_HZ)];
    let residual = Requirement::Residual { residual_dbfs: -30.0 };
    let found = one(band("whine", 950.0, 1_050.0, residual), &sections);
    assert_eq!(found.check, Some(Check::Depends));
    close("from", found.reaches_hz.unwrap().0, notch_edge_hz(1_000.0, 40.0, RATE_HZ, 30.0, -1.0), 1e-6);
    // A level above full scale asks for no attenuation.
    let residual = Requirement::Residual { residual_dbfs: 3.0 };
    assert_eq!(one(band("whine", 950.0, 1_050.0, residual), &sections).check, Some(Check::Depends));
}

#[test]
fn startup_and_shortest_length_are_those_of_the_band() {
    let sections = [notch(1_000.0, 40.0, RATE_HZ)];
    let bands = [band("hum", 998.0, 1_003.0, reduce(20.0)), band("seen", 10.0, 20.0, Requirement::Observe)];
    let placed = crate::common::placed(&bands);
    let found = bandproof::design::check::check(&placed, &sections, 1, RATE_HZ, 1.5);
    let frames = startup_frames(&sections, 1_000.5, RATE_HZ, 20.0).unwrap();
    assert_eq!(found[0].startup_s, Some(frames as f64 / RATE_HZ));
    assert_eq!((found[0].shortest_s, found[1].shortest_s), (Some(3.5), None));
}
