//! How a report looks, and that its bytes depend on nothing but its content.

use crate::samples::{self, band, db, done, reduce};
use bandproof::report::{BandEntry, Recording, Verdict};
use bandproof::spec::Requirement;
use proptest::prelude::*;

#[test]
fn a_small_report_looks_like_this() {
    let spec = samples::spec(&[
        ("pump hum x1", Requirement::Reduce { reduce_db: 30.0 }),
        ("bird calls", Requirement::Keep { keep_db: 0.5, except: Vec::new() }),
    ]);
    let recordings = [
        done("station-a/0512.wav", vec![vec![samples::hum(), samples::calls()]]),
        Recording::failed("station-b/0513.wav", "it holds no frames (empty)"),
    ];
    let bytes = samples::written(&spec, &recordings);
    let expected = include_str!("small.json");
    assert_eq!(String::from_utf8(bytes).unwrap(), expected, "see tests/report/small.json");
}

#[test]
fn a_report_without_recordings_is_valid_too() {
    let text = String::from_utf8(samples::written(&samples::spec(&[]), &[])).unwrap();
    assert!(text.contains("\n  \"recordings\": [],\n"), "{text}");
    assert!(serde_json::from_str::<serde_json::Value>(&text).is_ok());
    assert!(text.ends_with("}\n"));
}

fn verdict() -> impl Strategy<Value = Verdict> {
    prop_oneof![Just(Verdict::Met), Just(Verdict::Missed), Just(Verdict::Unproven)]
}

fn recording(number: usize) -> impl Strategy<Value = Recording> {
    let channel = (verdict(), -20.0..80.0f64).prop_map(|(verdict, figure)| {
        let reason = (verdict == Verdict::Unproven).then(|| format!("figure {figure}"));
        vec![BandEntry { measured_attenuation_db: db(figure), reason, ..band("hum", reduce(30.0), Some(verdict)) }]
    });
    (proptest::collection::vec(channel, 1..4), any::<bool>()).prop_map(move |(channels, fails)| {
        let path = format!("{number:02}.wav");
        if fails { Recording::failed(path, "it is damaged") } else { done(&path, channels) }
    })
}

fn shuffled() -> impl Strategy<Value = (Vec<Recording>, Vec<Recording>)> {
    let recordings: Vec<_> = (0..6).map(recording).collect();
    recordings.prop_flat_map(|recordings| (Just(recordings.clone()), Just(recordings).prop_shuffle()))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn the_order_in_which_recordings_finish_never_changes_a_byte((one, other) in shuffled()) {
        let spec = samples::spec(&[("hum", Requirement::Reduce { reduce_db: 30.0 })]);
        prop_assert_eq!(samples::written(&spec, &one), samples::written(&spec, &other));
    }

    #[test]
    fn nor_does_it_change_what_a_person_is_told((one, other) in shuffled()) {
        let spec = samples::spec(&[("hum", Requirement::Reduce { reduce_db: 30.0 })]);
        let told = |recordings: &[Recording]| {
            let mut builder = bandproof::report::SummaryBuilder::new(&spec).unwrap();
            recordings.iter().for_each(|recording| builder.add(recording));
            builder.finish(Default::default())
        };
        prop_assert_eq!(told(&one), told(&other));
    }
}
