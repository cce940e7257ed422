//! What must hold for any pair.

use crate::fixtures::{Bench, entry, wav};
use crate::sound::{Sound, stop, straight};
use serde_json::Value;

pub const RATE: u32 = 8000;
pub const SECONDS: f64 = 60.0;
pub const FRAMES: usize = 480_000;

/// A hum band, what stays beside it, and what may remain.
pub const SPEC: &str = r#"
[[band]]
name = "hum"
center_hz = 50
span_hz = 3
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
residual_dbfs = -70

[[band]]
name = "watched"
from_hz = 60
to_hz = 3500
"#;

/// A device with a stop around 50 Hz: before and after as 24-bit samples.
fn pair() -> (Vec<f64>, Sound) {
    let before = Sound::new(RATE, SECONDS, 7, straight).samples(0.0, 1.0, FRAMES);
    (before, Sound::new(RATE, SECONDS, 7, stop(46.0, 54.0, 40.0)))
}

fn measured(bench: &Bench, before: &[f64], after: &[f64]) -> Value {
    bench.write("before.wav", &wav(RATE, 1, 24, before));
    bench.write("after.wav", &wav(RATE, 1, 24, after));
    let ran = bench.run("measure spec.toml before.wav after.wav --replace");
    assert!(ran.status <= 1, "{}{}", ran.stdout, ran.stderr);
    bench.report_at("bandproof-report.json")["recordings"][0].clone()
}

fn bands(recording: &Value) -> &Vec<Value> {
    recording["channels"][0]["bands"].as_array().unwrap()
}

fn verdicts(recording: &Value) -> Vec<Value> {
    bands(recording).iter().map(|band| band["verdict"].clone()).collect()
}

#[test]
fn a_recording_against_itself_shows_no_change() {
    let bench = Bench::new(SPEC);
    let (before, _) = pair();
    let recording = measured(&bench, &before, &before);
    for band in bands(&recording) {
        let hum_or_rest = band["require"].get("reduce_db").or(band["require"].get("residual_dbfs")).is_some();
        assert_eq!(band["measured_attenuation_db"], 0.0, "{band}");
        if !hum_or_rest {
            assert_eq!((&band["gain_min_db"], &band["gain_max_db"]), (&0.0.into(), &0.0.into()), "{band}");
            assert_ne!(band["verdict"], "missed");
        }
    }
    assert_eq!(bands(&recording)[1]["verdict"], "met");
    let lies = &recording["pair"];
    assert_eq!((&lies["delay_frames"], &lies["clock_ppm"]), (&0.0.into(), &0.0.into()), "{lies}");
    assert_eq!(lies["inverted"], false);
}

#[test]
fn swapping_before_and_after_changes_the_sign_of_every_attenuation() {
    let bench = Bench::new(SPEC);
    let (before, device) = pair();
    let after = device.samples(0.0, 1.0, FRAMES);
    let (there, back) = (measured(&bench, &before, &after), measured(&bench, &after, &before));
    for (one, other) in bands(&there).iter().zip(bands(&back)) {
        let (one, other) = (one["measured_attenuation_db"].as_f64(), other["measured_attenuation_db"].as_f64());
        // Each is the difference of two levels rounded to 0.001 dB.
        assert!((one.unwrap() + other.unwrap()).abs() < 1e-9, "{one:?} {other:?}");
    }
    assert_eq!(bands(&there)[0]["verdict"], "met", "{}", bands(&there)[0]);
    assert_eq!(bands(&back)[0]["verdict"], "missed", "{}", bands(&back)[0]);
}

/// How far AFTER lies and how fast its clock runs: delay in frames, and parts in a million.
const LIES: [(f64, f64); 7] =
    [(1.0, 0.0), (0.4, 0.0), (333.25, 0.0), (-700.0, 0.0), (0.0, 3.0), (12_000.5, -3.0), (-250.0, 60.0)];

#[test]
fn delay_polarity_and_clock_change_no_verdict() {
    let bench = Bench::new(SPEC);
    let (before, device) = pair();
    let plain = measured(&bench, &before, &device.samples(0.0, 1.0, FRAMES));
    assert_eq!(verdicts(&plain), ["met".into(), "met".into(), "met".into(), Value::Null], "{plain:#}");
    for (index, (delay, ppm)) in LIES.into_iter().enumerate() {
        let sign = if index % 2 == 0 { -1.0 } else { 1.0 };
        // Frame n before is frame delay + n (1 + ppm 1e-6) after.
        let step = 1.0 / (1.0 + 1e-6 * ppm);
        let after: Vec<f64> = device.samples(-delay * step, step, FRAMES).iter().map(|sample| sign * sample).collect();
        let moved = measured(&bench, &before, &after);
        let lies = &moved["pair"];
        let figure = |key: &str| lies[key].as_f64().unwrap_or_else(|| panic!("{delay} {ppm}: {lies}"));
        assert_eq!(verdicts(&moved), verdicts(&plain), "delay {delay}, clock {ppm}: {moved:#}");
        assert!((figure("delay_frames") - delay).abs() < 0.01, "delay {delay}, clock {ppm}: {lies}");
        assert!((figure("clock_ppm") - ppm).abs() < 0.02, "delay {delay}, clock {ppm}: {lies}");
        assert_eq!(lies["inverted"], sign < 0.0, "delay {delay}, clock {ppm}");
        for (one, other) in bands(&plain).iter().zip(bands(&moved)) {
            for key in ["measured_attenuation_db", "gain_min_db", "gain_max_db"] {
                assert_eq!(one[key].is_null(), other[key].is_null(), "delay {delay}, clock {ppm}: {key}");
                let (Some(one), Some(other)) = (one[key].as_f64(), other[key].as_f64()) else { continue };
                // Gains of up to a tenth of a dB off zero would already stand out of their
                // errors here; levels differ by what comes and goes at the ends.
                assert!((one - other).abs() < 0.05, "delay {delay}, clock {ppm}: {key} {one} {other}");
            }
        }
    }
}

#[test]
fn the_report_does_not_depend_on_the_number_of_jobs() {
    let bench = Bench::new(SPEC);
    let (before, device) = pair();
    for (index, delay) in [0.0, 17.25, -300.0].into_iter().enumerate() {
        bench.write(&format!("before/{index}.wav"), &wav(RATE, 1, 24, &before));
        let after = device.samples(-delay, 1.0, FRAMES);
        bench.write(&format!("after/{index}.wav"), &wav(RATE, 1, 16, &after));
    }
    let report = |jobs: u32| {
        let ran = bench.run(&format!("measure spec.toml before after --replace --jobs {jobs}"));
        assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
        let mut report = bench.report_at("bandproof-report.json");
        report["run"] = Value::Null;
        assert_eq!(entry(&report, "1.wav")["pair"]["path"], "1.wav");
        serde_json::to_string(&report).unwrap()
    };
    assert_eq!(report(1), report(2));
}
