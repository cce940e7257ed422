//! The normalized spec: every default filled in, every value in range.

use super::stages::{Family, Line, Row, Stage};
pub use crate::wave::RateMeaning;

/// What to do with a dataset and what must come out.
#[derive(Clone, Debug, PartialEq)]
pub struct Spec {
    /// Free text for people, without control characters but line breaks and tabs.
    pub title: Option<String>,
    /// What happens to stages and bands that do not fit below half the sample rate.
    pub beyond_half_rate: BeyondHalfRate,
    /// Which sample rate every frequency of the spec means in time-expanded recordings;
    /// without it they fail.
    pub rate: Option<RateMeaning>,
    /// How filtered samples are written.
    pub output: OutputSpec,
    /// Whether the cascade runs once, or forward and backward.
    pub phase: Phase,
    /// There where the cascade is to be found from the bands: then there are no stages, some
    /// band has `reduce_db` and none `residual_dbfs`.
    pub auto: Option<Auto>,
    /// Name of one keep or observed band, `name xN` for a line of a row: its gain counts
    /// as 0 dB where pairs are measured that something else filtered.
    pub reference_band: Option<String>,
    /// The filters, applied in this order. With [`Phase::Zero`] none of them is a weighting or
    /// a transfer function: half of their decibels is no rational filter.
    pub stages: Vec<Stage>,
    /// Named frequency ranges with their requirements. No two share a name, and none has
    /// the name of a line of another. A reduce band shares no frequency with a keep band
    /// that does not name it in `except`.
    pub bands: Vec<Band>,
}

impl Spec {
    /// Whether nothing is done to the samples: no stage, none to be found, and no gain.
    /// Then there is no dither, whatever [`OutputSpec::dither`] says.
    pub fn is_identity(&self) -> bool {
        self.stages.is_empty() && self.auto.is_none() && self.output.gain_db == 0.0
    }

    /// The largest `reduce_db` of the spec, dB; nothing where no band must be reduced.
    pub fn largest_reduce_db(&self) -> Option<f64> {
        self.bands.iter().filter_map(|band| band.requirement.reduce_db()).reduce(f64::max)
    }

    /// All bands by their reported names, rows as their lines, in the spec's order.
    pub fn named_bands(&self) -> impl Iterator<Item = NamedBand> + '_ {
        self.bands.iter().flat_map(Band::named)
    }
}

/// `phase`: how the cascade runs over the samples.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Phase {
    /// Once, forward.
    #[default]
    Causal,
    /// Forward and backward: no phase shift, and every limit of the spec means both passes
    /// together.
    Zero,
}

impl Phase {
    /// How often the cascade runs over the samples.
    pub fn passes(self) -> u32 {
        match self {
            Self::Causal => 1,
            Self::Zero => 2,
        }
    }
}

/// `design = "auto"` and `[auto]`: what the search for a cascade is held to.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, serde::Serialize, schemars::JsonSchema)]
#[schemars(deny_unknown_fields)]
pub struct Auto {
    /// The only prototype family of low-pass, high-pass and band-stop stages; any without it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(with = "Family")]
    pub family: Option<Family>,
    /// Most second-order sections of the cascade, 1 to 200.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "super::schema::max_sections")]
    pub max_sections: Option<u32>,
}

/// `beyond_half_rate`: what to do with a stage or band that does not fit.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum BeyondHalfRate {
    /// An error before anything is written.
    #[default]
    Error,
    /// It is left out at that rate and listed.
    LeaveOut,
}

/// `[output]`: how filtered samples are written.
#[derive(Clone, Copy, Debug, Default, PartialEq, serde::Serialize, schemars::JsonSchema)]
#[serde(default)]
#[schemars(rename = "Output", deny_unknown_fields)]
pub struct OutputSpec {
    /// Sample encoding of the outputs: `same` is the recording's own.
    pub encoding: OutputEncoding,
    /// Dither before rounding to integers: `triangular`, 2 steps peak to peak, or `none`,
    /// plain rounding. Float output has none.
    pub dither: Dither,
    /// What becomes of filtered samples beyond full scale, in integer output only:
    /// `refuse` fails the recording and names its peak and the repair, `clip` saturates and
    /// counts the samples, `scale` filters the recording again with the gain that fits.
    pub overload: Overload,
    /// One fixed gain for the whole dataset, dB, from -200 to 200.
    #[schemars(schema_with = "super::schema::gain")]
    pub gain_db: f64,
    /// Whether what was done is appended to each recording's own metadata: a line to the
    /// coding history of its `bext` chunk, without one a field to its `guan` chunk.
    pub history: bool,
}

/// `output.encoding`.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum OutputEncoding {
    /// The recording's own.
    #[default]
    Same,
    Pcm16,
    Pcm24,
    Pcm32,
    Float32,
    Float64,
}

/// `output.dither`.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Dither {
    /// Triangular, 2 steps peak to peak.
    #[default]
    Triangular,
    /// Plain rounding.
    None,
}

/// `output.overload`.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Overload {
    /// The recording fails; its peak and the repair are named.
    #[default]
    Refuse,
    /// Samples saturate and are counted.
    Clip,
    /// The recording is filtered again with the gain that fits.
    Scale,
}

/// A range of frequencies under a name, with a requirement or without, or a row of them.
#[derive(Clone, Debug, PartialEq)]
pub struct Band {
    /// Unique name of one line, not blank.
    pub name: String,
    /// Where it is.
    pub extent: Extent,
    /// What must hold in it.
    pub requirement: Requirement,
}

/// Where a [`Band`] is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Extent {
    /// One range.
    Range {
        /// Lower edge, Hz, from 0.
        from_hz: f64,
        /// Upper edge, Hz, above the lower one; may equal half the sample rate.
        to_hz: f64,
    },
    /// A range around each line; `width` is its full extent.
    Row(Row),
}

/// What must hold in a band, for the net response of the whole run.
#[derive(Clone, Debug, PartialEq)]
pub enum Requirement {
    /// The level must fall by this much or more.
    Reduce {
        /// dB, above 0 and at most 200.
        reduce_db: f64,
    },
    /// The gain must stay within plus or minus this much.
    Keep {
        /// dB, above 0 and at most 200.
        keep_db: f64,
        /// Names of reduce bands whose stops are taken out of this band; a row's
        /// name stands for all its lines, `name xN` for one of them.
        except: Vec<String>,
    },
    /// What is left may have this level at most.
    Residual {
        /// dB relative to a full-scale sine, from -200 to 0.
        residual_dbfs: f64,
    },
    /// Only observed.
    Observe,
}

impl Requirement {
    /// The least attenuation of a reduce band, dB.
    pub fn reduce_db(&self) -> Option<f64> {
        match self {
            Self::Reduce { reduce_db } => Some(*reduce_db),
            Self::Keep { .. } | Self::Residual { .. } | Self::Observe => None,
        }
    }
}

/// One band of a row, or a single band, by its reported name.
#[derive(Clone, Debug, PartialEq)]
pub struct NamedBand {
    /// `name`, or `name xN` for the lines of a row of two or more.
    pub name: String,
    /// Name of the [`Band`] it comes from.
    pub base_name: String,
    /// Whether it is a line of a row of two or more.
    pub in_row: bool,
    /// Its line; for a single range the center is the arithmetic one.
    pub line: Line,
    /// What must hold in it.
    pub requirement: Requirement,
}

impl Extent {
    /// The ranges it stands for, both edges rising from one to the next.
    pub fn lines(&self) -> Vec<Line> {
        match *self {
            Self::Range { from_hz, to_hz } => {
                vec![Line { harmonic: 1, center_hz: (from_hz + to_hz) / 2.0, from_hz, to_hz }]
            }
            Self::Row(row) => row.lines().collect(),
        }
    }

    /// Whether it is a row of two lines or more, whose bands carry the line's number in
    /// their names.
    pub fn is_numbered(&self) -> bool {
        matches!(self, Self::Row(row) if row.harmonics > 1)
    }
}

impl Band {
    /// The bands this entry stands for, lowest first.
    pub fn named(&self) -> Vec<NamedBand> {
        let in_row = self.extent.is_numbered();
        let one = |line: Line| NamedBand {
            name: if in_row { line_name(&self.name, line.harmonic) } else { self.name.clone() },
            base_name: self.name.clone(),
            in_row,
            line,
            requirement: self.requirement.clone(),
        };
        self.extent.lines().into_iter().map(one).collect()
    }
}

/// The name of a row's line.
pub(super) fn line_name(row: &str, harmonic: u32) -> String {
    format!("{row} x{harmonic}")
}
