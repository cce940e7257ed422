//! What fits below half a sample rate.

use crate::common::{band, reduce};
use bandproof::design::DesignError;
use bandproof::design::placement::{Placed, place};
use bandproof::spec::{
    AnalogStage, Band, BeyondHalfRate, Coefficient, Dither, Extent, Family, FilterKind, FilterStage, NotchStage, Order,
    OutputEncoding, OutputSpec, Overload, Phase, Placement, Requirement, Root, RootUnit, Row, Spec, Stage, StopEdges,
    Transfer, Width,
};

fn spec(stages: Vec<Stage>, bands: Vec<Band>, beyond_half_rate: BeyondHalfRate) -> Spec {
    let output = OutputSpec {
        encoding: OutputEncoding::Same,
        dither: Dither::Triangular,
        overload: Overload::Refuse,
        gain_db: 0.0,
        history: false,
    };
    Spec {
        phase: Phase::Causal,
        auto: None,
        reference_band: None,
        rate: None,
        title: None,
        beyond_half_rate,
        output,
        stages,
        bands,
    }
}

fn filter(kind: FilterKind, placement: Placement) -> Stage {
    Stage::Filter(FilterStage {
        kind,
        family: Family::Butterworth,
        order: Order::Given(2),
        placement,
        ripple_db: None,
        stop_db: None,
    })
}

fn row(center_hz: f64, width_hz: f64, harmonics: u32) -> Row {
    Row { center_hz, width: Width::Hz(width_hz), harmonics }
}

fn row_band(row: Row) -> Band {
    Band { name: "hum".to_owned(), extent: Extent::Row(row), requirement: Requirement::Observe }
}

fn fits(stage: &Stage, rate_hz: u32) -> bool {
    place(&spec(vec![stage.clone()], Vec::new(), BeyondHalfRate::Error), rate_hz).is_ok()
}

fn left_out(placed: &Placed) -> Vec<&str> {
    placed.left_out.iter().map(|left| left.what.as_str()).collect()
}

#[test]
fn a_stage_fits_while_its_upper_edge_is_below_half_the_rate() {
    for (kind, placement) in [
        (FilterKind::Lowpass, Placement::Edge { edge_hz: 12_000.0 }),
        (FilterKind::Highpass, Placement::Edge { edge_hz: 12_000.0 }),
        (FilterKind::Bandpass, Placement::Edges { edges_hz: [1.0, 12_000.0] }),
        (FilterKind::Bandstop, Placement::Row(row(11_900.0, 200.0, 1))),
    ] {
        let stage = filter(kind, placement);
        assert!(!fits(&stage, 24_000), "{stage:?}");
        assert!(fits(&stage, 24_001), "{stage:?}");
    }
    let notch = Stage::Notch(NotchStage { row: row(11_900.0, 200.0, 1) });
    assert!(!fits(&notch, 24_000) && fits(&notch, 24_001));
}

/// Above half the rate there is no stop band that an order could follow from.
#[test]
fn a_stage_with_limits_fits_while_its_stop_edges_are_below_half_the_rate_too() {
    let limited = |kind, placement, stop| {
        let Stage::Filter(plain) = filter(kind, placement) else { panic!("a filter") };
        let (ripple_db, stop_db) = (Some(0.5), Some(40.0));
        Stage::Filter(FilterStage { order: Order::Limits(stop), ripple_db, stop_db, ..plain })
    };
    let low = limited(FilterKind::Lowpass, Placement::Edge { edge_hz: 9_000.0 }, StopEdges::One(12_000.0));
    let two = StopEdges::Two([50.0, 12_000.0]);
    let pass = limited(FilterKind::Bandpass, Placement::Edges { edges_hz: [100.0, 9_000.0] }, two);
    for (stage, edge) in [(&low, "stop edge"), (&pass, "upper stop edge")] {
        assert!(!fits(stage, 24_000) && fits(stage, 24_001), "{stage:?}");
        let placed = place(&spec(vec![stage.clone()], Vec::new(), BeyondHalfRate::LeaveOut), 24_000).unwrap();
        assert!(placed.stages.is_empty());
        let reason = format!("its {edge}, 12000 Hz, is not below half the sample rate, 12000 Hz");
        assert_eq!(placed.left_out[0].reason, reason);
        // Where both edges are too high the one that comes first is named.
        let reason = place(&spec(vec![stage.clone()], Vec::new(), BeyondHalfRate::Error), 16_000).unwrap_err();
        assert!(reason.to_string().contains("edge, 9000 Hz, is not below"), "{reason}");
    }
    let two = StopEdges::Two([200.0, 300.0]);
    let stop = limited(FilterKind::Bandstop, Placement::Edges { edges_hz: [100.0, 11_999.0] }, two);
    assert!(fits(&stop, 24_000));
}

#[test]
fn a_plain_band_may_end_at_half_the_rate_and_a_row_s_line_may_not() {
    let plain = [band("x", 0.0, 12_000.0, Requirement::Observe)];
    assert!(place(&spec(Vec::new(), plain.to_vec(), BeyondHalfRate::Error), 24_000).is_ok());
    assert!(place(&spec(Vec::new(), plain.to_vec(), BeyondHalfRate::Error), 23_999).is_err());
    // Center and span make the end come out above 350 by rounding at most.
    let single = [row_band(row(349.9, 0.2, 1))];
    let placed = place(&spec(Vec::new(), single.to_vec(), BeyondHalfRate::Error), 700).unwrap();
    assert!(placed.bands[0].line.to_hz <= 350.0);
    let placed = place(&spec(Vec::new(), vec![row_band(row(50.0, 100.0, 3))], BeyondHalfRate::Error), 300).unwrap();
    assert_eq!(placed.bands.iter().map(|band| band.name.as_str()).collect::<Vec<_>>(), ["hum x1"]);
    assert_eq!(left_out(&placed), ["band \"hum x2\"", "band \"hum x3\""]);
}

#[test]
fn lines_of_a_row_that_do_not_fit_are_left_out_and_listed_under_either_setting() {
    let stages = vec![
        filter(FilterKind::Highpass, Placement::Edge { edge_hz: 10.0 }),
        filter(FilterKind::Bandstop, Placement::Row(row(50.0, 3.2, 8))),
    ];
    for beyond in [BeyondHalfRate::Error, BeyondHalfRate::LeaveOut] {
        let placed = place(&spec(stages.clone(), vec![row_band(row(50.0, 1.0, 8))], beyond), 700).unwrap();
        let harmonics: Vec<_> = placed.stages.iter().map(|stage| (stage.stage_index, stage.harmonic)).collect();
        assert_eq!(harmonics[0], (0, None));
        assert_eq!(harmonics[1..], (1..=6).map(|k| (1, Some(k))).collect::<Vec<_>>());
        assert_eq!(placed.stages[6].edges_hz, [298.4, 301.6]);
        assert_eq!(placed.bands.len(), 6);
        let want = ["stage 2, line 7 (350 Hz)", "stage 2, line 8 (400 Hz)", "band \"hum x7\"", "band \"hum x8\""];
        assert_eq!(left_out(&placed), want);
        assert_eq!(placed.left_out[0].reason, "its upper edge, 351.6 Hz, is not below half the sample rate, 350 Hz");
    }
}

#[test]
fn a_row_with_not_even_one_line_fitting_is_treated_like_a_stage() {
    let stage = Stage::Notch(NotchStage { row: row(400.0, 10.0, 3) });
    assert!(!fits(&stage, 700));
    let placed = place(&spec(vec![stage], vec![row_band(row(400.0, 1.0, 3))], BeyondHalfRate::LeaveOut), 700).unwrap();
    assert!(placed.stages.is_empty() && placed.bands.is_empty());
    assert_eq!(left_out(&placed), ["stage 1 (notch)", "band \"hum\""]);
    assert!(placed.left_out.iter().all(|left| left.reason.starts_with("not even its first line fits")));
}

#[test]
fn one_error_names_everything_that_does_not_fit_and_the_repair() {
    let stages = vec![
        filter(FilterKind::Highpass, Placement::Edge { edge_hz: 40.0 }),
        Stage::Notch(NotchStage { row: Row { center_hz: 15_800.0, width: Width::Q(60.0), harmonics: 1 } }),
        filter(FilterKind::Lowpass, Placement::Edge { edge_hz: 13_000.0 }),
    ];
    let bands = vec![band("whine", 15_750.0, 15_850.0, reduce(20.0)), band("calls", 90.0, 6_000.0, reduce(1.0))];
    let error = place(&spec(stages.clone(), bands.clone(), BeyondHalfRate::Error), 24_000).unwrap_err();
    let text = error.to_string();
    let parts = [
        "24000 Hz",
        "stage 2 (notch)",
        "15931.666667 Hz",
        "stage 3 (lowpass)",
        "13000 Hz",
        "\"whine\"",
        "15850 Hz",
        "12000 Hz",
        "beyond_half_rate = \"leave-out\"",
    ];
    for part in parts {
        assert!(text.contains(part), "{part} in: {text}");
    }
    assert!(!text.contains("calls") && !text.contains("stage 1"));
    assert!(matches!(error, DesignError::BeyondHalfRate { rate_hz: 24_000, ref misfits } if misfits.len() == 3));
    let placed = place(&spec(stages, bands, BeyondHalfRate::LeaveOut), 24_000).unwrap();
    assert_eq!(left_out(&placed), ["stage 2 (notch)", "stage 3 (lowpass)", "band \"whine\""]);
    assert_eq!((placed.stages.len(), placed.bands.len()), (1, 1));
}

#[test]
fn a_row_of_constant_q_widens_with_its_lines() {
    let stage = Stage::Notch(NotchStage { row: Row { center_hz: 100.0, width: Width::Q(10.0), harmonics: 3 } });
    let placed = place(&spec(vec![stage], Vec::new(), BeyondHalfRate::Error), 48_000).unwrap();
    let edges: Vec<_> = placed.stages.iter().map(|stage| stage.edges_hz.clone()).collect();
    assert_eq!(edges, [[95.0, 105.0], [190.0, 210.0], [285.0, 315.0]]);
}

/// A response can't be matched at half the rate or above.
#[test]
fn an_analog_stage_that_is_matched_beyond_half_the_rate_is_left_out_or_named() {
    let real = |value: f64| Coefficient { value, unit: 0.0 };
    let poles = vec![Root { re: real(-1000.0), im: real(0.0) }];
    let transfer = Transfer::Roots { zeros: Vec::new(), poles, gain: real(1000.0) };
    let matched = |match_hz| Stage::Analog(AnalogStage { transfer: transfer.clone(), unit: RootUnit::Hertz, match_hz });
    let stage = matched(Some(6000.0));
    assert!(!fits(&stage, 12_000) && fits(&stage, 12_001) && fits(&matched(None), 1));
    let placed = place(&spec(vec![stage.clone()], Vec::new(), BeyondHalfRate::LeaveOut), 8_000).unwrap();
    assert!(placed.stages.is_empty());
    assert_eq!(left_out(&placed), ["stage 1 (analog)"]);
    assert_eq!(placed.left_out[0].reason, "its match_hz, 6000 Hz, is not below half the sample rate, 4000 Hz");
    let text = place(&spec(vec![stage], Vec::new(), BeyondHalfRate::Error), 8_000).unwrap_err().to_string();
    assert!(text.contains("its match_hz, 6000 Hz") && text.contains("beyond_half_rate = \"leave-out\""), "{text}");
}
