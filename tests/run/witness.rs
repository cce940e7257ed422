//! The witness catches faults in the code path that no recording would show.

use bandproof::cascade::Cascade;
use bandproof::design::design;
use bandproof::job::plan::treatment;
use bandproof::job::witness::{compare, respond, witness};
use bandproof::section::Section;
use bandproof::spec::{self, SpecSyntax};
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
    let spec = spec::parse(SPEC.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
    let design = design(&spec, 48_000).unwrap();
    let treatment = treatment(&spec, &design);
    (design, treatment)
}

fn with_cascade(change: impl FnOnce(&mut Vec<Section>)) -> bandproof::job::witness::Witness {
    let (design, mut treatment) = parts();
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
        cut.drain(from..from + frames);
        cut.resize(whole.len(), 0.0);
        assert!(!compare(&cut, &design).agrees, "{frames} frames dropped at {from}");
        let mut silent = whole.clone();
        silent[from..from + frames.max(2)].fill(0.0);
        assert!(!compare(&silent, &design).agrees, "{frames} frames silenced at {from}");
    }
}

#[test]
fn a_sample_that_is_no_number_is_caught() {
    let (design, treatment) = parts();
    let mut samples = respond(&design, &treatment).unwrap();
    samples[100] = f64::NAN;
    assert!(!compare(&samples, &design).agrees);
}
