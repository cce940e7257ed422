//! Devices of which everything is known, under limits 1 dB above and below what they do.

use crate::fixtures::{Bench, Noise, Ran, wav};
use crate::laws::{FRAMES, RATE, SECONDS, SPEC};
use crate::sound::{Sound, mixed, stop, straight};
use num_complex::Complex64;
use serde_json::Value;

fn noise(rms: f64, seed: u64, frames: usize) -> Vec<f64> {
    let mut noise = Noise(seed);
    // Uniform from -1 to 1 has a mean square of 1/3.
    (0..frames).map(|_| rms * 3f64.sqrt() * noise.next()).collect()
}

/// Measures `after` against the excitation under `spec`; the first channel's bands.
fn judged(spec: &str, after: &[f64], more: &str) -> (Ran, Vec<Value>, Value) {
    let bench = Bench::new(spec);
    bench.write("before.wav", &wav(RATE, 1, 24, &excitation()));
    bench.write("after.wav", &wav(RATE, 1, 24, after));
    bench.write("idle.wav", &wav(RATE, 1, 24, &Sound::new(RATE, 1.0, 1, straight).line(50.0, 1e-3, FRAMES)));
    let ran = bench.run(&format!("measure spec.toml before.wav after.wav {more}"));
    assert!(ran.status <= 1, "{}{}", ran.stdout, ran.stderr);
    let recording = bench.report_at("bandproof-report.json")["recordings"][0].clone();
    (ran, recording["channels"][0]["bands"].as_array().unwrap().clone(), recording["pair"].clone())
}

fn excitation() -> Vec<f64> {
    Sound::new(RATE, SECONDS, 7, straight).samples(0.0, 1.0, FRAMES)
}

fn through(device: impl Fn(f64) -> Complex64) -> Vec<f64> {
    Sound::new(RATE, SECONDS, 7, device).samples(5.0, 1.0, FRAMES)
}

#[test]
fn a_reduction_is_met_and_missed_to_either_side_of_its_limit() {
    // True attenuation 30 dB, under noise of the device that leaves 45 dB to be shown.
    let after = mixed(&through(stop(46.0, 54.0, 30.0)), &noise(0.1 * 10f64.powf(-45.0 / 20.0), 3, FRAMES));
    for (limit, expected, status) in [(29.0, "met", 0), (31.0, "missed", 1)] {
        let spec = SPEC.replace("reduce_db = 30", &format!("reduce_db = {limit}"));
        let (ran, bands, _) = judged(&spec, &after, "");
        assert_eq!(bands[0]["verdict"], expected, "limit {limit}: {}", bands[0]);
        assert_eq!(ran.status, status, "limit {limit}");
    }
}

#[test]
fn what_remains_is_met_and_missed_to_either_side_of_its_limit() {
    let after = through(stop(46.0, 54.0, 30.0));
    let level = judged(SPEC, &after, "").1[2]["after_dbfs"].as_f64().unwrap();
    for (limit, expected) in [(level + 1.0, "met"), (level - 1.0, "missed")] {
        let spec = SPEC.replace("residual_dbfs = -70", &format!("residual_dbfs = {limit:.1}"));
        let bands = judged(&spec, &after, "").1;
        assert_eq!(bands[2]["verdict"], expected, "limit {limit}: {}", bands[2]);
    }
}

#[test]
fn a_gain_is_met_and_missed_to_either_side_of_its_limit() {
    // The device lifts 1000 to 1500 Hz by 2 dB.
    let lift = |hz: f64| Complex64::new(if (1000.0..1500.0).contains(&hz) { 10f64.powf(0.1) } else { 1.0 }, 0.0);
    let after = mixed(&through(lift), &noise(1e-3, 4, FRAMES));
    for (limit, expected) in [(3.0, "met"), (1.0, "missed")] {
        let spec = SPEC.replace("keep_db = 0.5", &format!("keep_db = {limit}"));
        let bands = judged(&spec, &after, "").1;
        assert_eq!(bands[1]["verdict"], expected, "limit {limit}: {}", bands[1]);
        let (least, most) = (bands[1]["gain_min_db"].as_f64().unwrap(), bands[1]["gain_max_db"].as_f64().unwrap());
        assert!(least > -0.5 && (1.9..2.5).contains(&most), "{}", bands[1]);
    }
}

#[test]
fn a_device_that_hums_louder_than_the_notch_is_deep_is_no_proof() {
    // 60 dB deep, but its own hum stands 20 dB under the excitation's hum band.
    let device = through(stop(46.0, 54.0, 60.0));
    let hum = Sound::new(RATE, 1.0, 1, straight).line(50.0, 1e-3, FRAMES);
    let bands = judged(SPEC, &mixed(&device, &hum), "").1;
    let found = (&bands[0]["verdict"], &bands[0]["reason_code"]);
    assert_eq!(found, (&"unproven".into(), &"device-noise".into()), "{}", bands[0]);
    assert!(bands[0]["reason"].as_str().unwrap().contains("--noise"), "{}", bands[0]);
    // The device alone: what it hums is known then, and still hides what would have to be seen.
    let (_, bands, pair) = judged(SPEC, &mixed(&device, &hum), "--noise idle.wav");
    assert_eq!(bands[0]["reason_code"], "device-noise", "{}", bands[0]);
    assert_eq!(pair["noise_sha256"].as_str().map(str::len), Some(64), "{pair}");
}

/// A steady hum of the device in a recording of steady hum is coherent with it by chance;
/// only a recording of the idle device can tell.
#[test]
fn only_a_recording_of_the_idle_device_tells_its_hum_from_the_recordings() {
    let sound = Sound::new(RATE, SECONDS, 7, straight);
    let line = sound.line(50.0, 0.1, FRAMES);
    let before = mixed(&excitation(), &line);
    // Deep for the line, and then the device's own hum of 1e-3.
    let after = mixed(&through(stop(46.0, 54.0, 60.0)), &sound.line(50.0, 1e-3 + 1e-5, FRAMES));
    let bench = Bench::new(&SPEC.replace("reduce_db = 30", "reduce_db = 50"));
    bench.write("before.wav", &wav(RATE, 1, 24, &before));
    bench.write("after.wav", &wav(RATE, 1, 24, &after));
    bench.write("idle.wav", &wav(RATE, 1, 24, &sound.line(50.0, 1e-3, FRAMES)));
    let hum = |more: &str| {
        let ran = bench.run(&format!("measure spec.toml before.wav after.wav --replace {more}"));
        assert!(ran.status <= 1, "{}{}", ran.stdout, ran.stderr);
        bench.report_at("bandproof-report.json")["recordings"][0]["channels"][0]["bands"][0].clone()
    };
    let with = hum("--noise idle.wav");
    assert_eq!((&with["verdict"], &with["reason_code"]), (&"unproven".into(), &"device-noise".into()), "{with}");
    assert_eq!(hum("")["verdict"], "missed");
}

#[test]
fn the_gain_of_the_reference_band_counts_as_nothing() {
    let quieter: Vec<f64> = through(stop(46.0, 54.0, 35.0)).iter().map(|sample| 0.25 * sample).collect();
    let plain = judged(SPEC, &quieter, "").1;
    assert_eq!(plain[1]["verdict"], "missed", "{}", plain[1]);
    // Before and after hold the same sound but for the device: what differs is rounding, some
    // 60 dB under what remains (0.009 dB if it were in phase), and the figures' own.
    assert!((plain[0]["measured_attenuation_db"].as_f64().unwrap() - 47.041).abs() < 0.005, "{}", plain[0]);

    let (_, bands, pair) = judged(&format!("reference_band = \"voice\"\n{SPEC}"), &quieter, "");
    let gain = pair["reference_gain_db"][0].as_f64().unwrap();
    // 20 log10(1/4); the rounding of the samples lies 100 dB under them.
    assert!((gain + 12.041).abs() < 0.002, "{gain}");
    assert_eq!(bands[1]["verdict"], "met", "{}", bands[1]);
    assert!((bands[0]["measured_attenuation_db"].as_f64().unwrap() - 35.0).abs() < 0.005, "{}", bands[0]);
    assert_eq!(bands[0]["verdict"], "met", "{}", bands[0]);
}

#[test]
fn gains_are_held_against_the_design() {
    let stages = r#"
[[stage]]
kind = "highpass"
family = "butterworth"
order = 2
edge_hz = 100
"#;
    let bands = SPEC.replace("reduce_db = 30", "reduce_db = 3");
    // A Butterworth of order 2: its power response, up to phase, by the analog formula; far
    // below half the rate the two agree.
    let ideal = |hz: f64| Complex64::new((1.0 / (1.0 + (100.0 / hz).powi(4))).sqrt(), 0.0);
    let spec = format!("{stages}{bands}");
    let (_, _, pair) = judged(&spec, &through(ideal), "");
    let (off_db, at_hz) = (pair["design_deviation_db"].as_f64().unwrap(), pair["design_deviation_at_hz"].as_f64());
    // The bilinear transform bends the response at 60 Hz by 0.003 dB.
    assert!(off_db.abs() < 0.01, "{pair}");
    assert!((60.0..3500.0).contains(&at_hz.unwrap()), "{pair}");
    // And one that lies 1 dB off between 400 and 500 Hz.
    let off = |hz: f64| ideal(hz) * if (400.0..500.0).contains(&hz) { 10f64.powf(-1.0 / 20.0) } else { 1.0 };
    let (ran, _, pair) = judged(&spec, &through(off), "");
    let (off_db, at_hz) = (pair["design_deviation_db"].as_f64().unwrap(), pair["design_deviation_at_hz"].as_f64());
    assert!((off_db + 1.0).abs() < 0.01, "{pair}");
    assert!((400.0..500.0).contains(&at_hz.unwrap()), "{pair}");
    assert!(ran.stdout.contains("against what the spec's stages would show"), "{}", ran.stdout);
}
