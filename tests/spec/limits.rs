//! Limits in place of an order: where they are read to, and what contradicts them.

use bandproof::spec::*;

use crate::{read, refused, refused_json};

const LIMITS: &str = "family = 'bessel'\nripple_db = 1\nstop_db = 40\n";

/// The one stage of a spec.
fn filter(keys: &str) -> FilterStage {
    match read(&format!("[[stage]]\n{keys}")).stages.remove(0) {
        Stage::Filter(filter) => filter,
        other => panic!("{other:?}"),
    }
}

/// What is said of a stage whose keys begin in line 2.
fn stage(keys: &str) -> String {
    refused(&format!("[[stage]]\n{keys}"))
}

#[test]
fn stop_edges_stand_in_place_of_an_order_with_every_family() {
    for family in Family::ALL {
        let limits = LIMITS.replace("bessel", family.name());
        let lowpass = filter(&format!("kind = 'lowpass'\n{limits}edge_hz = 1000\nstop_edge_hz = 1500.5"));
        let expected = FilterStage {
            kind: FilterKind::Lowpass,
            family: *family,
            order: Order::Limits(StopEdges::One(1500.5)),
            placement: Placement::Edge { edge_hz: 1000.0 },
            ripple_db: Some(1.0),
            stop_db: Some(40.0),
        };
        assert_eq!(lowpass, expected);
    }
    let highpass = filter(&format!("kind = 'highpass'\n{LIMITS}edge_hz = 40\nstop_edge_hz = 25"));
    assert_eq!(highpass.order, Order::Limits(StopEdges::One(25.0)));
    let bandpass = filter(&format!("kind = 'bandpass'\n{LIMITS}edges_hz = [100, 200]\nstop_edges_hz = [90, 220]"));
    assert_eq!(bandpass.order, Order::Limits(StopEdges::Two([90.0, 220.0])));
    assert_eq!(bandpass.placement, Placement::Edges { edges_hz: [100.0, 200.0] });
    let bandstop = filter(&format!("kind = 'bandstop'\n{LIMITS}edges_hz = [45, 55]\nstop_edges_hz = [49, 51]"));
    assert_eq!(bandstop.order, Order::Limits(StopEdges::Two([49.0, 51.0])));
}

#[test]
fn they_are_written_as_they_are_read() {
    let spec = read(&format!("[[stage]]\nkind = 'bandstop'\n{LIMITS}edges_hz = [45, 55]\nstop_edges_hz = [49, 51]"));
    assert_eq!(
        serde_json::to_value(&spec.stages[0]).unwrap().to_string(),
        "{\"kind\":\"bandstop\",\"family\":\"bessel\",\"edges_hz\":[45.0,55.0],\"stop_edges_hz\":[49.0,51.0],\
         \"ripple_db\":1.0,\"stop_db\":40.0}"
    );
}

#[test]
fn an_order_and_a_stop_edge_or_neither() {
    assert_eq!(
        stage(&format!("kind = 'lowpass'\n{LIMITS}edge_hz = 1000\nstop_edge_hz = 1500\norder = 3")),
        "spec.toml:7:1: the lowpass stage has both order and stop_edge_hz, and each says how steep it is; \
         keep order, or stop_edge_hz with ripple_db and stop_db"
    );
    assert_eq!(
        stage("kind = 'bandstop'\nfamily = 'bessel'\nedges_hz = [45, 55]"),
        "spec.toml:1:1: the bandstop stage has neither order nor stop_edges_hz; \
         add the order of the low-pass prototype, or stop_edges_hz with ripple_db and stop_db"
    );
    // What was meant is there already.
    for (kind, written, meant) in [
        ("lowpass'\nedge_hz = 1000", "stop_hz = 2000", "stop_edge_hz"),
        ("bandstop'\nedges_hz = [45, 60]", "stop_hz = [49, 51]", "stop_edges_hz"),
    ] {
        let name = kind.split('\'').next().unwrap();
        assert_eq!(
            stage(&format!("kind = '{kind}\n{LIMITS}{written}")),
            format!("spec.toml:7:1: unknown key \"stop_hz\" in the {name} stage; did you mean {meant}?")
        );
    }
    // Ripple and attenuation alone hint at limits: what lacks is the stop edge, and nothing else.
    assert_eq!(
        stage(&format!("kind = 'highpass'\n{LIMITS}edge_hz = 40")),
        "spec.toml:1:1: the highpass stage has neither order nor stop_edge_hz; \
         add the order of the low-pass prototype, or stop_edge_hz with ripple_db and stop_db"
    );
    assert_eq!(
        stage(&format!("kind = 'lowpass'\n{LIMITS}edge_hz = 40\nstop_edge = 50")),
        "spec.toml:7:1: unknown key \"stop_edge\" in the lowpass stage; did you mean stop_edge_hz?"
    );
}

#[test]
fn both_limits_are_needed_whatever_the_family() {
    for family in Family::ALL {
        let keys = format!("kind = 'lowpass'\nfamily = '{}'\nedge_hz = 40\nstop_edge_hz = 50\n", family.name());
        assert_eq!(
            stage(&keys),
            "spec.toml:1:1: the lowpass stage has no ripple_db; \
             with stop_edge_hz every family needs the most its pass band may lose, in decibels\n\
             spec.toml:1:1: the lowpass stage has no stop_db; \
             with stop_edge_hz every family needs the least its stop band must lose, in decibels"
        );
        assert_eq!(
            stage(&format!("{keys}ripple_db = 6\nstop_db = 6")),
            "spec.toml:7:11: stop_db = 6 is not above ripple_db = 6; \
             the stop band must lie deeper than the ripple: raise stop_db"
        );
    }
}

#[test]
fn a_stop_edge_on_the_wrong_side() {
    let lowpass = |stop: &str| stage(&format!("kind = 'lowpass'\n{LIMITS}edge_hz = 1000\nstop_edge_hz = {stop}"));
    for stop in ["900", "1000"] {
        assert_eq!(
            lowpass(stop),
            format!(
                "spec.toml:7:16: stop_edge_hz = {stop} is not above edge_hz = 1000; \
                 a lowpass stops above its edge: give a stop_edge_hz above 1000"
            )
        );
    }
    assert_eq!(
        stage(&format!("kind = 'highpass'\n{LIMITS}edge_hz = 40\nstop_edge_hz = 40.5")),
        "spec.toml:7:16: stop_edge_hz = 40.5 is not below edge_hz = 40; \
         a highpass stops below its edge: give a stop_edge_hz below 40"
    );
    let band = |kind: &str, stops: &str| {
        stage(&format!("kind = '{kind}'\n{LIMITS}edges_hz = [100, 200]\nstop_edges_hz = {stops}"))
    };
    let around = "the stop edges of a bandpass lie around its edges: give one";
    let between = "the stop edges of a bandstop lie between its edges: give one";
    assert_eq!(
        band("bandpass", "[110, 220]"),
        format!(
            "spec.toml:7:17: the lower of stop_edges_hz, 110, is not below the lower of edges_hz, 100; {around} below 100"
        )
    );
    assert_eq!(
        band("bandpass", "[100, 200]"),
        format!(
            "spec.toml:7:17: the lower of stop_edges_hz, 100, is not below the lower of edges_hz, 100; {around} below 100\n\
             spec.toml:7:17: the upper of stop_edges_hz, 200, is not above the upper of edges_hz, 200; {around} above 200"
        )
    );
    assert_eq!(
        band("bandstop", "[90, 220]"),
        format!(
            "spec.toml:7:17: the lower of stop_edges_hz, 90, is not above the lower of edges_hz, 100; {between} above 100\n\
             spec.toml:7:17: the upper of stop_edges_hz, 220, is not below the upper of edges_hz, 200; {between} below 200"
        )
    );
    assert_eq!(
        band("bandstop", "[180, 120]"),
        "spec.toml:7:17: stop_edges_hz = [180, 120] is not in rising order; \
         write the lower edge first: stop_edges_hz = [120, 180]"
    );
    assert_eq!(
        band("bandstop", "150"),
        "spec.toml:7:17: stop_edges_hz is 150, not a list of two numbers; \
         write the lower and the upper one: stop_edges_hz = [48.4, 51.6]"
    );
}

#[test]
fn a_stop_edge_of_another_kind() {
    assert_eq!(
        stage(&format!("kind = 'lowpass'\n{LIMITS}edge_hz = 40\nstop_edges_hz = [50, 60]\norder = 2")),
        "spec.toml:4:1: ripple_db in the lowpass stage: bessel has no pass band ripple to choose; \
         remove it, or choose chebyshev1 or elliptic\n\
         spec.toml:5:1: stop_db in the lowpass stage: bessel has no stop band attenuation to choose; \
         remove it, or choose chebyshev2 or elliptic\n\
         spec.toml:7:1: stop_edges_hz in the lowpass stage: a low-pass or high-pass has one edge; \
         write stop_edge_hz instead"
    );
    assert_eq!(
        refused_json(
            r#"{"stage": [{"kind": "bandpass", "family": "bessel", "order": 2, "edges_hz": [4, 6], "stop_edge_hz": 3}]}"#
        ),
        "spec.json: stage[0].stop_edge_hz: stop_edge_hz in the bandpass stage: it has two edges; \
         write stop_edges_hz instead"
    );
    assert_eq!(
        stage("kind = 'notch'\ncenter_hz = 50\nq = 3\nstop_edge_hz = 40"),
        "spec.toml:5:1: stop_edge_hz in the notch stage: it belongs to lowpass, highpass; \
         remove it, or choose one of these kinds"
    );
}

#[test]
fn limits_of_a_row() {
    assert_eq!(
        stage(&format!("kind = 'bandstop'\n{LIMITS}center_hz = 50\nwidth_hz = 4\nstop_edges_hz = [49, 51]")),
        "spec.toml:6:1: center_hz in the bandstop stage: stop_edges_hz goes with edges_hz alone; \
         write edges_hz with stop_edges_hz, or order in place of stop_edges_hz"
    );
    assert_eq!(
        stage(&format!("kind = 'bandstop'\n{LIMITS}stop_edges_hz = [49, 51]")),
        "spec.toml:1:1: the bandstop stage has no edges_hz; add both edges in hertz"
    );
}
