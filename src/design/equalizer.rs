//! Peaks and shelves after the W3C Working Group Note "Audio EQ Cookbook" of 8 June 2021.
//!
//! With A = 10^(gain / 40), w0 = 2 pi f0 / rate and alpha = sin(w0) / (2 q), or with `slope`
//! alpha = sin(w0) / 2 sqrt((A + 1/A)(1/slope - 1) + 2), the note's coefficients are the
//! bilinear transform, W = tan(w0 / 2), of
//!
//! ```text
//! peak        (s^2 + A/q W s + W^2)                / (s^2 + 1/(A q) W s + W^2)
//! low shelf   (s^2 + sqrt(A)/q W s + A W^2)        / (s^2 + 1/(sqrt(A) q) W s + W^2/A)
//! high shelf  A^2 (s^2 + 1/(sqrt(A) q) W s + W^2/A) / (s^2 + sqrt(A)/q W s + A W^2)
//! ```
//!
//! so a peak has `gain_db` at its center and 0 dB at 0 Hz and half the rate; a shelf has
//! half of `gain_db` at its edge, `gain_db` at the end it lifts and 0 dB at the other.
//!
//! # Rounding
//! All is in doubled precision up to the coefficients, which alone are rounded. A peak's
//! numerator differs from its denominator in the outer coefficients alone, by the same amount up
//! and down, so 0 dB at both ends holds for the coefficients as they stand, as long as they have
//! the same last place.

use super::bilinear;
use super::double::Double;
use super::rounding::Rounded;
use super::sections::coefficients::{self, Rounding};
use super::transform::{Poles, warped};
use super::wording::figure;
use crate::section::Section;
use crate::spec::{EqualizerKind, EqualizerShape, EqualizerStage, Stage};

/// The section of a peak or shelf; `None` where its frequency is not between 0 and half of
/// `rate_hz`.
pub fn section(stage: &EqualizerStage, rate_hz: f64) -> Option<Section> {
    finished(stage, rate_hz).map(|one| one.section)
}

/// [`section`], with what rounding dropped of it.
pub fn finished(stage: &EqualizerStage, rate_hz: f64) -> Option<Rounded> {
    if !(stage.hz > 0.0 && stage.hz < rate_hz / 2.0) {
        return None;
    }
    let warped = warped(stage.hz, rate_hz);
    let amplitude = (Double::LN_10 * stage.gain_db / 40.0).exp();
    let inverse_q = inverse_q(stage, amplitude);
    Some(match stage.kind {
        EqualizerKind::Peak => peak(amplitude, inverse_q, warped),
        EqualizerKind::Lowshelf => shelf(Double::ONE, amplitude, inverse_q, warped),
        EqualizerKind::Highshelf => shelf(amplitude.square(), 1.0 / amplitude, inverse_q, warped),
    })
}

/// 1/q of the analog section.
fn inverse_q(stage: &EqualizerStage, amplitude: Double) -> Double {
    match stage.shape {
        EqualizerShape::Q(q) => Double::ONE / q,
        EqualizerShape::Slope(slope) => {
            ((amplitude + 1.0 / amplitude) * (Double::difference(1.0, slope) / slope) + 2.0).sqrt()
        }
    }
}

fn peak(amplitude: Double, inverse_q: Double, warped: Double) -> Rounded {
    let (up, down) = (amplitude * inverse_q * warped, inverse_q / amplitude * warped);
    let square = warped.square();
    let [a1, a2] = bilinear::denominator(Poles::Two { half_sum: down * -0.5, product: square });
    let change = (up - down) / (down + 1.0 + square);
    let a = coefficients::denominator([a1, a2], Rounding::Together);
    // To the step that 1 + `change` has, so that this sum and the difference below are exact.
    let whole = (1.0 + change.hi) - 1.0;
    let section = Section { b: [1.0 + whole, a[1], a[2] - whole], a };
    Rounded::of([[change + 1.0, a1, a2 - change], [Double::ONE, a1, a2]], section)
}

/// A low shelf with the amplitude `amplitude`^2 below, the whole times `gain`.
fn shelf(gain: Double, amplitude: Double, inverse_q: Double, warped: Double) -> Rounded {
    let root = amplitude.sqrt();
    let (zero_sum, pole_sum) = (root * inverse_q * warped, inverse_q / root * warped);
    let (zero_product, pole_product) = (amplitude * warped.square(), warped.square() / amplitude);
    let [a1, a2] = bilinear::denominator(Poles::Two { half_sum: pole_sum * -0.5, product: pole_product });
    let scale = gain / (pole_sum + 1.0 + pole_product);
    let middle = (zero_product - 1.0) * scale * 2.0;
    let b = [(zero_product + zero_sum + 1.0) * scale, middle, (zero_product - zero_sum + 1.0) * scale];
    let section = Section { b: b.map(|b| b.hi), a: coefficients::denominator([a1, a2], Rounding::Together) };
    Rounded::of([b, [Double::ONE, a1, a2]], section)
}

/// What a peak or shelf was asked for, of all passes together, without a period:
/// `+6 dB at its center, q 4`; `None` for other stages.
pub fn remark(stage: &Stage) -> Option<String> {
    let Stage::Equalizer(stage) = stage else { return None };
    let gain = format!("{}{} dB", if stage.gain_db > 0.0 { "+" } else { "" }, figure(stage.gain_db));
    let shape = match stage.shape {
        EqualizerShape::Q(q) => format!("q {}", figure(q)),
        EqualizerShape::Slope(slope) => format!("slope {}", figure(slope)),
    };
    Some(match stage.kind {
        EqualizerKind::Peak => format!("{gain} at its center, {shape}"),
        EqualizerKind::Lowshelf => format!("{gain} below its edge, half of that at it, {shape}"),
        EqualizerKind::Highshelf => format!("{gain} above its edge, half of that at it, {shape}"),
    })
}
