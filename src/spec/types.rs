//! The normalized spec: every default filled in, every value in range.

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
    /// Name of one keep or observed band, `name xN` for a line of a row: its gain counts
    /// as 0 dB where pairs are measured that something else filtered.
    pub reference_band: Option<String>,
    /// The filters, applied in this order.
    pub stages: Vec<Stage>,
    /// Named frequency ranges with their requirements. No two share a name, and none has
    /// the name of a line of another. A reduce band shares no frequency with a keep band
    /// that does not name it in `except`.
    pub bands: Vec<Band>,
}

impl Spec {
    /// Whether nothing is done to the samples: no stage and no gain.
    /// Then there is no dither, whatever [`OutputSpec::dither`] says.
    pub fn is_identity(&self) -> bool {
        self.stages.is_empty() && self.output.gain_db == 0.0
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

/// One filter as a user writes it.
#[derive(Clone, Debug, PartialEq)]
pub enum Stage {
    /// A low-pass, high-pass, band-pass, band-stop or a row of either of the last two.
    Filter(FilterStage),
    /// One second-order notch a line.
    Notch(NotchStage),
}

impl Stage {
    /// The word for its kind in spec and report.
    pub fn kind_name(&self) -> &'static str {
        match self {
            Self::Filter(filter) => filter.kind.name(),
            Self::Notch(_) => NotchStage::KIND_NAME,
        }
    }
}

/// A stage designed from an analog prototype.
#[derive(Clone, Debug, PartialEq)]
pub struct FilterStage {
    /// What it lets through.
    pub kind: FilterKind,
    /// Its prototype.
    pub family: Family,
    /// Order of the low-pass prototype, 1 to [`Family::highest_order`].
    pub order: u32,
    /// Where its edges are.
    pub placement: Placement,
    /// Pass band ripple, dB, above 0 and at most 12: there for Chebyshev I and elliptic
    /// alone.
    pub ripple_db: Option<f64>,
    /// Stop band attenuation, dB, above 3.0103 (half power) and above the ripple, at most
    /// 200: there for Chebyshev II and elliptic alone.
    pub stop_db: Option<f64>,
}

/// What a [`FilterStage`] lets through.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum FilterKind {
    Lowpass,
    Highpass,
    Bandpass,
    Bandstop,
}

/// Prototype family. It decides what an edge is: the half-power point (-3 dB) for
/// Butterworth and Bessel, the end of the ripple for Chebyshev I and elliptic, the
/// beginning of the stop band for Chebyshev II.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Family {
    Butterworth,
    Chebyshev1,
    Chebyshev2,
    Elliptic,
    Bessel,
}

impl Family {
    /// Highest order of its low-pass prototype: as far as prototypes are held against
    /// references. Beyond order 14 elliptic filters of usual ripple have transition
    /// bands below the resolution of what they are used on.
    pub fn highest_order(self) -> u32 {
        if self == Self::Elliptic { 14 } else { 20 }
    }

    /// Whether its pass band has a ripple to choose, `ripple_db`.
    pub fn takes_ripple(self) -> bool {
        matches!(self, Self::Chebyshev1 | Self::Elliptic)
    }

    /// Whether its stop band has an attenuation to choose, `stop_db`.
    pub fn takes_stop(self) -> bool {
        matches!(self, Self::Chebyshev2 | Self::Elliptic)
    }
}

/// Where a [`FilterStage`]'s edges are.
#[derive(Clone, Debug, PartialEq)]
pub enum Placement {
    /// One edge: low-pass and high-pass.
    Edge {
        /// The edge, Hz, above 0.
        edge_hz: f64,
    },
    /// Two edges: band-pass and band-stop.
    Edges {
        /// Lower and upper edge, Hz, above 0 and in this order.
        edges_hz: [f64; 2],
    },
    /// A row of lines at `center_hz` times 1, 2, ... `harmonics`; edges lie half a
    /// width below and above each center.
    Row(Row),
}

/// Lines at the multiples of a center. In a spec that was read, every line has
/// `0 < from_hz < center_hz < to_hz`; the lines of a row of stops or notches share no
/// frequency, and those of a row of band-passes have one in common.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Row {
    /// Center of the first line, Hz, above 0.
    pub center_hz: f64,
    /// Extent of the lines, edge to edge.
    pub width: Width,
    /// Number of lines, from 1 to 500.
    pub harmonics: u32,
}

/// Extent of the lines of a row.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Width {
    /// The same number of Hz for every line: less than twice the center.
    Hz(f64),
    /// The same Q (center over width) for every line: above 0.5.
    Q(f64),
}

/// One line of a row, or a single range.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Line {
    /// 1 for the fundamental.
    pub harmonic: u32,
    /// Center, Hz.
    pub center_hz: f64,
    /// Lower edge, Hz.
    pub from_hz: f64,
    /// Upper edge, Hz.
    pub to_hz: f64,
}

impl Row {
    /// The lines, lowest first.
    pub fn lines(&self) -> impl Iterator<Item = Line> + use<> {
        let row = *self;
        (1..=row.harmonics).map(move |harmonic| {
            let center_hz = row.center_hz * f64::from(harmonic);
            let width_hz = match row.width {
                Width::Hz(hz) => hz,
                Width::Q(q) => center_hz / q,
            };
            Line { harmonic, center_hz, from_hz: center_hz - width_hz / 2.0, to_hz: center_hz + width_hz / 2.0 }
        })
    }
}

/// A row of notches: `width` is the -3 dB width of the digital filter.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NotchStage {
    /// Where the notches are and how wide.
    pub row: Row,
}

impl NotchStage {
    /// The word for this kind of stage in spec and report.
    pub const KIND_NAME: &str = "notch";
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
