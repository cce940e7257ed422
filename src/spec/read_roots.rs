//! Zeros, poles and gain of a user's transfer function.

use super::conjugates::conjugates;
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
    let mates = conjugates(roots);
    let alone: Vec<usize> = (0..roots.len()).filter(|&index| mates[index].is_none()).collect();
    for &index in &alone {
        let (Some(root), Some(place)) = (roots.get(index), places.get(index)) else { continue };
        let show = |im: f64| format!("[{}, {}]", show_number(root.re.value), show_number(im));
        let message = format!("the {one} {} has no conjugate in {key}", show(root.im.value));
        let repair = format!("add {}, without which the filter is not real", show(-root.im.value));
        problems.add(place, message, repair);
    }
    alone.is_empty()
}
