//! Specs, signals and exports that several tests share.

use bandproof::cascade::{Cascade, Filter};
use bandproof::design::{self, Design, placement};
use bandproof::export::holding::Reference;
use bandproof::export::{ExportError, Exported, Form, Request, export};
use bandproof::section::Section;
use bandproof::spec::{self, SpecFile, SpecSyntax};
use std::path::Path;
use std::sync::Arc;

/// Specs with requirements, each with rates at which it fits: those of the project and very
/// narrow, very low ones.
pub fn specs() -> Vec<(&'static str, SpecFile, Vec<u32>)> {
    let file = |name: &str| spec::load(&Path::new(env!("CARGO_MANIFEST_DIR")).join("filter-specs").join(name)).unwrap();
    vec![
        ("reed-bed", file("reed-bed.toml"), vec![44_100, 48_000, 96_000]),
        ("converter-whine", file("converter-whine.toml"), vec![44_100, 96_000]),
        ("notch-997", file("notch-997.toml"), vec![48_000, 192_000]),
        ("third-octave", file("third-octave.toml"), vec![44_100, 48_000]),
        ("narrow notch", written(NARROW), vec![8_000, 384_000]),
        ("low edge", written(LOW), vec![48_000]),
    ]
}

const NARROW: &str = r#"
[[stage]]
kind = "notch"
center_hz = 50
width_hz = 0.05

[[band]]
name = "mains"
center_hz = 50
span_hz = 0.001
reduce_db = 30

[[band]]
name = "beside"
from_hz = 51
to_hz = 3000
keep_db = 0.01
"#;

const LOW: &str = r#"
[[stage]]
kind = "lowpass"
family = "chebyshev1"
order = 5
edge_hz = 20
ripple_db = 0.5

[[stage]]
kind = "highpass"
family = "butterworth"
order = 2
edge_hz = 1

[[band]]
name = "swell"
from_hz = 3
to_hz = 19
keep_db = 0.6

[[band]]
name = "rest"
from_hz = 40
to_hz = 24000
reduce_db = 45
"#;

/// Quick to settle, with sections of first and second order.
pub const SHORT: &str = r#"
[[stage]]
kind = "lowpass"
family = "elliptic"
order = 5
edge_hz = 9000
ripple_db = 0.5
stop_db = 60

[[stage]]
kind = "highpass"
family = "butterworth"
order = 1
edge_hz = 500
"#;

/// Nothing to run.
pub const IDENTITY: &str = "[[band]]\nname = \"all\"\nfrom_hz = 100\nto_hz = 1000\nkeep_db = 1\n";

/// A spec as written in TOML.
pub fn written(text: &str) -> SpecFile {
    let spec = spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap_or_else(|error| panic!("{error}"));
    SpecFile { spec, file_sha256: "0".repeat(64) }
}

/// `spec` as `form`.
pub fn exported(
    spec: &SpecFile,
    rate_hz: u32,
    form: Form,
    digits: Option<u32>,
    bits: Option<u32>,
) -> Result<Exported, ExportError> {
    export(&Request { spec, file_name: "spec.toml", rate_hz, form, digits, bits })
}

/// The text of `spec` as `form` with what the program chooses.
pub fn text(spec: &SpecFile, rate_hz: u32, form: Form) -> String {
    exported(spec, rate_hz, form, None, None).unwrap_or_else(|error| panic!("{error}")).text
}

pub fn designed(spec: &SpecFile, rate_hz: u32) -> Design {
    design::design(&spec.spec, rate_hz).unwrap()
}

pub fn reference(spec: &SpecFile, rate_hz: u32) -> Reference {
    Reference::new(&designed(spec, rate_hz), placement::place(&spec.spec, rate_hz).unwrap())
}

/// White noise in -1..1 from a linear congruential generator (Knuth's MMIX constants, from memory).
pub fn noise(seed: u64, frames: usize) -> Vec<f64> {
    let mut state = seed;
    (0..frames)
        .map(|_| {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
        })
        .collect()
}

/// What the program makes of one channel.
pub fn filtered(sections: &[Section], input: &[f64]) -> Vec<f64> {
    let mut filter = Filter::new(Arc::new(Cascade::new(sections)), 1);
    let mut out = vec![Vec::new()];
    filter.process(&[input.to_vec()], &mut out);
    filter.finish(&mut out);
    out.remove(0)
}
