//! The witness catches faults in the code path that no recording would show.

use bandproof::cascade::Cascade;
use bandproof::cascade::both_ways::Reach;
use bandproof::design::design;
use bandproof::job::plan::treatment;
use bandproof::job::witness::{compare, respond, witness};
use bandproof::section::Section;
use bandproof::spec::{self, Phase, SpecSyntax};
use std::sync::Arc;

const SPEC: &str = r#"
[[stage]]
kind = "highpass"
family = "butterworth"
order = 4
edge_hz = 90

[[stage]]
kind = "notch"
center_hz = 50
width_hz = 2
harmonics = 8
"#;

fn parts() -> (bandproof::design::Design, bandproof::job::recording::Treatment) {
    parts_with(Phase::Causal)
}

fn parts_with(phase: Phase) -> (bandproof::design::Design, bandproof::job::recording::Treatment) {
    let spec = spec::parse(SPEC.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
    let spec = spec::Spec { phase, ..spec };
    let design = design(&spec, 48_000).unwrap();
    let treatment = treatment(&spec, &design);
    (design, treatment)
}

fn with_cascade(change: impl FnOnce(&mut Vec<Section>)) -> bandproof::job::witness::Witness {
    with_cascade_in(Phase::Causal, change)
}

fn with_cascade_in(phase: Phase, change: impl FnOnce(&mut Vec<Section>)) -> bandproof::job::witness::Witness {
    let (design, mut treatment) = parts_with(phase);
    let mut sections = design.sections.clone();
    change(&mut sections);
    treatment.cascade = Arc::new(Cascade::new(&sections));
    witness(&design, &treatment).unwrap()
}

#[test]
fn a_correct_cascade_agrees_far_inside_the_limits() {
    // Rounding inside an f64 cascade of this kind reaches 1e-10 of full scale.
    let found = with_cascade(|_| ());
    assert!(found.agrees && found.deviation < 1e-9 && found.deviation_db < 1e-7, "{found:?}");
}

#[test]
fn the_order_of_sections_is_no_fault() {
    assert!(with_cascade(|sections| sections.reverse()).agrees);
}

#[test]
fn a_wrong_coefficient_is_caught() {
    // One part in ten million of one coefficient, anywhere.
    let count = parts().0.sections.len();
    for index in 0..count {
        for change in [|s: &mut Section| s.a[1] *= 1.0 + 1e-7, |s: &mut Section| s.b[1] *= 1.0 + 1e-7] {
            let found = with_cascade(|sections| change(&mut sections[index]));
            assert!(!found.agrees, "section {index}: {found:?}");
        }
    }
}

#[test]
fn a_section_in_the_place_of_another_is_caught() {
    let found = with_cascade(|sections| sections[3] = sections[4]);
    assert!(!found.agrees, "{found:?}");
}

#[test]
fn a_dropped_block_is_caught() {
    let (design, treatment) = parts();
    let whole = respond(&design, &treatment).unwrap();
    assert!(compare(&whole, &design).agrees);
    for (from, frames) in [(8192, 8192), (0, 1), (16_384, 64)] {
        let mut cut = whole.clone();
        cut.samples.drain(from..from + frames);
        cut.samples.resize(whole.samples.len(), 0.0);
        assert!(!compare(&cut, &design).agrees, "{frames} frames dropped at {from}");
        let mut silent = whole.clone();
        silent.samples[from..from + frames.max(2)].fill(0.0);
        assert!(!compare(&silent, &design).agrees, "{frames} frames silenced at {from}");
    }
}

#[test]
fn a_sample_that_is_no_number_is_caught() {
    let (design, treatment) = parts();
    let mut response = respond(&design, &treatment).unwrap();
    response.samples[100] = f64::NAN;
    assert!(!compare(&response, &design).agrees);
}

#[test]
fn both_ways_a_correct_cascade_agrees_far_inside_the_limits() {
    let found = with_cascade_in(Phase::Zero, |_| ());
    assert!(found.agrees && found.deviation < 1e-9 && found.deviation_db < 1e-7, "{found:?}");
}

#[test]
fn both_ways_a_wrong_coefficient_is_caught() {
    let count = parts().0.sections.len();
    for index in (0..count).step_by(3) {
        for change in [|s: &mut Section| s.a[1] *= 1.0 + 1e-7, |s: &mut Section| s.b[1] *= 1.0 + 1e-7] {
            let found = with_cascade_in(Phase::Zero, |sections| change(&mut sections[index]));
            assert!(!found.agrees, "section {index}: {found:?}");
        }
    }
}

/// One pass in place of two, two in place of one, and a backward pass that begins too near.
#[test]
fn a_pass_left_out_and_one_cut_short_are_caught() {
    let (zero, mut treatment) = parts_with(Phase::Zero);
    let reach = treatment.both_ways.take().unwrap();
    assert!(!witness(&zero, &treatment).unwrap().agrees);
    let (causal, mut treatment) = parts();
    treatment.both_ways = Some(reach);
    assert!(!witness(&causal, &treatment).unwrap().agrees);
    let (zero, mut treatment) = parts_with(Phase::Zero);
    treatment.both_ways = Some(Reach { ring_frames: reach.ring_frames / 8, ..reach });
    let found = witness(&zero, &treatment).unwrap();
    assert!(!found.agrees, "{found:?}");
}

/// The impulse stands where two blocks of the backward pass meet, so that both are seen.
#[test]
fn a_shift_and_a_lost_block_are_caught_both_ways() {
    let (design, treatment) = parts_with(Phase::Zero);
    let whole = respond(&design, &treatment).unwrap();
    assert!(compare(&whole, &design).agrees);
    let (seam, reach) = (whole.impulse_frame, treatment.both_ways.unwrap());
    assert_eq!(seam, reach.block_frames);
    assert!(whole.samples.len() > reach.block_frames + reach.ring_frames);
    let mut late = whole.clone();
    late.samples.rotate_right(1);
    assert!(!compare(&late, &design).agrees);
    for block in [seam - 64..seam, seam..seam + 64, seam - 8192..seam - 8192 + 64, seam + 8192..seam + 8192 + 64] {
        let mut silent = whole.clone();
        silent.samples[block.clone()].fill(0.0);
        assert!(!compare(&silent, &design).agrees, "{block:?}");
        let mut twice = whole.clone();
        twice.samples.copy_within(block.clone(), block.start + 1);
        assert!(!compare(&twice, &design).agrees, "{block:?}");
    }
}
