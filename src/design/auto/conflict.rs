//! Which bands can't be had together, and what would have to change.
//!
//! Every figure is found by the search itself: the least distance and the largest reduction
//! by halving, first for the two bands alone, then held against the whole spec.

use super::error::{AutoError, Conflict, Unsaid};
use super::groups::{self, Group};
use super::needs::{Keep, Line, Needs};
use super::search::{Failure, Search};
use crate::design::prototype;
use crate::spec::{Auto, Band, Extent, Family, Requirement, Spec};

/// Halvings of a distance or a reduction.
const HALVINGS: u32 = 9;

/// Lines with the keep bands nearest to them that are looked at for two that can't be had together:
/// each costs a search, and of those far apart none says anything.
const MOST_PAIRS: usize = 12;

/// What is tried beyond the least distance of two bands alone where the whole spec asks for
/// more.
const WIDENED: [f64; 5] = [1.0, 1.1, 1.3, 1.7, 2.5];

/// What `keep_db` is raised by where all bands together are too much.
const RAISED: [f64; 4] = [1.5, 2.0, 3.0, 5.0];

/// The sentence for a search that failed.
pub fn explain(spec: &Spec, auto: Auto, needs: &Needs, failure: &Failure, groups: &[Group]) -> AutoError {
    let family = auto.family.unwrap_or(Family::Elliptic);
    let asker = Asker { spec, needs, family, free: auto.family.is_none() };
    let limits = match auto.family {
        Some(family) => {
            format!("{} filters of order up to {}", prototype::family_name(family), family.highest_order())
        }
        None => format!("orders up to {}", family.highest_order()),
    };
    let lines = match failure {
        Failure::Group(index) => groups.get(*index).map_or(&[][..], |group| &group.lines),
        Failure::Together => &[],
    };
    if needs.keeps_unsaid() {
        return asker.unsaid(lines, limits);
    }
    let lines: Vec<&Line> = lines.iter().filter_map(|line| needs.lines.get(*line)).collect();
    let mut pairs: Vec<(&Line, &Keep)> =
        lines.iter().flat_map(|line| needs.keeps.iter().map(|keep| (*line, keep))).collect();
    pairs.sort_by(|a, b| gap_hz(a.0, a.1).total_cmp(&gap_hz(b.0, b.1)));
    let pair = pairs.iter().take(MOST_PAIRS).find(|(line, keep)| !asker.parts(line, keep, None, line.reduce_db));
    // Where no two of them are in each other's way, the nearest stand for all.
    let Some((line, keep)) = pair.or(pairs.first()) else { return asker.together(limits) };
    let is_excepted = keep.from_hz < line.to_hz && keep.to_hz > line.from_hz;
    let mut conflict = Conflict {
        line: line.name.clone(),
        line_hz: (line.from_hz, line.to_hz),
        reduce_db: line.reduce_db,
        keep: keep.name.clone(),
        keep_hz: (keep.from_hz, keep.to_hz),
        keep_db: keep.keep_db,
        is_excepted,
        limits,
        gap_hz: gap_hz(line, keep).max(0.0),
        enough: None,
        reachable_db: asker.reachable_db(line),
    };
    if !is_excepted && pair.is_some() {
        conflict.enough = asker.enough(line, keep);
    }
    AutoError::Conflict(Box::new(conflict))
}

/// Distance of a line from what is to be kept, Hz; negative where they overlap.
fn gap_hz(line: &Line, keep: &Keep) -> f64 {
    (keep.from_hz - line.to_hz).max(line.from_hz - keep.to_hz)
}

/// Asks the search.
struct Asker<'s> {
    spec: &'s Spec,
    needs: &'s Needs,
    family: Family,
    free: bool,
}

impl Asker<'_> {
    /// Whether a line and a keep band alone can be had, with the near end of the keep band
    /// moved to `end_hz`.
    fn parts(&self, line: &Line, keep: &Keep, end_hz: Option<f64>, reduce_db: f64) -> bool {
        let (mut from_hz, mut to_hz) = (keep.from_hz, keep.to_hz);
        if let Some(end_hz) = end_hz {
            if from_hz >= line.to_hz { from_hz = end_hz } else { to_hz = end_hz }
        }
        if from_hz >= to_hz {
            return false;
        }
        let band = |name: &str, from_hz: f64, to_hz: f64, requirement: Requirement| Band {
            name: name.to_owned(),
            extent: Extent::Range { from_hz, to_hz },
            requirement,
        };
        let keep_db = keep.keep_db;
        let bands = vec![
            band(&line.name, line.from_hz, line.to_hz, Requirement::Reduce { reduce_db }),
            band(&keep.name, from_hz, to_hz, Requirement::Keep { keep_db, except: vec![line.name.clone()] }),
        ];
        let spec = Spec { bands, ..self.spec.clone() };
        let Ok(needs) = Needs::new(&spec, &self.needs.rates_hz) else { return false };
        let groups = groups::groups(&needs);
        let mut search = Search::new(&needs, groups, self.family);
        search.has_any(0)
    }

    /// Whether the whole spec, changed, can be had.
    fn whole(&self, spec: &Spec) -> bool {
        let family = (!self.free).then_some(self.family);
        Needs::new(spec, &self.needs.rates_hz).is_ok_and(|needs| super::search(spec, family, &needs, u32::MAX).is_ok())
    }

    /// The least distance at which a line and a keep band can be had, and the end of the keep
    /// band that makes it so, Hz.
    fn enough(&self, line: &Line, keep: &Keep) -> Option<(f64, f64)> {
        let above = keep.from_hz >= line.to_hz;
        let end_hz = |gap_hz: f64| if above { line.to_hz + gap_hz } else { line.from_hz - gap_hz };
        let holds = |gap_hz: f64| self.parts(line, keep, Some(end_hz(gap_hz)), line.reduce_db);
        let widest_hz = if above { keep.to_hz - line.to_hz } else { line.from_hz - keep.from_hz };
        let mut low = gap_hz(line, keep).max(0.0);
        let mut high = (2.0 * low).max(1e-3 * line.to_hz);
        while !holds(high) {
            low = high;
            high *= 2.0;
            if high >= widest_hz {
                return None;
            }
        }
        for _ in 0..HALVINGS {
            let middle = 0.5 * (low + high);
            if holds(middle) { high = middle } else { low = middle }
        }
        let index = self.spec.bands.iter().position(|band| band.name == keep.name)?;
        for widened in WIDENED {
            let least_hz = high * widened;
            let step = step_of(least_hz);
            // An end that can be typed, on the far side.
            let end = end_hz(least_hz);
            let end = if above { libm::ceil(end / step) * step } else { libm::floor(end / step) * step };
            let end = tidy(end);
            let mut changed = self.spec.clone();
            let Some(Extent::Range { from_hz, to_hz }) = changed.bands.get_mut(index).map(|band| &mut band.extent)
            else {
                return None;
            };
            if above {
                *from_hz = end
            } else {
                *to_hz = end
            }
            if self.whole(&changed) {
                return Some((tidy((end - end_hz(0.0)).abs()), end));
            }
        }
        None
    }

    /// The largest reduction of a line's band with which the whole spec can be had, whole
    /// decibels where it is 10 dB or more.
    fn reachable_db(&self, line: &Line) -> Option<f64> {
        let index = match line.row {
            Some((index, ..)) => index,
            None => self.spec.bands.iter().position(|band| band.name == line.name)?,
        };
        let holds = |db: f64| {
            let mut changed = self.spec.clone();
            if let Some(band) = changed.bands.get_mut(index) {
                band.requirement = Requirement::Reduce { reduce_db: db };
            }
            self.whole(&changed)
        };
        let rounded = |db: f64| if db >= 10.0 { libm::floor(db) } else { tidy(libm::floor(db * 10.0) / 10.0) };
        let (mut low, mut high) = (0.0, line.reduce_db);
        while high - low > (0.02 * line.reduce_db).max(0.2) {
            let middle = rounded(0.5 * (low + high));
            if middle <= low {
                break;
            }
            if holds(middle) { low = middle } else { high = middle }
        }
        (low >= 1.0).then_some(low)
    }

    /// No band is to be kept: the line that is in the way of everything else, the widest of those
    /// of `lines`, or of all where there is none.
    fn unsaid(&self, lines: &[usize], limits: String) -> AutoError {
        let named = lines.iter().filter_map(|line| self.needs.lines.get(*line));
        let widest = |a: &&Line, b: &&Line| a.extent_hz().total_cmp(&b.extent_hz());
        let Some(line) = named.max_by(widest).or_else(|| self.needs.lines.iter().max_by(widest)) else {
            return self.together(limits);
        };
        let is_anything_left = !self.needs.kept_ranges().is_empty();
        AutoError::Unsaid(Box::new(Unsaid {
            line: line.name.clone(),
            line_hz: (line.from_hz, line.to_hz),
            reduce_db: line.reduce_db,
            limits,
            is_anything_left,
            reachable_db: if is_anything_left { self.reachable_db(line) } else { None },
        }))
    }

    /// All together are too much: what the strictest keep band would have to allow.
    fn together(&self, limits: String) -> AutoError {
        let strictest = |a: &&Band, b: &&Band| keep_db(a).total_cmp(&keep_db(b));
        let strict = self.spec.bands.iter().filter(|band| keep_db(band).is_finite()).min_by(strictest);
        let Some(strict) = strict else { return AutoError::Together { limits, repair: String::new() } };
        for factor in RAISED {
            let raised_db = tidy(libm::ceil(100.0 * factor * keep_db(strict)) / 100.0);
            let mut changed = self.spec.clone();
            for band in &mut changed.bands {
                if let Requirement::Keep { keep_db, .. } = &mut band.requirement {
                    *keep_db = keep_db.max(raised_db);
                }
            }
            if self.whole(&changed) {
                let figure = crate::design::wording::figure(raised_db);
                let repair = format!("with keep_db = {figure} or more in every keep band there is one");
                return AutoError::Together { limits, repair };
            }
        }
        AutoError::Together { limits, repair: String::new() }
    }
}

fn keep_db(band: &Band) -> f64 {
    match band.requirement {
        Requirement::Keep { keep_db, .. } => keep_db,
        _ => f64::INFINITY,
    }
}

/// A twentieth of a distance, down to a power of ten.
fn step_of(hz: f64) -> f64 {
    let mut step = 1.0;
    while step > hz / 20.0 && step > 1e-6 {
        step /= 10.0;
    }
    step
}

/// Without the last digits, which are rounding.
fn tidy(value: f64) -> f64 {
    libm::round(value * 1e6) / 1e6
}
