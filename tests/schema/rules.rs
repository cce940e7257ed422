//! Each rule of the keys that a schema can say, said by reader and schema alike, so that a rule
//! that is lost is named.

use crate::agreement::{Outcome, judge};
use serde_json::{Value, json};
use std::collections::BTreeMap;

fn assert_all(outcome: Outcome, documents: &[Value]) {
    for document in documents {
        assert_eq!(judge(document, &mut BTreeMap::new()), outcome, "{document}");
    }
}

/// A spec of one stage: `keys` over those of `stage`, null for one that is not there.
fn with(stage: Value, keys: Value) -> Value {
    let mut stage = stage;
    for (key, value) in keys.as_object().unwrap() {
        if value.is_null() {
            stage.as_object_mut().unwrap().shift_remove(key);
        } else {
            stage[key] = value.clone();
        }
    }
    json!({"stage": [stage]})
}

#[test]
fn each_rule_of_filters_and_bands_is_said_by_both() {
    let filter = |keys: Value| {
        with(json!({"kind": "bandstop", "family": "butterworth", "order": 2, "edges_hz": [40, 60]}), keys)
    };
    let notch = |keys: Value| with(json!({"kind": "notch", "center_hz": 50}), keys);
    let band = |keys: Value| {
        let mut band = json!({"name": "a"});
        band.as_object_mut().unwrap().extend(keys.as_object().unwrap().clone());
        json!({"band": [band]})
    };
    let wrong = [
        json!({}),
        json!({"title": "a"}),
        json!({"stage": [], "band": []}),
        json!([]),
        filter(json!({"kind": null})),
        filter(json!({"kind": "comb"})),
        filter(json!({"family": null})),
        filter(json!({"order": null})),
        filter(json!({"order": 2.5})),
        filter(json!({"order": 21})),
        filter(json!({"family": "elliptic", "ripple_db": 1, "stop_db": 40, "order": 15})),
        filter(json!({"ripple_db": 1})),
        filter(json!({"stop_db": 40})),
        filter(json!({"family": "chebyshev1"})),
        filter(json!({"family": "chebyshev1", "ripple_db": 1, "stop_db": 40})),
        filter(json!({"family": "chebyshev2"})),
        filter(json!({"family": "chebyshev2", "ripple_db": 1, "stop_db": 40})),
        filter(json!({"family": "elliptic", "ripple_db": 1})),
        filter(json!({"family": "elliptic", "stop_db": 40})),
        filter(json!({"edges_hz": null})),
        filter(json!({"edges_hz": [40]})),
        filter(json!({"edges_hz": [40, 50, 60]})),
        filter(json!({"edge_hz": 40})),
        filter(json!({"center_hz": 50})),
        filter(json!({"harmonics": 2})),
        filter(json!({"edges_hz": null, "center_hz": 50})),
        filter(json!({"edges_hz": null, "width_hz": 2})),
        filter(json!({"edges_hz": null, "center_hz": 50, "width_hz": 2, "q": 25})),
        filter(json!({"edges_hz": null, "center_hz": 50, "span_hz": 2})),
        filter(json!({"kind": "lowpass"})),
        filter(json!({"kind": "lowpass", "edge_hz": 40})),
        filter(json!({"kind": "highpass", "edges_hz": null, "edge_hz": 40, "q": 2})),
        notch(json!({})),
        notch(json!({"q": 0.5})),
        notch(json!({"q": 30, "width_hz": 2})),
        notch(json!({"q": 30, "family": "bessel"})),
        notch(json!({"q": 30, "order": 2})),
        notch(json!({"q": 30, "harmonics": 501})),
        notch(json!({"q": 30, "harmonics": 0})),
        band(json!({})),
        band(json!({"from_hz": 1})),
        band(json!({"from_hz": 1, "to_hz": 2, "center_hz": 1.5})),
        band(json!({"from_hz": 1, "to_hz": 2, "harmonics": 1})),
        band(json!({"center_hz": 5})),
        band(json!({"center_hz": 5, "span_hz": 1, "q": 5})),
        band(json!({"center_hz": 5, "width_hz": 1})),
        band(json!({"from_hz": 1, "to_hz": 2, "reduce_db": 1, "keep_db": 1})),
        band(json!({"from_hz": 1, "to_hz": 2, "reduce_db": 1, "residual_dbfs": -1})),
        band(json!({"from_hz": 1, "to_hz": 2, "keep_db": 1, "residual_dbfs": -1})),
        band(json!({"from_hz": 1, "to_hz": 2, "residual_dbfs": 1})),
        band(json!({"from_hz": 1, "to_hz": 2, "except": []})),
        band(json!({"from_hz": 1, "to_hz": 2, "reduce_db": 1, "except": []})),
        band(json!({"from_hz": 1, "to_hz": 2, "keep_db": 1, "except": "b"})),
    ];
    assert_all(Outcome::BothReject, &wrong);
    let right = [
        filter(json!({})),
        filter(json!({"order": 20})),
        filter(json!({"edges_hz": null, "center_hz": 50, "q": 25})),
        filter(json!({"edges_hz": null, "center_hz": 50, "width_hz": 2, "harmonics": 3})),
        filter(json!({"kind": "lowpass", "edges_hz": null, "edge_hz": 40})),
        notch(json!({"q": 30, "harmonics": 30})),
        band(json!({"center_hz": 5, "q": 5})),
        band(json!({"from_hz": 0, "to_hz": 2, "keep_db": 1, "except": []})),
    ];
    assert_all(Outcome::BothAccept, &right);
}

#[test]
fn each_rule_of_limits_is_said_by_both() {
    let one = json!({
        "kind": "lowpass", "family": "butterworth", "edge_hz": 40, "stop_edge_hz": 60, "ripple_db": 1, "stop_db": 40,
    });
    let two = json!({
        "kind": "bandpass", "family": "elliptic", "edges_hz": [40, 60], "stop_edges_hz": [30, 70],
        "ripple_db": 1, "stop_db": 40,
    });
    let (low, band) = (|keys: Value| with(one.clone(), keys), |keys: Value| with(two.clone(), keys));
    let wrong = [
        low(json!({"family": null})),
        low(json!({"order": 2})),
        low(json!({"stop_edge_hz": null})),
        low(json!({"edge_hz": null})),
        low(json!({"ripple_db": null})),
        low(json!({"stop_db": null})),
        low(json!({"stop_db": 3.0103})),
        low(json!({"ripple_db": 12.5})),
        low(json!({"stop_edge_hz": 0})),
        low(json!({"stop_edge_hz": [60]})),
        low(json!({"stop_edge_hz": null, "stop_edges_hz": [30, 70]})),
        low(json!({"kind": "notch"})),
        band(json!({"order": 2})),
        band(json!({"ripple_db": null})),
        band(json!({"stop_db": null})),
        band(json!({"stop_edges_hz": [30]})),
        band(json!({"stop_edges_hz": [0, 70]})),
        band(json!({"stop_edges_hz": null, "stop_edge_hz": 70})),
        band(json!({"edges_hz": null})),
        band(json!({"edges_hz": null, "center_hz": 50, "width_hz": 20})),
        band(json!({"edges_hz": null, "center_hz": 50, "q": 2})),
        band(json!({"harmonics": 1})),
    ];
    assert_all(Outcome::BothReject, &wrong);
    let right = [
        low(json!({})),
        low(json!({"family": "chebyshev1"})),
        low(json!({"kind": "highpass", "stop_edge_hz": 30})),
        band(json!({})),
        band(json!({"kind": "bandstop", "stop_edges_hz": [48, 52]})),
        band(json!({"stop_edges_hz": null, "order": 14})),
    ];
    assert_all(Outcome::BothAccept, &right);
}

#[test]
fn each_rule_of_peaks_shelves_and_curves_is_said_by_both() {
    let peak = |keys: Value| with(json!({"kind": "peak", "center_hz": 500, "gain_db": 3, "q": 2}), keys);
    let shelf = |keys: Value| with(json!({"kind": "lowshelf", "edge_hz": 500, "gain_db": 3, "slope": 1}), keys);
    let curve = |keys: Value| with(json!({"kind": "weighting", "curve": "A"}), keys);
    let wrong = [
        peak(json!({"center_hz": null})),
        peak(json!({"gain_db": null})),
        peak(json!({"q": null})),
        peak(json!({"q": null, "slope": 1})),
        peak(json!({"slope": 1})),
        peak(json!({"q": 0.009})),
        peak(json!({"q": 1000.5})),
        peak(json!({"gain_db": 0})),
        peak(json!({"gain_db": -0.0})),
        peak(json!({"gain_db": 60.5})),
        peak(json!({"gain_db": -60.5})),
        peak(json!({"edge_hz": 500})),
        peak(json!({"harmonics": 2})),
        peak(json!({"gain": 2})),
        shelf(json!({"edge_hz": null})),
        shelf(json!({"center_hz": 500})),
        shelf(json!({"slope": null})),
        shelf(json!({"slope": 0})),
        shelf(json!({"slope": 1.001})),
        shelf(json!({"q": 1})),
        shelf(json!({"order": 2})),
        curve(json!({"curve": null})),
        curve(json!({"curve": "a"})),
        curve(json!({"curve": "B"})),
        curve(json!({"q": 1})),
    ];
    assert_all(Outcome::BothReject, &wrong);
    let right = [
        peak(json!({})),
        peak(json!({"q": 0.01, "gain_db": -60})),
        shelf(json!({})),
        shelf(json!({"kind": "highshelf", "slope": null, "q": 1000})),
        curve(json!({"curve": "riaa"})),
    ];
    assert_all(Outcome::BothAccept, &right);
}

#[test]
fn each_rule_of_transfer_functions_is_said_by_both() {
    let digital = |keys: Value| with(json!({"kind": "digital"}), keys);
    let analog = |keys: Value| with(json!({"kind": "analog"}), keys);
    let polynomials =
        |numerator: Value, denominator: Value| digital(json!({"numerator": numerator, "denominator": denominator}));
    let section = |section: Value| digital(json!({"sections": [section]}));
    let many = |size: usize, item: Value| Value::Array(vec![item; size]);
    let wrong = [
        digital(json!({})),
        analog(json!({})),
        digital(json!({"numerator": [1]})),
        digital(json!({"denominator": [1]})),
        polynomials(json!([]), json!([1])),
        polynomials(json!([1]), json!([])),
        polynomials(json!([0, 0]), json!([1])),
        polynomials(json!([1]), json!([0, 1])),
        polynomials(json!([1]), json!(["1"])),
        polynomials(json!([1]), json!([1, null])),
        polynomials(json!([[1, 0]]), json!([1])),
        polynomials(json!(1), json!([1])),
        polynomials(many(65, json!(1)), json!([1])),
        digital(json!({"numerator": [1], "denominator": [1], "gain": 1})),
        digital(json!({"numerator": [1], "denominator": [1], "poles": []})),
        digital(json!({"numerator": [1], "denominator": [1], "match_hz": 5})),
        digital(json!({"numerator": [1], "denominator": [1], "rate_hz": 0})),
        digital(json!({"numerator": [1], "denominator": [1], "rate_hz": 44_100.5})),
        digital(json!({"numerator": [1], "denominator": [1], "rate_hz": "48000"})),
        analog(json!({"numerator": [1], "denominator": [1, 1], "rate_hz": 48_000})),
        digital(json!({"sections": []})),
        digital(json!({"sections": many(65, json!({"b": [1, 0, 0], "a": [1, 0, 0]}))})),
        digital(json!({"sections": [{"b": [1, 0, 0], "a": [1, 0, 0]}], "gain": 1})),
        section(json!([1, 0, 0, 1, 0, 0])),
        section(json!({"b": [1, 0, 0]})),
        section(json!({"b": [1, 0], "a": [1, 0, 0]})),
        section(json!({"b": [1, 0, 0], "a": [1, 0, 0, 0]})),
        section(json!({"b": [0, 0, 0], "a": [1, 0, 0]})),
        section(json!({"b": [1, 0, 0], "a": [0, 1, 0]})),
        section(json!({"b": [1, 0, 0], "a": [1, 0, 0], "g": 1})),
        digital(json!({"poles": [0.5]})),
        digital(json!({"zeros": [0.5], "gain": 1})),
        digital(json!({"poles": [0.5], "gain": 0})),
        digital(json!({"poles": [[0.5]], "gain": 1})),
        digital(json!({"poles": [[0.5, 0, 0]], "gain": 1})),
        digital(json!({"poles": ["0.5"], "gain": 1})),
        digital(json!({"poles": many(65, json!(0.5)), "gain": 1})),
        digital(json!({"poles_hz": [0.5], "gain": 1})),
        analog(json!({"sections": [{"b": [1, 0, 0], "a": [1, 0, 0]}]})),
        analog(json!({"poles": [], "gain": 1})),
        analog(json!({"poles_hz": [], "gain": 1})),
        analog(json!({"zeros": [1], "poles_hz": [1], "gain": 1})),
        analog(json!({"poles": [1], "poles_hz": [1], "gain": 1})),
        analog(json!({"poles": [1], "gain": 1, "match_hz": 0})),
        analog(json!({"numerator": [1], "denominator": [0, 1]})),
    ];
    assert_all(Outcome::BothReject, &wrong);
    let right = [
        polynomials(json!([0, 1]), json!([1, 0])),
        polynomials(many(64, json!(1)), many(64, json!(1))),
        section(json!({"b": [0, 0, 1], "a": [2, 0, 0]})),
        digital(json!({"poles": [], "gain": 1})),
        digital(json!({"zeros": [[1, 2], [1, -2], [3, 0]], "poles": [0, 0, 0], "gain": -1})),
        analog(json!({"zeros": [], "poles": [-1], "gain": 1, "match_hz": 50})),
        analog(json!({"poles_hz": [-1], "gain": 1})),
        analog(json!({"numerator": [0, 0, 1], "denominator": [1, 1]})),
    ];
    assert_all(Outcome::BothAccept, &right);
}

#[test]
fn each_rule_of_auto_and_phase_is_said_by_both() {
    let hum = json!({"name": "hum", "from_hz": 49, "to_hz": 51, "reduce_db": 30});
    let whine = json!({"name": "whine", "from_hz": 900, "to_hz": 910, "residual_dbfs": -90});
    let notch = json!({"kind": "notch", "center_hz": 50, "q": 9});
    let curve = json!({"kind": "weighting", "curve": "A"});
    let wrong = [
        json!({"design": "auto"}),
        json!({"auto": {}}),
        json!({"design": "auto", "stage": [notch]}),
        json!({"design": "auto", "stage": [notch], "band": [hum]}),
        json!({"auto": {}, "stage": [notch], "band": [hum]}),
        json!({"design": "auto", "band": [{"name": "a", "from_hz": 1, "to_hz": 2, "keep_db": 1}]}),
        json!({"design": "auto", "band": [hum, whine]}),
        json!({"design": "manual", "band": [hum]}),
        json!({"design": true, "band": [hum]}),
        json!({"auto": true, "band": [hum]}),
        json!({"auto": {"order": 3}, "band": [hum]}),
        json!({"auto": {"family": "comb"}, "band": [hum]}),
        json!({"auto": {"max_sections": 0}, "band": [hum]}),
        json!({"auto": {"max_sections": 201}, "band": [hum]}),
        json!({"auto": {"max_sections": 2.5}, "band": [hum]}),
        json!({"phase": "linear", "stage": [notch]}),
        json!({"phase": "zero", "stage": [notch, curve]}),
        json!({"phase": "zero", "stage": [{"kind": "digital", "numerator": [1], "denominator": [1]}]}),
        json!({"phase": "zero", "stage": [{"kind": "analog", "numerator": [1], "denominator": [1]}]}),
    ];
    assert_all(Outcome::BothReject, &wrong);
    let right = [
        json!({"design": "auto", "band": [hum]}),
        json!({"auto": {}, "stage": [], "band": [hum]}),
        json!({"design": "auto", "auto": {"family": "bessel", "max_sections": 200}, "phase": "zero", "band": [hum]}),
        json!({"phase": "causal", "stage": [curve]}),
        json!({"phase": "zero", "stage": [notch], "band": [whine]}),
    ];
    assert_all(Outcome::BothAccept, &right);
}
