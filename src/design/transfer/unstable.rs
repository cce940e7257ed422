//! Poles where none may be: which they are, why they may be there, and what to do.

use super::TransferError;
use super::analog::{Plane, Scale};
use super::digital::{Outside, outside};
use super::digits::{self, Digits};
use super::remarks::{Context, Survey};
use super::terms::Term;
use super::written::Written;
use crate::design::double::Double;
use crate::design::wording::figure;
use crate::section::Section;
use crate::spec::{AnalogStage, Coefficient, DigitalFilter, Root, RootUnit, Transfer, WrittenSection};
use core::f64::consts::TAU;

/// Refuses a transfer function with poles on or outside the unit circle.
pub(super) fn check(transfer: &Transfer, poles: &[Term], rate_hz: f64) -> Result<(), TransferError> {
    let Some(Outside { distance, at_hz }) = outside(poles, rate_hz) else { return Ok(()) };
    let stage = DigitalFilter::Transfer(transfer.clone());
    let of_digits = hint(&Written::digital(&stage)?, poles, &digits::of_digital(&stage), rate_hz);
    let (pole, hint) = match transfer {
        Transfer::Polynomials { .. } => (
            "it has a pole of radius".to_owned(),
            of_digits.map_or_else(
                || {
                    "the denominator is 1 + a1 z^-1 + a2 z^-2 + ..., so feedback coefficients that a source adds change \
                     their signs; or put the pole inside"
                        .to_owned()
                },
                |of_digits| of_digits + OTHER_FORMS,
            ),
        ),
        Transfer::Roots { poles, .. } => (
            outermost(poles).map_or_else(
                || "it has a pole of radius".to_owned(),
                |(number, pole)| format!("pole {number} in poles, {}, has the radius", shown(pole)),
            ),
            of_digits.unwrap_or_else(|| {
                "the poles of a digital stage are points of the z plane inside the unit circle; poles in rad/s or Hz \
                 belong to kind = \"analog\""
                    .to_owned()
            }),
        ),
    };
    Err(TransferError::Unstable { pole, distance, at_hz, hint })
}

/// The same of `written` sections, which became `sections`; the worst one is named.
pub(super) fn check_sections(
    written: &[WrittenSection],
    sections: &[Section],
    rate_hz: f64,
) -> Result<(), TransferError> {
    let poles = |section: &Section| [section.a.map(Double::from)];
    let found = written.iter().zip(sections).enumerate().filter_map(|(index, (written, section))| {
        outside(&poles(section), rate_hz).map(|outside| (index, written, poles(section), outside))
    });
    let worst = found.min_by(|a, b| a.3.distance.total_cmp(&b.3.distance));
    let Some((index, written, poles, Outside { distance, at_hz })) = worst else { return Ok(()) };
    let stage = DigitalFilter::Sections(vec![*written]);
    let hint = hint(&Written::digital(&stage)?, &poles, &digits::of_digital(&stage), rate_hz).unwrap_or_else(|| {
        "a holds the coefficients of a0 + a1 z^-1 + a2 z^-2, so feedback coefficients that a source adds change their \
         signs; or put the pole inside"
            .to_owned()
    });
    Err(TransferError::Unstable { pole: format!("section {} has a pole of radius", index + 1), distance, at_hz, hint })
}

/// Why a filter with a pole at `right`, its real and imaginary part in rad/s, can't run.
pub(super) fn analog(
    stage: &AnalogStage,
    plane: Plane,
    right: (f64, f64),
    scale: Scale,
    rate_hz: f64,
) -> TransferError {
    let (re, at_hz) = (right.0, right.1 / TAU);
    if let Transfer::Roots { poles, .. } = &stage.transfer
        && let Some((number, pole)) = rightmost(poles)
    {
        let key = if stage.unit == RootUnit::Hertz { "poles_hz" } else { "poles" };
        let (part, hint) = if pole.re.value > 0.0 {
            let left = |im: f64| shown(&Root { re: negative(pole.re), im: Coefficient { value: im, ..pole.im } });
            let both = if pole.im.value == 0.0 {
                left(0.0)
            } else {
                format!("{} and {}", left(pole.im.value), left(-pole.im.value))
            };
            ("a positive real part", format!("poles of a stable filter have negative ones: write {both}"))
        } else {
            ("a real part of 0", "poles of a stable filter have negative ones".to_owned())
        };
        let pole = format!("pole {number} in {key}, {}, has {part}", shown(pole));
        return TransferError::UnstableAnalog { pole, re, at_hz, hint };
    }
    // Poles right of the axis lie outside the circle; one at s = K has no place in z.
    let poles = plane.terms().map_or(Vec::new(), |terms| terms.poles);
    let written = Written::analog(stage, scale).ok();
    let of_digits = written.and_then(|written| hint(&written, &poles, &digits::of_analog(stage), rate_hz));
    let hint = of_digits.map_or_else(
        || {
            "poles of a stable filter have negative real parts, and all coefficients of its denominator the same sign"
                .to_owned()
        },
        |of_digits| of_digits + OTHER_FORMS,
    );
    let pole = format!("it has a pole at {} Hz with a real part of {} rad/s", figure(at_hz), six_digits(re));
    TransferError::UnstableAnalog { pole, re, at_hz, hint }
}

/// What else a source may offer where coefficients have too few digits.
const OTHER_FORMS: &str = ", or better give zeros, poles and gain, or sections";

/// Whether the digits may be why a pole is where it must not be, and how many would tell;
/// `None` where they are not the reason.
fn hint(written: &Written, poles: &[Term], numbers: &[Coefficient], rate_hz: f64) -> Option<String> {
    let digits = Digits::new(numbers)?;
    let own: Vec<Section> = poles.iter().map(|poles| Section { b: [1.0, 0.0, 0.0], a: poles.map(|c| c.hi) }).collect();
    let survey = Survey::new(written, Context { own: &own, others: [&[], &[]], bands: &[], rate_hz });
    survey.may_be_unstable(1.0)?;
    // The poles of rounded coefficients lie elsewhere than those that were meant, so this is
    // no more than a hint.
    let least = survey.settled_by(digits).map_or(String::new(), |more| {
        format!(" (at least {}, and for poles close to one another far more)", digits.more(more.max(1)))
    });
    Some(format!("{}, and rounding to them may have put it there: copy more digits{least}", digits.given()))
}

/// The pole farthest from 0 and its number in the list.
fn outermost(poles: &[Root]) -> Option<(usize, &Root)> {
    first_largest(poles, |root| libm::hypot(root.re.value, root.im.value))
}

/// The pole farthest right and its number in the list.
fn rightmost(poles: &[Root]) -> Option<(usize, &Root)> {
    first_largest(poles, |root| root.re.value)
}

fn first_largest(poles: &[Root], size: impl Fn(&Root) -> f64) -> Option<(usize, &Root)> {
    // Of equal ones the last is taken, which from the end is the first.
    (1..).zip(poles).collect::<Vec<_>>().into_iter().rev().max_by(|a, b| size(a.1).total_cmp(&size(b.1)))
}

/// As in a list of the spec: `1.5`, `[0.9, 1.1]`.
fn shown(root: &Root) -> String {
    let number = |c: Coefficient| {
        let text = c.literal();
        text.strip_suffix(".0").map_or_else(|| text.clone(), str::to_owned)
    };
    if root.im.value == 0.0 { number(root.re) } else { format!("[{}, {}]", number(root.re), number(root.im)) }
}

fn negative(c: Coefficient) -> Coefficient {
    Coefficient { value: -c.value, ..c }
}

/// A figure with six significant digits and no trailing zeros.
fn six_digits(value: f64) -> String {
    let rounded: f64 = format!("{value:.5e}").parse().unwrap_or(value);
    let is_long = rounded != 0.0 && !(1e-4..1e9).contains(&rounded.abs());
    if is_long { format!("{rounded:e}") } else { format!("{rounded}") }
}

#[cfg(test)]
mod tests {
    use super::six_digits;

    #[test]
    fn real_parts_have_six_digits_at_most() {
        let cases = [
            (1_234.567_891, "1234.57"),
            (0.287_815_479_557_647_97, "0.287815"),
            (6.27, "6.27"),
            (0.0, "0"),
            (1e-9, "1e-9"),
            (2.5e12, "2.5e12"),
        ];
        for (value, text) in cases {
            assert_eq!(six_digits(value), text);
        }
    }
}
