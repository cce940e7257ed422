//! From a spec and a sample rate to sections, and what they promise.
//!
//! [`auto`] finds stages where the spec has none, [`placement`] says which lines of which
//! stages and bands fit at a rate, [`recipe`] what one pass of each is made from ([`limits`]:
//! with which order), [`sections`] turns that into second-order sections ([`transfer`],
//! [`weighting`] and [`equalizer`] where there is no prototype), [`response`]
//! evaluates finished sections exactly, [`settling`] says how long they ring,
//! [`transition`] how many hertz a stage takes from its pass band to its stop band,
//! [`rounding`] what rounding coefficients costs, [`overflow`] whether the gain is one that
//! numbers can hold, [`check`] holds the spec's requirements
//! against the exact response, and [`curve`] lays it out for a plot. What comes before
//! sections is calculated in numbers of twice the digits ([`double`]).

pub mod auto;
mod bilinear;
pub mod check;
pub mod curve;
pub mod double;
mod edges;
pub mod equalizer;
mod error_free;
mod exceptions;
pub mod extrema;
mod golden;
pub mod limits;
mod notch;
pub mod overflow;
pub mod placement;
pub mod prototype;
pub mod recipe;
pub mod response;
mod ring;
pub mod roots;
pub mod rounding;
pub mod sections;
pub mod settling;
pub mod transfer;
mod transform;
pub mod transition;
pub mod weighting;
pub(crate) mod wording;

use crate::section::Section;
use crate::spec::Spec;
pub use check::{BandDesign, Check, Violation};
use core::f64::consts::TAU;
use num_complex::Complex64;
pub use placement::{LeftOut, Placed, PlacedStage};
use recipe::Recipe;
use sections::StageSize;

/// A spec at one sample rate.
#[derive(Clone, Debug, PartialEq)]
pub struct Design {
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Lines, stages and bands that do not fit below half the rate.
    pub left_out: Vec<LeftOut>,
    /// What each stage became, in the spec's order, a row's lines one by one.
    pub stages: Vec<DesignedStage>,
    /// One pass of the cascade, in the order it runs.
    pub sections: Vec<Section>,
    /// How often the cascade runs over the samples: 2 for forward and backward, 1 without
    /// sections. Everything that is promised below is of all passes together.
    pub passes: u32,
    /// Largest pole radius; 0 for the identity.
    pub max_pole_radius: f64,
    /// How far the response is at most, dB, from that of coefficients with all their digits
    /// (see [`rounding`]); 0 for the identity.
    pub rounding_db: f64,
    /// Where that is, Hz.
    pub rounding_at_hz: f64,
    /// Seconds after which the impulse response's tail no longer matters: it is down by
    /// 20 dB more than the largest `reduce_db` asks for, or by 60 dB without one. With two
    /// passes the response has such a tail on either side.
    pub settling_s: f64,
    /// The same in frames, rounded up.
    pub settling_frames: u64,
    /// The bands and what the design promises in each.
    pub bands: Vec<BandDesign>,
}

/// One stage, or one line of a row, as it was designed.
#[derive(Clone, Debug, PartialEq)]
pub struct DesignedStage {
    /// Where it is.
    pub placed: PlacedStage,
    /// What one pass of it was made from.
    pub recipe: Recipe,
    /// What it amounts to.
    pub size: StageSize,
    /// What is left of each limit of a stage whose order follows from limits.
    pub slack: Vec<Slack>,
    /// What a reader has to know of it, in sentences.
    pub remarks: Vec<String>,
}

/// A limit of a stage, and what the finished filter does there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Slack {
    /// The edge, Hz.
    pub at_hz: f64,
    /// Attenuation that the limit allows at most (a pass edge) or asks for (a stop edge), dB.
    pub limit_db: f64,
    /// Whether it is a stop edge.
    pub is_stop: bool,
    /// How far the finished filter stays on the right side of the limit, dB, at its worst
    /// frequency from this edge on.
    pub slack_db: f64,
}

impl Design {
    /// The sections of all passes one after another: their response in dB is the net one.
    /// (Its phase is that of as many forward passes.)
    pub fn net_sections(&self) -> Vec<Section> {
        self.sections.repeat(self.passes as usize)
    }

    /// The net response at `frequency_hz` (0 to half the rate): H of one pass, or |H|^2 of
    /// forward and backward.
    pub fn response_at(&self, frequency_hz: f64) -> Complex64 {
        let one_pass = response::at(&self.sections, frequency_hz, f64::from(self.rate_hz));
        if self.passes > 1 { Complex64::new(one_pass.norm_sqr(), 0.0) } else { one_pass }
    }

    /// Frames of a recording that figures leave out: at the start, and with two passes as many
    /// at the end.
    pub fn unsettled_frames(&self) -> u64 {
        self.settling_frames.saturating_mul(u64::from(self.passes))
    }

    /// The same in seconds.
    pub fn unsettled_s(&self) -> f64 {
        self.settling_s * f64::from(self.passes)
    }

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
    /// A stage that is given by a whole transfer function can't run forward and backward.
    #[error(
        "{stage}: phase = \"zero\" filters twice, and half of a {kind} stage is no filter that can run; \
         take the stage out, or set phase = \"causal\""
    )]
    ZeroPhase {
        /// Which stage.
        stage: String,
        /// Its kind as in the spec.
        kind: &'static str,
    },
    /// No order holds a stage's limits.
    #[error("{stage}: at a sample rate of {rate_hz} Hz {source}")]
    Limits {
        /// Which stage.
        stage: String,
        /// Sample rate, Hz.
        rate_hz: f64,
        /// What can't hold, and how nearly.
        source: limits::LimitsError,
    },
    /// A transfer function is no filter that can run.
    #[error("{stage}: {source}")]
    Transfer {
        /// Which stage.
        stage: String,
        /// What is wrong with it.
        source: transfer::TransferError,
    },
    /// A stage in z is given for another sample rate.
    #[error(
        "{stage}: its coefficients are those of a filter at {given_hz} Hz (rate_hz), and at a sample rate of {rate_hz} Hz \
         they would be another filter; give those for {rate_hz} Hz in a spec of its own"
    )]
    OtherRate {
        /// Which stage.
        stage: String,
        /// The rate the coefficients are for, Hz.
        given_hz: u32,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// A standard curve can't be had at this rate.
    #[error("{stage}: {source}")]
    Weighting {
        /// Which stage.
        stage: String,
        /// Why not.
        source: weighting::WeightingError,
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
    /// The cascade's gain up to a stage is beyond [`overflow::MOST_GAIN_DB`].
    #[error(
        "{stage}: at a sample rate of {rate_hz} Hz {} a gain of {gain_db:.0} dB at {} Hz, and more than {most} dB may \
         overflow; lower its gain{}",
        if *.together { "it and the stages before it have" } else { "it has" },
        wording::figure(*.at_hz),
        if *.together { ", or that of a stage before it" } else { "" },
        most = overflow::MOST_GAIN_DB
    )]
    Gain {
        /// The first stage up to which it is.
        stage: String,
        /// Gain at the output of one of the stage's sections, dB.
        gain_db: f64,
        /// Where, Hz.
        at_hz: f64,
        /// Whether the stage alone would stay below.
        together: bool,
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

impl DesignError {
    /// Whether another sample rate may help; what is wrong with a stage at any rate has nothing
    /// to do with recordings.
    pub fn depends_on_rate(&self) -> bool {
        match self {
            DesignError::Transfer { source, .. } => source.depends_on_rate(),
            DesignError::Prototype { .. } | DesignError::ZeroPhase { .. } => false,
            DesignError::Limits { .. }
            | DesignError::OtherRate { .. }
            | DesignError::Weighting { .. }
            | DesignError::Edges { .. }
            | DesignError::PoleAtUnitCircle { .. }
            | DesignError::PoleAtEnd { .. }
            | DesignError::Gain { .. }
            | DesignError::BeyondHalfRate { .. } => true,
        }
    }
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
/// `beyond_half_rate = "error"`; poles closer to the unit circle than the margin; a gain that
/// may overflow.
/// An `impossible` requirement is not an error here: see [`BandDesign::check`] and
/// [`Design::impossible`].
pub fn design(spec: &Spec, rate_hz: u32) -> Result<Design, DesignError> {
    let placed = placement::place(spec, rate_hz)?;
    let (mut stages, mut finished) = (Vec::new(), Vec::new());
    for stage in &placed.stages {
        let recipe = recipe::recipe(stage, spec.phase, f64::from(rate_hz))?;
        let own = sections::finish_stage(stage, &recipe, f64::from(rate_hz))?;
        let plain = sections::plain(&own);
        let mut remarks = recipe::remarks(stage, &recipe, spec.phase, f64::from(rate_hz));
        match &recipe {
            Recipe::Weighting(curve) => remarks.extend(weighting::remarks(*curve, &plain, f64::from(rate_hz))),
            Recipe::Equalizer(_) => remarks.extend(equalizer::remark(&stage.stage)),
            Recipe::Filter(_) | Recipe::Notch { .. } | Recipe::Digital(_) | Recipe::Analog(_) => {}
        }
        stages.push(DesignedStage {
            placed: stage.clone(),
            size: sections::size(&plain),
            slack: recipe::slack(stage, &recipe, &plain, spec.phase, f64::from(rate_hz)),
            remarks,
            recipe,
        });
        finished.extend(own);
    }
    let sections = sections::plain(&finished);
    check_gain(&stages, &sections, f64::from(rate_hz))?;
    // Nothing runs no more than once.
    let passes = if sections.is_empty() { 1 } else { spec.phase.passes() };
    let rounding = rounding::largest(&finished, passes);
    let settling_frames = match passes {
        1 => settling::settling_frames(&sections, settled_fall_db(spec)),
        _ => settling::settling_frames_both_ways(&sections, settled_fall_db(spec)),
    };
    let settling_s = settling_frames as f64 / f64::from(rate_hz);
    let bands = check::check(&placed, &sections, passes, f64::from(rate_hz), settling_s * f64::from(passes));
    let mut before = 0;
    for stage in &mut stages {
        let after = sections.len().min(before + stage.size.sections as usize);
        let context = transfer::Context {
            own: &sections[before..after],
            others: [&sections[..before], &sections[after..]],
            bands: &bands,
            rate_hz: f64::from(rate_hz),
        };
        stage.remarks.append(&mut transfer::remarks(&stage.recipe, context));
        before = after;
    }
    Ok(Design {
        rate_hz,
        left_out: placed.left_out,
        stages,
        max_pole_radius: sections.iter().map(sections::pole_radius).fold(0.0, f64::max),
        rounding_db: rounding.db * f64::from(passes),
        rounding_at_hz: rounding.angle / TAU * f64::from(rate_hz),
        sections,
        passes,
        settling_s,
        settling_frames,
        bands,
    })
}

/// Refuses a cascade of `stages` whose gain may overflow.
fn check_gain(stages: &[DesignedStage], sections: &[Section], rate_hz: f64) -> Result<(), DesignError> {
    let Some(overflow::TooLarge { section, gain_db, at_hz }) = overflow::first(sections, rate_hz) else {
        return Ok(());
    };
    let mut before = 0;
    for stage in stages {
        let after = sections.len().min(before + stage.size.sections as usize);
        if section < after {
            let together = overflow::first(&sections[before..after], rate_hz).is_none();
            let stage = stage.placed.label();
            return Err(DesignError::Gain { stage, gain_db, at_hz, together, rate_hz });
        }
        before = after;
    }
    Ok(())
}

/// The fall that [`Design::settling_s`] waits for: the same at every rate.
fn settled_fall_db(spec: &Spec) -> f64 {
    spec.largest_reduce_db().map_or(SETTLED_DB, |reduce_db| reduce_db + SETTLED_BELOW_REDUCTION_DB)
}
