//! Specs, samples and spectra.

use bandproof::excite::Plan;
use bandproof::spec::{self, Band, BeyondHalfRate, Extent, OutputSpec, Phase, Requirement, Spec, SpecSyntax};
use bandproof::spectrum::{Accumulator, SegmentPlan, Spectra, Transform};
use std::path::PathBuf;

/// Full scale of the samples.
pub const SCALE: f64 = 8_388_608.0;

/// A file of the project.
pub fn file(path: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(path)
}

/// A spec that comes with the project.
pub fn shipped(name: &str) -> Spec {
    spec::load(&file("filter-specs").join(name)).unwrap().spec
}

/// A spec from TOML.
pub fn parsed(text: &str) -> Spec {
    spec::parse(text.as_bytes(), SpecSyntax::Toml, "test.toml").unwrap()
}

/// One range to be reduced, no stages.
pub fn reduce(from_hz: f64, to_hz: f64, reduce_db: f64) -> Spec {
    Spec {
        phase: Phase::Causal,
        auto: None,
        title: None,
        beyond_half_rate: BeyondHalfRate::Error,
        output: OutputSpec::default(),
        reference_band: None,
        rate: None,
        stages: Vec::new(),
        bands: vec![Band {
            name: "hum".to_owned(),
            extent: Extent::Range { from_hz, to_hz },
            requirement: Requirement::Reduce { reduce_db },
        }],
    }
}

/// The samples as written, full scale 1.
pub fn samples(plan: &Plan) -> Vec<f64> {
    plan.samples().map(|sample| f64::from(sample) / SCALE).collect()
}

pub fn db(ratio: f64) -> f64 {
    10.0 * ratio.log10()
}

/// Averaged spectrum with segments of `length` frames that overlap by half.
pub fn spectrum(samples: &[f64], length: usize) -> Spectra {
    let mut sums = Accumulator::new(Transform::new(length), Vec::new());
    for start in SegmentPlan::spread(length, 0..samples.len() as u64).starts {
        let segment = &samples[start as usize..start as usize + length];
        sums.add(segment, segment);
    }
    sums.finish()
}
