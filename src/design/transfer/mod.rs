//! A user's transfer function to sections: factoring, stability, and what its digits are
//! good for.
//!
//! Polynomials become real factors (`factor`, by way of `roots`), roots stand for factors as
//! they are; `digital` and `analog` bring both to z^-1, `cascade` to sections. `written` evaluates what the user wrote, with what its last digits leave
//! open; `remarks` says what that comes to, `unstable` why a filter can't run.
//!
//! All up to the coefficients of the sections is in doubled precision
//! ([`crate::design::double`]): polynomials of high order lose more digits than f64 has when
//! they are taken apart.

mod analog;
mod cascade;
mod digital;
mod digits;
mod error;
mod factor;
mod multiple;
mod remarks;
mod risk;
mod roots;
mod terms;
mod unstable;
mod written;

use super::recipe::Recipe;
use super::response;
use super::rounding::Rounded;
use super::sections::plain;
use crate::section::Section;
use crate::spec::{AnalogStage, Coefficient, DigitalFilter, WrittenSection};
use analog::Scale;
use digits::Digits;
pub use error::{MOST_GAIN_DB, TransferError};
pub use remarks::Context;
use remarks::Survey;
use written::Written;

/// The sections of a transfer function in z. `sections` as written keep their order and gains;
/// of other forms they come in the order and with the gains of a designed stage.
///
/// # Errors
/// It is no stable filter; see [`TransferError`].
pub fn digital(stage: &DigitalFilter, rate_hz: f64) -> Result<Vec<Section>, TransferError> {
    Ok(plain(&finish_digital(stage, rate_hz)?))
}

/// [`digital()`], with what rounding dropped of each section: of factors in doubled precision.
/// What it dropped of `sections` as written is not known.
///
/// # Errors
/// As [`digital()`].
pub fn finish_digital(stage: &DigitalFilter, rate_hz: f64) -> Result<Vec<Rounded>, TransferError> {
    let sections = match stage {
        DigitalFilter::Sections(written) => {
            let sections =
                written.iter().enumerate().map(|(i, one)| normalized(i, one)).collect::<Result<Vec<_>, _>>()?;
            if sections.is_empty() {
                return Err(TransferError::Empty { what: "sections" });
            }
            unstable::check_sections(written, &sections, rate_hz)?;
            sections.into_iter().map(Rounded::unknown).collect()
        }
        DigitalFilter::Transfer(transfer) => {
            let terms = digital::terms(transfer)?;
            unstable::check(transfer, &terms.poles, rate_hz)?;
            cascade::sections(terms)?
        }
    };
    checked(sections, rate_hz)
}

/// The sections of a transfer function in s, by the bilinear transform.
///
/// # Errors
/// As [`digital()`].
pub fn analog(stage: &AnalogStage, rate_hz: f64) -> Result<Vec<Section>, TransferError> {
    Ok(plain(&finish_analog(stage, rate_hz)?))
}

/// [`analog()`], with what rounding dropped of each section.
///
/// # Errors
/// As [`digital()`].
pub fn finish_analog(stage: &AnalogStage, rate_hz: f64) -> Result<Vec<Rounded>, TransferError> {
    let scale = Scale::new(stage, rate_hz)?;
    let plane = analog::plane(stage, scale)?;
    if let Some(right) = plane.right(scale) {
        return Err(unstable::analog(stage, plane, right, scale, rate_hz));
    }
    let terms = plane.terms();
    checked(cascade::sections(terms?)?, rate_hz)
}

/// What a reader has to know of a stage that was made from `recipe` and runs: what its digits
/// are good for, what rounding costs, where the response of an analog one is bent. Nothing
/// where it is no transfer function.
pub fn remarks(recipe: &Recipe, context: Context<'_>) -> Vec<String> {
    let rate_hz = context.rate_hz;
    let (written, numbers, scale) = match recipe {
        Recipe::Digital(stage) => (Written::digital(stage), digits::of_digital(stage), None),
        Recipe::Analog(stage) => match Scale::new(stage, rate_hz) {
            Ok(scale) => (Written::analog(stage, scale), digits::of_analog(stage), Some(scale)),
            Err(_) => return Vec::new(),
        },
        Recipe::Filter(_) | Recipe::Notch { .. } | Recipe::Equalizer(_) | Recipe::Weighting(_) => return Vec::new(),
    };
    let Ok(written) = written else { return Vec::new() };
    let survey = Survey::new(&written, context);
    let digits = Digits::new(&numbers);
    let of_digits =
        digits.map(|digits| [remarks::stability(&survey, digits), remarks::accuracy(&survey, context.bands, digits)]);
    let bent = scale.and_then(|scale| remarks::warping(&written, &survey, scale.k * scale.rad_a_unit, rate_hz));
    let rounding = remarks::rounding(&survey, context.own, rate_hz);
    of_digits.into_iter().flatten().chain([bent, rounding]).flatten().collect()
}

/// The gain of a transfer function as it is written, and what it may be for any errors of half
/// a unit in the last given digit of every number (see `written`).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GainBounds {
    /// Least gain, dB; negative infinity where a zero may lie at this frequency.
    pub low_db: f64,
    /// Gain as written, dB.
    pub level_db: f64,
    /// Largest gain, dB; infinite where a pole may lie at this frequency.
    pub high_db: f64,
}

/// The gain at `hz`, after the bilinear transform where `recipe` is in s; `None` where it is no
/// transfer function, or none that can be evaluated.
pub fn gain_bounds(recipe: &Recipe, hz: f64, rate_hz: f64) -> Option<GainBounds> {
    let written = match recipe {
        Recipe::Digital(stage) => Written::digital(stage),
        Recipe::Analog(stage) => Scale::new(stage, rate_hz).and_then(|scale| Written::analog(stage, scale)),
        Recipe::Filter(_) | Recipe::Notch { .. } | Recipe::Equalizer(_) | Recipe::Weighting(_) => return None,
    };
    Some(written.ok()?.at(hz, rate_hz).bounds(1.0))
}

/// A section as written over its first denominator coefficient.
fn normalized(index: usize, written: &WrittenSection) -> Result<Section, TransferError> {
    let number = index + 1;
    if let Some(bad) = written.b.iter().chain(&written.a).find(|c| !c.value.is_finite()) {
        let what = format!("a coefficient of section {number}");
        return Err(TransferError::NotFinite { what, value: bad.value });
    }
    let [a0, ..] = written.a.map(|c| c.value);
    if a0 == 0.0 {
        return Err(TransferError::ZeroLeading {
            what: format!("the denominator of section {number}"),
            repair: "it belongs to the output sample itself and must not be 0",
        });
    }
    if written.b.iter().all(|c| c.value == 0.0) {
        return Err(TransferError::AllZero { what: format!("the numerator of section {number}") });
    }
    let over_a0 = |c: [Coefficient; 3]| c.map(|c| c.value / a0);
    Ok(Section { b: over_a0(written.b), a: over_a0(written.a) })
}

/// Finite coefficients, and a gain at rest that can be held.
fn checked(finished: Vec<Rounded>, rate_hz: f64) -> Result<Vec<Rounded>, TransferError> {
    let sections = plain(&finished);
    if sections.iter().flat_map(|section| section.b.iter().chain(&section.a)).any(|c| !c.is_finite()) {
        return Err(TransferError::Range { what: "the transfer function" });
    }
    for count in 1..=sections.len() {
        let gain_db = response::gain_db(&sections[..count], 0.0, rate_hz);
        if gain_db.is_nan() || gain_db > MOST_GAIN_DB {
            return Err(TransferError::GainAtRest { gain_db });
        }
    }
    Ok(finished)
}
