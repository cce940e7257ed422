//! What lies between both recordings: filters move the lag by their own delay at most, and
//! scatter nothing.

use crate::signals::{Bells, add_noise, find_mono, noise, power, random, seconds};
use bandproof::align::Alignment;
use bandproof::cascade::{Cascade, Filter};
use bandproof::design::{PlacedStage, sections};
use bandproof::section::Section;
use bandproof::spec::{Family, FilterKind, FilterStage, NotchStage, Order, Placement, Row, Stage, Width};
use std::sync::Arc;

fn stage(kind: FilterKind, order: u32, edge_hz: f64) -> Vec<Section> {
    let stage = Stage::Filter(FilterStage {
        kind,
        family: Family::Butterworth,
        order: Order::Given(order),
        placement: Placement::Edge { edge_hz },
        ripple_db: None,
        stop_db: None,
    });
    let placed = PlacedStage { stage_index: 0, stage, harmonic: None, edges_hz: vec![edge_hz] };
    sections::build(&[placed], 48_000.0).unwrap()
}

fn notches(count: u32) -> Vec<Section> {
    let row = Row { center_hz: 50.0, width: Width::Hz(3.0), harmonics: count };
    let placed: Vec<PlacedStage> = (1..=count)
        .map(|harmonic| {
            let center = 50.0 * f64::from(harmonic);
            PlacedStage {
                stage_index: 0,
                stage: Stage::Notch(NotchStage { row }),
                harmonic: Some(harmonic),
                edges_hz: vec![center - 1.5, center + 1.5],
            }
        })
        .collect();
    sections::build(&placed, 48_000.0).unwrap()
}

fn filtered(sections: &[Section], samples: &[f64]) -> Vec<f64> {
    let mut filter = Filter::new(Arc::new(Cascade::new(sections)), 1);
    let mut out = vec![Vec::new()];
    filter.process(&[samples.to_vec()], &mut out);
    filter.finish(&mut out);
    out.remove(0)
}

#[test]
fn filters_neither_move_the_clock_nor_scatter_the_lags() {
    let frames = seconds(40.0);
    let before = Bells::steady(21).record(frames, 0.0, 0.0);
    let cases = [
        ("high-pass", stage(FilterKind::Highpass, 4, 40.0)),
        ("steep high-pass", stage(FilterKind::Highpass, 8, 200.0)),
        ("notches", notches(8)),
        ("both", [stage(FilterKind::Highpass, 4, 90.0), notches(8)].concat()),
    ];
    for (what, sections) in cases {
        for (ppm, level) in [(0.0, 0.0), (0.0, 0.1), (-30.0, 0.1)] {
            let mut after = filtered(&sections, &Bells::steady(21).record(frames, 600.0, ppm));
            add_noise(&mut after, 22, level * power(&before).sqrt());
            let found = find_mono(&before, &after).unwrap();
            // Far above its edge a Butterworth high-pass of order 8 leads by 5.13 edge/f radians
            // (the sum of 1/Q): at 200 Hz, and 3 kHz where the bells are, by 0.9 frames.
            assert!((found.delay_frames - 600.0).abs() < 0.9 && !found.inverted, "{what}, noise {level}: {found:?}");
            let error = 5.0 * found.clock_error_ppm.unwrap() + 1e-3;
            assert!((found.clock_ppm - ppm).abs() < error, "{what}, noise {level}: {found:?}");
            assert!(found.scatter_s.unwrap() < 4e-7, "{what}, noise {level}: {found:?}");
        }
    }
}

#[test]
fn a_dominating_line_makes_the_peak_neither_broad_nor_periodic() {
    // A line 40 dB above a faint noise on both sides, which has its own phase on each.
    let frames = seconds(30.0);
    let line = |phase: f64, n: usize| 0.5 * (0.0143 * n as f64 + phase).sin();
    let sound = noise(31, frames + 5000);
    let before: Vec<f64> = (0..frames).map(|n| line(0.0, n) + 0.003 * sound[n + 5000]).collect();
    let after: Vec<f64> = (0..frames).map(|n| line(2.0, n) - 0.003 * sound[n + 1000]).collect();
    let found = find_mono(&before, &after).unwrap();
    assert!((found.delay_frames - 4000.0).abs() < 0.01 && found.inverted, "{found:?}");
    assert!(found.notes.is_empty() && found.scatter_s.unwrap() < 1e-7, "{found:?}");
}

#[test]
fn a_whole_delay_of_white_noise_is_found_to_the_frame() {
    let sound = noise(32, seconds(15.0) + 480_000);
    for lag in [1_usize, 17, 400_000] {
        let frames = seconds(15.0);
        let before = &sound[lag..lag + frames];
        let found = find_mono(before, &sound[..frames]).unwrap();
        assert_eq!((found.delay_frames, found.clock_ppm), (lag as f64, 0.0), "{found:?}");
    }
}

fn bandpass(order: u32, from_hz: f64, to_hz: f64) -> Vec<Section> {
    let stage = Stage::Filter(FilterStage {
        kind: FilterKind::Bandpass,
        family: Family::Butterworth,
        order: Order::Given(order),
        placement: Placement::Edges { edges_hz: [from_hz, to_hz] },
        ripple_db: None,
        stop_db: None,
    });
    let placed = PlacedStage { stage_index: 0, stage, harmonic: None, edges_hz: vec![from_hz, to_hz] };
    sections::build(&[placed], 48_000.0).unwrap()
}

#[test]
fn in_a_third_octave_polarity_is_not_told_and_not_inverted_is_preferred() {
    let before = Bells::steady(61).record(seconds(10.0), 0.0, 0.0);
    let sections = bandpass(3, 891.251, 1122.018);
    for delay in [0.0, 11.0, 24.0, 37.0] {
        for sign in [1.0, -1.0] {
            let mut after = filtered(&sections, &Bells::steady(61).record(seconds(10.0), delay, 0.0));
            after.iter_mut().for_each(|x| *x *= sign);
            let found = find_mono(&before, &after).unwrap();
            assert!(!found.inverted, "{delay} {sign}: {found:?}");
            // The group delay is 6 to 9 ms within the band's edges; far outside, where this
            // noiseless pair is coherent, too, the phase is a quarter turn at any frequency,
            // which has its extrema within 3 frames either way.
            assert!((delay - 3.0..delay + 480.0).contains(&found.delay_frames), "{delay} {sign}: {found:?}");
            let noted = found.notes.iter().any(|note| note.contains("polarity can't be told"));
            assert!(noted, "{delay} {sign}: {found:?}");
        }
    }
}

#[test]
fn a_narrow_band_shows_the_clock_too() {
    // What comes through is a hundredth of the power that went in.
    let before = Bells::steady(62).record(seconds(10.0), 0.0, 0.0);
    let sections = bandpass(2, 2000.0, 2300.0);
    for ppm in [0.0, 25.0, -60.0] {
        let after = filtered(&sections, &Bells::steady(62).record(seconds(10.0), 50.0, ppm));
        let found = find_mono(&before, &after).unwrap();
        let error = found.clock_error_ppm.unwrap();
        assert!((found.clock_ppm - ppm).abs() < 5.0 * error + 1e-2 && error < 1.0, "{ppm}: {found:?}");
        assert!(found.scatter_s.is_some(), "{ppm}: {found:?}");
    }
}

/// Six notes a second of random pitch, loudness and length, seven harmonics each.
fn music(seed: u64, frames: usize) -> Vec<f64> {
    let mut out: Vec<f64> = noise(seed, frames).iter().map(|x| 1e-5 * x).collect();
    let count = frames as u64 / 8000;
    for note in 0..count {
        let draw = |which: u64| 0.5 + 0.5 * random(seed ^ 0xABCD, 4 * note + which);
        let start = (draw(0) * frames as f64) as usize;
        let pitch_hz = 55.0 * (5.0 * draw(1)).exp2();
        let length = ((0.2 + 1.3 * draw(2)) * 48_000.0) as usize;
        for (n, x) in out.iter_mut().skip(start).take(length).enumerate() {
            let time = n as f64 / 48_000.0;
            for harmonic in (1..8).map(f64::from).take_while(|h| h * pitch_hz < 20_000.0) {
                let decay = (-3.0 * time * harmonic).exp() * (200.0 * time).min(1.0);
                *x += 0.08 / harmonic * decay * (std::f64::consts::TAU * harmonic * pitch_hz * time + harmonic).sin();
            }
        }
    }
    out
}

#[test]
fn most_notes_that_resemble_each_other_are_told_apart() {
    let mut found = 0;
    for seed in 0..10 {
        let frames = seconds(6.0);
        let sound = music(70 + seed, frames + 1457);
        let mut after = filtered(&stage(FilterKind::Highpass, 2, 200.0), &sound[..frames]);
        add_noise(&mut after, seed, 1e-4);
        let right = |lies: &Alignment| (lies.delay_frames - 1457.0).abs() < 8.0;
        found += usize::from(find_mono(&sound[1457..], &after).is_ok_and(|lies| right(&lies)));
    }
    // Not all: where no two chunks agree, the lag that stands out most is taken.
    assert!(found >= 5, "{found} of 10");
}
