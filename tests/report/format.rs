//! The keys, what they hold and their order, against types of their own: a key
//! added, renamed or dropped by accident fails here.

use crate::samples;
use bandproof::report::{Recording, write_report};
use bandproof::spec::Requirement;
use serde::Deserialize;
use std::collections::BTreeMap;

macro_rules! mirror {
    ($($name:ident { $($key:ident: $type:ty),* $(,)? })*) => {$(
        #[derive(Debug, Deserialize)]
        #[serde(deny_unknown_fields)]
        #[allow(dead_code)] // reading them is the test
        struct $name { $($key: $type),* }
    )*};
}

mirror! {
    Report {
        report: String, format: u32, tool_version: String, level_reference: String, run: Run, complete: bool,
        spec: Spec, designs: Vec<Design>, recordings: Vec<Entry>, summary: Summary,
    }
    Run { started: String, seconds: f64, jobs: u32, witness_deviation: Option<f64> }
    Spec { title: Option<String>, file_sha256: String, normalized: serde_json::Value }
    Design {
        rate_hz: u32, left_out: Vec<LeftOut>, stages: Vec<Stage>, sections: Vec<Section>, passes: u32,
        settling_s: f64, max_pole_radius: f64, rounding_db: f64, rounding_at_hz: Option<f64>, dither: String,
        bands: Vec<DesignBand>, witness: Option<Witness>, methods: Methods,
    }
    LeftOut { what: String, reason: String }
    Stage {
        stage: u32, line: Option<u32>, kind: String, family: Option<String>, order: Option<u32>, total_order: u32,
        sections: u32, edges_hz: Vec<f64>, ripple_db: Option<f64>, stop_db: Option<f64>, limits: Vec<Limit>,
        remarks: Vec<String>,
    }
    Limit { edge: String, at_hz: f64, limit_db: f64, slack_db: f64 }
    Section { b: [f64; 3], a: [f64; 3] }
    DesignBand {
        name: String, from_hz: f64, to_hz: f64, require: Option<BTreeMap<String, f64>>, attenuation_min_db: f64,
        attenuation_max_db: f64, reaches_from_hz: Option<f64>, reaches_to_hz: Option<f64>, excepted_hz: f64,
        group_delay_s: Option<f64>, startup_s: Option<f64>, shortest_s: Option<f64>, check: Option<String>,
        violation: Option<Violation>,
    }
    Violation { at_hz: f64, gain_db: f64 }
    Witness { agrees: bool, bands: Vec<WitnessBand> }
    WitnessBand { name: String, attenuation_min_db: f64, attenuation_max_db: f64 }
    Methods {
        sentence: String, program: String, applied: bool, rate_hz: u32, design: Option<String>, total_order: u32,
        sections: u32, passes: u32, direction: String, causal: bool, phase: String,
        start_state: Option<String>,
        settling_s: f64, arithmetic: Option<String>, dither: String, stages: Vec<MethodsStage>, bands: Vec<MethodsBand>,
    }
    MethodsStage {
        stage: u32, kind: String, family: Option<String>, order: Option<u32>, total_order: u32, sections: u32,
        edge_definition: Option<String>, ripple_db: Option<f64>, stop_db: Option<f64>, lines: Vec<MethodsLine>,
    }
    MethodsLine { line: Option<u32>, edges_hz: Vec<f64>, transitions: Vec<Transition> }
    Transition {
        pass_hz: Option<f64>, pass_db: f64, stop_hz: Option<f64>, stop_db: Option<f64>, width_hz: Option<f64>,
    }
    MethodsBand {
        name: String, from_hz: f64, to_hz: f64, require: Option<BTreeMap<String, f64>>, attenuation_db: Option<f64>,
        deviation_db: Option<f64>, group_delay_s: Option<f64>,
    }
    Entry {
        path: String, status: String, error: Option<String>, notes: Vec<String>, input: Option<Input>,
        output: Option<Output>, chunks: Vec<Chunk>, spectrum: Option<Spectrum>, pair: Option<Pair>,
        channels: Vec<Channel>,
    }
    Input {
        sha256: Option<String>, bytes: u64, rate_hz: u32, channels: u16, encoding: String, frames: u64,
        seconds: f64, full_scale_runs: Option<u64>, time_expansion: f64,
    }
    Output {
        path: String, sha256: String, bytes: u64, encoding: String, peak_dbfs: Option<f64>, clipped_samples: u64,
        gain_db: f64,
    }
    Chunk { id: String, bytes: u64, kept: bool }
    Spectrum { window: String, segment_frames: u64, segments: u64, bin_hz: f64, skipped_s: f64 }
    Pair {
        path: String, sha256: Option<String>, bytes: u64, encoding: String, frames: u64, full_scale_runs: Option<u64>,
        delay_frames: Option<f64>, delay_source: Option<String>, max_delay_s: Option<f64>, clock_ppm: Option<f64>,
        clock_error_ppm: Option<f64>, delay_scatter_s: Option<f64>,
        inverted: Option<bool>, overlap_frames: Option<u64>, noise_sha256: Option<String>, reference_gain_db: Option<Vec<f64>>,
        design_deviation_db: Option<f64>, design_deviation_error_db: Option<f64>, design_deviation_at_hz: Option<f64>,
    }
    Channel { channel: u16, bands: Vec<Band> }
    Band {
        name: String, from_hz: f64, to_hz: f64, require: Option<BTreeMap<String, f64>>,
        before_dbfs: Option<f64>, before_floor_dbfs: Option<f64>, after_dbfs: Option<f64>,
        after_floor_dbfs: Option<f64>, measured_attenuation_db: Option<f64>,
        demonstrable_attenuation_db: Option<f64>, line_hz: Option<f64>, line_before_dbfs: Option<f64>,
        line_after_dbfs: Option<f64>, gain_min_db: Option<f64>, gain_max_db: Option<f64>,
        gain_error_db: Option<f64>, resolved: Option<f64>, resolution_hz: Option<f64>, verdict: Option<String>,
        reason_code: Option<String>, reason: Option<String>,
    }
    Summary {
        recordings: u64, done: u64, failed: u64, skipped: Skipped, unpaired: Option<Unpaired>,
        bands: Vec<BandSummary>, verdict: String,
    }
    Unpaired { before: Vec<String>, after: Vec<String> }
    Skipped { dot_underscore: u64, other_files: u64 }
    BandSummary {
        name: String, met: u64, missed: u64, unproven: u64, worst_db: Option<f64>, median_db: Option<f64>,
    }
}

fn spec() -> bandproof::spec::Spec {
    samples::spec(&[
        ("pump hum x1", Requirement::Reduce { reduce_db: 30.0 }),
        ("bird calls", Requirement::Keep { keep_db: 0.5, except: Vec::new() }),
    ])
}

fn recordings() -> Vec<Recording> {
    vec![
        samples::done("station-a/0512.wav", vec![vec![samples::hum(), samples::calls()]]),
        Recording::failed("station-b/0513.wav", "it holds no frames (empty)"),
        samples::paired("station-c/0514.wav", vec![vec![samples::hum(), samples::calls()]]),
    ]
}

#[test]
fn every_key_is_known_and_every_known_key_is_there() {
    let bytes = samples::written(&spec(), &recordings());
    let report: Report = serde_json::from_slice(&bytes).unwrap();
    assert_eq!((report.report.as_str(), report.format, report.complete), ("bandproof", 1, true));
    assert_eq!(report.level_reference, "0 dBFS is the level of a full-scale sine; not sound pressure");
    assert_eq!(report.run.witness_deviation, Some(3.1e-11));
    let design = &report.designs[0];
    assert_eq!(design.sections[0].a[2], 0.1 + 0.2, "coefficients come back as the same bits");
    assert_eq!(design.bands[0].check.as_deref(), Some("guaranteed"));
    let limits: Vec<_> = design.stages[0].limits.iter().map(|one| (one.edge.as_str(), one.at_hz)).collect();
    assert_eq!(limits, [("pass", 48.4), ("pass", 51.6), ("stop", 49.5), ("stop", 50.5)]);
    assert_eq!(design.stages[0].remarks, ["a remark on this stage"]);
    let entry = &report.recordings[0];
    assert_eq!((entry.path.as_str(), entry.status.as_str()), ("station-a/0512.wav", "done"));
    let spectrum = entry.spectrum.as_ref().unwrap();
    assert_eq!((spectrum.window.as_str(), spectrum.bin_hz, spectrum.skipped_s), ("blackman-harris-4", 0.1, 2.2));
    let [hum, calls] = entry.channels[0].bands.as_slice() else { panic!("two bands") };
    assert_eq!(hum.require.as_ref().unwrap()["reduce_db"], 30.0);
    assert_eq!(calls.require.as_ref().unwrap()["keep_db"], 0.5);
    assert_eq!((calls.verdict.as_deref(), calls.reason_code.as_deref()), (Some("unproven"), Some("nothing-there")));
    let failed = &report.recordings[1];
    assert_eq!((failed.status.as_str(), failed.error.as_deref()), ("failed", Some("it holds no frames (empty)")));
    assert!(failed.output.is_none() && failed.channels.is_empty());
    let [_, _, paired] = report.recordings.as_slice() else { panic!("three recordings") };
    let pair = paired.pair.as_ref().unwrap();
    assert_eq!((pair.delay_frames, pair.delay_source.as_deref()), (Some(1441.25), Some("found")));
    assert!(entry.pair.is_none() && paired.output.is_none());
    assert_eq!((report.summary.done, report.summary.failed), (2, 1));
    assert!(report.summary.unpaired.is_none());
    let methods = &design.methods;
    assert_eq!((methods.applied, methods.stages[0].edge_definition.as_deref()), (true, Some("ripple-ends")));
    assert_eq!(methods.stages[0].lines[0].transitions[1].width_hz, Some(1.17));
    assert_eq!(report.summary.verdict, "unproven");
}

/// Keys of an object in the order in which they are written.
fn keys(value: &serde_json::Value) -> Vec<&str> {
    value.as_object().unwrap().keys().map(String::as_str).collect()
}

#[test]
fn keys_stand_in_their_fixed_order() {
    let report: serde_json::Value = serde_json::from_slice(&samples::written(&spec(), &recordings())).unwrap();
    let top = "report format tool_version level_reference run complete spec designs recordings summary";
    let design = "rate_hz left_out stages sections passes settling_s max_pole_radius rounding_db rounding_at_hz dither \
                  bands witness methods";
    let methods = "sentence program applied rate_hz design total_order sections passes direction causal phase \
                   start_state settling_s arithmetic dither stages bands";
    let stage = "stage kind family order total_order sections edge_definition ripple_db stop_db lines";
    let pair = "path sha256 bytes encoding frames full_scale_runs delay_frames delay_source max_delay_s clock_ppm \
                clock_error_ppm delay_scatter_s inverted overlap_frames noise_sha256 reference_gain_db \
                design_deviation_db design_deviation_error_db design_deviation_at_hz";
    let design_band = "name from_hz to_hz require attenuation_min_db attenuation_max_db reaches_from_hz \
                       reaches_to_hz excepted_hz group_delay_s startup_s shortest_s check violation";
    let recording = "path status error notes input output chunks spectrum pair channels";
    let input = "sha256 bytes rate_hz channels encoding frames seconds full_scale_runs time_expansion";
    let output = "path sha256 bytes encoding peak_dbfs clipped_samples gain_db";
    let band = "name from_hz to_hz require before_dbfs before_floor_dbfs after_dbfs after_floor_dbfs \
                measured_attenuation_db demonstrable_attenuation_db line_hz line_before_dbfs line_after_dbfs \
                gain_min_db gain_max_db gain_error_db resolved resolution_hz verdict reason_code reason";
    let first = &report["recordings"][0];
    for (value, expected) in [
        (&report, top),
        (&report["run"], "started seconds jobs witness_deviation"),
        (&report["spec"], "title file_sha256 normalized"),
        (&report["designs"][0], design),
        (
            &report["designs"][0]["stages"][0],
            "stage line kind family order total_order sections edges_hz ripple_db stop_db limits remarks",
        ),
        (&report["designs"][0]["stages"][0]["limits"][0], "edge at_hz limit_db slack_db"),
        (&report["designs"][0]["bands"][0], design_band),
        (&report["designs"][0]["methods"], methods),
        (&report["designs"][0]["methods"]["stages"][0], stage),
        (&report["designs"][0]["methods"]["stages"][0]["lines"][0], "line edges_hz transitions"),
        (
            &report["designs"][0]["methods"]["stages"][0]["lines"][0]["transitions"][0],
            "pass_hz pass_db stop_hz stop_db width_hz",
        ),
        (
            &report["designs"][0]["methods"]["bands"][0],
            "name from_hz to_hz require attenuation_db deviation_db group_delay_s",
        ),
        (first, recording),
        (&report["recordings"][2]["pair"], pair),
        (&report["recordings"][1], recording),
        (&first["input"], input),
        (&first["output"], output),
        (&first["chunks"][0], "id bytes kept"),
        (&first["spectrum"], "window segment_frames segments bin_hz skipped_s"),
        (&first["channels"][0]["bands"][0], band),
        (&report["summary"], "recordings done failed skipped unpaired bands verdict"),
        (&report["summary"]["bands"][0], "name met missed unproven worst_db median_db"),
    ] {
        assert_eq!(keys(value), expected.split_whitespace().collect::<Vec<_>>());
    }
}

#[test]
fn recordings_read_back_as_they_were_written() {
    for recording in recordings() {
        let text = serde_json::to_string(&recording).unwrap();
        assert_eq!(serde_json::from_str::<Recording>(&text).unwrap(), recording);
        let more = text.replacen('{', "{\"colour\": 1, ", 1);
        assert!(serde_json::from_str::<Recording>(&more).unwrap_err().to_string().contains("colour"));
    }
}

#[test]
fn a_damaged_recording_is_an_error_that_says_which() {
    let lines = [serde_json::to_string(&recordings()[0]).unwrap(), "{\"path\": \"b.wav\"}".to_owned()];
    let (summary, _) =
        bandproof::report::SummaryBuilder::new(&spec()).unwrap().finish(bandproof::report::Skipped::default());
    let error = write_report(&mut Vec::new(), &samples::head(), lines.into_iter().map(Ok), &summary).unwrap_err();
    assert_eq!(error.kind(), std::io::ErrorKind::InvalidData);
    assert!(error.to_string().contains("entry 2"), "{error}");
}

#[test]
fn recordings_without_a_partner_are_named_in_the_summary() {
    let (summary, _) = bandproof::report::SummaryBuilder::new(&spec()).unwrap().finish(Default::default());
    let unpaired = bandproof::report::Unpaired { before: vec!["a.wav".to_owned()], after: Vec::new() };
    let summary = bandproof::report::Summary { unpaired: Some(unpaired), ..summary };
    let mirror: Summary = serde_json::from_str(&serde_json::to_string(&summary).unwrap()).unwrap();
    let unpaired = mirror.unpaired.unwrap();
    assert_eq!((unpaired.before, unpaired.after), (vec!["a.wav".to_owned()], Vec::new()));
}

#[test]
fn a_coefficient_that_is_not_finite_never_becomes_null() {
    let mut head = samples::head();
    head.designs[0].sections[0].b[1] = f64::NAN;
    let (summary, _) =
        bandproof::report::SummaryBuilder::new(&spec()).unwrap().finish(bandproof::report::Skipped::default());
    let error = write_report(&mut Vec::new(), &head, std::iter::empty(), &summary).unwrap_err();
    assert_eq!(error.kind(), std::io::ErrorKind::InvalidData);
    assert!(error.to_string().contains("NaN"), "{error}");
}
