//! What a reader has to know of a curve as it was designed.

use super::formula::ZERO_DB_HZ;
use super::{anchor_hz, bs1770, deviation};
use crate::design::wording::figure;
use crate::section::Section;
use crate::spec::Curve;

/// Two sentences on `sections`, which were made for `curve` at `rate_hz`: which curve and how
/// near to it, and what it is not. They end without a period.
pub fn remarks(curve: Curve, sections: &[Section], rate_hz: f64) -> [String; 2] {
    let what = match curve {
        Curve::A => "frequency weighting A of IEC 61672-1:2013",
        Curve::C => "frequency weighting C of IEC 61672-1:2013",
        Curve::K => "weighting of ITU-R BS.1770",
        Curve::Riaa => "playback of records after IEC 60098 (3180, 318, and 75 us, without the later 7950 us)",
    };
    let anchor_hz = anchor_hz(curve, rate_hz);
    let (usual_hz, usual_db) = match curve {
        Curve::K => (bs1770::ANCHOR_HZ, "+0.691 dB"),
        Curve::A | Curve::C | Curve::Riaa => (ZERO_DB_HZ, "0 dB"),
    };
    let anchor = if anchor_hz == usual_hz {
        format!(", {usual_db} at {} Hz", figure(usual_hz))
    } else {
        format!(", exact at {} Hz since {} Hz is out of reach", figure(anchor_hz), figure(usual_hz))
    };
    let nearness = if curve == Curve::K && rate_hz == bs1770::RATE_HZ {
        "the printed coefficients".to_owned()
    } else {
        let of = if curve == Curve::K { "its response at 48000 Hz" } else { "its formula" };
        let deviation = deviation(curve, sections, rate_hz);
        format!(
            "within {} dB of {of} up to {} Hz (farthest off at {} Hz), not held above",
            figure(libm::ceil(deviation.largest_db * 1e5) / 1e5),
            figure(deviation.up_to_hz),
            figure(libm::round(deviation.at_hz * 10.0) / 10.0)
        )
    };
    let caution = match curve {
        Curve::A | Curve::C => {
            "levels are relative to full scale: this is no sound level meter, and where a standard or a law asks for \
             a level, a calibrated one has to measure it"
        }
        Curve::K => {
            "it is the weighting alone, without gating and summing over channels: where a loudness is asked for, \
             a meter after the Recommendation has to measure it"
        }
        Curve::Riaa => {
            "it is the curve alone: cartridge and preamplifier add their own response, which only a calibrated chain \
             shows"
        }
    };
    [format!("{what}{anchor}: {nearness}"), caution.to_owned()]
}
