//! `kind` of a stage: its words, and the keys that go with each.

use super::stages::{EqualizerKind, FilterKind, NotchStage, WeightingStage};
use super::transfer::{AnalogStage, DigitalStage};
use super::words::Word;

/// Keys of all kinds of stages.
pub(super) const KEYS: &[&str] = &[
    "kind",
    "family",
    "order",
    "edge_hz",
    "edges_hz",
    "stop_edge_hz",
    "stop_edges_hz",
    "center_hz",
    "width_hz",
    "q",
    "harmonics",
    "ripple_db",
    "stop_db",
    "gain_db",
    "slope",
    "curve",
    "numerator",
    "denominator",
    "sections",
    "zeros",
    "poles",
    "zeros_hz",
    "poles_hz",
    "gain",
    "match_hz",
    "rate_hz",
];

/// `kind`.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Kind {
    Filter(FilterKind),
    Notch,
    Equalizer(EqualizerKind),
    Weighting,
    Digital,
    Analog,
}

impl Kind {
    /// The keys that go with it.
    pub fn keys(self) -> &'static [&'static str] {
        match self {
            Self::Filter(FilterKind::Lowpass | FilterKind::Highpass) => {
                &["kind", "family", "order", "edge_hz", "stop_edge_hz", "ripple_db", "stop_db"]
            }
            Self::Filter(FilterKind::Bandpass | FilterKind::Bandstop) => &[
                "kind",
                "family",
                "order",
                "edges_hz",
                "stop_edges_hz",
                "center_hz",
                "width_hz",
                "q",
                "harmonics",
                "ripple_db",
                "stop_db",
            ],
            Self::Notch => &["kind", "center_hz", "width_hz", "q", "harmonics"],
            Self::Equalizer(EqualizerKind::Peak) => &["kind", "center_hz", "gain_db", "q"],
            Self::Equalizer(EqualizerKind::Lowshelf | EqualizerKind::Highshelf) => {
                &["kind", "edge_hz", "gain_db", "q", "slope"]
            }
            Self::Weighting => &["kind", "curve"],
            Self::Digital => &["kind", "numerator", "denominator", "sections", "zeros", "poles", "gain", "rate_hz"],
            Self::Analog => {
                &["kind", "numerator", "denominator", "zeros", "poles", "zeros_hz", "poles_hz", "gain", "match_hz"]
            }
        }
    }

    /// What is said of a known key that does not go with it: why, and the repair.
    pub fn stranger(self, key: &str) -> (String, String) {
        let said = |why: &str, repair: &str| (why.to_owned(), repair.to_owned());
        match (self, key) {
            (
                Self::Filter(FilterKind::Lowpass | FilterKind::Highpass),
                "edges_hz" | "center_hz" | "width_hz" | "q" | "harmonics",
            ) => said("a low-pass or high-pass has one edge", "write edge_hz instead"),
            (Self::Filter(FilterKind::Lowpass | FilterKind::Highpass), "stop_edges_hz") => {
                said("a low-pass or high-pass has one edge", "write stop_edge_hz instead")
            }
            (Self::Filter(_), "edge_hz") => said("it has two edges", "write edges_hz, or center_hz with width_hz or q"),
            (Self::Filter(_), "stop_edge_hz") => said("it has two edges", "write stop_edges_hz instead"),
            (Self::Notch, "family" | "order" | "ripple_db" | "stop_db") => {
                said("a notch is always one second-order section a line", "remove it")
            }
            (Self::Notch, "edge_hz" | "edges_hz") => {
                said("a notch lies around a center", "write center_hz with width_hz or q")
            }
            (Self::Equalizer(EqualizerKind::Peak), "edge_hz" | "edges_hz") => {
                said("a peak lies around a center", "write center_hz instead")
            }
            (Self::Equalizer(EqualizerKind::Peak), "width_hz" | "slope") => {
                said("the width of a peak is given by q", "write q instead, center over width")
            }
            (Self::Equalizer(_), "center_hz" | "edges_hz") => said("a shelf has one edge", "write edge_hz instead"),
            (Self::Equalizer(_), "family" | "order") => {
                said("peaks and shelves are always one second-order section", "remove it")
            }
            (Self::Equalizer(_), "gain") => said("the gain of a peak or shelf is in decibels", "write gain_db instead"),
            (Self::Digital | Self::Analog, "gain_db") => {
                said("the gain of a transfer function is a plain factor", "write gain instead")
            }
            (Self::Digital, "zeros_hz" | "poles_hz") => said(
                "roots in hertz are those of an analog filter",
                "write zeros and poles in the z plane, or choose kind = \"analog\"",
            ),
            _ => {
                let takers = Self::ALL.iter().filter(|kind| kind.keys().contains(&key)).map(|kind| kind.word());
                let takers = takers.collect::<Vec<_>>().join(", ");
                (format!("it belongs to {takers}"), "remove it, or choose one of these kinds".to_owned())
            }
        }
    }
}

impl Word for Kind {
    const ALL: &'static [Self] = &[
        Self::Filter(FilterKind::Lowpass),
        Self::Filter(FilterKind::Highpass),
        Self::Filter(FilterKind::Bandpass),
        Self::Filter(FilterKind::Bandstop),
        Self::Notch,
        Self::Equalizer(EqualizerKind::Peak),
        Self::Equalizer(EqualizerKind::Lowshelf),
        Self::Equalizer(EqualizerKind::Highshelf),
        Self::Weighting,
        Self::Digital,
        Self::Analog,
    ];
    const ALIASES: &'static [(&'static str, Self)] = &[
        ("lp", Self::Filter(FilterKind::Lowpass)),
        ("lpf", Self::Filter(FilterKind::Lowpass)),
        ("highcut", Self::Filter(FilterKind::Lowpass)),
        ("hp", Self::Filter(FilterKind::Highpass)),
        ("hpf", Self::Filter(FilterKind::Highpass)),
        ("lowcut", Self::Filter(FilterKind::Highpass)),
        ("bp", Self::Filter(FilterKind::Bandpass)),
        ("bpf", Self::Filter(FilterKind::Bandpass)),
        ("bs", Self::Filter(FilterKind::Bandstop)),
        ("bsf", Self::Filter(FilterKind::Bandstop)),
        ("bandreject", Self::Filter(FilterKind::Bandstop)),
        ("stop", Self::Filter(FilterKind::Bandstop)),
        ("comb", Self::Notch),
        ("hum", Self::Notch),
        ("peaking", Self::Equalizer(EqualizerKind::Peak)),
        ("bell", Self::Equalizer(EqualizerKind::Peak)),
        ("parametric", Self::Equalizer(EqualizerKind::Peak)),
        ("bass", Self::Equalizer(EqualizerKind::Lowshelf)),
        ("lowshelving", Self::Equalizer(EqualizerKind::Lowshelf)),
        ("treble", Self::Equalizer(EqualizerKind::Highshelf)),
        ("highshelving", Self::Equalizer(EqualizerKind::Highshelf)),
        ("aweighting", Self::Weighting),
        ("cweighting", Self::Weighting),
        ("kweighting", Self::Weighting),
        ("riaa", Self::Weighting),
        ("curve", Self::Weighting),
        ("iir", Self::Digital),
        ("fir", Self::Digital),
        ("biquad", Self::Digital),
        ("sections", Self::Digital),
        ("transferfunction", Self::Digital),
        ("zdomain", Self::Digital),
        ("laplace", Self::Analog),
        ("analogue", Self::Analog),
        ("sdomain", Self::Analog),
    ];

    fn word(self) -> &'static str {
        match self {
            Self::Filter(kind) => kind.name(),
            Self::Notch => NotchStage::KIND_NAME,
            Self::Equalizer(kind) => kind.name(),
            Self::Weighting => WeightingStage::KIND_NAME,
            Self::Digital => DigitalStage::KIND_NAME,
            Self::Analog => AnalogStage::KIND_NAME,
        }
    }
}
