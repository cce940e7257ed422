//! From a structure that holds to stages that a person would write.
//!
//! In this order: as little as possible is taken out of keep bands that except lines; each
//! stage gets the gentlest family with which all still holds; the least slack is made as
//! large as can be; figures are rounded as far as half of that slack allows. What comes out
//! is what was rounded, and that is verified.

use super::climb::Cascade;
use super::groups::Group;
use super::needs::Needs;
use super::points::{MOST_SLACK, Points};
use super::search::{ENOUGH, Way};
use super::slot::{Shape, Slot};
use super::start::{Room, Starts};
use super::verify::{self, Spare};
use crate::spec::{Family, Spec, Stage};

/// Halvings with which the least part is found that lines must take.
const HALVINGS: u32 = 7;

/// What a gentler family may take more than the least part, relative.
const PART_LEEWAY: f64 = 0.08;

/// Families before elliptic, the gentlest first.
const GENTLER: [Family; 3] = [Family::Butterworth, Family::Chebyshev2, Family::Chebyshev1];

/// Rounds of points added where a finished cascade missed its margin.
const MOST_ROUNDS: u32 = 5;

/// A cascade that is as it should be, but for rounding.
#[derive(Clone, Debug)]
pub struct Polished {
    cascade: Cascade,
    points: Points,
    slack: f64,
    /// What lines take of what they may.
    pub part: f64,
    roughness: u32,
}

/// Everything that came out.
#[derive(Clone, Debug)]
pub struct Finished {
    /// With the stages.
    pub spec: Spec,
    /// Second-order sections.
    pub sections: u32,
    /// What each band has to spare.
    pub spares: Vec<Spare>,
}

/// Polishes a structure; `free` where any family may be taken.
pub fn polish(way: &Way, needs: &Needs, groups: &[Group], free: bool) -> Option<Polished> {
    let phase = needs.phase;
    let (mut part, mut slots) = (1.0, way.slots.clone());
    if needs.has_exceptions() {
        let (mut low, mut high) = (0.0, 1.0);
        for _ in 0..HALVINGS {
            let middle = 0.5 * (low + high);
            let points = Points::new(needs, middle, |_| true, 0.0);
            let mut cascade = Cascade::new(slots.clone(), &points, phase)?;
            if cascade.climb(&points, phase, ENOUGH) >= ENOUGH {
                high = middle;
                slots = cascade.slots;
            } else {
                low = middle;
            }
        }
        part = (high * (1.0 + PART_LEEWAY)).min(1.0);
    }
    let points = Points::new(needs, part, |_| true, 0.0);
    let mut cascade = Cascade::new(slots, &points, phase)?;
    if free {
        cascade = gentlest(cascade, needs, groups, &points);
    }
    let slack = cascade.climb(&points, phase, MOST_SLACK);
    let roughness = cascade.slots.iter().map(roughness).max().unwrap_or(0);
    Some(Polished { cascade, points, slack, part, roughness })
}

/// Notches and gentle families first.
fn roughness(slot: &Slot) -> u32 {
    match (slot.shape, slot.family) {
        (Shape::Notch, _) => 0,
        (_, Family::Bessel | Family::Butterworth) => 1,
        (_, Family::Chebyshev2) => 2,
        (_, Family::Chebyshev1) => 3,
        (_, Family::Elliptic) => 4,
    }
}

/// Each stage with the gentlest family with which all still holds.
fn gentlest(mut cascade: Cascade, needs: &Needs, groups: &[Group], points: &Points) -> Cascade {
    let share = 0.7 / cascade.slots.len().max(1) as f64;
    for index in 0..cascade.slots.len() {
        let slot = cascade.slots[index].clone();
        if slot.shape == Shape::Notch {
            continue;
        }
        let rooms = rooms(groups, &slot.targets);
        for family in GENTLER {
            let starts = Starts::new(needs, family, share / f64::from(slot.count()));
            let mut slots = cascade.slots.clone();
            let Some(gentler) = starts.again(&slot, &rooms) else { continue };
            slots[index] = gentler;
            let Some(mut other) = Cascade::new(slots, points, needs.phase) else { continue };
            if other.climb(points, needs.phase, ENOUGH) >= ENOUGH {
                cascade = other;
                break;
            }
        }
    }
    cascade
}

/// The room around each of `targets`.
fn rooms(groups: &[Group], targets: &[usize]) -> Vec<Room> {
    let room = |target: &usize| {
        groups.iter().find_map(|group| {
            let place = group.lines.iter().position(|line| line == target)?;
            group.rooms.get(place).copied()
        })
    };
    targets.iter().map(|target| room(target).unwrap_or((None, None))).collect()
}

/// Sorts the better ones first: least part taken (but for what does not matter), gentler
/// families, more slack.
pub fn best_first(polished: &mut [Polished]) {
    let least = polished.iter().map(|one| one.part).fold(f64::INFINITY, f64::min);
    polished.sort_by(|a, b| {
        let wide = |one: &Polished| {
            if one.part <= least * (1.0 + 2.0 * PART_LEEWAY) { 0.0 } else { one.part }
        };
        (wide(a).total_cmp(&wide(b))).then(a.roughness.cmp(&b.roughness)).then(b.slack.total_cmp(&a.slack))
    });
}

impl Polished {
    /// Rounded, written and verified; `None` where what lies between the points can't be
    /// mended.
    pub fn finish(mut self, needs: &Needs, spec: &Spec) -> Option<Finished> {
        for _ in 0..MOST_ROUNDS {
            let values = self.rounded(needs)?;
            let written = Spec { stages: stages(&self.cascade.slots, &values), auto: None, ..spec.clone() };
            let misses = match verify::verify(&written, needs, self.part) {
                Ok(spares) => {
                    let finished = Finished { spec: written, sections: self.cascade.sections(), spares };
                    return Some(self.without_needless(finished, values, needs));
                }
                Err(misses) => misses,
            };
            if misses.is_empty() {
                return None;
            }
            for miss in misses {
                self.points.add(miss.rate, miss.hz, miss.ask);
            }
            self.cascade = Cascade::new(self.cascade.slots, &self.points, needs.phase)?;
            self.slack = self.cascade.climb(&self.points, needs.phase, MOST_SLACK);
            if self.slack <= 0.0 {
                return None;
            }
        }
        None
    }

    /// Without the stages that do nothing: where little more than rounding may be lost, the
    /// points may have asked for what the exact response does not need.
    fn without_needless(&self, mut finished: Finished, mut values: Vec<Vec<f64>>, needs: &Needs) -> Finished {
        let mut slots = self.cascade.slots.clone();
        let mut index = 0;
        while index < slots.len() && slots.len() > 1 {
            let (slot, figures) = (slots.remove(index), values.remove(index));
            let spec = Spec { stages: stages(&slots, &values), ..finished.spec.clone() };
            if let Ok(spares) = verify::verify(&spec, needs, self.part) {
                finished = Finished { spec, sections: finished.sections - slot.sections(), spares };
            } else {
                slots.insert(index, slot);
                values.insert(index, figures);
                index += 1;
            }
        }
        finished
    }

    /// The figures with as few digits as half the slack allows.
    fn rounded(&self, needs: &Needs) -> Option<Vec<Vec<f64>>> {
        let count: usize = self.cascade.slots.iter().map(|slot| slot.parameters.len()).sum();
        let mut slots = self.cascade.slots.clone();
        let mut turned = 0;
        for place in 0..slots.len() {
            for index in 0..slots[place].parameters.len() {
                turned += 1;
                let floor = self.slack * (1.0 - 0.5 * turned as f64 / count.max(1) as f64);
                for digits in 1..=9 {
                    let mut tried = slots.clone();
                    let parameter = &mut tried[place].parameters[index];
                    let value = round_to(parameter.value, digits);
                    if !(parameter.range.0..=parameter.range.1).contains(&value) {
                        continue;
                    }
                    parameter.value = value;
                    let held = Cascade::new(tried.clone(), &self.points, needs.phase);
                    if held.is_some_and(|held| held.least_slack(&self.points) >= floor) {
                        slots = tried;
                        break;
                    }
                }
            }
        }
        Some(slots.iter().map(Slot::values).collect())
    }
}

/// High-pass and low-pass first, then stops, rising.
fn stages(slots: &[Slot], values: &[Vec<f64>]) -> Vec<Stage> {
    let rank = |shape: Shape| match shape {
        Shape::Highpass => 0,
        Shape::Lowpass => 1,
        Shape::Stop | Shape::Notch => 2,
    };
    let mut order: Vec<usize> = (0..slots.len()).collect();
    let first = |index: usize| slots[index].targets.iter().min().copied().unwrap_or(usize::MAX);
    order.sort_by_key(|&index| (rank(slots[index].shape), first(index)));
    order.into_iter().flat_map(|index| slots[index].stages(&values[index])).collect()
}

/// `value` with so many significant digits.
fn round_to(value: f64, digits: i32) -> f64 {
    let magnitude = libm::floor(libm::log10(value.abs()));
    let exponent = f64::from(digits) - 1.0 - magnitude;
    // A power of ten that is a whole number on one side, so that the quotient is the nearest
    // number to its decimals.
    if exponent >= 0.0 {
        let scale = power_of_ten(exponent);
        libm::round(value * scale) / scale
    } else {
        let scale = power_of_ten(-exponent);
        libm::round(value / scale) * scale
    }
}

fn power_of_ten(exponent: f64) -> f64 {
    let mut power = 1.0;
    let mut left = exponent;
    while left >= 1.0 {
        power *= 10.0;
        left -= 1.0;
    }
    power
}

#[cfg(test)]
mod tests {
    use super::round_to;

    #[test]
    fn figures_are_rounded_to_their_first_digits() {
        for (value, digits, rounded) in [
            (47.3456, 1, 50.0),
            (47.3456, 3, 47.3),
            (47.3456, 5, 47.346),
            (0.012_345, 2, 0.012),
            (15_834.0, 2, 16_000.0),
        ] {
            assert_eq!(round_to(value, digits), rounded);
        }
    }
}
