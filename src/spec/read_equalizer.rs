//! `[[stage]]` of peaks, shelves and standard curves.

use super::fields::{Fields, Got};
use super::problems::Problems;
use super::quantity::{Low, Quantity};
use super::read::FREQUENCY;
use super::stages::{EqualizerKind, EqualizerShape, EqualizerStage, WeightingStage};

/// Gain of a peak or shelf.
pub(super) const BOOST: Quantity = Quantity { noun: "a gain", unit: "dB", low: Low::From(-60.0), high: 60.0 };

/// Q of a peak or shelf: at 0.01 the points at half the decibels of a peak lie four decades
/// apart, at 1000 a thousandth of its center.
pub(super) const SHAPE_Q: Quantity = Quantity { noun: "a Q", unit: "", low: Low::From(0.01), high: 1000.0 };

/// Slope of a shelf: above 1 its gain no longer rises or falls all the way. The lower end
/// keeps the reciprocal, which its section is made from, at a size that means something.
pub(super) const SLOPE: Quantity = Quantity { noun: "a slope", unit: "", low: Low::From(0.001), high: 1.0 };

/// Reads a peak or a shelf; nothing where something is wrong with it.
pub(super) fn equalizer(fields: &Fields<'_>, kind: EqualizerKind, problems: &mut Problems) -> Option<EqualizerStage> {
    let is_peak = kind == EqualizerKind::Peak;
    let (key, what) = if is_peak { ("center_hz", "center") } else { ("edge_hz", "edge") };
    let hz = fields.number(key, &FREQUENCY, problems);
    // Another key in its place has been refused already.
    if !hz.is_there() && !["center_hz", "edge_hz", "edges_hz"].iter().any(|key| fields.has(key)) {
        fields.missing(key, &format!("add the frequency of its {what} in hertz"), problems);
    }
    let gain_db = gain(fields, problems);
    let shape = shape(fields, is_peak, problems);
    Some(EqualizerStage { kind, hz: hz.value()?, gain_db: gain_db?, shape: shape? })
}

/// `gain_db`.
fn gain(fields: &Fields<'_>, problems: &mut Problems) -> Option<f64> {
    let gain_db = fields.number("gain_db", &BOOST, problems);
    // A plain factor in its place has been refused already.
    if !gain_db.is_there() && !fields.has("gain") {
        fields.missing("gain_db", "add its gain in decibels, above 0 to raise and below 0 to lower", problems);
    }
    if gain_db == Got::Is(0.0) {
        let message = format!("gain_db = 0 leaves {} without effect", fields.what);
        problems.add(fields.value_place("gain_db"), message, "remove the stage, or give another gain");
        return None;
    }
    gain_db.value()
}

/// `q`, or `slope` of a shelf.
fn shape(fields: &Fields<'_>, is_peak: bool, problems: &mut Problems) -> Option<EqualizerShape> {
    let q = fields.number("q", &SHAPE_Q, problems);
    if is_peak {
        // Another key in its place has been refused already.
        if !q.is_there() && !["width_hz", "slope"].iter().any(|key| fields.has(key)) {
            fields.missing("q", "add q: center over the width at half its decibels", problems);
        }
        return q.value().map(EqualizerShape::Q);
    }
    let slope = fields.number("slope", &SLOPE, problems);
    match (q, slope) {
        (Got::Absent, Got::Absent) => {
            let message = format!("{} has neither q nor slope", fields.what);
            problems.add(fields.place, message, "add slope (1 is the steepest without a bump), or q");
            None
        }
        (q, Got::Absent) => q.value().map(EqualizerShape::Q),
        (Got::Absent, slope) => slope.value().map(EqualizerShape::Slope),
        _ => {
            let message = format!("{} has both q and slope, which say the same", fields.what);
            problems.add(fields.key_place("slope"), message, "keep one of them");
            None
        }
    }
}

/// Reads a standard curve; nothing where something is wrong with it.
pub(super) fn weighting(fields: &Fields<'_>, problems: &mut Problems) -> Option<WeightingStage> {
    let curve = fields.word("curve", problems);
    if !curve.is_there() {
        fields.missing("curve", "choose one of A, C, K, riaa", problems);
    }
    Some(WeightingStage { curve: curve.value()? })
}
