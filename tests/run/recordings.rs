//! Recordings whose truth is known, through the whole program.

use super::fixtures::{Bench, entry, hum_and_noise, wav, wav16};

const SPEC: &str = r#"
[[stage]]
kind = "bandstop"
family = "elliptic"
order = 3
center_hz = 50
width_hz = 6
ripple_db = 0.1
stop_db = 40

[[band]]
name = "hum"
center_hz = 50
span_hz = 1
reduce_db = 30

[[band]]
name = "voice"
from_hz = 200
to_hz = 3000
keep_db = 0.5

[[band]]
name = "rest"
center_hz = 50
span_hz = 1.5
residual_dbfs = -60
"#;

#[test]
fn all_three_verdicts_come_out_for_their_reasons() {
    let bench = Bench::new(SPEC);
    let seconds = 16.0;
    bench.input("hum.wav", &wav16(8000, 1, &hum_and_noise(8000, seconds, 0.3, 1)));
    bench.input("quiet.wav", &wav16(8000, 1, &hum_and_noise(8000, seconds, 0.0, 2)));
    bench.input("short.wav", &wav16(8000, 1, &hum_and_noise(8000, 4.0, 0.3, 3)));
    // The mains have drifted: the line stands at the edge of the stop, not in it.
    let drifted: Vec<f64> = (0..128_000)
        .map(|n| 0.3 * (std::f64::consts::TAU * 52.9 * f64::from(n) / 8000.0).sin())
        .zip(hum_and_noise(8000, seconds, 0.0, 4))
        .map(|(line, noise)| line + noise)
        .collect();
    let wide = SPEC.replace("span_hz = 1\n", "span_hz = 6\n").replace("span_hz = 1.5", "span_hz = 6.5");
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report();
    let band = |path: &str, index: usize| entry(&report, path)["channels"][0]["bands"][index].clone();
    assert_eq!(band("hum.wav", 0)["verdict"], "met", "{}", band("hum.wav", 0));
    assert_eq!(band("hum.wav", 1)["verdict"], "met", "{}", band("hum.wav", 1));
    assert_eq!(band("hum.wav", 2)["verdict"], "met", "{}", band("hum.wav", 2));
    assert_eq!(
        (&band("short.wav", 0)["verdict"], &band("short.wav", 0)["reason_code"]),
        (&"unproven".into(), &"too-short".into())
    );
    assert_eq!(band("quiet.wav", 2)["verdict"], "met", "no line ever: {}", band("quiet.wav", 2));

    let drift = Bench::new(&wide);
    drift.input("drifted.wav", &wav16(8000, 1, &drifted));
    let ran = drift.filter("");
    assert_eq!(ran.status, 1, "{}{}", ran.stdout, ran.stderr);
    let report = drift.report();
    let hum = &entry(&report, "drifted.wav")["channels"][0]["bands"][0];
    assert_eq!(hum["verdict"], "missed", "{hum}");
    assert!((hum["line_hz"].as_f64().unwrap() - 52.9).abs() < 0.05, "{hum}");
    assert_eq!(report["summary"]["verdict"], "missed");
    assert!(ran.stdout.contains("drifted.wav"), "{}", ran.stdout);
}

#[test]
fn channels_are_judged_one_by_one() {
    let bench = Bench::new(SPEC);
    let (left, right) = (hum_and_noise(8000, 16.0, 0.3, 1), hum_and_noise(8000, 16.0, 0.0, 2));
    let both: Vec<f64> = left.iter().zip(&right).flat_map(|(&l, &r)| [l, r]).collect();
    bench.input("two.wav", &wav(8000, 2, 24, &both));
    assert_eq!(bench.filter("").status, 0);
    let report = bench.report();
    let hum = |channel: usize| &entry(&report, "two.wav")["channels"][channel]["bands"][0];
    assert_eq!(hum(0)["verdict"], "met", "{}", hum(0));
    assert_ne!(hum(1)["before_dbfs"], hum(0)["before_dbfs"]);
    assert_eq!(report["summary"]["bands"][0]["name"], "hum");
}

#[test]
fn the_summary_is_the_report_with_json() {
    let bench = Bench::new(SPEC);
    bench.input("hum.wav", &wav16(8000, 1, &hum_and_noise(8000, 16.0, 0.3, 1)));
    let ran = bench.filter("--json");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let printed: serde_json::Value = serde_json::from_str(&ran.stdout).unwrap();
    assert_eq!(printed, bench.report());
    assert_eq!(ran.stderr, "");
}

#[test]
fn tables_fit_a_hundred_columns() {
    let bench = Bench::new(SPEC);
    bench.input(
        "a station with a rather long name/and a folder below/hum recorded on a windy day.wav",
        &wav16(8000, 1, &hum_and_noise(8000, 16.0, 0.3, 1)),
    );
    bench.input("broken.wav", b"RIFF");
    for ran in [bench.filter(""), bench.run("design spec.toml --rate 8000")] {
        for line in ran.stdout.lines() {
            assert!(line.chars().count() <= 100, "{} columns: {line}", line.chars().count());
        }
    }
}

/// Calls of a tenth of a second at 170 Hz, where the stops at 150 and 200 Hz delay by
/// some ten milliseconds, over a little noise.
fn booming(seconds: f64, seed: u64) -> Vec<f64> {
    let mut samples = hum_and_noise(8000, seconds, 0.0, seed);
    for (n, sample) in samples.iter_mut().enumerate() {
        let t = n as f64 / 8000.0;
        let since_call = (t + 0.04 * seed as f64) % 0.41 - 0.2;
        *sample += 0.4 * (-(since_call / 0.04) * (since_call / 0.04)).exp() * (std::f64::consts::TAU * 170.0 * t).sin();
    }
    samples
}

/// A segment shorter than the filter rings sees less of what comes out than went in: the
/// gain read there is low by more than its standard error, and that is no proof.
#[test]
fn a_recording_short_against_the_ringing_is_no_proof_of_a_missed_keep_band() {
    let bench = Bench::new(
        r#"
[[stage]]
kind = "bandstop"
family = "elliptic"
order = 3
center_hz = 50
width_hz = 3.2
harmonics = 8
ripple_db = 0.1
stop_db = 40

[[band]]
name = "between the stops"
from_hz = 155
to_hz = 180
keep_db = 0.15

[[band]]
name = "beside the stops"
from_hz = 90
to_hz = 3000
keep_db = 0.5
except = ["hum"]

[[band]]
name = "hum"
center_hz = 50
span_hz = 0.6
harmonics = 8
reduce_db = 30
"#,
    );
    for index in 0..8 {
        // The filter settles in 2.15 s: less than a second is left.
        let seconds = 2.35 + 0.1 * index as f64;
        bench.input(&format!("{index}.wav"), &wav(8000, 1, 24, &booming(seconds, index)));
    }
    // And long enough to be sure.
    bench.input("long.wav", &wav(8000, 1, 24, &booming(40.0, 99)));
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report();
    for recording in report["recordings"].as_array().unwrap() {
        for band in &recording["channels"][0]["bands"].as_array().unwrap()[..2] {
            let expected =
                if recording["path"] == "long.wav" { band["verdict"] == "met" } else { band["verdict"] != "missed" };
            assert!(expected, "{}: {band}", recording["path"]);
        }
    }
}
