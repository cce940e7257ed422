//! From the program's own results to the report's entries.

use crate::samples::{finite, hz};
use bandproof::design::sections::StageSize;
use bandproof::design::{BandDesign, Check, Design, DesignedStage, LeftOut, PlacedStage, Violation, recipe};
use bandproof::evidence::{self, BandFigures, BandTask};
use bandproof::report::*;
use bandproof::section::Section;
use bandproof::spec::*;

fn design_band() -> BandDesign {
    let band = Band {
        name: "hum".to_owned(),
        extent: Extent::Row(Row { center_hz: 50.1, width: Width::Hz(1.0), harmonics: 3 }),
        requirement: Requirement::Reduce { reduce_db: 30.0 },
    };
    BandDesign {
        band: band.named().remove(2),
        attenuation_min_db: 12.34567,
        attenuation_max_db: 180.0,
        reaches_hz: Some((149.9, 150.7)),
        excepted_hz: Vec::new(),
        group_delay_s: None,
        startup_s: Some(0.55),
        shortest_s: Some(12.2),
        check: Some(Check::Depends),
        violation: None,
    }
}

fn stage(kind: FilterKind, order: u32) -> PlacedStage {
    let stage = Stage::Filter(FilterStage {
        kind,
        family: Family::Chebyshev2,
        order: Order::Given(order),
        placement: Placement::Edge { edge_hz: 40.0 },
        ripple_db: None,
        stop_db: Some(60.0),
    });
    PlacedStage { stage_index: 0, stage, harmonic: None, edges_hz: vec![40.0] }
}

fn designed(placed: PlacedStage, total_order: u32, sections: u32) -> DesignedStage {
    let recipe = recipe::recipe(&placed, Phase::Causal, 48_000.0).unwrap();
    let size = StageSize { total_order, sections };
    DesignedStage { placed, recipe, size, slack: Vec::new(), remarks: Vec::new() }
}

fn design() -> Design {
    let row = Row { center_hz: 15_800.0, width: Width::Q(60.0), harmonics: 1 };
    let notch = PlacedStage {
        stage_index: 1,
        stage: Stage::Notch(NotchStage { row }),
        harmonic: Some(1),
        edges_hz: vec![15_668.3, 15_931.7],
    };
    Design {
        rate_hz: 48_000,
        left_out: vec![LeftOut { what: "band \"whine\"".to_owned(), reason: "too high".to_owned() }],
        stages: vec![
            designed(stage(FilterKind::Highpass, 5), 5, 3),
            designed(stage(FilterKind::Bandstop, 3), 6, 3),
            designed(notch, 2, 1),
        ],
        sections: vec![Section { b: [1.0, 0.0, 0.0], a: [1.0, -0.5, 0.0] }],
        passes: 1,
        max_pole_radius: 0.5,
        rounding_db: 1.234_5e-9,
        rounding_at_hz: 15_931.7,
        settling_s: 2.2,
        settling_frames: 105_600,
        bands: vec![design_band()],
    }
}

#[test]
fn a_design_becomes_its_entry() {
    let entry = DesignEntry::new(&design(), "triangular-1", None).unwrap();
    assert_eq!((entry.rate_hz, entry.passes, entry.dither.as_str()), (48_000, 1, "triangular-1"));
    assert_eq!((entry.left_out[0].what.as_str(), entry.left_out[0].reason.as_str()), ("band \"whine\"", "too high"));
    assert_eq!((entry.rounding_db.get(), entry.rounding_at_hz.map(Hz::get)), (1.23e-9, Some(15_931.7)));
    let orders: Vec<_> = entry.stages.iter().map(|s| (s.stage, s.order, s.total_order, s.sections)).collect();
    assert_eq!(orders, [(1, Some(5), 5, 3), (1, Some(3), 6, 3), (2, None, 2, 1)]);
    assert_eq!((entry.stages[0].kind.as_str(), entry.stages[0].family.as_deref()), ("highpass", Some("chebyshev2")));
    assert_eq!((entry.stages[0].stop_db, entry.stages[2].kind.as_str()), (Some(finite(60.0)), "notch"));
    let band = &entry.bands[0];
    assert_eq!((band.name.as_str(), band.from_hz, band.to_hz), ("hum x3", hz(149.8), hz(150.8)));
    assert_eq!(band.require, Some(Require::ReduceDb(finite(30.0))));
    assert_eq!(band.attenuation_min_db.get(), 12.346);
    assert_eq!((band.reaches_from_hz, band.reaches_to_hz), (Some(hz(149.9)), Some(hz(150.7))));
    assert_eq!(band.check, Some(CheckResult::Depends));
}

#[test]
fn exceptions_add_up_and_violations_are_told() {
    let keep = BandDesign {
        excepted_hz: vec![(48.5, 51.5), (98.0, 102.25)],
        reaches_hz: None,
        check: Some(Check::Impossible),
        violation: Some(Violation { at_hz: 90.0, gain_db: f64::NEG_INFINITY }),
        ..design_band()
    };
    let entry = DesignBand::new(&keep).unwrap();
    assert_eq!(entry.excepted_hz, hz(7.25));
    assert_eq!((entry.reaches_from_hz, entry.reaches_to_hz), (None, None));
    let violation = entry.violation.unwrap();
    assert_eq!((violation.at_hz, violation.gain_db.get()), (hz(90.0), -180.0));
}

#[test]
fn a_design_that_is_not_finite_is_refused() {
    for spoilt in [
        Design { settling_s: f64::INFINITY, ..design() },
        Design { max_pole_radius: f64::NAN, ..design() },
        Design { rounding_db: f64::INFINITY, ..design() },
        Design { bands: vec![BandDesign { attenuation_min_db: f64::NAN, ..design_band() }], ..design() },
    ] {
        assert!(DesignEntry::new(&spoilt, "none", None).is_err());
    }
}

#[test]
fn figures_become_their_entry_and_what_is_not_finite_becomes_null() {
    let task = BandTask {
        name: "whine".to_owned(),
        from_hz: 15_750.0,
        to_hz: 15_850.0,
        requirement: Requirement::Residual { residual_dbfs: -90.0 },
        excepted_hz: Vec::new(),
        shortest_s: None,
    };
    let figures = BandFigures {
        before_dbfs: Some(-60.00049),
        after_dbfs: Some(f64::NEG_INFINITY),
        line_hz: Some(15_801.25),
        verdict: Some(evidence::Verdict::Unproven),
        reason_code: Some(evidence::ReasonCode::LoudNeighbor),
        reason: Some("a neighbor hides it".to_owned()),
        ..BandFigures::default()
    };
    let entry = BandEntry::new(&task, &figures).unwrap();
    assert_eq!(entry.require, Some(Require::ResidualDbfs(finite(-90.0))));
    assert_eq!((entry.before_dbfs, entry.after_dbfs), (Db::new(-60.0), None));
    assert_eq!((entry.line_hz, entry.verdict), (Some(hz(15_801.25)), Some(Verdict::Unproven)));
    assert_eq!(entry.reason_code, Some(ReasonCode::LoudNeighbor));
    assert!(BandEntry::new(&BandTask { from_hz: f64::NAN, ..task }, &figures).is_err());
}

#[test]
fn reason_codes_are_spelled_as_documented() {
    for (code, spelled) in [
        (evidence::ReasonCode::NothingThere, "nothing-there"),
        (evidence::ReasonCode::TooShort, "too-short"),
        (evidence::ReasonCode::TooQuiet, "too-quiet"),
        (evidence::ReasonCode::LoudNeighbor, "loud-neighbor"),
        (evidence::ReasonCode::Unsettled, "unsettled"),
        (evidence::ReasonCode::OutOfRange, "out-of-range"),
    ] {
        assert_eq!(serde_json::to_value(ReasonCode::from(code)).unwrap(), spelled);
    }
}

#[test]
fn chunk_names_stay_readable_and_unambiguous() {
    for (id, written) in [(*b"bext", "bext"), (*b"id3 ", "id3 "), (*b"a%b\0", "a%25b%00"), ([0xFF; 4], "%FF%FF%FF%FF")]
    {
        assert_eq!(ChunkEntry::new(id, 1, true).id, written);
    }
}
