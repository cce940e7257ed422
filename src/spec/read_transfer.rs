//! `[[stage]]` of a user's own transfer function, in z or in s.

use super::fields::{Fields, Got};
use super::problems::Problems;
use super::quantity::{Low, Quantity};
use super::read::FREQUENCY;
use super::read_roots::zeros_and_poles;
use super::transfer::{AnalogStage, Coefficient, DigitalFilter, DigitalStage, RootUnit, Transfer, WrittenSection};
use super::tree::{Node, Value, show_number};

/// Most coefficients, roots or sections of a list: polynomials of a degree above some tens
/// are rounded away, and longer filters are written as several stages.
pub(super) const MAX_LIST: usize = 64;

pub(super) const SECTION_KEYS: &[&str] = &["b", "a"];

/// A way to give a transfer function: its keys, `gain` left out.
type Form = (TransferForm, &'static [&'static str]);

#[derive(Clone, Copy, PartialEq)]
enum TransferForm {
    Polynomials,
    Sections,
    Roots,
    RootsHz,
}

const POLYNOMIALS: Form = (TransferForm::Polynomials, &["numerator", "denominator"]);
const SECTIONS: Form = (TransferForm::Sections, &["sections"]);
const ROOTS: Form = (TransferForm::Roots, &["zeros", "poles"]);
const ROOTS_HZ: Form = (TransferForm::RootsHz, &["zeros_hz", "poles_hz"]);

const DIGITAL_WAYS: &str = "give numerator and denominator, or sections, or zeros, poles and gain";
const ANALOG_WAYS: &str =
    "give numerator and denominator, or zeros, poles and gain in rad/s, or zeros_hz, poles_hz and gain in Hz";

/// The sample rate that coefficients are for: any that a file can state.
pub(super) const RATE: Quantity =
    Quantity { noun: "a sample rate", unit: "Hz", low: Low::From(1.0), high: u32::MAX as f64 };

/// Reads a transfer function in z; nothing where something is wrong with it.
pub(super) fn digital(fields: &Fields<'_>, problems: &mut Problems) -> Option<DigitalStage> {
    let rate_hz = fields.whole("rate_hz", &RATE, problems).map(Some).or(None);
    let filter = digital_filter(fields, problems);
    Some(DigitalStage { filter: filter?, rate_hz: rate_hz? })
}

fn digital_filter(fields: &Fields<'_>, problems: &mut Problems) -> Option<DigitalFilter> {
    match form(fields, &[POLYNOMIALS, SECTIONS, ROOTS], DIGITAL_WAYS, problems)? {
        TransferForm::Polynomials => {
            let (numerator, denominator) = polynomials(fields, problems)?;
            begins(&denominator, "denominator", LeadingZero::Constant, fields, problems)
                .then_some(DigitalFilter::Transfer(Transfer::Polynomials { numerator, denominator }))
        }
        TransferForm::Sections => sections(fields, problems).map(DigitalFilter::Sections),
        TransferForm::Roots | TransferForm::RootsHz => {
            let transfer =
                zeros_and_poles(fields, ["zeros", "poles"], "add its poles, [] where it has none", problems)?;
            let repair = "its output would come before its input: add poles at 0, each of which delays by one sample";
            no_more_zeros(&transfer, "zeros", repair, fields, problems).then_some(DigitalFilter::Transfer(transfer))
        }
    }
}

/// Reads a transfer function in s; nothing where something is wrong with it.
pub(super) fn analog(fields: &Fields<'_>, problems: &mut Problems) -> Option<AnalogStage> {
    let match_hz = fields.number("match_hz", &FREQUENCY, problems).map(Some).or(None);
    let form = form(fields, &[POLYNOMIALS, ROOTS, ROOTS_HZ], ANALOG_WAYS, problems)?;
    let unit = if form == TransferForm::RootsHz { RootUnit::Hertz } else { RootUnit::RadiansPerSecond };
    let transfer = match form {
        TransferForm::Polynomials | TransferForm::Sections => {
            let (numerator, denominator) = polynomials(fields, problems)?;
            let begins = begins(&denominator, "denominator", LeadingZero::Highest, fields, problems);
            (begins && is_proper(&numerator, &denominator, fields, problems))
                .then_some(Transfer::Polynomials { numerator, denominator })
        }
        TransferForm::Roots => analog_roots(fields, ["zeros", "poles"], problems),
        TransferForm::RootsHz => analog_roots(fields, ["zeros_hz", "poles_hz"], problems),
    };
    Some(AnalogStage { transfer: transfer?, unit, match_hz: match_hz? })
}

/// The one form that is written; anything else is a problem.
fn form(fields: &Fields<'_>, forms: &[Form], ways: &str, problems: &mut Problems) -> Option<TransferForm> {
    let is_there = |key: &&&'static str| fields.has(key) || fields.is_meant(key);
    let written: Vec<_> = forms.iter().filter_map(|(form, keys)| Some((*form, *keys.iter().find(is_there)?))).collect();
    match *written.as_slice() {
        [(form, _)] => {
            let (holder, factor) = match form {
                TransferForm::Polynomials => ("numerator and denominator hold", "the numerator"),
                TransferForm::Sections => ("sections hold", "one b"),
                TransferForm::Roots | TransferForm::RootsHz => return Some(form),
            };
            if fields.has("gain") {
                let repair = format!("multiply {factor} by it, and remove it");
                fields.refuse("gain", &format!("{holder} the gain already"), &repair, problems);
                return None;
            }
            Some(form)
        }
        [] if fields.has("gain") => Some(TransferForm::Roots),
        // Roots in hertz of a digital stage have been refused already.
        [] if fields.has("zeros_hz") || fields.has("poles_hz") => None,
        [] => {
            problems.add(fields.place, format!("{} has no transfer function", fields.what), ways);
            None
        }
        [(_, first), (_, second), ..] => {
            let message = format!("{} says twice what it is, by {first} and by {second}", fields.what);
            problems.add(fields.key_place(second), message, ways);
            None
        }
    }
}

/// A list of `read` things, [`MAX_LIST`] at most; `what` they are.
pub(super) fn list<T>(
    node: &Node,
    key: &str,
    what: &str,
    problems: &mut Problems,
    read: impl Fn(&Node, &mut Problems) -> Option<T>,
) -> Option<Vec<T>> {
    let Value::List(items) = &node.value else {
        let message = format!("{key} is {}, not a list of {what}", node.value.show());
        problems.add(&node.place, message, format!("write {}", problems.assign(key, "[...]")));
        return None;
    };
    if items.len() > MAX_LIST {
        let message = format!("{key} is a list of {} {what}, more than {MAX_LIST}", items.len());
        problems.add(&node.place, message, "write the filter as several stages");
        return None;
    }
    // All of them, so that every problem is noted.
    let read: Vec<_> = items.iter().map(|item| read(item, problems)).collect();
    read.into_iter().collect()
}

/// One coefficient of `key`.
pub(super) fn coefficient(node: &Node, key: &str, problems: &mut Problems) -> Option<Coefficient> {
    let Value::Number(number) = node.value else {
        let message = format!("{key} holds {}, not a number", node.value.show());
        problems.add(&node.place, message, "write a plain number");
        return None;
    };
    if !number.value.is_finite() {
        let message = format!("{key} holds {}, not a finite number", show_number(number.value));
        problems.add(&node.place, message, "give a finite number");
        return None;
    }
    // Minus zero would be written back as such; it means zero.
    Some(Coefficient { value: number.value + 0.0, ..number })
}

fn polynomials(fields: &Fields<'_>, problems: &mut Problems) -> Option<(Vec<Coefficient>, Vec<Coefficient>)> {
    let numerator = polynomial(fields, "numerator", "add its coefficients, [1] where it has no zeros", problems);
    let denominator = polynomial(fields, "denominator", "add its coefficients, [1] where it has no poles", problems);
    Some((numerator?, denominator?))
}

/// `numerator` or `denominator`: not empty, and not zero everywhere.
fn polynomial(
    fields: &Fields<'_>,
    key: &'static str,
    repair: &str,
    problems: &mut Problems,
) -> Option<Vec<Coefficient>> {
    let got = fields.get(key, |node| {
        let read = list(node, key, "numbers", problems, |item, problems| coefficient(item, key, problems))?;
        let wrong = if read.is_empty() {
            "is empty"
        } else if read.iter().all(|coefficient| coefficient.value == 0.0) {
            "holds nothing but zeros"
        } else {
            return Some(read);
        };
        problems.add(&node.place, format!("{key} {wrong}"), "give the coefficients of the transfer function");
        None
    });
    if !got.is_there() {
        fields.missing(key, repair, problems);
    }
    got.value()
}

/// What the first coefficient of a denominator stands for.
#[derive(Clone, Copy)]
enum LeadingZero {
    /// Powers of z^-1: the constant term.
    Constant,
    /// Powers of s: the highest.
    Highest,
}

/// Whether a denominator begins with another number than 0.
fn begins(
    denominator: &[Coefficient],
    key: &str,
    leading: LeadingZero,
    fields: &Fields<'_>,
    problems: &mut Problems,
) -> bool {
    if denominator.first().is_none_or(|first| first.value != 0.0) {
        return true;
    }
    let (what, repair) = match leading {
        LeadingZero::Constant => (
            "its constant term, so that there is no output to compute",
            "write powers of z^-1, the constant term first, and leave out common delays",
        ),
        LeadingZero::Highest => {
            ("the coefficient of its highest power of s", "remove the zeros in front, or write the highest power first")
        }
    };
    let message = format!("{key} begins with 0, {what}");
    problems.add(fields.value_place(key), message, repair);
    false
}

/// Whether an analog numerator has no higher degree than its denominator.
fn is_proper(
    numerator: &[Coefficient],
    denominator: &[Coefficient],
    fields: &Fields<'_>,
    problems: &mut Problems,
) -> bool {
    let zeros_in_front = numerator.iter().take_while(|coefficient| coefficient.value == 0.0).count();
    let degree = |length: usize| length.saturating_sub(1);
    let (above, below) = (degree(numerator.len() - zeros_in_front), degree(denominator.len()));
    if above <= below {
        return true;
    }
    let message = format!("numerator has degree {above} in s, and denominator degree {below}");
    let repair = format!(
        "its gain would grow without end: give a numerator of degree {below} at most, the highest power of s first"
    );
    problems.add(fields.value_place("numerator"), message, repair);
    false
}

/// Zeros and poles of an analog filter: at least one pole, and no more zeros than poles.
fn analog_roots(fields: &Fields<'_>, keys: [&'static str; 2], problems: &mut Problems) -> Option<Transfer> {
    let [zeros_key, poles_key] = keys;
    let unit = if poles_key == "poles_hz" { "hertz" } else { "radians per second" };
    let transfer = zeros_and_poles(fields, keys, &format!("add its poles in {unit}"), problems)?;
    if matches!(&transfer, Transfer::Roots { poles, .. } if poles.is_empty()) {
        let message = format!("{poles_key} is empty");
        problems.add(fields.value_place(poles_key), message, "an analog stage has at least one pole: give it");
        return None;
    }
    let repair = "its gain would grow without end: check both lists";
    no_more_zeros(&transfer, zeros_key, repair, fields, problems).then_some(transfer)
}

/// Whether there are no more zeros than poles.
fn no_more_zeros(
    transfer: &Transfer,
    zeros_key: &'static str,
    repair: &str,
    fields: &Fields<'_>,
    problems: &mut Problems,
) -> bool {
    let Transfer::Roots { zeros, poles, .. } = transfer else { return true };
    let is_held = zeros.len() <= poles.len();
    if !is_held {
        let message = format!("{} has more zeros than poles, {} and {}", fields.what, zeros.len(), poles.len());
        problems.add(fields.value_place(zeros_key), message, repair);
    }
    is_held
}

/// `sections`.
fn sections(fields: &Fields<'_>, problems: &mut Problems) -> Option<Vec<WrittenSection>> {
    let got: Got<Vec<_>> = fields.get("sections", |node| {
        let read = list(node, "sections", "tables", problems, section)?;
        if read.is_empty() {
            problems.add(&node.place, "sections is empty", "give at least one section");
            return None;
        }
        Some(read)
    });
    got.value()
}

/// `{b = [b0, b1, b2], a = [a0, a1, a2]}`.
fn section(node: &Node, problems: &mut Problems) -> Option<WrittenSection> {
    let mut fields = Fields::open(node, "the section", problems)?;
    fields.only(SECTION_KEYS, SECTION_KEYS, problems);
    let b = three(&fields, "b", problems).filter(|b| {
        let is_zero = b.iter().all(|coefficient| coefficient.value == 0.0);
        if is_zero {
            let repair = "give the coefficients of the transfer function";
            problems.add(fields.value_place("b"), "b holds nothing but zeros", repair);
        }
        !is_zero
    });
    let a = three(&fields, "a", problems).filter(|a| begins(a, "a", LeadingZero::Constant, &fields, problems));
    Some(WrittenSection { b: b?, a: a? })
}

/// The three coefficients of one side of a section.
fn three(fields: &Fields<'_>, key: &'static str, problems: &mut Problems) -> Option<[Coefficient; 3]> {
    let repair = format!("write three, 0 for those that are not there: {}", problems.assign(key, "[1, 0, 0]"));
    let got = fields.get(key, |node| {
        if let Value::List(items) = &node.value
            && items.len() != 3
        {
            problems.add(&node.place, format!("{key} is a list of {}, not of three numbers", items.len()), &*repair);
            return None;
        }
        let read = list(node, key, "three numbers", problems, |item, problems| coefficient(item, key, problems))?;
        <[Coefficient; 3]>::try_from(read).ok()
    });
    if !got.is_there() {
        fields.missing(key, &repair, problems);
    }
    got.value()
}
