//! `designs`: the spec at one sample rate, what it promises, and what the witness saw.

use super::{Db, Finite, Hz, Methods, NotFinite, Require, Seconds, schema};
use crate::design::check::CAP_DB;
use crate::design::{BandDesign, Check, Design, DesignedStage, LeftOut, Slack, Violation};
use crate::section::Section;
use crate::spec::{self, Family, Stage};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize, Serializer, ser::Error};

/// The spec at one sample rate.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct DesignEntry {
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Lines, stages and bands that do not fit below half the rate.
    pub left_out: Vec<LeftOutEntry>,
    /// What each stage became, in the spec's order, a row's lines one by one.
    pub stages: Vec<StageEntry>,
    /// The cascade in the order it runs, coefficients in full.
    #[serde(serialize_with = "finite_sections")]
    pub sections: Vec<Section>,
    /// How often the cascade runs over the samples: 1, or 2 for forward and backward. `sections`,
    /// orders and `max_pole_radius` are those of one pass, everything else that of both.
    #[schemars(range(min = 1))]
    pub passes: u32,
    /// Seconds until the tail of the impulse response no longer matters: figures of
    /// recordings leave out as much at the start, with two passes also at the end.
    #[schemars(extend("minimum" = 0))]
    pub settling_s: Seconds,
    /// Largest distance of a pole from zero; 0 for the identity, always below 1.
    #[schemars(extend("minimum" = 0, "exclusiveMaximum" = 1))]
    pub max_pole_radius: Finite,
    /// How far the net response is at most, dB, from that of coefficients with all their digits,
    /// of which `sections` holds 53 binary ones; where it is below -80 dB, as a part of that
    /// level. To three digits. Of weighting stages and of sections as given a bound, which
    /// rounding stays within; calculated of all others.
    #[schemars(extend("minimum" = 0))]
    pub rounding_db: Finite,
    /// Where it is farthest, Hz; null for the identity, which has no coefficients.
    pub rounding_at_hz: Option<Hz>,
    /// Name and version of the dither, or `none`. It speaks of integer output;
    /// float output is never dithered.
    #[schemars(schema_with = "schema::dither")]
    pub dither: String,
    /// What the exact response promises in each band, in the spec's order.
    pub bands: Vec<DesignBand>,
    /// What an impulse sent through the same code showed; null where none was sent
    /// (`design`, `measure`).
    pub witness: Option<WitnessEntry>,
    /// What a methods section has to state.
    pub methods: Methods,
}

/// Something that does not fit below half the sample rate.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct LeftOutEntry {
    /// The line, stage or band.
    pub what: String,
    /// Why, with figures.
    pub reason: String,
}

/// One stage, or one line of a row, at one sample rate.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct StageEntry {
    /// Place of the stage in the spec, 1 for the first.
    #[schemars(range(min = 1))]
    pub stage: usize,
    /// Number of the line in its row, 1 for the fundamental; null for a stage that is no row.
    #[schemars(range(min = 1))]
    pub line: Option<u32>,
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
    /// Poles of the finished filter: twice `order` for band-pass and band-stop.
    pub total_order: u32,
    /// Second-order sections it takes.
    pub sections: u32,
    /// One edge, or the lower and the upper, Hz, as written; a notch: its -3 dB points. The
    /// frequency of a peak or shelf; none for a weighting or a transfer function.
    #[schemars(length(max = 2))]
    pub edges_hz: Vec<Hz>,
    /// Ripple of the pass band, dB; null for families without, unless the order was found
    /// from limits.
    pub ripple_db: Option<Finite>,
    /// Attenuation of the stop band, dB; null for families without, unless the order was
    /// found from limits.
    pub stop_db: Option<Finite>,
    /// What the exact response leaves of each limit where the order was found from limits,
    /// pass edges first; empty where the order is given.
    pub limits: Vec<LimitEntry>,
    /// What else there is to know of this stage at this rate, in sentences.
    pub remarks: Vec<String>,
}

/// A limit of a stage whose order was found from limits, and what is left of it.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct LimitEntry {
    /// Which side of the transition the edge belongs to.
    pub edge: LimitEdge,
    /// The edge, Hz.
    pub at_hz: Hz,
    /// Attenuation of all passes that is allowed at most on the pass side, or asked for on the
    /// stop side, dB.
    pub limit_db: Finite,
    /// How far the exact response stays on the right side of the limit, dB, at its worst
    /// frequency from the edge on, and at most 180. Between two edges of the same side each
    /// speaks for its half.
    pub slack_db: Db,
}

/// A side of the transition.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum LimitEdge {
    /// The pass band ends here.
    Pass,
    /// The stop band begins here.
    Stop,
}

/// What the exact response promises in one band. Attenuations stop at 180 dB.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct DesignBand {
    /// Name of the band; `xN` for line N of a row.
    pub name: String,
    /// Lower edge, Hz.
    pub from_hz: Hz,
    /// Upper edge, Hz.
    pub to_hz: Hz,
    /// What must hold; null for a band that is only observed.
    pub require: Option<Require>,
    /// Least attenuation anywhere in the band outside its exceptions, dB, positive where the
    /// level falls.
    pub attenuation_min_db: Db,
    /// Largest attenuation anywhere in the band outside its exceptions, dB.
    pub attenuation_max_db: Db,
    /// Start, Hz, of the range in which the requirement of a reduce or residual band is
    /// reached, which may begin below the band; null for other bands and where no
    /// frequency reaches it.
    pub reaches_from_hz: Option<Hz>,
    /// End of that range, Hz; null likewise.
    pub reaches_to_hz: Option<Hz>,
    /// Width of what is taken out of a keep band by its exceptions, Hz; 0 for other bands.
    pub excepted_hz: Hz,
    /// Group delay at the center, seconds; null for reduce and residual bands.
    pub group_delay_s: Option<Seconds>,
    /// Seconds until a steady line at the center is down by `reduce_db`, with two passes also
    /// from there to the end; null for other bands and for a line that never is.
    #[schemars(extend("minimum" = 0))]
    pub startup_s: Option<Seconds>,
    /// Length of the shortest recording in which the band can be judged, seconds; null
    /// without a requirement.
    #[schemars(extend("minimum" = 0))]
    pub shortest_s: Option<Seconds>,
    /// Whether the design holds the requirement; null without one.
    pub check: Option<CheckResult>,
    /// Where the requirement fails; null unless `check` is `impossible`.
    pub violation: Option<ViolationEntry>,
}

/// Whether the design can hold a requirement.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum CheckResult {
    /// It holds everywhere in the band.
    Guaranteed,
    /// It depends on where in the band the energy lies, or how loud it is.
    Depends,
    /// A keep band is violated outside its exceptions, or no frequency of a reduce
    /// band reaches its requirement.
    Impossible,
}

/// The worst point of an impossible requirement.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ViolationEntry {
    /// Where, Hz.
    pub at_hz: Hz,
    /// Gain there, dB, negative where the level falls.
    pub gain_db: Db,
}

/// What an impulse showed that was filtered by the very code that filters recordings.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct WitnessEntry {
    /// Whether it agrees with the sections' exact response.
    pub agrees: bool,
    /// The response seen in each band, in the spec's order.
    pub bands: Vec<WitnessBand>,
}

/// The response of one band as the witness saw it, to be compared with that of the design.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct WitnessBand {
    /// Name of the band.
    pub name: String,
    /// Least attenuation in the band outside its exceptions, dB; null where the
    /// witness has no figure for the band.
    pub attenuation_min_db: Option<Db>,
    /// Largest attenuation in the band outside its exceptions, dB; null likewise.
    pub attenuation_max_db: Option<Db>,
}

impl DesignEntry {
    /// The entry for `design`. `dither` is its name and version, or `none`.
    ///
    /// # Errors
    /// A figure of the design is NaN or infinite.
    pub fn new(design: &Design, dither: &str, witness: Option<WitnessEntry>) -> Result<Self, NotFinite> {
        let methods = Methods::new(design, Some(dither))?;
        DesignEntry::with(design, methods, witness)
    }

    /// The entry for a `design` that this program does not filter with, as in `measure`: no
    /// dither, no witness, and `methods` that say so.
    ///
    /// # Errors
    /// As [`DesignEntry::new`].
    pub fn not_applied(design: &Design) -> Result<Self, NotFinite> {
        DesignEntry::with(design, Methods::new(design, None)?, None)
    }

    fn with(design: &Design, methods: Methods, witness: Option<WitnessEntry>) -> Result<Self, NotFinite> {
        Ok(DesignEntry {
            rate_hz: design.rate_hz,
            left_out: design.left_out.iter().map(LeftOutEntry::from).collect(),
            stages: design.stages.iter().map(StageEntry::new).collect::<Result<_, _>>()?,
            sections: design.sections.clone(),
            passes: design.passes,
            settling_s: design.settling_s.try_into()?,
            max_pole_radius: design.max_pole_radius.try_into()?,
            rounding_db: three_digits(design.rounding_db).try_into()?,
            rounding_at_hz: if design.sections.is_empty() { None } else { Some(design.rounding_at_hz.try_into()?) },
            dither: methods.dither.clone(),
            bands: design.bands.iter().map(DesignBand::new).collect::<Result<_, _>>()?,
            witness,
            methods,
        })
    }
}

impl From<&LeftOut> for LeftOutEntry {
    fn from(left_out: &LeftOut) -> Self {
        LeftOutEntry { what: left_out.what.clone(), reason: left_out.reason.clone() }
    }
}

impl StageEntry {
    /// The entry for one stage.
    ///
    /// # Errors
    /// An edge, ripple, stop attenuation or slack is NaN or infinite.
    pub fn new(stage: &DesignedStage) -> Result<Self, NotFinite> {
        let DesignedStage { placed, size, .. } = stage;
        let edges_hz = placed.edges_hz.iter().map(|&hz| hz.try_into()).collect::<Result<_, _>>()?;
        let entry = StageEntry {
            stage: placed.stage_index + 1,
            line: placed.harmonic,
            kind: placed.stage.kind_name().to_owned(),
            family: None,
            order: None,
            total_order: size.total_order,
            sections: size.sections,
            edges_hz,
            ripple_db: None,
            stop_db: None,
            limits: stage.slack.iter().map(LimitEntry::new).collect::<Result<_, _>>()?,
            remarks: stage.remarks.clone(),
        };
        let Stage::Filter(filter) = &placed.stage else { return Ok(entry) };
        Ok(StageEntry {
            family: Some(filter.family.name().to_owned()),
            order: stage.recipe.order(),
            ripple_db: filter.ripple_db.map(Finite::try_from).transpose()?,
            stop_db: filter.stop_db.map(Finite::try_from).transpose()?,
            ..entry
        })
    }
}

impl LimitEntry {
    /// # Errors
    /// A figure is NaN or infinite.
    fn new(slack: &Slack) -> Result<Self, NotFinite> {
        Ok(LimitEntry {
            edge: if slack.is_stop { LimitEdge::Stop } else { LimitEdge::Pass },
            at_hz: slack.at_hz.try_into()?,
            limit_db: slack.limit_db.try_into()?,
            slack_db: slack.slack_db.try_into()?,
        })
    }
}

impl DesignBand {
    /// The entry for one band.
    ///
    /// # Errors
    /// A figure of the design is NaN or infinite.
    pub fn new(design: &BandDesign) -> Result<Self, NotFinite> {
        let (reaches_from_hz, reaches_to_hz) = match design.reaches_hz {
            Some((from_hz, to_hz)) => (Some(from_hz.try_into()?), Some(to_hz.try_into()?)),
            None => (None, None),
        };
        Ok(DesignBand {
            name: design.band.name.clone(),
            from_hz: design.band.line.from_hz.try_into()?,
            to_hz: design.band.line.to_hz.try_into()?,
            require: Require::new(&design.band.requirement)?,
            attenuation_min_db: design.attenuation_min_db.try_into()?,
            attenuation_max_db: design.attenuation_max_db.try_into()?,
            reaches_from_hz,
            reaches_to_hz,
            excepted_hz: design.excepted_width_hz().try_into()?,
            group_delay_s: design.group_delay_s.map(Seconds::try_from).transpose()?,
            startup_s: design.startup_s.map(Seconds::try_from).transpose()?,
            shortest_s: design.shortest_s.map(Seconds::try_from).transpose()?,
            check: design.check.map(CheckResult::from),
            violation: design.violation.map(ViolationEntry::new).transpose()?,
        })
    }
}

impl ViolationEntry {
    /// # Errors
    /// The frequency or the gain is NaN or infinite; a gain below -[`CAP_DB`] counts as that.
    fn new(violation: Violation) -> Result<Self, NotFinite> {
        Ok(ViolationEntry { at_hz: violation.at_hz.try_into()?, gain_db: violation.gain_db.max(-CAP_DB).try_into()? })
    }
}

impl From<Check> for CheckResult {
    fn from(check: Check) -> Self {
        match check {
            Check::Guaranteed => CheckResult::Guaranteed,
            Check::Depends => CheckResult::Depends,
            Check::Impossible => CheckResult::Impossible,
        }
    }
}

/// `value` to three significant digits.
fn three_digits(value: f64) -> f64 {
    format!("{value:.2e}").parse().unwrap_or(value)
}

/// [`Section`] holds bare `f64`, for which serde_json would write null.
fn finite_sections<S: Serializer>(sections: &[Section], serializer: S) -> Result<S::Ok, S::Error> {
    match sections.iter().flat_map(|s| s.b.iter().chain(&s.a)).find(|c| !c.is_finite()) {
        Some(&coefficient) => Err(S::Error::custom(NotFinite(coefficient))),
        None => sections.serialize(serializer),
    }
}
