//! Which lines belong together, and with which stages they may be taken out.
//!
//! What must be kept cuts the spectrum into places: below it, between two ranges of it, and
//! above it. Lines of one place make a group; lines of a row that are alone in their places
//! make one group together. Groups share what the keep bands may lose, and nothing else to
//! speak of.

use super::needs::Needs;
use super::slot::{Shape, Slot, is_whole_row};
use super::start::{Aim, Room, Starts};
use crate::spec::Row;

/// Ways to split a number of sections or lines are cut off beyond this many.
const MOST_WAYS: usize = 40;

/// Where a group lies.
#[derive(Clone, Debug, PartialEq)]
pub enum Place {
    /// Below all that is kept.
    Below,
    /// Above all that is kept.
    Above,
    /// Between two ranges that are kept.
    Between,
    /// Lines of a row, each alone between two ranges that are kept.
    Row {
        /// The row.
        row: Row,
        /// The numbers of the lines.
        harmonics: Vec<u32>,
    },
}

/// Lines of one place, or of one row.
#[derive(Clone, Debug, PartialEq)]
pub struct Group {
    /// Where.
    pub place: Place,
    /// Indices of the lines, rising.
    pub lines: Vec<usize>,
    /// The room around each of them.
    pub rooms: Vec<Room>,
}

impl Group {
    /// The sections that the next step up takes: one, or one a line of a row.
    pub fn step(&self) -> u32 {
        match &self.place {
            Place::Row { harmonics, .. } => u32::try_from(harmonics.len()).unwrap_or(u32::MAX),
            Place::Below | Place::Above | Place::Between => 1,
        }
    }

    fn room(&self) -> Room {
        (self.rooms.first().and_then(|room| room.0), self.rooms.last().and_then(|room| room.1))
    }

    /// Whether its lines can only be taken out by stages that are written each by itself.
    pub fn is_one_by_one(&self) -> bool {
        match &self.place {
            Place::Row { harmonics, .. } => !is_whole_row(harmonics),
            Place::Between => true,
            Place::Below | Place::Above => false,
        }
    }

    /// The group's rows taken apart into lines.
    pub fn apart(&self) -> Vec<Group> {
        let one =
            |(line, room): (&usize, &Room)| Group { place: Place::Between, lines: vec![*line], rooms: vec![*room] };
        match self.place {
            Place::Row { .. } => self.lines.iter().zip(&self.rooms).map(one).collect(),
            Place::Below | Place::Above | Place::Between => vec![self.clone()],
        }
    }

    /// Stages with `steps` sections (a line, of a row) that may take the group's lines out,
    /// with figures to begin the search with. One structure may come more than once.
    pub fn variants(&self, steps: u32, starts: &Starts<'_>) -> Vec<Vec<Slot>> {
        let highest = starts.family.highest_order();
        match &self.place {
            Place::Row { row, harmonics } => {
                if steps > highest {
                    return Vec::new();
                }
                starts.row(steps, row, harmonics, &self.lines, &self.rooms).map(|slot| vec![slot]).into_iter().collect()
            }
            Place::Between => self.stops(&self.lines, self.room(), steps, starts),
            Place::Below => self.beside(Shape::Highpass, steps, starts),
            Place::Above => self.beside(Shape::Lowpass, steps, starts),
        }
    }

    /// One edge for all, with or without stops for the lines nearest to what is kept; or
    /// stops alone.
    fn beside(&self, shape: Shape, steps: u32, starts: &Starts<'_>) -> Vec<Vec<Slot>> {
        let highest = starts.family.highest_order();
        let mut nearest_first = self.lines.clone();
        if shape == Shape::Highpass {
            nearest_first.reverse();
        }
        let mut variants = Vec::new();
        for beside in 0..=steps.saturating_sub(1).min(3) {
            let order = (2 * (steps - beside)).min(highest);
            if order.div_ceil(2) < steps - beside {
                continue;
            }
            let stops: Vec<Vec<Slot>> =
                if beside == 0 { vec![Vec::new()] } else { self.few_stops(&nearest_first, beside, starts) };
            for stops in stops {
                let helped: Vec<usize> = stops.iter().flat_map(|slot| slot.targets.iter().copied()).collect();
                let rest: Vec<usize> = self.lines.iter().copied().filter(|line| !helped.contains(line)).collect();
                let aimed = if rest.is_empty() { &self.lines } else { &rest };
                for aim in [Aim::Nearest, Aim::Deepest] {
                    let mut slots = vec![starts.edge(shape, order, aimed, self.room(), aim)];
                    slots.extend(stops.iter().cloned());
                    variants.push(slots);
                }
            }
        }
        let reaches_end = self.lines.iter().any(|line| starts.reaches_end(*line));
        if !reaches_end {
            variants.extend(self.stops(&self.lines, self.room(), steps, starts));
        }
        variants
    }

    /// `count` sections of stops on the lines that come first in `nearest_first`.
    fn few_stops(&self, nearest_first: &[usize], count: u32, starts: &Starts<'_>) -> Vec<Vec<Slot>> {
        let Some(&nearest) = nearest_first.first() else { return Vec::new() };
        if starts.reaches_end(nearest) {
            return Vec::new();
        }
        let mut ways = vec![starts.notches(count, nearest)];
        if count >= 2 {
            ways.push(vec![starts.stop(count, &[nearest], self.room_of(nearest), Aim::Deepest)]);
            let several: Vec<usize> = nearest_first.iter().copied().take(count as usize).collect();
            if several.len() == count as usize && !several.iter().any(|line| starts.reaches_end(*line)) {
                ways.push(several.iter().flat_map(|line| starts.notches(1, *line)).collect());
            }
        }
        ways
    }

    fn room_of(&self, line: usize) -> Room {
        let place = self.lines.iter().position(|own| *own == line);
        place.and_then(|place| self.rooms.get(place)).copied().unwrap_or((None, None))
    }

    /// Stops with `steps` sections in all: the lines in runs, each run with one stop or
    /// notches.
    fn stops(&self, lines: &[usize], room: Room, steps: u32, starts: &Starts<'_>) -> Vec<Vec<Slot>> {
        let mut variants = Vec::new();
        for runs in runs(lines) {
            let Ok(count) = u32::try_from(runs.len()) else { continue };
            if count > steps {
                continue;
            }
            for orders in splits(steps, count) {
                let parts: Vec<Vec<Vec<Slot>>> =
                    runs.iter().zip(&orders).map(|(run, order)| one_run(run, room, *order, starts)).collect();
                // The first way of each run, and each other way of one run at a time.
                let firsts: Vec<&Vec<Slot>> = parts.iter().filter_map(|ways| ways.first()).collect();
                if firsts.len() < parts.len() {
                    continue;
                }
                variants.push(firsts.iter().flat_map(|slots| slots.iter().cloned()).collect());
                for (index, ways) in parts.iter().enumerate() {
                    for way in ways.iter().skip(1) {
                        let chosen = firsts.iter().enumerate().map(|(i, first)| if i == index { way } else { *first });
                        variants.push(chosen.flat_map(|slots| slots.iter().cloned()).collect());
                    }
                }
                if variants.len() > MOST_WAYS {
                    return variants;
                }
            }
        }
        variants
    }
}

/// The ways to take out one run of lines with `order` sections.
fn one_run(run: &[usize], room: Room, order: u32, starts: &Starts<'_>) -> Vec<Vec<Slot>> {
    let mut ways = Vec::new();
    if let [line] = *run {
        if order == 1 {
            return vec![starts.notches(1, line)];
        }
        if order <= starts.family.highest_order() {
            for aim in [Aim::Nearest, Aim::Deepest] {
                ways.push(vec![starts.stop(order, run, room, aim)]);
            }
        }
        if order <= 3 {
            ways.push(starts.notches(order, line));
        }
        if order == 3 {
            let mut slots = vec![starts.stop(2, run, room, Aim::Deepest)];
            slots.append(&mut starts.notches(1, line));
            ways.push(slots);
        }
        return ways;
    }
    if order <= starts.family.highest_order() {
        for aim in [Aim::Nearest, Aim::Deepest] {
            ways.push(vec![starts.stop(order, run, room, aim)]);
        }
    }
    ways
}

/// All ways to cut `lines` into runs; of many lines only one run, and one run each.
fn runs(lines: &[usize]) -> Vec<Vec<Vec<usize>>> {
    if lines.len() > 5 {
        return vec![vec![lines.to_vec()], lines.iter().map(|line| vec![*line]).collect()];
    }
    let cuts = 1_u32 << lines.len().saturating_sub(1);
    (0..cuts)
        .map(|mask| {
            let mut runs: Vec<Vec<usize>> = Vec::new();
            for (index, line) in lines.iter().enumerate() {
                match runs.last_mut() {
                    Some(run) if mask & (1 << (index - 1)) == 0 => run.push(*line),
                    _ => runs.push(vec![*line]),
                }
            }
            runs
        })
        .collect()
}

/// The ways to write `total` as a sum of `count` numbers of at least 1, the most even first.
pub fn splits(total: u32, count: u32) -> Vec<Vec<u32>> {
    fn fill(left: u32, parts: u32, own: &mut Vec<u32>, all: &mut Vec<Vec<u32>>) {
        if all.len() > 4 * MOST_WAYS {
            return;
        }
        if parts == 1 {
            own.push(left);
            all.push(own.clone());
            own.pop();
            return;
        }
        for first in 1..=left.saturating_sub(parts - 1) {
            own.push(first);
            fill(left - first, parts - 1, own, all);
            own.pop();
        }
    }
    let mut all = Vec::new();
    if count > 0 && total >= count {
        if count > 6 {
            // Even, the rest to the first.
            let even = total / count;
            let rest = total % count;
            return vec![(0..count).map(|index| even + u32::from(index < rest)).collect()];
        }
        fill(total, count, &mut Vec::new(), &mut all);
    }
    all.sort_by_key(|parts| parts.iter().max().copied());
    all.truncate(MOST_WAYS);
    all
}

/// The groups of all lines.
pub fn groups(needs: &Needs) -> Vec<Group> {
    let kept = needs.kept_ranges();
    let place_of = |hz: f64| kept.iter().filter(|range| range.1 <= hz).count();
    let mut by_place: Vec<(usize, Vec<usize>)> = Vec::new();
    let mut order: Vec<usize> = (0..needs.lines.len()).collect();
    order.sort_by(|a, b| needs.lines[*a].from_hz.total_cmp(&needs.lines[*b].from_hz));
    for index in order {
        let place = place_of(needs.lines[index].from_hz);
        match by_place.iter_mut().find(|(known, _)| *known == place) {
            Some((_, lines)) => lines.push(index),
            None => by_place.push((place, vec![index])),
        }
    }
    let mut groups: Vec<Group> = Vec::new();
    for (place, lines) in by_place {
        let below = place.checked_sub(1).and_then(|before| kept.get(before)).map(|range| range.1);
        let above = kept.get(place).map(|range| range.0);
        let rooms = vec![(below, above); lines.len()];
        let alone = match *lines.as_slice() {
            [line] if below.is_some() && above.is_some() => needs.lines[line].row,
            _ => None,
        };
        let Some((band, row, harmonic)) = alone else {
            let place = match (below, above) {
                (Some(_), Some(_)) => Place::Between,
                (Some(_), None) => Place::Above,
                (None, _) => Place::Below,
            };
            groups.push(Group { place, lines, rooms });
            continue;
        };
        let same = groups.iter_mut().find(|group| {
            matches!(group.place, Place::Row { .. })
                && group.lines.first().and_then(|first| needs.lines[*first].row).is_some_and(|own| own.0 == band)
        });
        match same {
            Some(Group { place: Place::Row { harmonics, .. }, lines: own, rooms: own_rooms }) => {
                harmonics.push(harmonic);
                own.extend(lines);
                own_rooms.extend(rooms);
            }
            _ => groups.push(Group { place: Place::Row { row, harmonics: vec![harmonic] }, lines, rooms }),
        }
    }
    for group in &mut groups {
        if group.lines.len() == 1 && group.step() == 1 && matches!(group.place, Place::Row { .. }) {
            group.place = Place::Between;
        }
    }
    groups
}
