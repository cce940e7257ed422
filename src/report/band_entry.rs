//! A band in one channel of one recording.

use super::{Db, Finite, Hz, NotFinite, Share};
use crate::evidence::{self, BandFigures, BandTask};
use crate::spec::Requirement;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// What must hold in a band: `{"reduce_db": 30.0}`, `{"keep_db": 0.5}` or
/// `{"residual_dbfs": -90.0}`, as in the spec.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum Require {
    /// The level must fall by this much or more, dB.
    ReduceDb(Finite),
    /// The gain must stay within plus or minus this much, dB.
    KeepDb(Finite),
    /// What is left may have this level at most, dB relative to a full-scale sine.
    ResidualDbfs(Finite),
}

impl Require {
    /// The requirement as reported; `None` for a band that is only observed.
    ///
    /// # Errors
    /// The limit is NaN or infinite.
    pub fn new(requirement: &Requirement) -> Result<Option<Self>, NotFinite> {
        Ok(match *requirement {
            Requirement::Reduce { reduce_db } => Some(Require::ReduceDb(reduce_db.try_into()?)),
            Requirement::Keep { keep_db, .. } => Some(Require::KeepDb(keep_db.try_into()?)),
            Requirement::Residual { residual_dbfs } => Some(Require::ResidualDbfs(residual_dbfs.try_into()?)),
            Requirement::Observe => None,
        })
    }
}

/// Whether a requirement was shown to hold.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum Verdict {
    /// Shown to hold.
    Met,
    /// Shown not to hold.
    Missed,
    /// Neither can be shown from this recording.
    Unproven,
}

impl From<evidence::Verdict> for Verdict {
    fn from(verdict: evidence::Verdict) -> Self {
        match verdict {
            evidence::Verdict::Met => Verdict::Met,
            evidence::Verdict::Missed => Verdict::Missed,
            evidence::Verdict::Unproven => Verdict::Unproven,
        }
    }
}

/// Why a band is unproven.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum ReasonCode {
    /// The band holds nothing that stands above its floor before filtering.
    NothingThere,
    /// The recording is too short for so narrow a band.
    TooShort,
    /// What remains is hidden by the rounding noise of the written samples.
    TooQuiet,
    /// A loud neighbor outside the band hides what remains.
    LoudNeighbor,
    /// The filter is still settling when the recording ends.
    Unsettled,
    /// What the device adds of its own hides what would have to be seen, or its clock
    /// wanders too much; only in pairs that `measure` was given.
    DeviceNoise,
    /// The band does not lie in the range that can be measured at this sample rate.
    OutOfRange,
}

impl From<evidence::ReasonCode> for ReasonCode {
    fn from(code: evidence::ReasonCode) -> Self {
        match code {
            evidence::ReasonCode::NothingThere => ReasonCode::NothingThere,
            evidence::ReasonCode::TooShort => ReasonCode::TooShort,
            evidence::ReasonCode::TooQuiet => ReasonCode::TooQuiet,
            evidence::ReasonCode::LoudNeighbor => ReasonCode::LoudNeighbor,
            evidence::ReasonCode::Unsettled => ReasonCode::Unsettled,
            evidence::ReasonCode::DeviceNoise => ReasonCode::DeviceNoise,
            evidence::ReasonCode::OutOfRange => ReasonCode::OutOfRange,
        }
    }
}

/// A band in one channel of one recording: figures over the settled part of the
/// samples as written, and the verdict. A figure below -200 dBFS or without a
/// meaning in its kind of band is null.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct BandEntry {
    /// Name of the band; `xN` for line N of a row.
    pub name: String,
    /// Lower edge, Hz.
    pub from_hz: Hz,
    /// Upper edge, Hz.
    pub to_hz: Hz,
    /// What must hold; null for a band that is only observed.
    pub require: Option<Require>,
    /// Level before, dB relative to a full-scale sine.
    pub before_dbfs: Option<Db>,
    /// Level up to which `before_dbfs` may be something else than the band's content.
    pub before_floor_dbfs: Option<Db>,
    /// Level after, likewise; a gain in force is taken back first.
    pub after_dbfs: Option<Db>,
    /// Level up to which `after_dbfs` may be something else than what the filter left.
    pub after_floor_dbfs: Option<Db>,
    /// `before_dbfs` less `after_dbfs`, dB: positive when the level falls.
    pub measured_attenuation_db: Option<Db>,
    /// Largest attenuation that this recording could have shown, dB; null where the
    /// band stands not above its floor before.
    pub demonstrable_attenuation_db: Option<Db>,
    /// Frequency of the highest peak before, Hz; null in keep and observed bands and where the
    /// peak lies below -200 dBFS.
    pub line_hz: Option<Hz>,
    /// Level of that peak before; null likewise.
    pub line_before_dbfs: Option<Db>,
    /// Level at the same place after; null likewise.
    pub line_after_dbfs: Option<Db>,
    /// Lowest gain seen in the band, dB, negative when the level falls; null in reduce and
    /// residual bands and where nothing in the band is loud enough.
    pub gain_min_db: Option<Db>,
    /// Highest gain seen in the band, dB; null likewise.
    pub gain_max_db: Option<Db>,
    /// One standard error, dB, of the gain that decides (the extreme closest to the limit, or
    /// the sub-band that lies outside); null likewise.
    #[schemars(extend("minimum" = 0))]
    pub gain_error_db: Option<Db>,
    /// Share of the band's width in which a gain could be seen, 0 to 1; null in
    /// reduce and residual bands.
    pub resolved: Option<Share>,
    /// Narrowest detail that the figures can tell apart, Hz; null where no spectrum was taken.
    pub resolution_hz: Option<Hz>,
    /// Whether the requirement was shown to hold; null where nothing is required.
    pub verdict: Option<Verdict>,
    /// Why the band is unproven; null unless it is.
    pub reason_code: Option<ReasonCode>,
    /// A sentence on the verdict or on figures that are null; null where none is needed.
    pub reason: Option<String>,
}

impl BandEntry {
    /// The entry for `figures` of `task`. A figure that is NaN or infinite becomes null.
    ///
    /// # Errors
    /// An edge or the limit is NaN or infinite.
    pub fn new(task: &BandTask, figures: &BandFigures) -> Result<Self, NotFinite> {
        let db = |figure: Option<f64>| figure.and_then(Db::new);
        let hz = |figure: Option<f64>| figure.and_then(Hz::new);
        Ok(BandEntry {
            name: task.name.clone(),
            from_hz: task.from_hz.try_into()?,
            to_hz: task.to_hz.try_into()?,
            require: Require::new(&task.requirement)?,
            before_dbfs: db(figures.before_dbfs),
            before_floor_dbfs: db(figures.before_floor_dbfs),
            after_dbfs: db(figures.after_dbfs),
            after_floor_dbfs: db(figures.after_floor_dbfs),
            measured_attenuation_db: db(figures.measured_attenuation_db),
            demonstrable_attenuation_db: db(figures.demonstrable_attenuation_db),
            line_hz: hz(figures.line_hz),
            line_before_dbfs: db(figures.line_before_dbfs),
            line_after_dbfs: db(figures.line_after_dbfs),
            gain_min_db: db(figures.gain_min_db),
            gain_max_db: db(figures.gain_max_db),
            gain_error_db: db(figures.gain_error_db),
            resolved: figures.resolved.and_then(Share::new),
            resolution_hz: hz(figures.resolution_hz),
            verdict: figures.verdict.map(Verdict::from),
            reason_code: figures.reason_code.map(ReasonCode::from),
            reason: figures.reason.clone(),
        })
    }

    /// The gain farthest from 0 dB that was seen in the band, the lower of two
    /// equally far; `None` where no gain was seen.
    pub fn farthest_gain_db(&self) -> Option<Db> {
        match (self.gain_min_db, self.gain_max_db) {
            (Some(min), Some(max)) if max.get().abs() > min.get().abs() => Some(max),
            (min, max) => min.or(max),
        }
    }

    /// The one figure that speaks for the band: the measured attenuation of a reduce
    /// band, the level after of a residual band, else the gain farthest from 0 dB.
    pub fn figure_db(&self) -> Option<Db> {
        match self.require {
            Some(Require::ReduceDb(_)) => self.measured_attenuation_db,
            Some(Require::ResidualDbfs(_)) => self.after_dbfs,
            Some(Require::KeepDb(_)) | None => self.farthest_gain_db(),
        }
    }
}
