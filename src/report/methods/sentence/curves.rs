//! Phrases of peaks, shelves and standard curves.

use super::figures::{hertz, nearest};
use crate::spec::{Curve, EqualizerKind, EqualizerShape, EqualizerStage};

/// `a peak of +6 dB at 1000 Hz with a Q of 4`.
pub fn equalizer(stage: &EqualizerStage) -> String {
    let sign = if stage.gain_db > 0.0 { "+" } else { "" };
    let (gain, at) = (format!("{sign}{} dB", nearest(stage.gain_db, 4)), hertz(stage.hz));
    let shape = match stage.shape {
        EqualizerShape::Q(q) => format!("a Q of {}", nearest(q, 6)),
        EqualizerShape::Slope(slope) => format!("a slope S of {}", nearest(slope, 4)),
    };
    match stage.kind {
        EqualizerKind::Peak => format!("a peak of {gain} at {at} Hz with {shape}"),
        EqualizerKind::Lowshelf => format!("a low shelf of {gain} with its midpoint at {at} Hz and {shape}"),
        EqualizerKind::Highshelf => format!("a high shelf of {gain} with its midpoint at {at} Hz and {shape}"),
    }
}

/// `the frequency weighting A of IEC 61672-1:2013`.
pub fn weighting(curve: Curve) -> String {
    match curve {
        Curve::A => "the frequency weighting A of IEC 61672-1:2013",
        Curve::C => "the frequency weighting C of IEC 61672-1:2013",
        Curve::K => "the K weighting of ITU-R BS.1770",
        Curve::Riaa => "the playback equalization of IEC 60098 (time constants of 3180, 318, and 75 us)",
    }
    .to_owned()
}
