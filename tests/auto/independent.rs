//! A search that shares no code with the one it is held against but the prototypes, which
//! have references of their own: all structures of so many sections in every place, figures
//! turned by the simplex method of J. A. Nelder and R. Mead (1965, from memory) from many
//! starts, and the requirements as they stand, without a margin.
//!
//! A place is what lies below all that is kept, between two kept ranges, or above. Stages of
//! one place hold nothing in another but by what the kept ranges may lose, so each place is
//! first asked alone for so much less; what fails alone can't hold together with others.

use crate::magnitude::{Filter, Kind, Point};
use crate::simplex::{Random, simplex};
use crate::tasks::{Ask, Task};
use bandproof::design::prototype;
use bandproof::spec::Family;
use std::f64::consts::PI;

const FAMILIES: [Family; 4] = [Family::Elliptic, Family::Chebyshev2, Family::Chebyshev1, Family::Butterworth];

/// A range to take out, Hz, and by how many dB.
#[derive(Clone, Copy, Debug)]
pub struct Line {
    pub from_hz: f64,
    pub to_hz: f64,
    pub db: f64,
}

/// A task in numbers.
pub struct Problem {
    rates_hz: Vec<f64>,
    points: Vec<Point>,
    places: Vec<Vec<Line>>,
    /// Kept ranges, Hz, rising.
    kept: Vec<(f64, f64)>,
    passes: f64,
    keep_db: f64,
    /// Stages beyond half a rate are left out there.
    leaves_out: bool,
}

/// Stages of one place.
#[derive(Clone, Debug)]
struct Part {
    place: usize,
    kinds: Vec<Kind>,
    family: Family,
}

impl Problem {
    /// Of the bands of a task; of a row only the lines `wanted`.
    pub fn new(task: &Task, wanted: impl Fn(u32) -> bool) -> Problem {
        let mut lines: Vec<(Line, &str)> = Vec::new();
        let mut all: Vec<(Line, &str)> = Vec::new();
        for (name, from_hz, to_hz, ask) in task.bands {
            if let Ask::Reduce(db) = ask {
                lines.push((Line { from_hz: *from_hz, to_hz: *to_hz, db: *db }, name));
                all.push(lines[lines.len() - 1]);
            }
        }
        for (name, center_hz, span_hz, count, db) in task.rows {
            for number in 1..=*count {
                let center_hz = center_hz * f64::from(number);
                let line = Line { from_hz: center_hz - span_hz / 2.0, to_hz: center_hz + span_hz / 2.0, db: *db };
                all.push((line, name));
                if wanted(number) {
                    lines.push((line, name));
                }
            }
        }
        let mut keeps: Vec<(f64, f64, f64)> = Vec::new();
        for (_, from_hz, to_hz, ask) in task.bands {
            let (db, except): (f64, &[&str]) = match ask {
                Ask::Keep(db) => (*db, &[]),
                Ask::KeepExcept(db, except) => (*db, except),
                Ask::Reduce(_) => continue,
            };
            let mut inside: Vec<(f64, f64)> = all
                .iter()
                .filter(|(line, name)| except.contains(name) && line.to_hz > *from_hz && line.from_hz < *to_hz)
                .map(|(line, _)| (line.from_hz, line.to_hz))
                .collect();
            inside.sort_by(|a, b| a.0.total_cmp(&b.0));
            let mut start_hz = *from_hz;
            for (index, line) in inside.iter().enumerate() {
                let side_hz = 4.5 * (line.1 - line.0);
                let below_hz = match index.checked_sub(1) {
                    Some(before) => 0.25 * (line.0 - inside[before].1),
                    None => 0.5 * (line.0 - from_hz).max(0.0),
                };
                let above_hz = match inside.get(index + 1) {
                    Some(after) => 0.25 * (after.0 - line.1),
                    None => 0.5 * (to_hz - line.1).max(0.0),
                };
                keeps.push((start_hz, line.0 - side_hz.min(below_hz), db));
                start_hz = line.1 + side_hz.min(above_hz);
            }
            keeps.push((start_hz, *to_hz, db));
        }
        keeps.retain(|keep| keep.0 < keep.1);
        keeps.sort_by(|a, b| a.0.total_cmp(&b.0));
        let kept: Vec<(f64, f64)> = keeps.iter().map(|keep| (keep.0, keep.1)).collect();
        let mut places: Vec<Vec<Line>> = vec![Vec::new(); kept.len() + 1];
        lines.sort_by(|a, b| a.0.from_hz.total_cmp(&b.0.from_hz));
        for (line, _) in &lines {
            places[kept.iter().filter(|range| range.1 <= line.from_hz).count()].push(*line);
        }
        let rates_hz: Vec<f64> = task.rates_hz.iter().copied().map(f64::from).collect();
        let mut points = Vec::new();
        for (rate, &rate_hz) in rates_hz.iter().enumerate() {
            let half_hz = rate_hz / 2.0;
            let mut push = |hz: f64, keep: bool, db: f64, place: usize| {
                points.push(Point { at: (PI * hz.min(0.499_999_9 * rate_hz) / rate_hz).tan(), rate, keep, db, place });
            };
            for &(from_hz, to_hz, db) in keeps.iter().filter(|keep| keep.1 <= half_hz) {
                // Evenly in the logarithm, and closer and closer to both ends.
                for step in 0..=24 {
                    push(from_hz * (to_hz / from_hz).powf(f64::from(step) / 24.0), true, db, usize::MAX);
                }
                for step in 0..16 {
                    let off_hz = 0.4 * (to_hz - from_hz) * 0.6_f64.powi(step);
                    push(from_hz + off_hz, true, db, usize::MAX);
                    push(to_hz - off_hz, true, db, usize::MAX);
                }
            }
            for (place, lines) in places.iter().enumerate() {
                for line in lines.iter().filter(|line| line.to_hz <= half_hz) {
                    for step in 0..=16 {
                        // Evenly in the angle: dense at both ends.
                        let part = 0.5 - 0.5 * (PI * f64::from(step) / 16.0).cos();
                        push(line.from_hz + part * (line.to_hz - line.from_hz), false, line.db, place);
                    }
                }
            }
        }
        let keep_db = keeps.iter().map(|keep| keep.2).fold(0.0, f64::max);
        let passes = if task.zero { 2.0 } else { 1.0 };
        let leaves_out = task.head.contains("leave-out");
        Problem { rates_hz, points, places, kept, passes, keep_db, leaves_out }
    }

    /// Number of places, those without lines among them.
    pub fn place_count(&self) -> usize {
        self.places.len()
    }

    /// The same with the lines of one place alone.
    pub fn only(&self, place: usize) -> Problem {
        let others = self
            .places
            .iter()
            .enumerate()
            .map(|(index, lines)| if index == place { lines.clone() } else { Vec::new() });
        Problem {
            rates_hz: self.rates_hz.clone(),
            points: self.points.iter().copied().filter(|point| point.keep || point.place == place).collect(),
            places: others.collect(),
            kept: self.kept.clone(),
            passes: self.passes,
            keep_db: self.keep_db,
            leaves_out: self.leaves_out,
        }
    }

    /// Whether there is nothing to take out.
    pub fn is_empty(&self) -> bool {
        self.places.iter().all(Vec::is_empty)
    }

    /// The largest least slack that some cascade of `sections` sections is found to have,
    /// nepers: 0 or more where all holds. `effort` counts starts.
    pub fn best(&self, sections: u32, effort: u32) -> f64 {
        let mut random = Random(0x9e37_79b9_7f4a_7c15);
        let busy: Vec<usize> = (0..self.places.len()).filter(|place| !self.places[*place].is_empty()).collect();
        let least_of_others = u32::try_from(busy.len()).unwrap() - 1;
        if sections <= least_of_others {
            return f64::NEG_INFINITY;
        }
        // What each place can do alone with 1, 2, ... sections.
        let alone: Vec<Vec<Vec<Part>>> = busy
            .iter()
            .map(|&place| {
                (1..=sections - least_of_others).map(|count| self.alone(place, count, effort, &mut random)).collect()
            })
            .collect();
        let mut best = f64::NEG_INFINITY;
        for counts in compositions(sections, busy.len()) {
            let ways: Vec<&Vec<Part>> =
                counts.iter().zip(&alone).map(|(count, alone)| &alone[*count as usize - 1]).collect();
            if ways.iter().any(|ways| ways.is_empty()) {
                continue;
            }
            if ways.len() == 1 && self.passes_alone(&ways) {
                return 0.0;
            }
            // Each way of one place with the first of the others.
            for (index, own) in ways.iter().enumerate() {
                for (number, part) in own.iter().enumerate() {
                    if number == 0 && index > 0 {
                        continue;
                    }
                    let parts: Vec<Part> = ways
                        .iter()
                        .enumerate()
                        .map(|(i, ways)| if i == index { part.clone() } else { ways[0].clone() })
                        .collect();
                    best = best.max(self.turned(&parts, None, effort, &mut random));
                    if best >= 0.0 {
                        return best;
                    }
                }
            }
        }
        best
    }

    /// With one place alone there is nothing to share, and no help was given.
    fn passes_alone(&self, ways: &[&Vec<Part>]) -> bool {
        self.places.iter().filter(|lines| !lines.is_empty()).count() == 1 && !ways[0].is_empty()
    }

    fn alone(&self, place: usize, count: u32, effort: u32, random: &mut Random) -> Vec<Part> {
        let mut parts = Vec::new();
        for kinds in self.structures(place, count) {
            for family in FAMILIES {
                let part = Part { place, kinds: kinds.clone(), family };
                // A stop of order 1 is the same in every family.
                let is_notches = kinds.iter().all(|kind| matches!(kind, Kind::Stop(1, ..)));
                let most = kinds.iter().map(|kind| match kind {
                    Kind::Highpass(order) | Kind::Lowpass(order) | Kind::Stop(order, ..) => *order,
                });
                let too_high = most.max().unwrap_or(0) > family.highest_order();
                if too_high || (is_notches && family != Family::Elliptic) {
                    continue;
                }
                let slack = self.turned(std::slice::from_ref(&part), Some(place), effort, random);
                if slack >= 0.0 {
                    parts.push((part, slack));
                }
            }
        }
        parts.sort_by(|a, b| b.1.total_cmp(&a.1));
        parts.truncate(6);
        parts.into_iter().map(|(part, _)| part).collect()
    }

    /// Everything that `count` sections can be in a place.
    fn structures(&self, place: usize, count: u32) -> Vec<Vec<Kind>> {
        let lines = &self.places[place];
        let (is_low, is_high) = (place == 0, place == self.kept.len());
        let half_hz = self.rates_hz.iter().copied().fold(0.0, f64::max) / 2.0;
        let mut all = Vec::new();
        for edge in 0..=count {
            if edge > 0 && !(is_low || is_high) {
                break;
            }
            let orders = if edge == 0 { vec![0] } else { vec![2 * edge, 2 * edge - 1] };
            for order in orders {
                let mut first = Vec::new();
                if order > 0 {
                    first.push(if is_low { Kind::Highpass(order) } else { Kind::Lowpass(order) });
                }
                for stops in stops(count - edge, lines.len()) {
                    let ends = stops.iter().any(|kind| match kind {
                        Kind::Stop(_, from, to) => lines[*from].from_hz <= 0.0 || lines[*to].to_hz >= 0.9999 * half_hz,
                        _ => false,
                    });
                    if !ends {
                        all.push(first.iter().chain(&stops).copied().collect());
                    }
                }
            }
        }
        all.retain(|kinds: &Vec<Kind>| !kinds.is_empty());
        all
    }

    /// The largest least slack of one structure; with `only` at the lines of that place, each
    /// asked for what others may add there less.
    fn turned(&self, parts: &[Part], only: Option<usize>, effort: u32, random: &mut Random) -> f64 {
        let help_db = if only.is_some() && self.places.iter().filter(|lines| !lines.is_empty()).count() > 1 {
            self.keep_db
        } else {
            0.0
        };
        let share = if parts.len() > 1 { 0.7 / parts.len() as f64 } else { 0.7 };
        let mut best = f64::NEG_INFINITY;
        for start in 0..effort {
            let mut begin = Vec::new();
            for part in parts {
                for kind in &part.kinds {
                    begin.extend(self.start(part, *kind, share, start, random));
                }
            }
            let cost = |x: &[f64]| -self.slack(parts, x, only, help_db);
            let evaluations = 150 + 120 * begin.len();
            let mut found = simplex(&begin, 0.35, evaluations, &cost);
            // The simplex method gets stuck: begin again where it stopped.
            for size in [0.1, 0.02] {
                if found.1 < 1.0 {
                    found = simplex(&found.0, size, evaluations, &cost);
                }
            }
            best = best.max(-found.1);
            if best >= 0.0 {
                break;
            }
        }
        best
    }

    fn room(&self, place: usize) -> (Option<f64>, Option<f64>) {
        let below = place.checked_sub(1).and_then(|before| self.kept.get(before)).map(|range| range.1);
        (below, self.kept.get(place).map(|range| range.0))
    }

    /// Figures: edges as parts of the way from the line (0) to what is kept (1), the logarithm
    /// of the ripple over 0.1 dB, the stop attenuation in tens of dB.
    fn start(&self, part: &Part, kind: Kind, share: f64, number: u32, random: &mut Random) -> Vec<f64> {
        let family = part.family;
        let deepest = self.places[part.place].iter().map(|line| line.db).fold(0.0, f64::max);
        let spread = if number == 0 { 0.0 } else { 1.0 };
        let edge = match family {
            Family::Chebyshev2 => 0.02,
            Family::Butterworth => 0.6,
            _ => 1.0,
        };
        let mut x = match kind {
            Kind::Highpass(_) | Kind::Lowpass(_) => vec![edge + 0.3 * spread * random.next()],
            Kind::Stop(1, ..) => vec![0.4 * spread * random.next(), 1.0 + 1.5 * spread * random.next()],
            Kind::Stop(..) => vec![edge + 0.3 * spread * random.next(), edge + 0.3 * spread * random.next()],
        };
        if matches!(kind, Kind::Stop(1, ..)) {
            return x;
        }
        if family.takes_ripple() {
            x.push((self.keep_db * share / self.passes / 0.1).ln() + spread * random.next());
        }
        if family.takes_stop() {
            x.push((deepest / self.passes + 2.0) / 10.0 + 1.5 * spread * random.next());
        }
        x
    }

    fn slack(&self, parts: &[Part], x: &[f64], only: Option<usize>, help_db: f64) -> f64 {
        let mut filters = Vec::new();
        let mut rest = x;
        for part in parts {
            for kind in &part.kinds {
                let Some(filter) = self.filter(part, *kind, &mut rest) else { return -1e3 };
                filters.push(filter);
            }
        }
        let mut least = f64::INFINITY;
        for point in &self.points {
            if !point.keep && only.is_some_and(|place| place != point.place) {
                continue;
            }
            let db: f64 = filters.iter().map(|filter| filter.attenuation_db(point)).sum::<f64>() * self.passes;
            let slack = if point.keep {
                (point.db / db.max(1e-9)).ln()
            } else {
                (db - (point.db - help_db).max(0.1 * point.db)) / 4.343
            };
            least = least.min(slack);
        }
        least
    }

    fn filter(&self, part: &Part, kind: Kind, rest: &mut &[f64]) -> Option<Filter> {
        let mut next = || {
            let (first, others) = rest.split_first()?;
            *rest = others;
            Some(*first)
        };
        let lines = &self.places[part.place];
        let (below, above) = self.room(part.place);
        let lowest_half_hz = if self.leaves_out {
            self.rates_hz.iter().copied().fold(0.0, f64::max)
        } else {
            self.rates_hz.iter().copied().fold(f64::INFINITY, f64::min)
        } / 2.0;
        // From the line's edge to the kept edge in the logarithm.
        let between = |from_hz: f64, to_hz: f64, part: f64| from_hz * (to_hz / from_hz).powf(part);
        let (edges_hz, order) = match kind {
            Kind::Highpass(order) => {
                let top_hz = lines.iter().map(|line| line.to_hz).fold(0.0, f64::max);
                (vec![between(top_hz, above?, next()?)], order)
            }
            Kind::Lowpass(order) => {
                let bottom_hz = lines.iter().map(|line| line.from_hz).fold(f64::INFINITY, f64::min);
                (vec![between(bottom_hz, below?, next()?)], order)
            }
            Kind::Stop(1, from, to) => {
                let (low_hz, high_hz) = (lines[from].from_hz, lines[to].to_hz);
                let half_hz = 0.5 * (high_hz - low_hz);
                let center_hz = low_hz + half_hz + half_hz * next()?;
                let width_hz = half_hz * (1.5 * next()?).exp();
                let (a, b) = ((width_hz * width_hz + center_hz * center_hz).sqrt(), width_hz);
                (vec![a - b, a + b], 1)
            }
            Kind::Stop(order, from, to) => {
                let (low_hz, high_hz) = (lines[from].from_hz, lines[to].to_hz);
                let extent_hz = high_hz - low_hz;
                let end_below = below.unwrap_or(low_hz * low_hz / (low_hz + 4.0 * extent_hz));
                let end_above = above.unwrap_or((high_hz + 4.0 * extent_hz).min(lowest_half_hz * 0.99));
                (vec![between(low_hz, end_below, next()?), between(high_hz, end_above, next()?)], order)
            }
        };
        let inside = edges_hz.iter().all(|hz| *hz > 0.0 && *hz < lowest_half_hz && hz.is_finite());
        if !inside || edges_hz.len() == 2 && edges_hz[0] >= edges_hz[1] {
            return None;
        }
        let (mut ripple_db, mut stop_db) = (None, None);
        let family = if matches!(kind, Kind::Stop(1, ..)) { Family::Butterworth } else { part.family };
        if family.takes_ripple() {
            ripple_db = Some(0.1 * next()?.exp()).filter(|db| (1e-6..=3.0).contains(db));
        }
        if family.takes_stop() {
            stop_db = Some(10.0 * next()?).filter(|db| (3.1..=200.0).contains(db));
        }
        let made = prototype::approximate(family, order, ripple_db, stop_db).ok()?;
        Some(Filter::new(kind, &made, &edges_hz, &self.rates_hz))
    }
}

/// The ways to spread `count` sections of stops over `lines` lines.
fn stops(count: u32, lines: usize) -> Vec<Vec<Kind>> {
    if count == 0 {
        return vec![Vec::new()];
    }
    let mut all = Vec::new();
    // The stage on the lowest lines first, so that each set comes once.
    for order in 1..=count {
        for from in 0..lines {
            for to in from..lines {
                for rest in stops(count - order, lines) {
                    let own = Kind::Stop(order, from, to);
                    let is_next = rest.first().is_none_or(|next| match (own, next) {
                        (Kind::Stop(a, b, c), Kind::Stop(d, e, f)) => (b, c, a) <= (*e, *f, *d),
                        _ => true,
                    });
                    if is_next {
                        let mut kinds = vec![own];
                        kinds.extend(rest);
                        all.push(kinds);
                    }
                }
            }
        }
    }
    // Where there are too many, the ones of few stages.
    all.sort_by_key(Vec::len);
    all.truncate(24);
    all
}

fn compositions(total: u32, parts: usize) -> Vec<Vec<u32>> {
    if parts == 1 {
        return vec![vec![total]];
    }
    let others = u32::try_from(parts).unwrap() - 1;
    (1..=total - others)
        .flat_map(|first| {
            compositions(total - first, parts - 1).into_iter().map(move |mut rest| {
                rest.insert(0, first);
                rest
            })
        })
        .collect()
}
