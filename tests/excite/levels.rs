//! Levels told beforehand against those of the written samples.

use crate::support::{db, reduce, samples, shipped};
use bandproof::excite::{BandLevel, Part, Plan};
use num_complex::Complex64;
use rustfft::FftPlanner;
use std::io::Cursor;

/// Energy spectrum of a whole recording, without a window: mean square a bin, one-sided.
fn whole(samples: &[f64]) -> (Vec<f64>, usize) {
    let length = samples.len().next_power_of_two();
    let mut line: Vec<Complex64> = samples.iter().map(|&x| Complex64::new(x, 0.0)).collect();
    line.resize(length, Complex64::new(0.0, 0.0));
    FftPlanner::new().plan_fft_forward(length).process(&mut line);
    let scale = 2.0 / (length as f64 * samples.len() as f64);
    (line[..length / 2].iter().map(|z| z.norm_sqr() * scale).collect(), length)
}

#[test]
fn each_band_of_each_spec_holds_the_level_that_is_told() {
    for (name, rate_hz) in [("reed-bed.toml", 48_000), ("third-octave.toml", 96_000), ("notch-997.toml", 44_100)] {
        let plan = Plan::new(&shipped(name), rate_hz, 60.0).unwrap();
        let (spectrum, length) = whole(&samples(&plan));
        for band in &plan.bands {
            let bin = |hz: f64| (hz / f64::from(rate_hz) * length as f64).ceil() as usize;
            let line = band.band.line;
            let seen: f64 = spectrum[bin(line.from_hz)..bin(line.to_hz).min(length / 2)].iter().sum();
            let off_db = db(2.0 * seen) - band.level_dbfs;
            // The noise is random: its power in a band of width B over T seconds is a mean of
            // BT squared values, and it beats with the sweep, whose part is fixed.
            let n = (line.to_hz - line.from_hz) * plan.seconds();
            let allowed_db = 4.34 * 4.0 / n.sqrt() + 0.1;
            assert!(off_db.abs() < allowed_db, "{name} {}: off by {off_db:.3} of {allowed_db:.3} dB", band.band.name);
        }
    }
}

#[test]
fn each_part_has_the_level_that_is_told() {
    for (rate_hz, seconds) in [(48_000, 60.0), (96_000, 20.0), (44_100, 120.0)] {
        let plan = Plan::new(&shipped("reed-bed.toml"), rate_hz, seconds).unwrap();
        let written = plan.write(Cursor::new(Vec::new())).unwrap();
        let all = samples(&plan);
        let (sweep, noise) = all.split_at(plan.sweep.frames as usize);
        for (part, level, samples) in [(Part::Sweep, written.sweep, sweep), (Part::Noise, written.noise, noise)] {
            let mean_square = samples.iter().map(|x| x * x).sum::<f64>() / samples.len() as f64;
            assert!((level.mean_square / mean_square - 1.0).abs() < 1e-9);
            assert_eq!(level.peak, samples.iter().fold(0.0f64, |peak, x| peak.max(x.abs())));
            let off_db = db(mean_square / plan.mean_square(part));
            // The slowest sources change every 0.2 s and hold a third of the octaves'
            // mean square in a few hundred values.
            // The sweep's fades lie on a few periods only.
            let allowed_db = if part == Part::Sweep { 0.05 } else { 0.3 };
            assert!(off_db.abs() < allowed_db, "{part:?} at {rate_hz} Hz: {off_db} dB");
        }
    }
}

#[test]
fn the_parts_divide_the_length_as_documented() {
    for (seconds, sweep_s) in [(8.0, 0.4), (60.0, 3.0), (100.0, 5.0), (600.0, 5.0)] {
        let plan = Plan::new(&reduce(100.0, 200.0, 20.0), 8000, seconds).unwrap();
        assert_eq!(plan.sweep.seconds(), sweep_s);
        assert_eq!(plan.part_frames(Part::Sweep) + plan.part_frames(Part::Noise), plan.frames);
    }
}

#[test]
fn a_longer_recording_shows_no_less() {
    let shown = |seconds: f64| {
        let plan = Plan::new(&shipped("third-octave.toml"), 48_000, seconds).unwrap();
        let shown = |band: &BandLevel| band.shown_16_bit_db.zip(band.shown_24_bit_db);
        plan.bands.iter().filter_map(shown).collect::<Vec<_>>()
    };
    let (short, long) = (shown(30.0), shown(300.0));
    assert_eq!(short.len(), 4);
    for ((short_16, short_24), (long_16, long_24)) in short.into_iter().zip(long) {
        assert!(long_16 >= short_16 - 0.01 && long_24 >= short_24 - 0.01);
        assert!(short_24 >= short_16 && long_24 >= long_16);
    }
}

#[test]
fn the_sweep_is_a_twentieth_of_each_bands_energy_and_less_in_long_recordings() {
    // However few octaves the sweep covers of those the noise has.
    for spec in [shipped("reed-bed.toml"), reduce(49.5, 50.5, 60.0), reduce(10_000.0, 20_000.0, 40.0)] {
        for (seconds, share) in [(60.0, 0.05), (100.0, 0.05), (1000.0, 0.005)] {
            let plan = Plan::new(&spec, 192_000, seconds).unwrap();
            for band in &plan.bands {
                let seen = 1.0 - 10f64.powf((band.noise_dbfs - band.level_dbfs) / 10.0);
                // The noise's density has a ripple of 0.55 dB, 14 %.
                assert!((seen / share - 1.0).abs() < 0.15, "{} in {seconds} s: {seen}", band.band.name);
            }
        }
    }
}
