//! Zeros, poles and gain of a user's transfer function.

use super::error::Place;
use super::fields::{Fields, Got};
use super::problems::Problems;
use super::read_transfer::{coefficient, list};
use super::transfer::{Coefficient, Root, Transfer};
use super::tree::{Node, Value, show_number};

/// A list of zeros and one of poles with `gain`. The zeros may be left out; `repair` is for
/// poles that are not there.
pub(super) fn zeros_and_poles(
    fields: &Fields<'_>,
    keys: [&'static str; 2],
    repair: &str,
    problems: &mut Problems,
) -> Option<Transfer> {
    let [zeros_key, poles_key] = keys;
    let zeros = roots(fields, zeros_key, "zero", problems).or(Vec::new());
    let poles = roots(fields, poles_key, "pole", problems);
    // Poles in hertz of a digital stage have been refused already.
    if !poles.is_there() && !fields.has("poles_hz") {
        fields.missing(poles_key, repair, problems);
    }
    let gain = gain(fields, problems);
    Some(Transfer::Roots { zeros: zeros?, poles: poles.value()?, gain: gain? })
}

/// `gain`, not 0.
fn gain(fields: &Fields<'_>, problems: &mut Problems) -> Option<Coefficient> {
    let got = fields.get("gain", |node| {
        let gain = coefficient(node, "gain", problems)?;
        if gain.value == 0.0 {
            problems.add(&node.place, "gain = 0 lets nothing through", "give the gain of the transfer function");
            return None;
        }
        Some(gain)
    });
    // Decibels in its place have been refused already.
    if !got.is_there() && !fields.has("gain_db") {
        fields.missing("gain", "add the factor before the product of the roots, 1 where there is none", problems);
    }
    got.value()
}

/// A list of roots in which every complex one has its conjugate.
fn roots(fields: &Fields<'_>, key: &'static str, one: &str, problems: &mut Problems) -> Got<Vec<Root>> {
    fields.get(key, |node| {
        let read = list(node, key, "roots", problems, |item, problems| root(item, key, problems))?;
        let Value::List(items) = &node.value else { return None };
        let places: Vec<_> = items.iter().map(|item| &item.place).collect();
        has_conjugates(&read, &places, key, one, problems).then_some(read)
    })
}

/// A number, or `[re, im]`.
fn root(node: &Node, key: &str, problems: &mut Problems) -> Option<Root> {
    let parts = match &node.value {
        Value::List(parts) => parts.as_slice(),
        Value::Number(_) => {
            let re = coefficient(node, key, problems)?;
            return Some(Root { re, im: Coefficient { value: 0.0, unit: 0.0 } });
        }
        _ => &[],
    };
    let [re, im] = parts else {
        let shown = match &node.value {
            Value::List(parts) => format!("a list of {}", parts.len()),
            other => other.show(),
        };
        let message = format!("{key} holds {shown}, which is no root");
        problems.add(&node.place, message, "write a number, or [re, im] off the real axis");
        return None;
    };
    let re = coefficient(re, key, problems);
    let im = coefficient(im, key, problems);
    Some(Root { re: re?, im: im? })
}

/// Whether every root off the real axis has its conjugate; each that has none is named.
fn has_conjugates(roots: &[Root], places: &[&Place], key: &str, one: &str, problems: &mut Problems) -> bool {
    let alone = without_conjugate(roots);
    for &index in &alone {
        let (Some(root), Some(place)) = (roots.get(index), places.get(index)) else { continue };
        let show = |im: f64| format!("[{}, {}]", show_number(root.re.value), show_number(im));
        let message = format!("the {one} {} has no conjugate in {key}", show(root.im.value));
        let repair = format!("add {}, without which the filter is not real", show(-root.im.value));
        problems.add(place, message, repair);
    }
    alone.is_empty()
}

/// Indexes of the roots off the real axis that are left when each is paired with the nearest
/// one that can be its conjugate.
fn without_conjugate(roots: &[Root]) -> Vec<usize> {
    let mut is_paired: Vec<_> = roots.iter().map(|root| root.im.value == 0.0).collect();
    for (index, root) in roots.iter().enumerate() {
        if is_paired.get(index).is_none_or(|is_paired| *is_paired) {
            continue;
        }
        let candidates = roots.iter().enumerate().skip(index + 1);
        let free = candidates.filter(|(other, _)| is_paired.get(*other).is_some_and(|is_paired| !*is_paired));
        let conjugates = free.filter(|(_, other)| is_conjugate(root, other));
        let nearest = conjugates.min_by(|(_, a), (_, b)| distance(root, a).total_cmp(&distance(root, b)));
        if let Some((other, _)) = nearest {
            for paired in [index, other] {
                if let Some(is_paired) = is_paired.get_mut(paired) {
                    *is_paired = true;
                }
            }
        }
    }
    is_paired.iter().enumerate().filter(|(_, is_paired)| !**is_paired).map(|(index, _)| index).collect()
}

/// Whether two roots are conjugates within half a unit of their last given digits.
fn is_conjugate(root: &Root, other: &Root) -> bool {
    let is_near = |a: Coefficient, b: f64, unit: f64| {
        // The difference itself is rounded.
        (a.value - b).abs() <= 0.5 * a.unit.max(unit) + f64::EPSILON * a.value.abs()
    };
    let is_across = (root.im.value > 0.0) != (other.im.value > 0.0);
    is_across && is_near(root.re, other.re.value, other.re.unit) && is_near(root.im, -other.im.value, other.im.unit)
}

/// How far a root is from the conjugate of another, along both axes.
fn distance(root: &Root, other: &Root) -> f64 {
    (root.re.value - other.re.value).abs() + (root.im.value + other.im.value).abs()
}
