//! Floors against what a band without content really reads.

use crate::support::{Biquad, Noise, RATE, Take, add_line, db, frames, reduce, rounding_power};
use bandproof::evidence::BandTask;

/// Levels and floors after, of a recording that is `after` and nothing else.
fn after_levels(after: Vec<f64>, rounding: f64, band: &BandTask, length: usize) -> (Option<f64>, Option<f64>) {
    let take = Take {
        rate_hz: RATE,
        before: vec![0.0; after.len()],
        after,
        rounding_before: 0.0,
        rounding_after: rounding,
        gain: 1.0,
        skipped: 0,
    };
    let spectra = take.spectra_of(std::slice::from_ref(band), length);
    let figures = take.judge_with(&spectra, band);
    (figures.after_dbfs, figures.after_floor_dbfs)
}

#[test]
fn the_rounding_floor_is_what_dither_alone_reads() {
    let take = Take::silence16(300.0, 1);
    for (from_hz, to_hz) in [(100.0, 200.0), (1000.0, 4000.0)] {
        let figures = take.judge_one(&reduce(from_hz, to_hz, 10.0));
        let expected = db(2.0 * 3.0 * rounding_power(16) * (to_hz - from_hz) / 4000.0);
        // Spread of 100 bins in 595 segments: 0.03 dB.
        assert!((figures.after_dbfs.unwrap() - expected).abs() < 0.1, "{expected} {figures:#?}");
        // Never above its level, and above the rounding only by what noise beside the
        // band leaks (counted twice at most: some bins of a hundred).
        assert!(figures.after_floor_dbfs.unwrap() <= figures.after_dbfs.unwrap());
        assert!(figures.after_floor_dbfs.unwrap() > expected - 0.1, "{expected} {figures:#?}");
    }
}

#[test]
fn the_leakage_floor_bounds_the_leakage_of_a_line_wherever_it_lies() {
    // Bins of 1 Hz. The worst place is half-way between two bins; one bin and more
    // outside the band the floor must hold what leaks in.
    let mut checked = 0;
    for band_hz in [(400.0, 410.0), (400.0, 700.0), (400.0, 404.0)] {
        for distance in [2, 3, 4, 5, 6, 7, 8, 9, 10, 12, 15, 19, 20, 21, 30, 45, 63, 64, 65, 66, 90, 200] {
            for tenths in [0.0, 0.1, 0.25, 0.4, 0.5] {
                let mut y = vec![0.0; RATE as usize];
                add_line(&mut y, RATE, 400.0 - f64::from(distance) + tenths, -1.0);
                let task = reduce(band_hz.0, band_hz.1, 10.0);
                let (level, floor) = after_levels(y, 0.0, &task, RATE as usize);
                let Some(level) = level else { continue };
                // Rounding to 0.001 dB on both. A floor is cut to its level, so equal
                // means that it lies at least as high.
                assert!(floor.unwrap() >= level - 0.0011, "{distance} {tenths} {band_hz:?}: {floor:?} {level}");
                checked += 1;
            }
        }
    }
    assert!(checked > 250, "{checked}");
}

#[test]
fn an_offset_and_the_highest_bin_leak_like_any_line() {
    // Below the band's level would be no floor at all: half full scale at 0 Hz, and at
    // half the rate, 64 bins and less from the band.
    let band_low = reduce(9.0, 20.0, 10.0);
    let band_high = reduce(3980.0, 3991.0, 10.0);
    let offset: Vec<f64> = vec![0.5; RATE as usize];
    let highest: Vec<f64> = (0..RATE).map(|n| if n % 2 == 0 { 0.5 } else { -0.5 }).collect();
    for (y, task) in [(&offset, &band_low), (&highest, &band_high)] {
        // A whisper in the band, so that it has a level.
        let mut with_line = y.clone();
        add_line(&mut with_line, RATE, (task.from_hz + task.to_hz) / 2.0, -40.0);
        let (level, floor) = after_levels(with_line, 0.0, task, RATE as usize);
        assert!((level.unwrap() + 40.0).abs() < 0.01, "{level:?}");
        // Side lobes at -92 dB of 0.5 (-3 dBFS), doubled and at several bins: from
        // -110 to -85 dBFS.
        assert!((-110.0..-75.0).contains(&floor.unwrap()), "{floor:?}");
    }
}

#[test]
fn floors_follow_the_level_of_what_is_outside() {
    let task = reduce(400.0, 450.0, 10.0);
    let mut floors = Vec::new();
    for line_dbfs in [-1.0, -21.0, -41.0] {
        let mut y = Noise::new(4).white(frames(10.0), -120.0);
        add_line(&mut y, RATE, 380.3, line_dbfs);
        add_line(&mut y, RATE, 425.0, -60.0);
        floors.push(after_levels(y, 0.0, &task, RATE as usize).1.unwrap());
    }
    assert!((floors[0] - floors[1] - 20.0).abs() < 0.5, "{floors:?}");
    assert!((floors[1] - floors[2] - 20.0).abs() < 3.0, "{floors:?}");
}

#[test]
fn float_recordings_have_a_floor_of_arithmetic_only() {
    let mut x = vec![0.0; frames(20.0)];
    add_line(&mut x, RATE, 50.0, -6.0);
    let figures = Take::exact(x, &[Biquad::notch(RATE, 50.0, 1.0)]).judge_one(&reduce(49.0, 51.0, 60.0));
    // A line in the middle of 20 bins leaks nothing beyond its side lobes.
    assert!(figures.before_floor_dbfs.is_none_or(|floor| floor < -90.0), "{figures:#?}");
    assert!(figures.measured_attenuation_db.unwrap() > 60.0);
}
