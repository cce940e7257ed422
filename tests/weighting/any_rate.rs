//! Laws of the curves at any rate.

use crate::support::{CURVES, RATES_HZ, made};
use bandproof::design::weighting::{self, HELD_WITHIN_DB, WeightingError};
use bandproof::spec::Curve;
use proptest::prelude::*;

/// What a rate must come to: the bound, or a sentence.
fn hold_or_refuse(curve: Curve, rate_hz: f64, part: f64) {
    match weighting::sections(curve, rate_hz) {
        Ok(_) => {
            let made = made(curve, rate_hz);
            made.assert_minimum_phase();
            let deviation = weighting::deviation(curve, &made.sections, rate_hz);
            assert!(deviation.largest_db <= HELD_WITHIN_DB, "{curve:?} at {rate_hz} Hz: {deviation:?}");
            // No frequency is farther off than the deviation says; 1e-6 dB for a summit that
            // its grid may have cut.
            let hz = part * deviation.up_to_hz;
            let off_db = (made.gain_db(hz) - weighting::curve_db(curve, hz)).abs();
            assert!(off_db <= deviation.largest_db + 1e-6, "{curve:?} at {rate_hz} Hz, {hz} Hz: {off_db} dB");
            let at = weighting::anchor_hz(curve, rate_hz);
            // Half a unit in the last place of 2 in each of two polynomials a section, which near
            // z = 1 are of the size of (2 pi f / rate)^2, and ten units of the gain itself.
            let smallest = (2.0 * std::f64::consts::PI * at / rate_hz).powi(2).min(1.0);
            let within_db = 20.0 / std::f64::consts::LN_10 * 2f64.powi(-53) * (8.0 / smallest + 10.0);
            let off_db = (made.gain_db(at) - weighting::curve_db(curve, at)).abs();
            assert!(off_db < within_db, "{curve:?} at {rate_hz} Hz: {off_db} dB");
        }
        Err(error) => assert_refusal(&error),
    }
}

fn assert_refusal(error: &WeightingError) {
    let text = error.to_string();
    assert!(text.starts_with("curve ") && text.contains(" Hz; ") && text.contains("leave the stage out"), "{text}");
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    #[test]
    fn every_rate_holds_its_bound_or_is_refused(
        curve in prop::sample::select(CURVES.to_vec()),
        rate_hz in 1_000u32..=1_000_000,
        part in 1e-3..1.0,
    ) {
        hold_or_refuse(curve, f64::from(rate_hz), part);
    }

    #[test]
    fn so_does_any_other_number(
        curve in prop::sample::select(CURVES.to_vec()),
        rate_hz in prop_oneof![1u32..1_000, 1_000_000u32..100_000_000, Just(u32::MAX)],
        part in 1e-3..1.0,
    ) {
        hold_or_refuse(curve, f64::from(rate_hz), part);
    }
}

/// From 100 Hz to 50 MHz nothing is refused: 500 rates, evenly spread by their logarithm. The
/// farthest off is A near 1 kHz, by 0.0042 dB.
#[test]
fn no_rate_from_100_hz_to_50_mhz_is_refused() {
    for curve in CURVES {
        for i in 0..=500 {
            let rate_hz = (100.0 * 5e5f64.powf(f64::from(i) / 500.0)).round();
            let sections = weighting::sections(curve, rate_hz).unwrap();
            let deviation = weighting::deviation(curve, &sections, rate_hz);
            assert!(deviation.largest_db < 0.005, "{curve:?} at {rate_hz} Hz: {deviation:?}");
        }
    }
}

#[test]
fn a_rate_beyond_these_is_refused_with_both_ends() {
    for curve in CURVES {
        for rate_hz in [1.0, 99.0, 50_000_001.0, f64::from(u32::MAX), f64::NAN] {
            let error = weighting::sections(curve, rate_hz).unwrap_err();
            assert_refusal(&error);
            assert!(error.to_string().contains("from 100 to 50000000 Hz"), "{error}");
        }
    }
}

#[test]
fn usual_rates_are_of_minimum_phase() {
    for curve in CURVES {
        for rate_hz in RATES_HZ {
            made(curve, rate_hz).assert_minimum_phase();
        }
    }
}

/// Each section passes about as much as the whole, so none overloads what the next would
/// have taken down: at most 20 dB, which only riaa needs, towards 0 Hz.
#[test]
fn no_section_lifts_far_above_the_whole() {
    for curve in CURVES {
        for rate_hz in RATES_HZ {
            let made = made(curve, rate_hz);
            for i in 0..=1_000 {
                let hz = rate_hz / 2.0 * f64::from(i) / 1_000.0;
                for section in &made.sections {
                    let gain_db = bandproof::design::response::gain_db(&[*section], hz, rate_hz);
                    assert!(gain_db < 20.0, "{curve:?} at {rate_hz} Hz, {hz} Hz: {gain_db} dB");
                }
            }
        }
    }
}

/// The bits of one design, pinned: they may not depend on the machine. Made by this program.
#[test]
fn the_bits_are_the_same_on_every_machine() {
    let bits = |curve, rate_hz| -> Vec<u64> {
        let sections = made(curve, rate_hz).sections;
        sections.iter().flat_map(|section| section.b.iter().chain(&section.a[1..])).map(|c| c.to_bits()).collect()
    };
    let hash = |bits: Vec<u64>| {
        bits.iter()
            .flat_map(|bits| bits.to_le_bytes())
            .fold(0xcbf2_9ce4_8422_2325_u64, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3))
    };
    let got = [
        hash(bits(Curve::A, 44_100.0)),
        hash(bits(Curve::C, 11_025.0)),
        hash(bits(Curve::K, 16_000.0)),
        hash(bits(Curve::Riaa, 96_000.0)),
    ];
    let want = [0x1af8_7f7f_8d37_39d3, 0xe037_37ae_9281_4227, 0xe6e4_46ec_d697_297e, 0xf050_37d2_8e48_e7bc];
    assert_eq!(got, want, "{got:#x?}");
}
