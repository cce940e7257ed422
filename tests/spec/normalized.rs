//! The normalized spec as it stands in reports.

use super::examples::REED_BED_TOML;

#[test]
fn every_default_is_filled_in() {
    let spec = crate::read(
        "[[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 30\n[[band]]\nname = 'b'\nfrom_hz = 90\nto_hz = 100\nkeep_db = 1",
    );
    assert_eq!(
        serde_json::to_string(&spec).unwrap(),
        r#"{"beyond_half_rate":"error","phase":"causal","output":{"encoding":"same","dither":"triangular","overload":"refuse","gain_db":0.0,"history":false},"stage":[{"kind":"notch","center_hz":50.0,"q":30.0,"harmonics":1}],"band":[{"name":"b","from_hz":90.0,"to_hz":100.0,"keep_db":1.0,"except":[]}]}"#
    );
}

#[test]
fn keys_stand_in_a_fixed_order() {
    let json = serde_json::to_value(crate::read(REED_BED_TOML)).unwrap();
    let keys = |value: &serde_json::Value| value.as_object().unwrap().keys().cloned().collect::<Vec<_>>();
    assert_eq!(
        keys(&json),
        ["title", "beyond_half_rate", "reference_band", "rate", "phase", "output", "stage", "band"]
    );
    assert_eq!(
        keys(&json["stage"][1]),
        ["kind", "family", "order", "center_hz", "width_hz", "harmonics", "ripple_db", "stop_db"]
    );
    assert_eq!(keys(&json["band"][0]), ["name", "center_hz", "span_hz", "harmonics", "reduce_db"]);
}

#[test]
fn minus_zero_becomes_zero() {
    let spec = crate::read("output.gain_db = -0.0\n[[band]]\nname = 'b'\nfrom_hz = -0.0\nto_hz = 100");
    let json = serde_json::to_string(&spec).unwrap();
    assert!(json.contains(r#""gain_db":0.0"#) && json.contains(r#""from_hz":0.0"#), "{json}");
}
