//! A cascade run forward and backward: what it promises, against simulations of both passes.

use crate::common::{butterworth, close, notch, run};
use bandproof::design::settling::{
    settling_frames, settling_frames_both_ways, startup_frames, startups, startups_both_ways,
};
use bandproof::design::{Check, Design, design};
use bandproof::section::Section;
use bandproof::spec::{self, Phase, SpecSyntax};
use rustfft::FftPlanner;
use rustfft::num_complex::Complex64;
use std::f64::consts::PI;

const RATE_HZ: f64 = 8_000.0;

fn cascades() -> Vec<(&'static str, Vec<Section>, usize)> {
    let hum: Vec<Section> = (1..=3).map(|k| notch(50.0 * f64::from(k), 8.0, RATE_HZ)).collect();
    let mut mixed = butterworth(4, 300.0, RATE_HZ, true);
    mixed.extend(butterworth(4, 3_000.0, RATE_HZ, false));
    mixed.push(notch(1_000.0, 10.0, RATE_HZ));
    vec![
        ("one notch", vec![notch(1_000.0, 10.0, RATE_HZ)], 1 << 13),
        ("three notches", hum, 1 << 13),
        ("three equal notches", vec![notch(440.0, 20.0, RATE_HZ); 3], 1 << 13),
        ("high-pass of order 8", butterworth(8, 30.0, RATE_HZ, true), 1 << 13),
        ("high-pass, low-pass and notch", mixed, 1 << 13),
    ]
}

fn impulse_response(sections: &[Section], frames: usize) -> Vec<f64> {
    run(sections, (0..frames).map(|n| if n == 0 { 1.0 } else { 0.0 }))
}

/// One side of the autocorrelation of `h`, lag 0 first, by FFT.
fn autocorrelation(h: &[f64]) -> Vec<f64> {
    let size = 2 * h.len().next_power_of_two();
    let mut bins: Vec<Complex64> = h.iter().map(|&h| Complex64::new(h, 0.0)).collect();
    bins.resize(size, Complex64::ZERO);
    let mut planner = FftPlanner::new();
    planner.plan_fft_forward(size).process(&mut bins);
    bins.iter_mut().for_each(|bin| *bin = Complex64::new(bin.norm_sqr(), 0.0));
    planner.plan_fft_inverse(size).process(&mut bins);
    bins[..h.len()].iter().map(|bin| bin.re / size as f64).collect()
}

/// max over w of |sum of r[m] e^(-jwm) over m > n|, by an FFT padded eightfold.
fn tail_height(r: &[f64], n: usize) -> f64 {
    let size = r.len().next_power_of_two() * 8;
    let mut spectrum: Vec<Complex64> = r[n + 1..].iter().map(|&r| Complex64::new(r, 0.0)).collect();
    spectrum.resize(size, Complex64::ZERO);
    FftPlanner::new().plan_fft_forward(size).process(&mut spectrum);
    spectrum.iter().map(|bin| bin.re.hypot(bin.im)).fold(0.0, f64::max)
}

#[test]
fn it_is_settled_where_one_side_of_the_net_response_has_fallen() {
    for (name, sections, frames) in cascades() {
        let r = autocorrelation(&impulse_response(&sections, frames));
        for fall_db in [40.0, 60.0] {
            let limit = 10_f64.powf(-fall_db / 20.0);
            let settled = usize::try_from(settling_frames_both_ways(&sections, fall_db)).unwrap();
            // As for one pass: an eightfold FFT meets a summit within 0.2 %.
            assert!(tail_height(&r, settled) <= limit, "{name}, {fall_db} dB: not down at {settled}");
            assert!(settled > 0 && tail_height(&r, settled - 1) > 0.998 * limit, "{name}, {fall_db} dB: down before");
        }
    }
}

#[test]
fn nothing_and_a_plain_gain_ring_neither_way() {
    assert_eq!(settling_frames_both_ways(&[], 80.0), 0);
    assert_eq!(settling_frames_both_ways(&[Section { b: [0.5, 0.0, 0.0], a: [1.0, 0.0, 0.0] }], 80.0), 0);
    assert_eq!(startups_both_ways(&[], RATE_HZ, &[(50.0, 30.0), (60.0, 3.0)]), [None, None]);
    // Both passes together delay by nothing.
    let delay = Section { b: [0.0, 0.0, 1.0], a: [1.0, 0.0, 0.0] };
    assert_eq!((settling_frames(&[delay], 80.0), settling_frames_both_ways(&[delay], 80.0)), (2, 0));
}

/// Both passes over `input`, which is continued at both ends by itself turned about its first
/// and its last sample.
fn both_ways(sections: &[Section], input: &[f64]) -> Vec<f64> {
    let (first, last, count) = (input[0], input[input.len() - 1], input.len() - 1);
    let before = input[1..].iter().rev().map(|x| 2.0 * first - x);
    let after = input[..count].iter().rev().map(|x| 2.0 * last - x);
    let mut samples = run(sections, before.chain(input.iter().copied()).chain(after));
    samples.reverse();
    let mut samples = run(sections, samples);
    samples.reverse();
    samples[count..count + input.len()].to_vec()
}

/// The recording is long enough for both passes to ring out within its extension, so that
/// starting them from rest is no matter. Of all starting phases the worst is the root of
/// the sum of the squares of two a quarter of a turn apart.
#[test]
fn the_startup_is_that_of_sines_sent_both_ways_at_both_ends() {
    let sections: Vec<Section> = (1..=3).map(|k| notch(50.0 * f64::from(k), 8.0, RATE_HZ)).collect();
    let highpass = butterworth(4, 100.0, RATE_HZ, true);
    let equal = [notch(440.0, 20.0, RATE_HZ); 3];
    for (name, sections, hz, reduce_db) in [
        ("at the first notch", &sections[..], 50.0, 30.0),
        ("at the third notch", &sections, 150.0, 60.0),
        ("beside the second notch", &sections, 100.2, 20.0),
        ("in a high-pass", &highpass, 20.0, 40.0),
        ("at three equal notches", &equal, 440.0, 60.0),
        ("beside three equal notches", &equal, 441.0, 60.0),
    ] {
        let frames = 12_000;
        let line = |phase: f64, start: usize| -> Vec<f64> {
            let at = |n: usize| libm::cos(2.0 * PI * hz / RATE_HZ * (n as f64 - start as f64) + phase);
            both_ways(sections, &(0..frames).map(at).collect::<Vec<_>>())
        };
        let limit = 10_f64.powf(-reduce_db / 20.0);
        let found = startups_both_ways(sections, RATE_HZ, &[(hz, reduce_db)])[0].unwrap();
        // Phases counted from the first frame, then from the last.
        let worst = |start: usize| -> Vec<f64> {
            line(0.0, start).iter().zip(line(-PI / 2.0, start)).map(|(c, s)| c.hypot(s)).collect()
        };
        let (half, first, last) = (frames / 2, worst(0), worst(frames - 1));
        let at_start = first[..half].iter().rposition(|y| *y > limit).map_or(0, |n| n + 1);
        let at_end = last[half..].iter().position(|y| *y > limit).map_or(0, |n| half - n);
        assert_eq!((at_start as u64, at_end as u64), (found, found), "{name}");
    }
}

#[test]
fn a_line_that_both_passes_never_take_far_enough_has_no_startup() {
    let sections = [notch(1_000.0, 10.0, RATE_HZ)];
    assert_eq!(startups_both_ways(&sections, RATE_HZ, &[(1_200.0, 30.0)]), [None]);
    // One pass takes 20 dB, both 40.
    let hz = 1_000.502_5;
    assert!(startup_frames(&sections, hz, RATE_HZ, 25.0).is_none());
    let lines = [(hz, 25.0), (1_000.0, 120.0)];
    assert!(startups_both_ways(&sections, RATE_HZ, &lines).iter().all(Option::is_some));
    assert!(startups(&sections, RATE_HZ, &lines)[1].is_some());
}

const SPEC: &str = r#"
[[stage]]
kind = "notch"
center_hz = 50
width_hz = 6

[[band]]
name = "hum"
center_hz = 50
span_hz = 0.5
reduce_db = 20

[[band]]
name = "near"
from_hz = 30
to_hz = 45
keep_db = 3

[[band]]
name = "seen"
from_hz = 100
to_hz = 200
"#;

fn designed(phase: Phase, rate_hz: u32) -> Design {
    let spec = spec::parse(SPEC.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
    design(&spec::Spec { phase, ..spec }, rate_hz).unwrap()
}

/// Figures of a zero-phase design are those of its own sections run twice.
#[test]
fn a_design_of_two_passes_promises_what_both_do_together() {
    let both = designed(Phase::Zero, 8_000);
    assert_eq!((both.passes, both.net_sections().len()), (2, 2 * both.sections.len()));
    let gain_db = |hz: f64| 20.0 * bandproof::design::response::gain_db(&both.sections, hz, RATE_HZ) / 10.0;
    let [hum, near, seen] = [&both.bands[0], &both.bands[1], &both.bands[2]];
    assert_eq!((hum.check, near.check, seen.check), (Some(Check::Guaranteed), Some(Check::Guaranteed), None));
    close("hum", hum.attenuation_min_db, -gain_db(50.25).max(gain_db(49.75)), 1e-9);
    close("near", near.attenuation_max_db, -gain_db(45.0), 1e-9);
    let (from_hz, to_hz) = hum.reaches_hz.unwrap();
    assert!((gain_db(from_hz) + 20.0).abs() < 1e-6 && (gain_db(to_hz) + 20.0).abs() < 1e-6, "{from_hz} {to_hz}");
    assert_eq!((near.group_delay_s, seen.group_delay_s, hum.group_delay_s), (Some(0.0), Some(0.0), None));
    for hz in [20.0, 49.7, 52.0, 3_000.0] {
        let h = both.response_at(hz);
        assert!(h.im == 0.0 && (20.0 * libm::log10(h.re) - gain_db(hz)).abs() < 1e-9, "{hz} Hz: {h}");
    }
    // 20 dB below the 20 dB that the band asks for, at both ends, and 10 bins of what is judged.
    assert_eq!(both.settling_frames, settling_frames_both_ways(&both.sections, 40.0));
    assert_eq!(both.unsettled_frames(), 2 * both.settling_frames);
    close("shortest", hum.shortest_s.unwrap(), 2.0 * both.settling_s + 10.0 / 0.5, 1e-12);
    let startup = startups_both_ways(&both.sections, RATE_HZ, &[(50.0, 20.0)])[0].unwrap();
    assert_eq!(hum.startup_s.unwrap(), startup as f64 / RATE_HZ);
}

#[test]
fn without_sections_nothing_runs_twice() {
    let text =
        "phase = \"zero\"\nbeyond_half_rate = \"leave-out\"\n[[stage]]\nkind = \"notch\"\ncenter_hz = 5000\nq = 9\n";
    let spec = spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
    let design = design(&spec, 8_000).unwrap();
    assert_eq!((design.sections.len(), design.passes, design.unsettled_frames()), (0, 1, 0));
}
