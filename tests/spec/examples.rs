//! Complete specs in both notations.

use bandproof::spec::*;

/// One entry of every kind.
pub(crate) const REED_BED_TOML: &str = r#"title = "Reed bed beside the pumping station"
beyond_half_rate = "leave-out"
reference_band = "bird calls"
rate = "acoustic"

[output]
encoding = "pcm24"
dither   = "none"
overload = "scale"
gain_db  = -1
history  = true

[[stage]]
kind = "highpass"
family = "butterworth"
order = 4
edge_hz = 40

[[stage]]
kind = "bandstop"
family = "elliptic"
order = 3
center_hz = 50
width_hz = 3.2
harmonics = 8
ripple_db = 0.1
stop_db = 40

[[stage]]
kind = "bandpass"
family = "chebyshev2"
order = 5
edges_hz = [20, 21_000.5]
stop_db = 60

[[stage]]
kind = "lowpass"
family = "chebyshev1"
order = 20
edge_hz = 20e3
ripple_db = 3

[[stage]]
kind = "bandstop"
family = "bessel"
order = 1
center_hz = 440
q = 10

[[stage]]
kind = "notch"
center_hz = 15800
q = 60

[[band]]
name = "pump hum"
center_hz = 50
span_hz = 1
harmonics = 8
reduce_db = 30

[[band]]
name = "bird calls"
from_hz = 90
to_hz = 6000
keep_db = 0.5
except = ["pump hum"]

[[band]]
name = "converter whine"
from_hz = 15750
to_hz = 15850
residual_dbfs = -90

[[band]]
name = "overtones"
center_hz = 700
q = 50
"#;

/// The same in JSON.
pub(crate) const REED_BED_JSON: &str = r#"{
  "title": "Reed bed beside the pumping station",
  "beyond_half_rate": "leave-out",
  "reference_band": "bird calls",
  "rate": "acoustic",
  "output": {"encoding": "pcm24", "dither": "none", "overload": "scale", "gain_db": -1, "history": true},
  "stage": [
    {"kind": "highpass", "family": "butterworth", "order": 4, "edge_hz": 40},
    {"kind": "bandstop", "family": "elliptic", "order": 3, "center_hz": 50, "width_hz": 3.2, "harmonics": 8,
     "ripple_db": 0.1, "stop_db": 40},
    {"kind": "bandpass", "family": "chebyshev2", "order": 5, "edges_hz": [20, 21000.5], "stop_db": 60},
    {"kind": "lowpass", "family": "chebyshev1", "order": 20, "edge_hz": 20e3, "ripple_db": 3},
    {"kind": "bandstop", "family": "bessel", "order": 1, "center_hz": 440, "q": 10},
    {"kind": "notch", "center_hz": 15800, "q": 60}
  ],
  "band": [
    {"name": "pump hum", "center_hz": 50, "span_hz": 1, "harmonics": 8, "reduce_db": 30},
    {"name": "bird calls", "from_hz": 90, "to_hz": 6000, "keep_db": 0.5, "except": ["pump hum"]},
    {"name": "converter whine", "from_hz": 15750, "to_hz": 15850, "residual_dbfs": -90},
    {"name": "overtones", "center_hz": 700, "q": 50}
  ]
}
"#;

fn reed_bed() -> Spec {
    let filter = |kind, family, order, placement, ripple_db, stop_db| {
        Stage::Filter(FilterStage { kind, family, order: Order::Given(order), placement, ripple_db, stop_db })
    };
    let row = |center_hz, width, harmonics| Row { center_hz, width, harmonics };
    let band = |name: &str, extent, requirement| Band { name: name.to_owned(), extent, requirement };
    Spec {
        phase: Phase::Causal,
        auto: None,
        reference_band: Some("bird calls".to_owned()),
        rate: Some(RateMeaning::Acoustic),
        title: Some("Reed bed beside the pumping station".to_owned()),
        beyond_half_rate: BeyondHalfRate::LeaveOut,
        output: OutputSpec {
            encoding: OutputEncoding::Pcm24,
            dither: Dither::None,
            overload: Overload::Scale,
            gain_db: -1.0,
            history: true,
        },
        stages: vec![
            filter(FilterKind::Highpass, Family::Butterworth, 4, Placement::Edge { edge_hz: 40.0 }, None, None),
            filter(
                FilterKind::Bandstop,
                Family::Elliptic,
                3,
                Placement::Row(row(50.0, Width::Hz(3.2), 8)),
                Some(0.1),
                Some(40.0),
            ),
            filter(
                FilterKind::Bandpass,
                Family::Chebyshev2,
                5,
                Placement::Edges { edges_hz: [20.0, 21000.5] },
                None,
                Some(60.0),
            ),
            filter(FilterKind::Lowpass, Family::Chebyshev1, 20, Placement::Edge { edge_hz: 20e3 }, Some(3.0), None),
            filter(FilterKind::Bandstop, Family::Bessel, 1, Placement::Row(row(440.0, Width::Q(10.0), 1)), None, None),
            Stage::Notch(NotchStage { row: row(15800.0, Width::Q(60.0), 1) }),
        ],
        bands: vec![
            band("pump hum", Extent::Row(row(50.0, Width::Hz(1.0), 8)), Requirement::Reduce { reduce_db: 30.0 }),
            band(
                "bird calls",
                Extent::Range { from_hz: 90.0, to_hz: 6000.0 },
                Requirement::Keep { keep_db: 0.5, except: vec!["pump hum".to_owned()] },
            ),
            band(
                "converter whine",
                Extent::Range { from_hz: 15750.0, to_hz: 15850.0 },
                Requirement::Residual { residual_dbfs: -90.0 },
            ),
            band("overtones", Extent::Row(row(700.0, Width::Q(50.0), 1)), Requirement::Observe),
        ],
    }
}

#[test]
fn toml_is_read_into_the_types() {
    assert_eq!(crate::read(REED_BED_TOML), reed_bed());
}

#[test]
fn json_is_read_into_the_same_types() {
    assert_eq!(parse(REED_BED_JSON.as_bytes(), SpecSyntax::Json, "spec.json").unwrap(), reed_bed());
}

#[test]
fn keys_left_out_get_their_defaults() {
    let spec = crate::read("[[band]]\nname = 'all'\nfrom_hz = 0\nto_hz = 100");
    assert_eq!(spec.title, None);
    assert_eq!(spec.beyond_half_rate, BeyondHalfRate::Error);
    assert_eq!(spec.reference_band, None);
    assert_eq!(spec.rate, None);
    assert_eq!(
        spec.output,
        OutputSpec {
            encoding: OutputEncoding::Same,
            dither: Dither::Triangular,
            overload: Overload::Refuse,
            gain_db: 0.0,
            history: false,
        }
    );
    assert!(spec.stages.is_empty());
    let hum = crate::read("[[stage]]\nkind = 'notch'\ncenter_hz = 50\nwidth_hz = 1");
    assert_eq!(
        hum.stages,
        [Stage::Notch(NotchStage { row: Row { center_hz: 50.0, width: Width::Hz(1.0), harmonics: 1 } })]
    );
}

#[test]
fn bands_without_stages_are_the_identity_and_stages_without_bands_are_judged_by_nothing() {
    let bands_only = crate::read("[[band]]\nname = 'all'\nfrom_hz = 5\nto_hz = 100\nkeep_db = 1");
    assert!(bands_only.is_identity());
    let stages_only = crate::read("[[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 30");
    assert!(!stages_only.is_identity());
    assert!(stages_only.bands.is_empty());
    let gain_only = crate::read("[output]\ngain_db = -6\n[[band]]\nname = 'all'\nfrom_hz = 5\nto_hz = 100");
    assert!(!gain_only.is_identity());
}

#[test]
fn the_largest_reduction_is_found_among_reduce_bands_alone() {
    assert_eq!(reed_bed().largest_reduce_db(), Some(30.0));
    assert_eq!(crate::read("[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9\nkeep_db = 60").largest_reduce_db(), None);
    let two = "[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9\nreduce_db = 20\n\
               [[band]]\nname = 'b'\nfrom_hz = 9\nto_hz = 12\nreduce_db = 70";
    assert_eq!(crate::read(two).largest_reduce_db(), Some(70.0));
}

#[test]
fn rows_are_named_by_their_lines_and_single_bands_by_themselves() {
    let spec = reed_bed();
    let named: Vec<_> = spec.named_bands().collect();
    assert_eq!(named.len(), 8 + 3);
    assert_eq!(named[2].name, "pump hum x3");
    assert_eq!((named[2].line.from_hz, named[2].line.to_hz), (149.5, 150.5));
    assert_eq!((named[10].name.as_str(), named[10].in_row), ("overtones", false));
    // The width of a line with q is center over q: 700 / 50 = 14.
    assert_eq!((named[10].line.from_hz, named[10].line.to_hz), (693.0, 707.0));
}

#[test]
fn every_choice_is_written_by_its_name() {
    let output = |key: &str, word: &str| {
        crate::read(&format!("[output]\n{key} = '{word}'\n[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9")).output
    };
    for encoding in OutputEncoding::ALL {
        assert_eq!(output("encoding", encoding.name()).encoding, *encoding);
    }
    for dither in Dither::ALL {
        assert_eq!(output("dither", dither.name()).dither, *dither);
    }
    for overload in Overload::ALL {
        assert_eq!(output("overload", overload.name()).overload, *overload);
    }
    let names: Vec<_> = OutputEncoding::ALL.iter().map(|encoding| encoding.name()).collect();
    assert_eq!(names, ["same", "pcm16", "pcm24", "pcm32", "float32", "float64"]);
    for rate in RateMeaning::ALL {
        let top = format!("rate = '{}'\n[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9", rate.name());
        assert_eq!(crate::read(&top).rate, Some(*rate));
    }
    let names: Vec<_> = RateMeaning::ALL.iter().map(|rate| rate.name()).collect();
    assert_eq!(names, ["header", "acoustic"]);
    let names: Vec<_> = Family::ALL.iter().map(|family| family.name()).collect();
    assert_eq!(names, ["butterworth", "chebyshev1", "chebyshev2", "elliptic", "bessel"]);
    let names: Vec<_> = FilterKind::ALL.iter().map(|kind| kind.name()).collect();
    assert_eq!(names, ["lowpass", "highpass", "bandpass", "bandstop"]);
}
