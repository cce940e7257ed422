//! From a spec and a sample rate to sections, and what they promise.
//!
//! [`placement`] says which lines of which stages and bands fit at a rate,
//! [`sections`] turns the placed stages into second-order sections, [`response`]
//! evaluates finished sections exactly, [`settling`] says how long they ring,
//! [`transition`] how many hertz a stage takes from its pass band to its stop band, and
//! [`check`] holds the spec's requirements against the exact response.

mod bilinear;
pub mod check;
mod complex;
mod error_free;
mod exceptions;
pub mod extrema;
mod golden;
mod notch;
pub mod placement;
pub mod prototype;
pub mod response;
mod ring;
pub mod roots;
pub mod sections;
pub mod settling;
mod transform;
pub mod transition;
mod wording;

use crate::section::Section;
use crate::spec::Spec;
pub use check::{BandDesign, Check, Violation};
pub use placement::{LeftOut, Placed, PlacedStage};

/// A spec at one sample rate.
#[derive(Clone, Debug, PartialEq)]
pub struct Design {
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Lines, stages and bands that do not fit below half the rate.
    pub left_out: Vec<LeftOut>,
    /// What each stage became, in the spec's order, a row's lines one by one.
    pub stages: Vec<PlacedStage>,
    /// The cascade, in the order it runs.
    pub sections: Vec<Section>,
    /// Largest pole radius; 0 for the identity.
    pub max_pole_radius: f64,
    /// Seconds after which the impulse response's tail no longer matters: it is down by
    /// 20 dB more than the largest `reduce_db` asks for, or by 60 dB without one.
    pub settling_s: f64,
    /// The same in frames, rounded up.
    pub settling_frames: u64,
    /// The bands and what the design promises in each.
    pub bands: Vec<BandDesign>,
}

impl Design {
    /// One sentence for each requirement that this design can't hold: band, rate,
    /// requirement, frequency and figure, and what to change. Empty where all is well.
    pub fn impossible(&self) -> Vec<String> {
        let has_stages = !self.sections.is_empty();
        self.bands.iter().filter_map(|band| wording::impossible(band, self.rate_hz, has_stages)).collect()
    }
}

/// Why a spec can't be designed at a sample rate. What holds for some rates only is
/// found here; what is wrong at any rate is a [`crate::spec::SpecError`].
#[derive(Debug, thiserror::Error)]
pub enum DesignError {
    /// A stage asks for a prototype that there is none of.
    #[error("{stage}: {source}")]
    Prototype {
        /// Which stage: `stage 2, line 7 (350 Hz)`.
        stage: String,
        /// What is wrong with it.
        source: prototype::PrototypeError,
    },
    /// A stage's edges are not in order between 0 and half the sample rate.
    #[error("{stage}: {found} at a sample rate of {rate_hz} Hz; {expected}")]
    Edges {
        /// Which stage.
        stage: String,
        /// The edges, or center and width.
        found: String,
        /// What they must be.
        expected: &'static str,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// A pole lies closer to the unit circle than [`sections::POLE_MARGIN`].
    #[error(
        "{stage}: at a sample rate of {rate_hz} Hz it needs a pole at {frequency_hz:.6} Hz that lies {distance:.1e} \
         inside the unit circle, and under {margin:e} f64 coefficients can't hold its damping; \
         use a wider band, a higher edge, a lower order, or a stop_db farther from ripple_db",
        margin = sections::POLE_MARGIN
    )]
    PoleAtUnitCircle {
        /// Which stage.
        stage: String,
        /// Frequency of the pole, Hz.
        frequency_hz: f64,
        /// 1 - radius; negative outside.
        distance: f64,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// Poles lie closer to z = 1 or z = -1 than [`sections::END_MARGIN`].
    #[error(
        "{stage}: at a sample rate of {rate_hz} Hz it needs poles so near {end} that f64 coefficients can't hold \
         their frequency; move its edges farther from {end}, or filter at a sample rate that suits them"
    )]
    PoleAtEnd {
        /// Which stage.
        stage: String,
        /// `0 Hz` or `half the sample rate`.
        end: &'static str,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// Stages or bands reach half the sample rate, and the spec does not allow leaving
    /// them out.
    #[error(
        "at {rate_hz} Hz not everything fits below half the sample rate: {}; \
         give each an edge below it, or leave them out at such rates with beyond_half_rate = \"leave-out\"",
        list(misfits)
    )]
    BeyondHalfRate {
        /// The sample rate, Hz.
        rate_hz: u32,
        /// Every stage and band that does not fit.
        misfits: Vec<LeftOut>,
    },
}

fn list(misfits: &[LeftOut]) -> String {
    misfits.iter().map(|misfit| format!("{}: {}", misfit.what, misfit.reason)).collect::<Vec<_>>().join("; ")
}

/// Fall of the tail that counts as settled where no band asks for a reduction, dB.
const SETTLED_DB: f64 = 60.0;

/// Fall of the tail below the largest reduction that is asked for, dB.
const SETTLED_BELOW_REDUCTION_DB: f64 = 20.0;

/// Designs `spec` for `rate_hz`.
///
/// # Errors
/// A stage or band that reaches beyond half the rate while
/// `beyond_half_rate = "error"`; poles closer to the unit circle than the margin.
/// An `impossible` requirement is not an error here: see [`BandDesign::check`] and
/// [`Design::impossible`].
pub fn design(spec: &Spec, rate_hz: u32) -> Result<Design, DesignError> {
    let placed = placement::place(spec, rate_hz)?;
    let sections = sections::build(&placed.stages, f64::from(rate_hz))?;
    let settling_frames = settling::settling_frames(&sections, settled_fall_db(spec));
    let settling_s = settling_frames as f64 / f64::from(rate_hz);
    let bands = check::check(&placed, &sections, f64::from(rate_hz), settling_s);
    Ok(Design {
        rate_hz,
        left_out: placed.left_out,
        stages: placed.stages,
        max_pole_radius: sections.iter().map(sections::pole_radius).fold(0.0, f64::max),
        sections,
        settling_s,
        settling_frames,
        bands,
    })
}

/// The fall that [`Design::settling_s`] waits for: the same at every rate.
fn settled_fall_db(spec: &Spec) -> f64 {
    spec.largest_reduce_db().map_or(SETTLED_DB, |reduce_db| reduce_db + SETTLED_BELOW_REDUCTION_DB)
}
