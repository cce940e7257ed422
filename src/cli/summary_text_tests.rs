use super::*;
use bandproof::report::{BandEntry, Recording, SummaryBuilder};
use bandproof::spec::SpecSyntax;
use serde_json::{Value, json};

/// The quay of `tests/cli/specs`.
fn spec() -> Spec {
    let bytes = include_bytes!("../../tests/cli/specs/quay.toml");
    bandproof::spec::parse(bytes, SpecSyntax::Toml, "quay.toml").unwrap()
}

/// A band entry from the keys that matter to a summary.
fn entry(name: &str, require: Value, verdict: Value, figures: Value) -> BandEntry {
    let mut all = json!({
        "name": name, "from_hz": 1.0, "to_hz": 2.0, "require": require, "before_dbfs": null,
        "before_floor_dbfs": null, "after_dbfs": null, "after_floor_dbfs": null, "measured_attenuation_db": null,
        "demonstrable_attenuation_db": null, "line_hz": null, "line_before_dbfs": null, "line_after_dbfs": null,
        "gain_min_db": null, "gain_max_db": null, "gain_error_db": null, "resolved": null, "resolution_hz": null,
        "verdict": verdict, "reason_code": null, "reason": null,
    });
    for (key, figure) in figures.as_object().unwrap() {
        all[key] = figure.clone();
    }
    serde_json::from_value(all).unwrap()
}

fn recording(path: &str, bands: Vec<BandEntry>) -> Recording {
    let mut recording = Recording::failed(path, "");
    recording.status = bandproof::report::Status::Done;
    recording.error = None;
    recording.channels = vec![bandproof::report::ChannelEntry { channel: 1, bands }];
    recording
}

fn design(rate_hz: u32) -> DesignEntry {
    DesignEntry::new(&bandproof::design::design(&spec(), rate_hz).unwrap(), "triangular-1", None).unwrap()
}

fn outcome(recordings: &[Recording], rates: &[u32]) -> Outcome {
    let mut builder = SummaryBuilder::new(&spec()).unwrap();
    recordings.iter().for_each(|recording| builder.add(recording));
    let skipped = bandproof::report::Skipped { dot_underscore: 1, other_files: 3 };
    let (summary, highlights) = builder.finish(skipped);
    Outcome {
        summary,
        highlights,
        found: None,
        designs: rates.iter().map(|&rate_hz| design(rate_hz)).collect(),
        report_path: Some("quiet/bandproof-report.json".into()),
        table_path: None,
        package: Vec::new(),
        seconds: 12.4,
        bytes_read: 1_240_000_000,
        complete: true,
        kept: 0,
        not_done: 0,
        dry: None,
    }
}

fn hum(line: u32, verdict: &str, figures: Value) -> BandEntry {
    entry(&format!("generator x{line}"), json!({"reduce_db": 30.0}), json!(verdict), figures)
}

fn mixed() -> Vec<Recording> {
    let whistles = |verdict: &str, low: f64, high: f64| {
        let figures = json!({"gain_min_db": low, "gain_max_db": high});
        entry("whistles", json!({"keep_db": 0.5}), json!(verdict), figures)
    };
    let beacon = |verdict: &str, level: f64| {
        entry("beacon", json!({"residual_dbfs": -90.0}), json!(verdict), json!({"after_dbfs": level}))
    };
    let swell = entry("swell", Value::Null, Value::Null, json!({"gain_min_db": -1.4, "gain_max_db": -0.2}));
    let short = json!({"reason_code": "too-short", "reason": "the recording lasts 5.0 s"});
    let met = |db: f64| json!({"measured_attenuation_db": db});
    vec![
        recording(
            "pier-1/0001.wav",
            vec![
                hum(1, "met", met(54.8)),
                hum(2, "met", met(41.0)),
                hum(3, "missed", json!({"measured_attenuation_db": 29.996, "reason": "what remains is a line"})),
                whistles("met", -0.05, 0.01),
                beacon("met", -101.25),
                swell.clone(),
            ],
        ),
        recording(
            "pier-1/0002.wav",
            vec![
                hum(1, "unproven", short.clone()),
                hum(2, "unproven", short.clone()),
                hum(3, "unproven", short),
                whistles("missed", -0.7, 0.1),
                beacon("missed", -80.5),
                swell,
            ],
        ),
        Recording::failed("pier-2/0001\u{7}.wav", "it holds no frames (empty)"),
    ]
}

#[test]
fn a_summary_looks_like_this() {
    let text = text(&spec(), &outcome(&mixed(), &[48_000]), Palette::OFF);
    assert_eq!(text, include_str!("../../tests/cli/snapshots/summary.txt"), "\n{text}");
}

#[test]
fn no_line_is_wider_than_a_hundred_columns() {
    let text = text(&spec(), &outcome(&mixed(), &[48_000, 192_000]), Palette::OFF);
    for line in text.lines() {
        assert!(line.chars().count() <= WIDTH, "{line}");
    }
    assert!(!text.contains('\u{7}'), "control characters of names stay out");
}

#[test]
fn a_figure_just_short_is_not_rounded_to_the_limit() {
    let text = text(&spec(), &outcome(&mixed(), &[48_000]), Palette::OFF);
    assert!(text.contains("down by 29.996 dB, 30 dB required"), "{text}");
}

#[test]
fn rates_are_told_apart_where_there_are_several() {
    let text = text(&spec(), &outcome(&mixed(), &[22_050, 48_000]), Palette::OFF);
    let lines: Vec<_> = text.lines().filter(|line| line.contains("still carry it")).collect();
    assert!(lines.iter().any(|line| line.ends_with("still carry it.")), "alike at both: {text}");
    let apart = startup_text(|s| s * 1.5);
    assert!(apart.contains("(at 22050 Hz)") && apart.contains("(at 48000 Hz)"), "{apart}");
}

/// The start-up lines of two rates, those of the second changed by `change`.
fn startup_text(change: impl Fn(f64) -> f64) -> String {
    let (one, mut other) = (design(22_050), design(48_000));
    for band in &mut other.bands {
        band.startup_s = band.startup_s.and_then(|s| bandproof::report::Seconds::new(change(s.get())));
    }
    startup(&[one, other], Palette::OFF)
}

#[test]
fn a_line_that_goes_at_once_or_never_is_told_so() {
    assert!(startup_text(|_| f64::NAN).contains("never comes down"), "no start-up time: never");
    assert!(!startup_text(|_| 0.0).contains("48000"), "none to speak of");
}

#[test]
fn lines_of_a_row_that_missed_alike_are_told_together() {
    let missed = |line, db: f64| hum(line, "missed", json!({"measured_attenuation_db": db}));
    let recordings = [recording("a.wav", vec![missed(1, 2.0), missed(2, 7.5), missed(3, 4.0)])];
    let text = text(&spec(), &outcome(&recordings, &[48_000]), Palette::OFF);
    assert!(text.contains("generator x1 to x3: down by 2 to 7.5 dB, 30 dB required"), "{text}");
}

#[test]
fn a_run_in_which_all_went_well_is_short() {
    let well = [recording("a.wav", vec![hum(1, "met", json!({"measured_attenuation_db": 54.8}))])];
    let text = text(&spec(), &outcome(&well, &[48_000]), Palette::OFF);
    for part in ["Missed\n", "Failed", "Unproven, and"] {
        assert!(!text.contains(part), "{text}");
    }
    assert!(text.starts_with("1 of 1 recording filtered and measured: 1.24 GB read in 12.4 s, 100 MB a second."));
}

#[test]
fn an_interrupted_run_says_that_it_is_not_all() {
    let whole = outcome(&mixed(), &[48_000]);
    assert!(!text(&spec(), &whole, Palette::OFF).contains("Interrupted"));
    let part = Outcome { complete: false, not_done: 9, ..whole };
    assert!(text(&spec(), &part, Palette::OFF).contains("\nInterrupted with 9 recordings not done"));
}

#[test]
fn every_reason_names_what_it_would_take() {
    let codes = [
        ReasonCode::NothingThere,
        ReasonCode::TooShort,
        ReasonCode::TooQuiet,
        ReasonCode::LoudNeighbor,
        ReasonCode::Unsettled,
        ReasonCode::OutOfRange,
    ];
    for code in codes {
        assert_ne!(needed(Some(code), None), needed(None, None), "{code:?}");
    }
    // A recording as long as the summary says must suffice.
    assert!(needed(Some(ReasonCode::TooShort), Some(12.21)).contains("12.3 s"));
}

#[test]
fn no_length_is_asked_for_that_a_recording_has() {
    let short = json!({"reason_code": "too-short", "reason": "a longer recording would narrow it down"});
    let told = |seconds: u64| {
        let mut one = recording("a.wav", vec![hum(1, "unproven", short.clone())]);
        one.input = Some(bandproof::report::Input {
            sha256: None,
            bytes: 96_044 * seconds,
            rate_hz: 48_000,
            channels: 1,
            encoding: "pcm16".to_owned(),
            frames: 48_000 * seconds,
            seconds: bandproof::report::Seconds::of_frames(48_000 * seconds, 48_000),
            full_scale_runs: Some(0),
            time_expansion: bandproof::report::Finite::try_from(1.0).unwrap(),
        });
        text(&spec(), &outcome(&[one], &[48_000]), Palette::OFF)
    };
    // generator x1 takes 11.8 s at this rate.
    assert!(told(5).contains("Needed: longer recordings, of 11.8 s at the least."), "{}", told(5));
    assert!(told(60).contains("Needed: longer recordings. The first"), "{}", told(60));
}
