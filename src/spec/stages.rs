//! The stages of a normalized spec.

use super::transfer::{AnalogStage, DigitalStage};

/// One filter as a user writes it.
#[derive(Clone, Debug, PartialEq)]
pub enum Stage {
    /// A low-pass, high-pass, band-pass, band-stop or a row of either of the last two.
    Filter(FilterStage),
    /// One second-order notch a line.
    Notch(NotchStage),
    /// A peak or a shelf.
    Equalizer(EqualizerStage),
    /// A standard curve.
    Weighting(WeightingStage),
    /// A transfer function in z.
    Digital(DigitalStage),
    /// A transfer function in s.
    Analog(AnalogStage),
}

impl Stage {
    /// The word for its kind in spec and report.
    pub fn kind_name(&self) -> &'static str {
        match self {
            Self::Filter(filter) => filter.kind.name(),
            Self::Notch(_) => NotchStage::KIND_NAME,
            Self::Equalizer(equalizer) => equalizer.kind.name(),
            Self::Weighting(_) => WeightingStage::KIND_NAME,
            Self::Digital(_) => DigitalStage::KIND_NAME,
            Self::Analog(_) => AnalogStage::KIND_NAME,
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
    /// Its order, or where its stop band begins.
    pub order: Order,
    /// Where its edges are. With [`Order::Limits`] an edge is where `ripple_db` ends,
    /// whatever the family, and there are no rows.
    pub placement: Placement,
    /// Pass band ripple, dB, above 0 and at most 12: there for Chebyshev I and elliptic
    /// alone, and for every family with [`Order::Limits`].
    pub ripple_db: Option<f64>,
    /// Stop band attenuation, dB, above 3.0103 (half power) and above the ripple, at most
    /// 200: there for Chebyshev II and elliptic alone, and for every family with
    /// [`Order::Limits`].
    pub stop_db: Option<f64>,
}

/// Order of a [`FilterStage`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Order {
    /// `order` of the low-pass prototype, 1 to [`Family::highest_order`].
    Given(u32),
    /// The smallest order that holds `ripple_db` up to the edges and `stop_db` from the stop
    /// edges on.
    Limits(StopEdges),
}

/// Where the stop band of a [`FilterStage`] begins, Hz. The stop edges lie on the stop side
/// of the edges: `stop_edge_hz` above `edge_hz` of a low-pass, below that of a high-pass,
/// `stop_edges_hz` around `edges_hz` of a band-pass, between those of a band-stop.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum StopEdges {
    /// `stop_edge_hz`: low-pass and high-pass.
    One(f64),
    /// `stop_edges_hz`, rising: band-pass and band-stop.
    Two([f64; 2]),
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

/// A peak or a shelf: one second-order section after the W3C note "Audio EQ Cookbook".
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EqualizerStage {
    /// Which.
    pub kind: EqualizerKind,
    /// `center_hz` of a peak, where the gain is `gain_db`; `edge_hz` of a shelf, where it is
    /// half of that.
    pub hz: f64,
    /// Gain at the center, or on the shelf, dB, from -60 to 60 and not 0.
    pub gain_db: f64,
    /// How wide, or how steep.
    pub shape: EqualizerShape,
}

/// Which [`EqualizerStage`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum EqualizerKind {
    Peak,
    Lowshelf,
    Highshelf,
}

/// How wide a peak is, or how steep a shelf.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum EqualizerShape {
    /// `q` of the note, from 0.01 to 1000; of a peak the center over the distance of the
    /// points at half its decibels.
    Q(f64),
    /// `slope` of the note, S, from 0.001 to 1; shelves only.
    Slope(f64),
}

/// A standard curve.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct WeightingStage {
    /// Which.
    pub curve: Curve,
}

impl WeightingStage {
    /// The word for this kind of stage in spec and report.
    pub const KIND_NAME: &str = "weighting";
}

/// `curve` of a [`WeightingStage`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Curve {
    /// Frequency weighting A of IEC 61672-1:2013, 0 dB at 1 kHz.
    A,
    /// Frequency weighting C of IEC 61672-1:2013, 0 dB at 1 kHz.
    C,
    /// The two stages before the mean square of ITU-R BS.1770, as they are.
    K,
    /// Playback of records after IEC 60098 (time constants 3180, 318 and 75 us), 0 dB at 1 kHz.
    Riaa,
}
