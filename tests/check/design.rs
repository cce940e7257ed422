//! From spec to design in one go.

use crate::common::{band, close, keep, reduce};
use bandproof::design::{Check, DesignError, design};
use bandproof::spec::{
    Band, BeyondHalfRate, Dither, Extent, Family, FilterKind, FilterStage, NotchStage, Order, OutputEncoding,
    OutputSpec, Overload, Phase, Placement, Requirement, Row, Spec, Stage, Width,
};

const OUTPUT: OutputSpec = OutputSpec {
    encoding: OutputEncoding::Same,
    dither: Dither::Triangular,
    overload: Overload::Refuse,
    gain_db: 0.0,
    history: false,
};

/// Rumble, hum and whine of a pumping station.
fn pumping_station() -> Spec {
    let highpass = FilterStage {
        kind: FilterKind::Highpass,
        family: Family::Butterworth,
        order: Order::Given(4),
        placement: Placement::Edge { edge_hz: 40.0 },
        ripple_db: None,
        stop_db: None,
    };
    let row = |width_hz| Row { center_hz: 50.0, width: Width::Hz(width_hz), harmonics: 8 };
    let stops = FilterStage {
        kind: FilterKind::Bandstop,
        family: Family::Elliptic,
        order: Order::Given(3),
        placement: Placement::Row(row(3.2)),
        ripple_db: Some(0.1),
        stop_db: Some(40.0),
    };
    let notch = NotchStage { row: Row { center_hz: 15_800.0, width: Width::Q(60.0), harmonics: 1 } };
    Spec {
        phase: Phase::Causal,
        auto: None,
        reference_band: None,
        rate: None,
        title: None,
        beyond_half_rate: BeyondHalfRate::LeaveOut,
        output: OUTPUT,
        stages: vec![Stage::Filter(highpass), Stage::Filter(stops), Stage::Notch(notch)],
        bands: vec![
            Band { name: "pump hum".to_owned(), extent: Extent::Row(row(1.0)), requirement: reduce(30.0) },
            band("bird calls", 90.0, 6_000.0, keep(0.5, &["pump hum"])),
            band("converter whine", 15_750.0, 15_850.0, Requirement::Residual { residual_dbfs: -90.0 }),
        ],
    }
}

#[test]
fn the_pumping_station_is_guaranteed_at_every_rate_and_settles_in_the_same_time() {
    for rate_hz in [44_100, 48_000, 96_000, 384_000] {
        let design = design(&pumping_station(), rate_hz).unwrap();
        assert_eq!((design.sections.len(), design.stages.len(), design.bands.len()), (27, 10, 10));
        assert!(design.left_out.is_empty() && design.impossible().is_empty());
        for (k, band) in design.bands[..8].iter().enumerate() {
            assert_eq!(band.check, Some(Check::Guaranteed), "line {} at {rate_hz} Hz", k + 1);
            assert!((31.8..33.5).contains(&band.attenuation_min_db), "line {}: {band:?}", k + 1);
            // What the bilinear transform bends at 400 Hz is 0.03 % at 44.1 kHz.
            close("startup, s", band.startup_s.unwrap(), if k == 0 { 1.1276 } else { 1.1403 }, 1e-3);
        }
        assert_eq!(design.bands[8].check, Some(Check::Guaranteed));
        assert_eq!(design.bands[9].check, Some(Check::Depends));
        // 50 dB, 20 below the largest reduction; 103747 frames at 48 kHz in
        // tests/reference/check_pumping_station.json. The height rises and falls by
        // 0.1 dB within 10 ms there, so another rate may cross it that much earlier.
        close("settling, s", design.settling_s, 103_747.0 / 48_000.0, 1e-2);
        assert_eq!(design.settling_frames as f64, (design.settling_s * f64::from(rate_hz)).round());
    }
}

#[test]
fn what_does_not_fit_is_left_out_and_the_rest_is_designed() {
    let design = design(&pumping_station(), 24_000).unwrap();
    assert_eq!((design.stages.len(), design.bands.len()), (9, 9));
    let names: Vec<_> = design.left_out.iter().map(|left| left.what.as_str()).collect();
    assert_eq!(names, ["stage 3 (notch)", "band \"converter whine\""]);
    let spec = Spec { beyond_half_rate: BeyondHalfRate::Error, ..pumping_station() };
    assert!(matches!(bandproof::design::design(&spec, 24_000), Err(DesignError::BeyondHalfRate { .. })));
}

#[test]
fn without_the_exception_every_stop_violates_the_keep_band() {
    let mut spec = pumping_station();
    spec.bands[1].requirement = keep(0.5, &[]);
    let design = design(&spec, 48_000).unwrap();
    let sentences = design.impossible();
    assert_eq!(sentences.len(), 1);
    assert!(sentences[0].starts_with("band \"bird calls\" at 48000 Hz: keep_db = 0.5"), "{}", sentences[0]);
}

#[test]
fn without_a_reduction_the_tail_has_to_fall_by_60_db() {
    let mut spec = pumping_station();
    spec.bands = vec![band("bird calls", 2_000.0, 6_000.0, keep(0.5, &[]))];
    let design = design(&spec, 48_000).unwrap();
    assert_eq!(design.settling_frames, bandproof::design::settling::settling_frames(&design.sections, 60.0));
    spec.bands.push(band("hum", 49.9, 50.1, reduce(40.0)));
    let with_reduction = bandproof::design::design(&spec, 48_000).unwrap();
    assert_eq!(with_reduction.settling_frames, design.settling_frames);
}

#[test]
fn a_spec_without_stages_is_the_identity() {
    let bands = vec![band("all", 0.0, 4_000.0, keep(0.1, &[])), band("hum", 49.0, 51.0, reduce(20.0))];
    let spec = Spec {
        phase: Phase::Causal,
        auto: None,
        reference_band: None,
        rate: None,
        title: None,
        beyond_half_rate: BeyondHalfRate::Error,
        output: OUTPUT,
        stages: Vec::new(),
        bands,
    };
    let design = design(&spec, 8_000).unwrap();
    assert!(design.sections.is_empty() && design.stages.is_empty());
    assert_eq!((design.settling_frames, design.settling_s, design.max_pole_radius), (0, 0.0, 0.0));
    assert_eq!((design.bands[0].check, design.bands[1].check), (Some(Check::Guaranteed), Some(Check::Impossible)));
    assert_eq!(design.bands[0].excepted_width_hz().to_bits(), 0.0_f64.to_bits());
    assert_eq!(design.impossible().len(), 1);
}

#[test]
fn two_designs_of_one_spec_are_the_same_to_the_last_bit() {
    let (first, second) = (design(&pumping_station(), 48_000).unwrap(), design(&pumping_station(), 48_000).unwrap());
    assert_eq!(first, second);
}

/// One stage at 48.4 to 51.6 Hz, or at 1000 Hz, and one band.
fn one_stage(kind: FilterKind, family: Family, order: u32, band: Band) -> Spec {
    let placement = match kind {
        FilterKind::Lowpass | FilterKind::Highpass => Placement::Edge { edge_hz: 1_000.0 },
        FilterKind::Bandpass | FilterKind::Bandstop => Placement::Edges { edges_hz: [48.4, 51.6] },
    };
    let ripple_db = matches!(family, Family::Chebyshev1 | Family::Elliptic).then_some(0.25);
    let stop_db = matches!(family, Family::Chebyshev2 | Family::Elliptic).then_some(40.0);
    let stage = FilterStage { kind, family, order: Order::Given(order), placement, ripple_db, stop_db };
    let (stages, bands) = (vec![Stage::Filter(stage)], vec![band]);
    Spec {
        phase: Phase::Causal,
        auto: None,
        rate: None,
        reference_band: None,
        title: None,
        beyond_half_rate: BeyondHalfRate::Error,
        output: OUTPUT,
        stages,
        bands,
    }
}

#[test]
fn what_a_stage_promises_at_its_edges_is_guaranteed_when_asked_for_exactly() {
    let three_db = 10.0 * libm::log10(2.0);
    let below = |keep_db| band("x", 0.0, 1_000.0, keep(keep_db, &[]));
    let above = |keep_db| band("x", 51.6, 4_000.0, keep(keep_db, &[]));
    let cases = [
        ("Butterworth low-pass", FilterKind::Lowpass, Family::Butterworth, below(three_db)),
        ("Bessel low-pass", FilterKind::Lowpass, Family::Bessel, below(three_db)),
        ("Chebyshev I low-pass", FilterKind::Lowpass, Family::Chebyshev1, below(0.25)),
        ("elliptic low-pass", FilterKind::Lowpass, Family::Elliptic, below(0.25)),
        ("Chebyshev II high-pass", FilterKind::Highpass, Family::Chebyshev2, band("x", 0.0, 1_000.0, reduce(40.0))),
        ("Butterworth stop", FilterKind::Bandstop, Family::Butterworth, above(three_db)),
        ("Chebyshev I stop", FilterKind::Bandstop, Family::Chebyshev1, above(0.25)),
        ("elliptic stop", FilterKind::Bandstop, Family::Elliptic, above(0.25)),
        ("Chebyshev II stop", FilterKind::Bandstop, Family::Chebyshev2, band("x", 48.4, 51.6, reduce(40.0))),
        ("elliptic pass", FilterKind::Bandpass, Family::Elliptic, band("x", 48.4, 51.6, keep(0.25, &[]))),
    ];
    for (name, kind, family, band) in cases {
        for rate_hz in [8_000, 48_000, 384_000] {
            for order in 1..=6 {
                let mut spec = one_stage(kind, family, order, band.clone());
                let found = &design(&spec, rate_hz).unwrap().bands[0];
                assert_eq!(found.check, Some(Check::Guaranteed), "{name}, order {order}, {rate_hz} Hz: {found:?}");
                // And no more than that: 0.001 dB stricter, and it is not.
                match &mut spec.bands[0].requirement {
                    Requirement::Keep { keep_db, .. } => *keep_db -= 1e-3,
                    Requirement::Reduce { reduce_db } => *reduce_db += 1e-3,
                    _ => {}
                }
                let found = &design(&spec, rate_hz).unwrap().bands[0];
                assert_ne!(found.check, Some(Check::Guaranteed), "{name}, order {order}, {rate_hz} Hz: {found:?}");
            }
        }
    }
}
