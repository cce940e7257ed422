//! The fewest sections with which some structure holds.
//!
//! Each group of lines by itself, with all that the keep bands may lose, gives the least
//! number of sections it can do with. From their sum on, every way to spread the sections
//! over the groups is tried with all groups together, until one holds.

use super::climb::Cascade;
use super::groups::Group;
use super::needs::Needs;
use super::points::Points;
use super::slot::{Lines, Shape, Slot};
use super::start::Starts;
use crate::spec::Family;
use rayon::prelude::*;
use std::collections::BTreeMap;

/// A cascade holds at the points if its least slack is at least this, nepers: what may lie
/// between the points is then still well inside the margin.
pub const ENOUGH: f64 = 2e-3;

/// Ways of one group that are tried together with those of the others.
const BEST_WAYS: usize = 4;

/// Cascades of one number of sections that go on.
const MOST_FOUND: usize = 6;

/// Joint searches at most.
const MOST_TRIALS: u32 = 600;

/// Parts of ways to spread sections over groups that are looked at: where no sum is right, there
/// may be no end of them.
const MOST_WALKED: u32 = 100_000;

/// Sections beyond the sum of what the groups take alone that are looked at.
const MOST_EXCESS: u32 = 24;

/// A structure with the figures at which it is best.
#[derive(Clone, Debug)]
pub struct Way {
    /// Its stages.
    pub slots: Vec<Slot>,
    /// Its least slack, nepers.
    pub slack: f64,
}

/// Why nothing is found.
#[derive(Clone, Debug, PartialEq)]
pub enum Failure {
    /// This group alone can't be had at any order.
    Group(usize),
    /// Only together they can't.
    Together,
}

/// The search for one set of groups.
pub struct Search<'n> {
    needs: &'n Needs,
    groups: Vec<Group>,
    family: Family,
    /// All points, lines taking all that they may.
    points: Points,
    alone: BTreeMap<(usize, u32), Vec<Way>>,
    trials: u32,
}

impl<'n> Search<'n> {
    /// For `groups` with stages of `family`.
    pub fn new(needs: &'n Needs, groups: Vec<Group>, family: Family) -> Search<'n> {
        let points = Points::new(needs, 1.0, |_| true, 0.0);
        Search { needs, groups, family, points, alone: BTreeMap::new(), trials: 0 }
    }

    /// The groups.
    pub fn groups(&self) -> &[Group] {
        &self.groups
    }

    /// What other groups may add where a group's lines are, dB: no more than what must be
    /// kept on both sides of them may lose.
    fn help_db(&self) -> f64 {
        if self.groups.len() < 2 {
            return 0.0;
        }
        self.needs.keeps.iter().map(|keep| keep.keep_db).fold(0.0, f64::max)
    }

    /// The ways to take out a group alone with `steps` sections (a line), the best first.
    fn alone(&mut self, index: usize, steps: u32) -> &[Way] {
        if !self.alone.contains_key(&(index, steps)) {
            let ways = self.groups.get(index).map_or_else(Vec::new, |group| self.ways(group, steps));
            self.alone.insert((index, steps), ways);
        }
        self.alone.get(&(index, steps)).map_or(&[], Vec::as_slice)
    }

    fn ways(&self, group: &Group, steps: u32) -> Vec<Way> {
        let points = Points::new(self.needs, 1.0, |line| group.lines.contains(&line), self.help_db());
        let share = 0.7 / f64::from(group.step());
        let starts = Starts::new(self.needs, self.family, share);
        let mut ways: Vec<Way> = Vec::new();
        let climbed = |slots: Vec<Slot>| {
            let phase = self.needs.phase;
            let mut cascade = Cascade::new(slots, &points, phase)?;
            let slack = cascade.climb(&points, phase, f64::INFINITY);
            (slack >= 0.0).then_some((cascade.slots, slack))
        };
        // Collected in order, so that threads change nothing.
        let climbed: Vec<_> = group.variants(steps, &starts).into_par_iter().map(climbed).collect();
        for (slots, slack) in climbed.into_iter().flatten() {
            match ways.iter_mut().find(|way| same_structure(&way.slots, &slots)) {
                Some(way) if way.slack < slack => *way = Way { slots, slack },
                Some(_) => {}
                None => ways.push(Way { slots, slack }),
            }
        }
        ways.sort_by(|a, b| b.slack.total_cmp(&a.slack));
        ways.truncate(BEST_WAYS);
        ways
    }

    /// Whether a group can be had alone at all: with many sections, else with fewer.
    pub fn has_any(&mut self, index: usize) -> bool {
        let highest = self.family.highest_order();
        let tried = [highest.div_ceil(2), highest, highest.div_ceil(4), 3, 2, 1];
        tried.into_iter().any(|steps| !self.alone(index, steps).is_empty())
    }

    /// The least number of sections (a line) with which a group can be had alone.
    fn least_alone(&mut self, index: usize) -> Option<u32> {
        let most = self.family.highest_order();
        (1..=most).find(|steps| !self.alone(index, *steps).is_empty())
    }

    /// The least sections of each group alone.
    ///
    /// # Errors
    /// A group that can't be had.
    pub fn least(&mut self) -> Result<Vec<u32>, Failure> {
        (0..self.groups.len()).map(|index| self.least_alone(index).ok_or(Failure::Group(index))).collect()
    }

    /// All structures found of the least number of sections that is above `above` and at
    /// most `most`, and that number.
    ///
    /// # Errors
    /// There is none.
    pub fn fewest(&mut self, above: u32, most: u32) -> Result<(u32, Vec<Way>), Failure> {
        let least = self.least()?;
        let step: Vec<u32> = self.groups.iter().map(Group::step).collect();
        let floor: u32 = least.iter().zip(&step).map(|(steps, step)| steps * step).sum();
        let excess = MOST_EXCESS.max(2 * step.iter().copied().max().unwrap_or(1));
        for total in floor.max(above + 1)..=most.min(floor + excess) {
            let mut found: Vec<Way> = Vec::new();
            for extra in spread(total - floor, &step) {
                let steps: Vec<u32> = least.iter().zip(&extra).map(|(least, extra)| least + extra).collect();
                self.together(&steps, &mut found);
                if found.len() >= MOST_FOUND || self.trials >= MOST_TRIALS {
                    break;
                }
            }
            if !found.is_empty() {
                found.sort_by(|a, b| b.slack.total_cmp(&a.slack));
                return Ok((total, found));
            }
            if self.trials >= MOST_TRIALS {
                break;
            }
        }
        Err(Failure::Together)
    }

    /// Tries all groups together with so many sections each.
    fn together(&mut self, steps: &[u32], found: &mut Vec<Way>) {
        let mut parts: Vec<Vec<Way>> = Vec::new();
        for (index, steps) in steps.iter().enumerate() {
            let ways = self.alone(index, *steps).to_vec();
            if ways.is_empty() {
                return;
            }
            parts.push(ways);
        }
        for choice in choices(&parts) {
            if self.trials >= MOST_TRIALS {
                return;
            }
            self.trials += 1;
            let slots: Vec<Slot> = choice.iter().flat_map(|way| way.slots.iter().cloned()).collect();
            if slots.is_empty() {
                continue;
            }
            let phase = self.needs.phase;
            let Some(mut cascade) = Cascade::new(slots, &self.points, phase) else { continue };
            let slack = cascade.climb(&self.points, phase, ENOUGH);
            if slack >= ENOUGH {
                found.push(Way { slots: cascade.slots, slack });
            }
        }
    }
}

/// The best way of each part, and each other way of one part at a time.
fn choices(parts: &[Vec<Way>]) -> Vec<Vec<&Way>> {
    let best: Vec<&Way> = parts.iter().filter_map(|ways| ways.first()).collect();
    let mut choices = vec![best.clone()];
    for (index, ways) in parts.iter().enumerate() {
        for way in ways.iter().skip(1) {
            let mut choice = best.clone();
            choice[index] = way;
            choices.push(choice);
        }
    }
    choices
}

/// The ways to spread `excess` sections over groups that take them in `step`s.
fn spread(excess: u32, step: &[u32]) -> Vec<Vec<u32>> {
    let mut left = MOST_WALKED;
    walk(excess, step, &mut left)
}

/// The same, of which no more than `left` parts are looked at.
fn walk(excess: u32, step: &[u32], left: &mut u32) -> Vec<Vec<u32>> {
    let Some((&first, rest)) = step.split_first() else {
        return if excess == 0 { vec![Vec::new()] } else { Vec::new() };
    };
    let mut all = Vec::new();
    *left = left.saturating_sub(1);
    if *left == 0 || !excess.is_multiple_of(step.iter().copied().fold(0, common_divisor).max(1)) {
        return all;
    }
    for own in 0..=excess / first.max(1) {
        for mut others in walk(excess - own * first, rest, left) {
            others.insert(0, own);
            all.push(others);
        }
        if all.len() > 300 {
            break;
        }
    }
    all
}

/// The greatest, by Euclid; of 0 and a number that number.
fn common_divisor(a: u32, b: u32) -> u32 {
    if b == 0 { a } else { common_divisor(b, a % b) }
}

/// Whether two cascades differ in figures only.
fn same_structure(a: &[Slot], b: &[Slot]) -> bool {
    let key = |slot: &Slot| {
        let harmonics = match &slot.lines {
            Lines::Own => 0,
            Lines::Row { harmonics, .. } => harmonics.len(),
        };
        let family = (slot.shape != Shape::Notch).then_some(slot.family);
        (slot.shape, family, slot.order, harmonics, slot.targets.clone())
    };
    a.len() == b.len() && a.iter().zip(b).all(|(a, b)| key(a) == key(b))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_spread_sections_are_as_many_as_there_are() {
        assert_eq!(spread(2, &[1, 2, 1]), [[0, 0, 2], [0, 1, 0], [1, 0, 1], [2, 0, 0]]);
        let step: Vec<u32> = std::iter::once(1).chain([2; 60]).collect();
        let ways = spread(25, &step);
        assert!(ways.len() > 300);
        for way in ways {
            assert_eq!(way.iter().zip(&step).map(|(own, step)| own * step).sum::<u32>(), 25);
        }
    }

    /// C(72, 12), or 1.5e13, partial ways come to 24 or less.
    #[test]
    fn no_way_is_found_in_time_where_there_is_none() {
        assert_eq!(spread(25, &[2; 60]), Vec::<Vec<u32>>::new());
        // 29 is the largest number that is no sum of these.
        assert_eq!(spread(29, &[6, 10, 15].repeat(60)), Vec::<Vec<u32>>::new());
    }
}
