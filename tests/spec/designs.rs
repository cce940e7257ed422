//! A complete spec with every way to say what a filter is, in both notations.

use crate::any_rate;
use bandproof::spec::*;

/// One stage of every kind and way but those of `examples`.
pub(crate) const DESIGNS_TOML: &str = r#"title = "Hydrophone below the weir"
phase = "causal"

[[stage]]
kind = "lowpass"
family = "elliptic"
edge_hz = 9000
stop_edge_hz = 11025.5
ripple_db = 0.1
stop_db = 60

[[stage]]
kind = "bandpass"
family = "bessel"
edges_hz = [100, 8000]
stop_edges_hz = [20, 16000]
ripple_db = 3
stop_db = 20

[[stage]]
kind = "peak"
center_hz = 1200
gain_db = -6
q = 1.5

[[stage]]
kind = "lowshelf"
edge_hz = 80
gain_db = 3.5
slope = 0.8

[[stage]]
kind = "highshelf"
edge_hz = 6000
gain_db = -12
q = 0.7

[[stage]]
kind = "weighting"
curve = "K"

[[stage]]
kind = "digital"
numerator = [0.0675, 0.1349, 0.0675]
denominator = [1, -1.1430, 0.4128]

[[stage]]
kind = "digital"
sections = [
  {b = [1, 2, 1], a = [1, -1.0106, 0.3583]},
  {b = [0.5, 0, 0], a = [2, 0, 7.738860E-02]},
]

[[stage]]
kind = "digital"
zeros = [-1, [0.25, 0.75], [0.25, -0.75]]
poles = [[0.5, 0.25], [0.5, -0.25], 0]
gain = 0.125

[[stage]]
kind = "analog"
numerator = [0, 1]
denominator = [0.0000031831, 1]
match_hz = 5000

[[stage]]
kind = "analog"
poles = [-6283.2]
gain = 6283.2

[[stage]]
kind = "analog"
zeros_hz = [0, 0]
poles_hz = [-20.6, -20.6]
gain = 1
"#;

/// The same in JSON.
pub(crate) const DESIGNS_JSON: &str = r#"{
  "title": "Hydrophone below the weir", "phase": "causal",
  "stage": [
    {"kind": "lowpass", "family": "elliptic", "edge_hz": 9000, "stop_edge_hz": 11025.5, "ripple_db": 0.1, "stop_db": 60},
    {"kind": "bandpass", "family": "bessel", "edges_hz": [100, 8000], "stop_edges_hz": [20, 16000],
     "ripple_db": 3, "stop_db": 20},
    {"kind": "peak", "center_hz": 1200, "gain_db": -6, "q": 1.5},
    {"kind": "lowshelf", "edge_hz": 80, "gain_db": 3.5, "slope": 0.8},
    {"kind": "highshelf", "edge_hz": 6000, "gain_db": -12, "q": 0.7},
    {"kind": "weighting", "curve": "K"},
    {"kind": "digital", "numerator": [0.0675, 0.1349, 0.0675], "denominator": [1, -1.1430, 0.4128]},
    {"kind": "digital", "sections": [{"b": [1, 2, 1], "a": [1, -1.0106, 0.3583]},
                                     {"b": [0.5, 0, 0], "a": [2, 0, 7.738860E-02]}]},
    {"kind": "digital", "zeros": [-1, [0.25, 0.75], [0.25, -0.75]], "poles": [[0.5, 0.25], [0.5, -0.25], 0], "gain": 0.125},
    {"kind": "analog", "numerator": [0, 1], "denominator": [0.0000031831, 1], "match_hz": 5000},
    {"kind": "analog", "poles": [-6283.2], "gain": 6283.2},
    {"kind": "analog", "zeros_hz": [0, 0], "poles_hz": [-20.6, -20.6], "gain": 1}
  ]
}
"#;

fn designs() -> Vec<Stage> {
    let c = |value: f64, unit: f64| Coefficient { value, unit };
    let whole = |value: f64| c(value, 0.0);
    let real = |re: Coefficient| Root { re, im: whole(0.0) };
    let limits = |kind, family, order, placement, ripple, stop| {
        let order = Order::Limits(order);
        Stage::Filter(FilterStage { kind, family, order, placement, ripple_db: Some(ripple), stop_db: Some(stop) })
    };
    let equalizer = |kind, hz, gain_db, shape| Stage::Equalizer(EqualizerStage { kind, hz, gain_db, shape });
    let digital = |transfer| any_rate(DigitalFilter::Transfer(transfer));
    let analog = |transfer, unit, match_hz| Stage::Analog(AnalogStage { transfer, unit, match_hz });
    let pair = |re: Coefficient, im: f64| [im, -im].map(|im| Root { re, im: c(im, 0.01) });
    let mut zeros = vec![real(whole(-1.0))];
    zeros.extend(pair(c(0.25, 0.01), 0.75));
    let mut poles = pair(c(0.5, 0.1), 0.25).to_vec();
    poles.push(real(whole(0.0)));
    vec![
        limits(
            FilterKind::Lowpass,
            Family::Elliptic,
            StopEdges::One(11025.5),
            Placement::Edge { edge_hz: 9000.0 },
            0.1,
            60.0,
        ),
        limits(
            FilterKind::Bandpass,
            Family::Bessel,
            StopEdges::Two([20.0, 16000.0]),
            Placement::Edges { edges_hz: [100.0, 8000.0] },
            3.0,
            20.0,
        ),
        equalizer(EqualizerKind::Peak, 1200.0, -6.0, EqualizerShape::Q(1.5)),
        equalizer(EqualizerKind::Lowshelf, 80.0, 3.5, EqualizerShape::Slope(0.8)),
        equalizer(EqualizerKind::Highshelf, 6000.0, -12.0, EqualizerShape::Q(0.7)),
        Stage::Weighting(WeightingStage { curve: Curve::K }),
        digital(Transfer::Polynomials {
            numerator: vec![c(0.0675, 1e-4), c(0.1349, 1e-4), c(0.0675, 1e-4)],
            denominator: vec![whole(1.0), c(-1.143, 1e-4), c(0.4128, 1e-4)],
        }),
        any_rate(DigitalFilter::Sections(vec![
            WrittenSection { b: [1.0, 2.0, 1.0].map(whole), a: [whole(1.0), c(-1.0106, 1e-4), c(0.3583, 1e-4)] },
            WrittenSection {
                b: [c(0.5, 0.1), whole(0.0), whole(0.0)],
                a: [whole(2.0), whole(0.0), c(0.0773886, 1e-8)],
            },
        ])),
        digital(Transfer::Roots { zeros, poles, gain: c(0.125, 0.001) }),
        analog(
            Transfer::Polynomials {
                numerator: vec![whole(0.0), whole(1.0)],
                denominator: vec![c(3.1831e-6, 1e-10), whole(1.0)],
            },
            RootUnit::RadiansPerSecond,
            Some(5000.0),
        ),
        analog(
            Transfer::Roots { zeros: vec![], poles: vec![real(c(-6283.2, 0.1))], gain: c(6283.2, 0.1) },
            RootUnit::RadiansPerSecond,
            None,
        ),
        analog(
            Transfer::Roots { zeros: vec![real(whole(0.0)); 2], poles: vec![real(c(-20.6, 0.1)); 2], gain: whole(1.0) },
            RootUnit::Hertz,
            None,
        ),
    ]
}

#[test]
fn both_notations_are_read_into_the_types() {
    let toml = crate::read(DESIGNS_TOML);
    assert_eq!(toml.stages, designs());
    assert_eq!(parse(DESIGNS_JSON.as_bytes(), SpecSyntax::Json, "spec.json").unwrap(), toml);
    assert!(!toml.is_identity());
}

#[test]
fn every_kind_is_called_by_its_word() {
    let names: Vec<_> = designs().iter().map(Stage::kind_name).collect();
    let transfers = ["digital", "digital", "digital", "analog", "analog", "analog"];
    assert_eq!(names[..6], ["lowpass", "bandpass", "peak", "lowshelf", "highshelf", "weighting"]);
    assert_eq!(names[6..], transfers);
}
