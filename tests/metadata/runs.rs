//! Whole runs over time-expanded recordings.

use crate::chunks::{all_chunks, bodies, expanded_tenfold, guan, tone};
use crate::fixtures::{Bench, entry};
use std::fs;

/// A tone at 40 kHz as it was in the air, 4 kHz as the recording plays.
pub const SPEC: &str = r#"
[[stage]]
kind = "notch"
center_hz = 40_000
width_hz = 2000

[[band]]
name = "tone"
center_hz = 40_000
span_hz = 400
reduce_db = 10

[[band]]
name = "calls"
from_hz = 60_000
to_hz = 150_000
keep_db = 0.5
"#;

/// The same for the recording as it plays.
const SLOW_SPEC: &str = r#"
[[stage]]
kind = "notch"
center_hz = 4000
width_hz = 200

[[band]]
name = "tone"
center_hz = 4000
span_hz = 40
reduce_db = 10

[[band]]
name = "calls"
from_hz = 6000
to_hz = 15_000
keep_db = 0.5
"#;

/// 0.5 s of sound sampled at 384 kHz, expanded tenfold.
pub const FRAMES: usize = 192_000;

pub fn expanded() -> Vec<u8> {
    tone(38_400, 4000.0, FRAMES, &[expanded_tenfold(384_000)], &[])
}

fn bench(rate: &str, spec: &str) -> Bench {
    let bench = Bench::new(&format!("{rate}\n{spec}"));
    bench.input("bat.wav", &expanded());
    bench
}

fn header_rate(file: &[u8]) -> u32 {
    u32::from_le_bytes(bodies(file, b"fmt ")[0][4..8].try_into().unwrap())
}

#[test]
fn without_the_key_the_recording_fails_and_says_what_to_write() {
    let bench = bench("", SLOW_SPEC);
    let sentence = "byte 36: `guan` says that the recording is time-expanded (TE 10, Samplerate 384000): the header's \
                    rate is 38400 Hz, the acoustic rate 384000 Hz; write rate = \"acoustic\" at the top of the spec";
    for dry in ["--dry-run --json", "--dry-run --scan --json"] {
        let ran = bench.filter(dry);
        assert!(ran.stdout.contains(&sentence.replace('"', "\\\"")), "{dry}: {}", ran.stdout);
        assert!(!bench.path("out").exists());
    }
    let words = bench.filter("--dry-run").stdout;
    assert!(words.contains("bat.wav") && words.contains("time-expanded"), "{words}");
    // Another one beside it is done.
    bench.input("bird.wav", &tone(38_400, 4000.0, FRAMES, &[guan(&["GUANO|Version: 1.0", "TE: 1"])], &[]));
    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}{}", ran.stdout, ran.stderr);
    assert!(ran.stderr.contains(sentence), "{}", ran.stderr);
    assert!(!bench.path("out/bat.wav").exists());
    let report = bench.report();
    let bat = entry(&report, "bat.wav");
    assert_eq!((&bat["status"], &bat["input"]), (&"failed".into(), &serde_json::Value::Null));
    assert!(bat["error"].as_str().unwrap().starts_with(sentence));
    assert_eq!(entry(&report, "bird.wav")["status"], "done");
}

#[test]
fn the_acoustic_rate_is_that_of_the_whole_job() {
    let bench = bench("rate = 'acoustic'", SPEC);
    // Sampled at that rate without expansion: one design for both.
    bench.input("direct.wav", &tone(384_000, 40_000.0, FRAMES, &[], &[]));
    let foreseen = bench.filter("--dry-run --scan");
    assert!(foreseen.status == 0 && !foreseen.stdout.contains("time-expanded"), "{}", foreseen.stdout);
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report();
    assert_eq!(report["spec"]["normalized"]["rate"], "acoustic");
    let rates: Vec<_> = report["designs"].as_array().unwrap().iter().map(|design| &design["rate_hz"]).collect();
    assert_eq!(rates, [384_000]);
    let (bat, direct) = (entry(&report, "bat.wav"), entry(&report, "direct.wav"));
    for (recording, expansion) in [(bat, 10.0), (direct, 1.0)] {
        let input = &recording["input"];
        assert_eq!((&input["rate_hz"], &input["time_expansion"]), (&384_000.into(), &expansion.into()));
        assert_eq!((&input["frames"], &input["seconds"]), (&FRAMES.into(), &0.5.into()));
        let tone = &recording["channels"][0]["bands"][0];
        assert_eq!((&tone["name"], &tone["verdict"]), (&"tone".into(), &"met".into()), "{tone}");
        // A bin is at most a tenth of the narrowest band wide.
        assert!((tone["line_hz"].as_f64().unwrap() - 40_000.0).abs() < 40.0, "{tone}");
    }
    // The samples are the same, and so is everything found in them.
    assert_eq!(bat["channels"], direct["channels"]);
    assert_eq!(bat["spectrum"], direct["spectrum"]);
    assert_eq!(
        bat["notes"],
        serde_json::json!([
            "time-expanded (`guan` at byte 36: TE 10, Samplerate 384000); frequencies and times are those \
                            of the sound itself, at 384000 Hz, and the header keeps its 38400 Hz"
        ])
    );
    let (input, output) = (expanded(), fs::read(bench.path("out/bat.wav")).unwrap());
    assert_eq!(header_rate(&output), 38_400);
    let data = bodies(&output, b"data")[0];
    assert_eq!(data, bodies(&fs::read(bench.path("out/direct.wav")).unwrap(), b"data")[0]);
    let differing = all_chunks(&input).into_iter().zip(all_chunks(&output)).filter(|(then, now)| then != now);
    assert_eq!(differing.map(|((id, _), _)| id.to_vec()).collect::<Vec<_>>(), [b"data"]);
}

#[test]
fn the_header_s_rate_is_that_of_the_whole_job() {
    let bench = bench("rate = 'header'", SLOW_SPEC);
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report();
    assert_eq!(report["designs"][0]["rate_hz"], 38_400);
    let bat = entry(&report, "bat.wav");
    let input = &bat["input"];
    assert_eq!((&input["rate_hz"], &input["time_expansion"]), (&38_400.into(), &1.0.into()));
    assert_eq!(input["seconds"], 5.0);
    let tone = &bat["channels"][0]["bands"][0];
    assert!((tone["line_hz"].as_f64().unwrap() - 4000.0).abs() < 4.0, "{tone}");
    assert_eq!(tone["verdict"], "met");
    assert!(bat["notes"][0].as_str().unwrap().ends_with("as it plays, at the header's 38400 Hz"), "{}", bat["notes"]);
    // Frequencies of the sound do not fit below half the header's rate.
    let other = self::bench("rate = 'header'", SPEC);
    assert_eq!(other.filter("").status, 2);
    assert!(!other.path("out").exists());
}

#[test]
fn the_header_keeps_its_rate_when_it_is_written_anew() {
    for (encoding, bytes) in [("pcm24", 3), ("float32", 4)] {
        let bench = bench("rate = 'acoustic'", &format!("output.encoding = '{encoding}'\n{SPEC}"));
        assert_eq!(bench.filter("").status, 0);
        let output = fs::read(bench.path("out/bat.wav")).unwrap();
        assert_eq!(header_rate(&output), 38_400);
        let byte_rate = u32::from_le_bytes(bodies(&output, b"fmt ")[0][8..12].try_into().unwrap());
        assert_eq!(byte_rate, bytes * 38_400);
        assert_eq!(entry(&bench.report(), "bat.wav")["input"]["rate_hz"], 384_000);
    }
}

#[test]
fn a_recheck_takes_the_rate_that_the_report_s_spec_means() {
    for (rate, spec) in [("rate = 'acoustic'", SPEC), ("rate = 'header'", SLOW_SPEC)] {
        let bench = bench(rate, &format!("output.history = true\n{spec}"));
        bench.input("other.wav", &tone(320_000, 40_000.0, 160_000, &[], &[]));
        assert_eq!(bench.filter("").status, 0);
        let ran = bench.run("recheck out/bandproof-report.json --input in --replay --remeasure --csv rows.csv");
        assert_eq!(ran.status, 0, "{rate}: {}{}", ran.stdout, ran.stderr);
        let rows = fs::read_to_string(bench.path("rows.csv")).unwrap();
        let expected = if rate.contains("acoustic") { ",384000,1," } else { ",38400,1," };
        assert!(rows.contains(expected), "{rows}");
    }
}

#[test]
fn a_recheck_holds_the_expansion_against_the_header() {
    let bench = bench("rate = 'acoustic'", SPEC);
    assert_eq!(bench.filter("").status, 0);
    let path = bench.path("out/bandproof-report.json");
    let text = fs::read_to_string(&path).unwrap();
    let other = text.replace("\"time_expansion\": 10.0", "\"time_expansion\": 8.0");
    assert_ne!(text, other);
    fs::write(&path, other).unwrap();
    let ran = bench.run("recheck out/bandproof-report.json --input in --remeasure");
    assert_eq!(ran.status, 1, "{}{}", ran.stdout, ran.stderr);
    assert!(ran.stdout.contains("what the report says of the recording before"), "{}", ran.stdout);
}

/// A report under the other meaning, or under none, is not that of these outputs.
#[test]
fn a_recheck_under_another_meaning_disagrees() {
    let bench = bench("rate = 'acoustic'", SPEC);
    assert_eq!(bench.filter("").status, 0);
    let path = bench.path("out/bandproof-report.json");
    let text = fs::read_to_string(&path).unwrap();
    let other = text.replace("\"rate\": \"acoustic\",", "");
    assert_ne!(text, other);
    fs::write(&path, other).unwrap();
    let ran = bench.run("recheck out/bandproof-report.json --input in --replay");
    assert_eq!(ran.status, 1, "{}{}", ran.stdout, ran.stderr);
    assert!(ran.stdout.contains("time-expanded"), "{}", ran.stdout);
}

#[test]
fn a_contradiction_fails_with_three_figures_and_costs_nothing_else() {
    let bench = bench("rate = 'acoustic'", SPEC);
    bench.input("wrong.wav", &tone(38_400, 4000.0, FRAMES, &[guan(&["TE: 8", "Samplerate: 384000"])], &[]));
    assert_eq!(bench.filter("").status, 3);
    let report = bench.report();
    let error = entry(&report, "wrong.wav")["error"].as_str().unwrap();
    for figure in ["byte 36", "38400 Hz", "TE of 8 is 307200 Hz", "Samplerate says 384000"] {
        assert!(error.contains(figure), "{error}");
    }
    assert_eq!(entry(&report, "bat.wav")["status"], "done");
}

/// `design` knows no recording: its rates are those that frequencies mean.
#[test]
fn design_takes_the_rate_that_frequencies_mean() {
    let bench = bench("rate = 'acoustic'", SPEC);
    let ran = bench.run("design spec.toml --rate 384000 --json");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let document: serde_json::Value = serde_json::from_str(&ran.stdout).unwrap();
    assert_eq!(document["designs"][0]["rate_hz"], 384_000);
}
