//! Folders, formats, options, and what is written where.

use crate::fixtures::{Bench, entry, wav, wav_float, wav16};
use crate::laws::{FRAMES, RATE, SPEC};
use crate::sound::{Sound, stop, straight};
use std::fs;

fn before_and_after() -> (Vec<f64>, Vec<f64>) {
    let before = Sound::new(RATE, 60.0, 7, straight).samples(0.0, 1.0, FRAMES);
    (before, Sound::new(RATE, 60.0, 7, stop(46.0, 54.0, 40.0)).samples(-12.0, 1.0, FRAMES))
}

#[test]
fn pairs_go_by_path_and_what_has_no_partner_is_listed() {
    let bench = Bench::new(SPEC);
    let (before, after) = before_and_after();
    bench.write("before/a/1.wav", &wav16(RATE, 1, &before));
    bench.write("before/a/lost.wav", &wav16(RATE, 1, &before[..8000]));
    bench.write("before/notes.txt", b"x");
    bench.write("after/a/1.wav", &wav(RATE, 1, 24, &after));
    bench.write("after/b/1.wav", &wav(RATE, 1, 24, &after));
    bench.write("after/._1.wav", b"x");
    let ran = bench.run("measure spec.toml before after");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report_at("bandproof-report.json");
    assert_eq!(report["recordings"].as_array().unwrap().len(), 1);
    let summary = &report["summary"];
    assert_eq!(summary["unpaired"], serde_json::json!({"before": ["a/lost.wav"], "after": ["b/1.wav"]}));
    assert_eq!(summary["skipped"], serde_json::json!({"dot_underscore": 1, "other_files": 1}));
    for name in ["a/lost.wav", "b/1.wav"] {
        assert!(ran.stdout.contains(name), "{}", ran.stdout);
    }
    let pair = &entry(&report, "a/1.wav")["pair"];
    assert_eq!((&pair["path"], &pair["encoding"]), (&"a/1.wav".into(), &"pcm24".into()));
    assert_eq!(pair["delay_frames"], 12.0);
    assert_eq!(pair["overlap_frames"], FRAMES - 12);
    assert_eq!(pair["delay_source"], "found");
    assert_eq!(report["run"]["witness_deviation"], serde_json::Value::Null);
}

#[test]
fn formats_and_lengths_may_differ() {
    let bench = Bench::new(SPEC);
    let (before, after) = before_and_after();
    let float: Vec<f32> = after[..400_000].iter().map(|&sample| sample as f32).collect();
    bench.write("before/1.wav", &wav16(RATE, 1, &before));
    bench.write("after/1.wav", &wav_float(RATE, 1, &float));
    let ran = bench.run("measure spec.toml before after");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report_at("bandproof-report.json");
    let recording = entry(&report, "1.wav");
    assert_eq!(recording["pair"]["overlap_frames"], 400_000 - 12);
    assert_eq!((&recording["input"]["frames"], &recording["pair"]["frames"]), (&480_000.into(), &400_000.into()));
    assert_eq!(recording["channels"][0]["bands"][1]["verdict"], "met", "{recording:#}");
}

#[test]
fn a_delay_that_is_known_is_taken_as_it_is() {
    let bench = Bench::new(SPEC);
    let (before, after) = before_and_after();
    bench.write("before.wav", &wav16(RATE, 1, &before));
    bench.write("after.wav", &wav16(RATE, 1, &after));
    assert_eq!(bench.run("measure spec.toml before.wav after.wav --delay 12").status, 0);
    let pair = bench.report_at("bandproof-report.json")["recordings"][0]["pair"].clone();
    assert_eq!((&pair["delay_frames"], &pair["delay_source"]), (&12.0.into(), &"given".into()), "{pair}");
    assert_eq!(pair["max_delay_s"], serde_json::Value::Null);
}

/// What this program filtered itself gets the same figures as while it was filtered, a gain
/// for the whole dataset included.
#[test]
fn what_filter_wrote_measures_the_same() {
    for gain_db in [0, -7] {
        measures_the_same(gain_db);
    }
}

fn measures_the_same(gain_db: i32) {
    let stages = r#"
[[stage]]
kind = "notch"
center_hz = 50
width_hz = 12
"#;
    let spec = SPEC.replace("reduce_db = 30", "reduce_db = 10");
    let output = format!("[output]\ngain_db = {gain_db}\n");
    let bench = Bench::new(&format!("{output}{stages}{}", spec.replace("from_hz = 60", "from_hz = 100")));
    bench.input("1.wav", &wav16(RATE, 1, &before_and_after().0));
    let filtered = bench.filter("");
    assert!(filtered.status <= 1, "{}", filtered.stderr);
    let ran = bench.run("measure spec.toml in out");
    assert_eq!(ran.status, filtered.status, "{}{}", ran.stdout, ran.stderr);
    let (filter, measure) = (bench.report(), bench.report_at("bandproof-report.json"));
    let band = |report: &serde_json::Value, index: usize| entry(report, "1.wav")["channels"][0]["bands"][index].clone();
    for index in 0..4 {
        let (one, other) = (band(&filter, index), band(&measure, index));
        for key in ["before_dbfs", "before_floor_dbfs", "after_dbfs", "measured_attenuation_db", "verdict"] {
            assert_eq!(one[key], other[key], "{key}: {one} {other}");
        }
    }
    let measured = entry(&measure, "1.wav");
    assert_eq!(measured["pair"]["sha256"], entry(&filter, "1.wav")["output"]["sha256"]);
    assert_eq!(measured["output"], serde_json::Value::Null);
    // The samples' own rounding is what the gains can be off by: 16 bits dithered over white
    // noise 70 dB above, sub-bands of 10 bins and more.
    assert!(measured["pair"]["design_deviation_db"].as_f64().unwrap().abs() < 0.005, "{}", measured["pair"]);
}

/// A delay that was given and that the recordings do not bear out is refused, not judged by.
#[test]
fn a_delay_that_does_not_fit_is_refused() {
    let bench = Bench::new(SPEC);
    let before = before_and_after().0;
    bench.write("before.wav", &wav16(RATE, 1, &before));
    bench.write("after.wav", &wav16(RATE, 1, &before[4000..]));
    let measured = |delay: i32| {
        let ran = bench.run(&format!("measure spec.toml before.wav after.wav --replace --delay {delay}"));
        (ran.status, bench.report_at("bandproof-report.json")["recordings"][0].clone())
    };
    let (_, right) = measured(-4000);
    assert_eq!(right["channels"][0]["bands"][1]["verdict"], "met", "{right:#}");
    let (status, wrong) = measured(0);
    let error = wrong["error"].as_str().unwrap();
    assert_eq!((status, &wrong["status"]), (3, &"failed".into()));
    assert!(error.contains("match in 0 of") && error.contains("check --delay"), "{error}");
}

#[test]
fn the_table_has_the_figures_too() {
    let bench = Bench::new(SPEC);
    let (before, after) = before_and_after();
    bench.write("before/1.wav", &wav16(RATE, 1, &before));
    bench.write("after/1.wav", &wav16(RATE, 1, &after));
    let ran = bench.run("measure spec.toml before after --csv figures.csv");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let table = fs::read_to_string(bench.path("figures.csv")).unwrap();
    assert_eq!(table.lines().count(), 5, "{table}");
    assert!(ran.stdout.contains("Table: figures.csv"), "{}", ran.stdout);
}

#[test]
fn nothing_of_the_users_is_written_over() {
    let bench = Bench::new(SPEC);
    let (before, after) = before_and_after();
    bench.write("before/1.wav", &wav16(RATE, 1, &before[..16_000]));
    bench.write("after/1.wav", &wav16(RATE, 1, &after[..16_000]));
    bench.write("after/alone.wav", &wav16(RATE, 1, &after[..16_000]));
    fs::write(bench.path("bandproof-report.json"), "mine").unwrap();
    let untouched = bench.tree(".");
    for more in [
        "",
        "--report before/1.wav --replace",
        "--report after/1.wav --replace",
        "--report after/alone.wav --replace",
        "--report before/new.json",
        "--report spec.toml --replace",
        "--report r.json --csv r.json",
        "--report r.json --csv after/1.wav --replace",
    ] {
        let ran = bench.run(&format!("measure spec.toml before after {more}"));
        assert_eq!(ran.status, 2, "{more}: {}{}", ran.stdout, ran.stderr);
        assert!(ran.stderr.len() > 20, "{more}: {}", ran.stderr);
        assert_eq!(bench.tree("."), untouched, "{more}");
    }
}
