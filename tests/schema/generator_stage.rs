//! Stages as people write them, of every kind.

use crate::generator::{and, frequency, number, row};
use bandproof::spec::{Curve, EqualizerKind, Family, FilterKind};
use proptest::prelude::*;
use proptest::sample::select;
use serde_json::{Value, json};

fn edges() -> impl Strategy<Value = Value> {
    (1.0..9000.0_f64, 1.001..3.0_f64).prop_map(|(low, times)| json!({"edges_hz": [low, low * times]}))
}

/// A filter with an order.
fn ordered() -> impl Strategy<Value = Value> {
    let family = select(Family::ALL).prop_flat_map(|family| {
        let order = 1..=family.highest_order();
        (order, 0.01..12.0_f64, 12.1..200.0_f64).prop_map(move |(order, ripple_db, stop_db)| {
            let mut keys = json!({"family": family.name(), "order": order});
            if family.takes_ripple() {
                keys["ripple_db"] = json!(ripple_db);
            }
            if family.takes_stop() {
                keys["stop_db"] = json!(stop_db);
            }
            keys
        })
    });
    let place = select(FilterKind::ALL).prop_flat_map(|kind| {
        let place = match kind {
            FilterKind::Lowpass | FilterKind::Highpass => frequency().prop_map(|hz| json!({"edge_hz": hz})).boxed(),
            FilterKind::Bandpass => prop_oneof![edges(), row("width_hz", 1)].boxed(),
            FilterKind::Bandstop => prop_oneof![edges(), row("width_hz", 20)].boxed(),
        };
        place.prop_map(move |place| and(json!({"kind": kind.name()}), place))
    });
    (place, family).prop_map(|(place, family)| and(place, family))
}

/// A filter with limits.
fn limited() -> impl Strategy<Value = Value> {
    let gap = || 1.001..3.0_f64;
    let limits = (select(Family::ALL), number(1.0, 12.0), number(13.0, 200.0))
        .prop_map(|(family, ripple, stop)| json!({"family": family.name(), "ripple_db": ripple, "stop_db": stop}));
    (select(FilterKind::ALL), 1.0..500.0_f64, gap(), gap(), gap(), limits).prop_map(|(kind, a, b, c, d, limits)| {
        let (a, b, c, d) = (a, a * b, a * b * c, a * b * c * d);
        let edges = match kind {
            FilterKind::Lowpass => json!({"edge_hz": a, "stop_edge_hz": b}),
            FilterKind::Highpass => json!({"edge_hz": b, "stop_edge_hz": a}),
            FilterKind::Bandpass => json!({"edges_hz": [b, c], "stop_edges_hz": [a, d]}),
            FilterKind::Bandstop => json!({"edges_hz": [a, d], "stop_edges_hz": [b, c]}),
        };
        and(and(json!({"kind": kind.name()}), limits), edges)
    })
}

fn equalizer() -> impl Strategy<Value = Value> {
    let gain_db = prop_oneof![number(-60.0, -0.1), number(0.1, 60.0)];
    let q = number(0.01, 1000.0).prop_map(|q| json!({"q": q}));
    let slope = (0.001..1.0_f64).prop_map(|slope| json!({"slope": slope}));
    (select(EqualizerKind::ALL), frequency(), gain_db, q, proptest::option::of(slope)).prop_map(
        |(kind, hz, gain_db, q, slope)| {
            let (key, shape) = match (kind, slope) {
                (EqualizerKind::Peak, _) => ("center_hz", q),
                (_, slope) => ("edge_hz", slope.unwrap_or(q)),
            };
            and(json!({"kind": kind.name(), key: hz, "gain_db": gain_db}), shape)
        },
    )
}

fn coefficient() -> impl Strategy<Value = Value> {
    number(-5.0, 5.0)
}

fn nonzero() -> impl Strategy<Value = Value> {
    prop_oneof![number(-5.0, -0.001), number(0.001, 5.0)]
}

/// Three or more coefficients of which the first is not 0, or the last.
fn list(is_first: bool, size: impl Into<proptest::collection::SizeRange>) -> impl Strategy<Value = Vec<Value>> {
    (nonzero(), proptest::collection::vec(coefficient(), size)).prop_map(move |(one, mut list)| {
        let at = if is_first { 0 } else { list.len() };
        list.insert(at, one);
        list
    })
}

/// Real roots and conjugate pairs.
fn roots(least: usize, most: usize) -> impl Strategy<Value = Vec<Value>> {
    let part = prop_oneof![
        coefficient().prop_map(|re| vec![re]),
        (coefficient(), 0.001..2.0_f64).prop_map(|(re, im)| vec![json!([re, im]), json!([re, -im])]),
    ];
    proptest::collection::vec(part, least..=most).prop_map(|parts| parts.concat())
}

fn digital() -> impl Strategy<Value = Value> {
    let polynomials = (list(false, 0..9), list(true, 0..9))
        .prop_map(|(numerator, denominator)| json!({"numerator": numerator, "denominator": denominator}));
    let section = (list(false, 2), list(true, 2)).prop_map(|(b, a)| json!({"b": b, "a": a}));
    let sections = proptest::collection::vec(section, 1..5).prop_map(|sections| json!({"sections": sections}));
    let roots = (proptest::option::of(roots(0, 2)), roots(0, 4), nonzero()).prop_map(|(zeros, mut poles, gain)| {
        // No more zeros than poles: what lacks lies at 0.
        let lacking = zeros.as_ref().map_or(0, Vec::len).saturating_sub(poles.len());
        poles.extend(vec![json!(0); lacking]);
        let keys = json!({"poles": poles, "gain": gain});
        if let Some(zeros) = zeros { and(keys, json!({"zeros": zeros})) } else { keys }
    });
    let rate_hz = prop_oneof![Just(json!({})), (1_u32..400_000).prop_map(|hz| json!({"rate_hz": hz}))];
    (prop_oneof![polynomials, sections, roots], rate_hz)
        .prop_map(|(keys, rate_hz)| and(and(json!({"kind": "digital"}), keys), rate_hz))
}

fn analog() -> impl Strategy<Value = Value> {
    let polynomials = (list(false, 0..4), list(true, 3..9))
        .prop_map(|(numerator, denominator)| json!({"numerator": numerator, "denominator": denominator}));
    let roots = (proptest::option::of(roots(0, 2)), roots(4, 6), nonzero(), any::<bool>());
    let roots = roots.prop_map(|(zeros, poles, gain, is_hertz)| {
        let [zeros_key, poles_key] = if is_hertz { ["zeros_hz", "poles_hz"] } else { ["zeros", "poles"] };
        let keys = json!({poles_key: poles, "gain": gain});
        if let Some(zeros) = zeros { and(keys, json!({zeros_key: zeros})) } else { keys }
    });
    let match_hz = prop_oneof![Just(json!({})), frequency().prop_map(|hz| json!({"match_hz": hz}))];
    (prop_oneof![polynomials, roots], match_hz)
        .prop_map(|(keys, match_hz)| and(and(json!({"kind": "analog"}), keys), match_hz))
}

/// A stage that runs forward and backward.
pub fn stage() -> impl Strategy<Value = Value> {
    let notch = row("width_hz", 20).prop_map(|row| and(json!({"kind": "notch"}), row));
    prop_oneof![3 => ordered(), 2 => limited(), 1 => notch, 1 => equalizer()]
}

/// A stage that does not.
pub fn whole_stage() -> impl Strategy<Value = Value> {
    let weighting = select(Curve::ALL).prop_map(|curve| json!({"kind": "weighting", "curve": curve.name()}));
    prop_oneof![1 => weighting, 3 => digital(), 2 => analog()]
}
