//! What a methods section has to state about a filter.
//!
//! The list is that of A. Widmann, E. Schroeger, B. Maess, "Digital filter design for
//! electrophysiological data: a practical approach", J. Neurosci. Methods 250, 2015, doi
//! 10.1016/j.jneumeth.2014.08.002: type and kind, edges and what they mean, order,
//! transition widths, ripple and attenuation, delay, causality, direction.

mod phase;
mod sentence;
mod ways;

use super::{Db, Finite, Hz, NotFinite, Require, Seconds, schema};
use crate::design::sections::StageSize;
use crate::design::transition::{self, Transition};
use crate::design::{BandDesign, Design, DesignedStage};
use crate::section::Section;
use crate::spec::{self, Family, Order, Stage};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// What a methods section has to state about the filter at one sample rate.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Methods {
    /// The whole in English, ready to be pasted.
    pub sentence: String,
    /// Name and version of the program.
    pub program: String,
    /// Whether this program filtered the recordings; false in a report of `measure`, where
    /// the filter is what the spec describes and the recordings are held against.
    pub applied: bool,
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// How the filter was designed; null for the identity.
    pub design: Option<String>,
    /// Poles of the whole cascade in one pass: the total orders of all stages and lines added
    /// up. Its attenuation in dB is the sum of theirs.
    pub total_order: u32,
    /// Sections of second order or less in the whole cascade.
    pub sections: usize,
    /// How often the cascade runs over the samples.
    #[schemars(range(min = 1))]
    pub passes: u32,
    /// Direction of the passes: `forward`, or `forward and backward`.
    pub direction: String,
    /// Whether no output sample depends on a later input sample.
    pub causal: bool,
    /// `non-linear`: the group delay depends on frequency; `linear` where it does not, for an
    /// impulse response that ends and mirrors itself; `zero` for two passes, forward and
    /// backward, and for the identity.
    pub phase: String,
    /// State before the first sample, of each pass; null for the identity and where `applied`
    /// is false.
    pub start_state: Option<String>,
    /// Seconds until the tail of the impulse response no longer matters, as in the design; with
    /// two passes on both sides.
    #[schemars(extend("minimum" = 0))]
    pub settling_s: Seconds,
    /// Number format and structure of the sections; null where `start_state` is.
    pub arithmetic: Option<String>,
    /// Name and version of the dither of integer output, or `none`, as in the design.
    #[schemars(schema_with = "schema::dither")]
    pub dither: String,
    /// The stages in the spec's order, the lines of a row under one entry.
    pub stages: Vec<MethodsStage>,
    /// What the exact response promises, band by band in the spec's order.
    pub bands: Vec<MethodsBand>,
}

/// A stage, or a row of lines.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct MethodsStage {
    /// Place of the stage in the spec, 1 for the first.
    #[schemars(range(min = 1))]
    pub stage: usize,
    /// Kind of the stage as in the spec.
    #[schemars(schema_with = "spec::kind_schema")]
    pub kind: String,
    /// Prototype family as in the spec; null for a notch, which is given by its poles and
    /// zeros directly.
    #[schemars(with = "Option<Family>")]
    pub family: Option<String>,
    /// Order of the low-pass prototype; null for a notch.
    #[schemars(range(min = 1))]
    pub order: Option<u32>,
    /// Poles of one line: twice `order` for band-pass and band-stop, 2 for a notch.
    pub total_order: u32,
    /// Sections of one line.
    pub sections: u32,
    /// What an edge is; null for a peak, a shelf, a weighting and a transfer function.
    pub edge_definition: Option<EdgeDefinition>,
    /// Ripple of the pass band, dB; null for families without, unless the order was found
    /// from limits.
    pub ripple_db: Option<Finite>,
    /// Attenuation of the stop band, dB; null for families without, unless the order was
    /// found from limits.
    pub stop_db: Option<Finite>,
    /// The lines of the row that fit at this sample rate; one for a stage that is no row.
    pub lines: Vec<MethodsLine>,
}

/// What an edge of a stage is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum EdgeDefinition {
    /// The response is down to half the power, 3.01 dB: Butterworth, Bessel, notch.
    HalfPower,
    /// The ripple of the pass band ends: Chebyshev I, elliptic, and any family where the order
    /// was found from limits.
    RippleEnds,
    /// The stop band begins: Chebyshev II.
    StopBegins,
}

/// A line of a row, or a stage that is no row.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct MethodsLine {
    /// Number of the line in its row, 1 for the fundamental; null for a stage that is no row.
    #[schemars(range(min = 1))]
    pub line: Option<u32>,
    /// One edge, or the lower and the upper, Hz, as designed for; a notch: half its width
    /// below and above the center. The frequency of a peak or shelf; none for a weighting or
    /// a transfer function.
    #[schemars(length(max = 2))]
    pub edges_hz: Vec<Hz>,
    /// From pass band to stop band at each of the edges, from the exact response of this
    /// line alone.
    pub transitions: Vec<MethodsTransition>,
}

/// From pass band to stop band at one edge, on the exact response of one stage or line
/// alone, whatever the other stages add.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct MethodsTransition {
    /// Where the pass band ends: at the edge, for Chebyshev II and the notch at the
    /// half-power point; null where the response does not come up to `pass_db`.
    pub pass_hz: Option<Hz>,
    /// Attenuation there, dB: `ripple_db`, or 3.010 for half power.
    pub pass_db: Finite,
    /// Where the attenuation first reaches `stop_db`, counted from the pass band; for
    /// Chebyshev II the edge. Null where `stop_db` is, and where it is not reached.
    pub stop_hz: Option<Hz>,
    /// The stage's stop attenuation, dB. For families without one: the largest `reduce_db` of a
    /// band with its center on the stop side of the edge, in which this line alone reaches
    /// it somewhere; null where there is no such band.
    pub stop_db: Option<Finite>,
    /// Transition width, the distance of `pass_hz` and `stop_hz`; null where one of them is.
    pub width_hz: Option<Hz>,
}

/// What the exact response of the whole cascade promises in one band, outside its
/// exceptions. Attenuations stop at 180 dB.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct MethodsBand {
    /// Name of the band; `xN` for line N of a row.
    pub name: String,
    /// Lower edge.
    pub from_hz: Hz,
    /// Upper edge.
    pub to_hz: Hz,
    /// What must hold; null for a band that is only observed.
    pub require: Option<Require>,
    /// Least attenuation; null for keep and observed bands.
    pub attenuation_db: Option<Db>,
    /// Largest deviation of the gain from 0 dB, without sign; null for reduce and residual
    /// bands.
    pub deviation_db: Option<Db>,
    /// Group delay at the center; null for reduce and residual bands.
    pub group_delay_s: Option<Seconds>,
}

impl Methods {
    /// What `design` comes to. `dither` is the name and version of the dither of integer
    /// output, or `none`; `None` where this program does not filter (`measure`).
    ///
    /// # Errors
    /// A figure of the design is NaN or infinite.
    pub fn new(design: &Design, dither: Option<&str>) -> Result<Self, NotFinite> {
        let stages = stages(design)?;
        let identity = design.stages.is_empty();
        let runs = dither.is_some() && !identity;
        let both_ways = design.passes > 1;
        let lines = design.stages.iter().map(|stage| stage.size.total_order);
        let mut methods = Methods {
            sentence: String::new(),
            program: concat!("bandproof ", env!("CARGO_PKG_VERSION")).to_owned(),
            applied: dither.is_some(),
            rate_hz: design.rate_hz,
            design: (!identity).then(|| ways::described(design)),
            total_order: lines.fold(0, u32::saturating_add),
            sections: design.sections.len(),
            passes: design.passes,
            direction: if both_ways { "forward and backward" } else { "forward" }.to_owned(),
            causal: !both_ways,
            phase: if identity || both_ways { "zero" } else { phase::of_one_pass(&design.sections) }.to_owned(),
            start_state: runs.then(|| {
                if both_ways {
                    "each pass from the steady state of the first sample it meets, the recording continued at both \
                     ends by its own samples turned about the first and the last one (odd extension) for as long as \
                     one pass rings"
                } else {
                    "steady state of the first sample, as if it had always been there"
                }
                .to_owned()
            }),
            settling_s: design.settling_s.try_into()?,
            arithmetic: runs.then(|| {
                "64-bit floating point (IEEE 754 double precision), each operation rounded once, transposed direct \
                 form II"
                    .to_owned()
            }),
            dither: dither.unwrap_or("none").to_owned(),
            stages,
            bands: design.bands.iter().map(MethodsBand::new).collect::<Result<_, _>>()?,
        };
        methods.sentence = sentence::sentence(&methods, design);
        Ok(methods)
    }
}

/// The stages with their lines together.
fn stages(design: &Design) -> Result<Vec<MethodsStage>, NotFinite> {
    let mut stages: Vec<MethodsStage> = Vec::new();
    let mut rest = design.sections.as_slice();
    for stage in &design.stages {
        let count = usize::try_from(stage.size.sections).unwrap_or(usize::MAX).min(rest.len());
        let (own, after) = rest.split_at(count);
        rest = after;
        let line = MethodsLine::new(stage, own, design)?;
        match stages.last_mut() {
            Some(last) if last.stage == stage.placed.stage_index + 1 => last.lines.push(line),
            _ => stages.push(MethodsStage::new(stage, line)?),
        }
    }
    Ok(stages)
}

impl MethodsStage {
    fn new(designed: &DesignedStage, line: MethodsLine) -> Result<Self, NotFinite> {
        let DesignedStage { placed, size: StageSize { total_order, sections }, .. } = designed;
        let stage = MethodsStage {
            stage: placed.stage_index + 1,
            kind: placed.stage.kind_name().to_owned(),
            family: None,
            order: None,
            total_order: *total_order,
            sections: *sections,
            edge_definition: matches!(placed.stage, Stage::Notch(_)).then_some(EdgeDefinition::HalfPower),
            ripple_db: None,
            stop_db: None,
            lines: vec![line],
        };
        let Stage::Filter(filter) = &placed.stage else { return Ok(stage) };
        Ok(MethodsStage {
            family: Some(filter.family.name().to_owned()),
            order: designed.recipe.order(),
            edge_definition: Some(match filter.order {
                Order::Given(_) => filter.family.into(),
                Order::Limits(_) => EdgeDefinition::RippleEnds,
            }),
            ripple_db: filter.ripple_db.map(Finite::try_from).transpose()?,
            stop_db: filter.stop_db.map(Finite::try_from).transpose()?,
            ..stage
        })
    }
}

impl From<Family> for EdgeDefinition {
    fn from(family: Family) -> Self {
        match family {
            Family::Butterworth | Family::Bessel => EdgeDefinition::HalfPower,
            Family::Chebyshev1 | Family::Elliptic => EdgeDefinition::RippleEnds,
            Family::Chebyshev2 => EdgeDefinition::StopBegins,
        }
    }
}

impl MethodsLine {
    /// `own` are the sections of one pass of this line.
    fn new(stage: &DesignedStage, own: &[Section], design: &Design) -> Result<Self, NotFinite> {
        let placed = &stage.placed;
        let net = own.repeat(design.passes as usize);
        let transitions = transition::transitions(placed, &net, f64::from(design.rate_hz), &design.bands);
        Ok(MethodsLine {
            line: placed.harmonic,
            edges_hz: placed.edges_hz.iter().map(|&hz| hz.try_into()).collect::<Result<_, _>>()?,
            transitions: transitions.iter().map(MethodsTransition::new).collect::<Result<_, _>>()?,
        })
    }
}

impl MethodsTransition {
    fn new(transition: &Transition) -> Result<Self, NotFinite> {
        let hz = |hz: Option<f64>| hz.map(Hz::try_from).transpose();
        Ok(MethodsTransition {
            pass_hz: hz(transition.pass_hz)?,
            pass_db: transition.pass_db.try_into()?,
            stop_hz: hz(transition.stop_hz)?,
            stop_db: transition.stop_db.map(Finite::try_from).transpose()?,
            width_hz: hz(transition.width_hz())?,
        })
    }
}

impl MethodsBand {
    fn new(design: &BandDesign) -> Result<Self, NotFinite> {
        let least_db: Db = design.attenuation_min_db.try_into()?;
        let largest_db: Db = design.attenuation_max_db.try_into()?;
        let require = Require::new(&design.band.requirement)?;
        let lowered = matches!(require, Some(Require::ReduceDb(_) | Require::ResidualDbfs(_)));
        let deviation_db = least_db.get().abs().max(largest_db.get().abs());
        Ok(MethodsBand {
            name: design.band.name.clone(),
            from_hz: design.band.line.from_hz.try_into()?,
            to_hz: design.band.line.to_hz.try_into()?,
            require,
            attenuation_db: lowered.then_some(least_db),
            deviation_db: if lowered { None } else { Some(deviation_db.try_into()?) },
            group_delay_s: design.group_delay_s.map(Seconds::try_from).transpose()?,
        })
    }
}
