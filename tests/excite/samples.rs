//! Samples: the same as a second writing of the formulas gives, sweep in tune, no clicks.

use crate::support::{SCALE, db, parsed, reduce, samples, shipped, spectrum};
use bandproof::excite::{PEAK, Part, Pink, Plan};
use proptest::prelude::*;
use serde_json::Value;
use sha2::{Digest as _, Sha256};
use std::io::Cursor;

/// `tests/reference/excite.py`: the formulas written again with Python's integers and math
/// module, spectra with SciPy 1.17.1.
fn reference() -> Vec<Value> {
    let document: Value = serde_json::from_str(include_str!("../reference/excite.json")).unwrap();
    document["cases"].as_array().unwrap().clone()
}

fn planned(case: &Value) -> Plan {
    let figure = |key: &str| case[key].as_f64().unwrap();
    let spec = reduce(figure("lowest_edge_hz"), figure("highest_edge_hz"), 10.0);
    Plan::new(&spec, figure("rate_hz") as u32, figure("seconds")).unwrap()
}

fn integers(list: &Value) -> Vec<i32> {
    list.as_array().unwrap().iter().map(|value| value.as_i64().unwrap() as i32).collect()
}

#[test]
fn every_sample_is_that_of_the_formulas() {
    for case in reference() {
        let plan = planned(&case);
        assert_eq!(plan.frames, case["frames"].as_u64().unwrap());
        assert_eq!(u64::from(plan.pink.octaves), case["octaves"].as_u64().unwrap());
        let written: Vec<i32> = plan.samples().collect();
        assert_eq!(written[..24], integers(&case["sweep_samples"]), "start of the sweep");
        let steady = (plan.sweep.frames + plan.fade.frames) as usize;
        assert_eq!(written[steady..steady + 24], integers(&case["noise_samples"]), "noise after its fade");
        let bytes: Vec<u8> = written.iter().flat_map(|sample| sample.to_le_bytes()[..3].to_vec()).collect();
        let hash: String = Sha256::digest(&bytes).iter().map(|byte| format!("{byte:02x}")).collect();
        assert_eq!(hash, case["data_sha256"].as_str().unwrap());
    }
}

#[test]
fn the_bytes_of_a_file_stay_what_they_are() {
    // Committed with the first version of the generator: a change needs a new name.
    let plan = Plan::new(&shipped("reed-bed.toml"), 48_000, 12.0).unwrap();
    let mut file = Cursor::new(Vec::new());
    plan.write(&mut file).unwrap();
    let hash: String = Sha256::digest(file.get_ref()).iter().map(|byte| format!("{byte:02x}")).collect();
    assert_eq!(hash, "f815afe4214c1c865683fd17dcabda11316b742477beacec3cdb9d2afef4322e");
    assert_eq!(bandproof::excite::GENERATOR_NAME, "pink-octaves-1");
}

#[test]
fn scipy_sees_the_noise_as_promised() {
    for case in reference() {
        let plan = planned(&case);
        for band in case["octave_bands"].as_array().unwrap() {
            let figure = |key: &str| band[key].as_f64().unwrap();
            let (from_hz, to_hz) = (figure("from_hz"), figure("to_hz"));
            // Bins from k to 2k - 1 hold what lies half a bin lower.
            let half_bin_hz = f64::from(plan.rate_hz) / 4096.0 / 2.0;
            let promised = plan.pink.power(from_hz - half_bin_hz, to_hz - half_bin_hz);
            // Mean of n squared values: n = segments times bins over 2.76.
            let segments = plan.part_frames(Part::Noise) as f64 / 2048.0 - 1.0;
            let n = segments * (to_hz - from_hz) / (2.0 * half_bin_hz) / 2.76;
            let allowed_db = 4.34 * 4.0 / n.sqrt() + 0.02;
            let off_db = db(figure("mean_square") / promised);
            assert!(off_db.abs() < allowed_db, "{from_hz} Hz: off by {off_db} dB, {allowed_db} allowed");
        }
    }
}

#[test]
fn the_density_is_pink_within_its_tolerance_and_adds_up_to_the_mean_square() {
    for (rate_hz, lowest_hz) in [(8000, 5.0), (48_000, 5.0), (96_000, 0.2), (384_000, 40.0)] {
        let plan = Plan::new(&reduce(2.0 * lowest_hz, 2000.0, 10.0), rate_hz, 60.0).unwrap();
        let pink = plan.pink;
        assert!(pink.lowest_hz() <= lowest_hz && pink.lowest_hz() > lowest_hz / 2.0, "{pink:?}");
        let half_hz = f64::from(rate_hz) / 2.0;
        let mut worst_db: f64 = 0.0;
        for point in 0..=20_000 {
            let hz = pink.lowest_hz() * (half_hz / pink.lowest_hz()).powf(f64::from(point) / 20_000.0);
            worst_db = worst_db.max(db(pink.density(hz) / pink.line(hz)).abs());
        }
        assert!(worst_db < Pink::TOLERANCE_DB, "{worst_db}");
        // The tolerance is no more than it has to be.
        assert!(worst_db > 0.8 * Pink::TOLERANCE_DB, "{worst_db}");
        let edge_hz = pink.lowest_hz() / 64.0;
        let whole = pink.power(0.0, edge_hz) + pink.power(edge_hz, half_hz);
        assert!(db(whole / pink.mean_square()).abs() < 0.01, "{}", db(whole / pink.mean_square()));
    }
}

#[test]
fn an_octave_of_written_noise_is_as_loud_as_the_next() {
    // Third octaves from 40 Hz to 20 kHz, 60 s at 48 kHz.
    let plan = Plan::new(&shipped("reed-bed.toml"), 48_000, 60.0).unwrap();
    let all = samples(&plan);
    let noise = &all[(plan.sweep.frames + plan.fade.frames) as usize..];
    let length = 48_000;
    let spectra = spectrum(noise, length);
    let segments = noise.len() as f64 / (length as f64 / 2.0) - 1.0;
    let mut place = 16;
    while place < 43 {
        let edge = |place: i32| 10f64.powf((f64::from(place) - 0.5) / 10.0).round();
        let (from_hz, to_hz) = (edge(place), edge(place + 1));
        let seen: f64 = spectra.sxx[from_hz as usize..to_hz as usize].iter().sum();
        let pink: f64 = plan.pink.line(1.0f64.max(plan.pink.lowest_hz()))
            * plan.pink.lowest_hz().max(1.0)
            * ((to_hz - 0.5) / (from_hz - 0.5)).ln();
        let chance_db = 4.34 * 4.0 / (segments * (to_hz - from_hz) / 2.76).sqrt();
        let off_db = db(seen / pink);
        assert!(off_db.abs() < Pink::TOLERANCE_DB + chance_db, "{from_hz} to {to_hz} Hz: {off_db} dB");
        place += 1;
    }
}

#[test]
fn the_sweep_has_the_frequency_it_should_have_at_each_time() {
    let plan = Plan::new(&shipped("reed-bed.toml"), 48_000, 60.0).unwrap();
    let all = samples(&plan);
    let rate_hz = f64::from(plan.rate_hz);
    assert_eq!((plan.sweep.from_hz, plan.sweep.to_hz), (5.0, 23_520.0));
    // From memory: f1 (f2/f1)^(t/T).
    for part in [0.0f64, 0.25, 0.5, 1.0] {
        let wanted_hz = 5.0 * (23_520.0f64 / 5.0).powf(part);
        let told_hz = plan.sweep.frequency_hz(3.0 * part);
        assert!((told_hz / wanted_hz - 1.0).abs() < 1e-12, "{told_hz} {wanted_hz}");
    }
    for at_s in [1.5, 1.8, 2.2, 2.6] {
        // Upward zero crossings in 20 ms around it, interpolated, give the mean frequency.
        let middle = (at_s * rate_hz) as usize;
        let crossings: Vec<f64> = (middle - 480..middle + 480)
            .filter(|&n| all[n] < 0.0 && all[n + 1] >= 0.0)
            .map(|n| n as f64 + all[n] / (all[n] - all[n + 1]))
            .collect();
        let (first, last) = (crossings[0], crossings[crossings.len() - 1]);
        let seen_hz = (crossings.len() - 1) as f64 / (last - first) * rate_hz;
        let wanted_hz = plan.sweep.frequency_hz((first + last) / 2.0 / rate_hz);
        // Within 20 ms the mean of an exponential lies 1e-4 above its middle; the
        // interpolation of a crossing is off by 0.02 frames at most up to 6 kHz.
        assert!((seen_hz / wanted_hz - 1.0).abs() < 3e-4, "{at_s} s: {seen_hz} Hz for {wanted_hz} Hz");
    }
}

#[test]
fn the_sweep_rises_an_octave_in_the_time_it_tells() {
    let plan = Plan::new(&shipped("notch-997.toml"), 44_100, 20.0).unwrap();
    let octave_s = plan.sweep.octave_s();
    let ratio = plan.sweep.frequency_hz(1.0 + octave_s) / plan.sweep.frequency_hz(1.0);
    assert!((ratio - 2.0).abs() < 1e-12, "{ratio}");
}

#[test]
fn parts_begin_and_end_softly() {
    let plan = Plan::new(&shipped("reed-bed.toml"), 48_000, 60.0).unwrap();
    assert_eq!(plan.fade.frames, 2400);
    let all: Vec<i32> = plan.samples().collect();
    let turn = plan.sweep.frames as usize;
    let end = all.len();
    for (name, edge) in [
        ("start", &all[..24]),
        ("end of the sweep", &all[turn - 24..turn]),
        ("start of the noise", &all[turn..turn + 24]),
        ("end", &all[end - 24..]),
    ] {
        // 24 frames into a fade of 2400: sin^2(pi/2 / 100) is 2.5e-4 of the peak.
        let largest = edge.iter().map(|sample| sample.unsigned_abs()).max().unwrap();
        assert!(f64::from(largest) / SCALE <= 2.5e-4 * PEAK, "{name}: {largest}");
    }
    // Half-way through a fade a part has half its amplitude, and the next frame after it all.
    let sweep = plan.sweep;
    let full = |frame: usize| {
        let t = frame as f64 / 48_000.0;
        let turns = 5.0 * 3.0 / (23_520.0f64 / 5.0).ln() * (sweep.frequency_hz(t) / 5.0 - 1.0);
        sweep.peak * (std::f64::consts::TAU * turns).sin()
    };
    for (frame, factor) in [(1200, 0.5), (2400, 1.0), (100_000, 1.0)] {
        let sample = f64::from(all[frame]) / SCALE;
        assert!((sample - factor * full(frame)).abs() < 1e-3, "{frame}: {sample} {}", full(frame));
    }
}

#[test]
fn no_sample_passes_the_peak_and_the_noise_gets_there() {
    // The noise is at its peak once in 2^15 frames at 48 kHz.
    for (name, rate_hz) in [("reed-bed.toml", 48_000), ("third-octave.toml", 96_000)] {
        let plan = Plan::new(&shipped(name), rate_hz, 60.0).unwrap();
        let limit = (PEAK * SCALE) as u32;
        let largest = |part: &[i32]| part.iter().map(|sample| sample.unsigned_abs()).max().unwrap();
        let all: Vec<i32> = plan.samples().collect();
        let (sweep, noise) = all.split_at(plan.sweep.frames as usize);
        assert!(f64::from(largest(sweep)) <= plan.sweep.peak * SCALE + 0.5 && largest(sweep) < limit);
        assert_eq!(largest(noise), limit);
    }
}

#[test]
fn crest_factor_is_what_the_number_of_sources_makes_it() {
    let plan = Plan::new(&shipped("reed-bed.toml"), 48_000, 60.0).unwrap();
    assert_eq!(plan.pink.octaves, 15);
    let crest_db = db(PEAK * PEAK / plan.pink.mean_square());
    // (13 + 2.28)^2 / (13 + 2 * 1.2996)
    assert!((crest_db - 11.7514).abs() < 0.001, "{crest_db}");
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn any_plan_keeps_its_promises(
        rate_hz in 400u32..50_000,
        seconds in 0.8f64..6.0,
        low in 0.002f64..0.2,
        width in 0.05f64..0.3,
    ) {
        let half_hz = f64::from(rate_hz) / 2.0;
        let spec = reduce(low * half_hz, (low + width) * half_hz, 6.0);
        let plan = Plan::new(&spec, rate_hz, seconds).unwrap();
        let all: Vec<i32> = plan.samples().collect();
        prop_assert_eq!(all.len() as u64, plan.frames);
        prop_assert_eq!(plan.frames % 2, 0);
        prop_assert!((plan.seconds() - seconds).abs() <= 1.5 / f64::from(rate_hz));
        let limit = (PEAK * SCALE) as u32;
        prop_assert!(all.iter().all(|sample| sample.unsigned_abs() <= limit));
        prop_assert!(plan.sweep.from_hz <= low * half_hz / 2.0 * (1.0 + 1e-12));
        prop_assert!(plan.sweep.to_hz < half_hz);
        prop_assert!(plan.pink.lowest_hz() <= plan.sweep.from_hz);
    }
}

#[test]
fn a_band_from_0_hz_is_covered_from_a_twentieth_of_its_end() {
    let spec = parsed("[[band]]\nname = \"rumble\"\nfrom_hz = 0\nto_hz = 40\nreduce_db = 20\n");
    let plan = Plan::new(&spec, 8000, 30.0).unwrap();
    assert_eq!((plan.sweep.from_hz, plan.sweep.to_hz), (2.0, 80.0));
    assert!(plan.bands[0].level_dbfs.is_finite() && plan.bands[0].shown_16_bit_db.is_some_and(f64::is_finite));
}
