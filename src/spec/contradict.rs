//! What only shows between bands: names used twice, exceptions and references that name
//! nothing, and bands that ask for the impossible together.

use std::collections::HashMap;

use super::error::Place;
use super::problems::Problems;
use super::read_band::ReadBand;
use super::stages::Line;
use super::suggest;
use super::tree::{quote, show_hz};
use super::types::{Extent, Requirement, line_name};

/// Checks the bands against each other.
pub(super) fn check(bands: &[ReadBand<'_>], problems: &mut Problems) {
    let names = Names::new(bands);
    names.check_unique(problems);
    for (index, band) in bands.iter().enumerate() {
        if let Some(Requirement::Keep { except, .. }) = &band.requirement
            && !problems.is_full()
            && let Some(excepted) = names.resolve_except(band, except, problems)
        {
            check_keep(bands, index, &excepted, problems);
        }
    }
}

/// Checks that `reference_band` names one band that shows gains.
pub(super) fn check_reference(bands: &[ReadBand<'_>], name: &str, place: &Place, problems: &mut Problems) {
    let shows_gains =
        |band: &ReadBand<'_>| matches!(band.requirement, Some(Requirement::Keep { .. } | Requirement::Observe));
    let named = Names::new(bands).resolve(name);
    let Some((named, band)) = named.and_then(|named| Some((named, bands.get(named.band)?))) else {
        // It may be the name of a band that has a problem of its own.
        if bands.iter().all(|band| band.name.is_some()) {
            let fitting = bands.iter().filter(|band| shows_gains(band));
            let near = near_name(name, fitting.filter_map(|band| band.name));
            let row = near.and_then(|near| bands.iter().find(|band| band.name == Some(near))).and_then(lines);
            let repair = match (near, row) {
                (Some(near), Some(lines)) => format!("the bands of that row are {}", row_names(near, lines)),
                (Some(near), None) => format!("did you mean {}?", quote(near)),
                (None, _) => "name a band that has keep_db or no requirement, or remove it".to_owned(),
            };
            let message = format!("reference_band names {}, which is no band of this spec", quote(name));
            problems.add(place, message, repair);
        }
        return;
    };
    let limit = match &band.requirement {
        Some(Requirement::Reduce { .. }) => "reduce_db",
        Some(Requirement::Residual { .. }) => "residual_dbfs",
        Some(Requirement::Keep { .. } | Requirement::Observe) => {
            if let (Some(lines), None) = (lines(band), named.harmonic) {
                let message = format!("reference_band names a row of {lines} bands, and only one can be the reference");
                problems.add(place, message, format!("name one of {}", row_names(name, lines)));
            }
            return;
        }
        None => return,
    };
    let message = format!("reference_band names {}, which has {limit} and so shows no gain", quote(name));
    problems.add(place, message, "name a band that has keep_db or no requirement, or remove it");
}

/// How many bands a row stands for; nothing for a single band.
fn lines(band: &ReadBand<'_>) -> Option<u32> {
    match band.extent {
        Some(Extent::Row(row)) if row.harmonics > 1 => Some(row.harmonics),
        _ => None,
    }
}

/// `"tones x1" to "tones x8"`.
fn row_names(row: &str, lines: u32) -> String {
    format!("{} to {}", quote(&line_name(row, 1)), quote(&line_name(row, lines)))
}

/// The name most like `written`. `hum x9` of a row of eight lines is near the row,
/// however it is spelled.
fn near_name<'k>(written: &str, known: impl Iterator<Item = &'k str> + Clone) -> Option<&'k str> {
    let row = written.rsplit_once(" x").map(|(row, _)| row);
    known.clone().find(|known| Some(*known) == row).or_else(|| suggest::name(written, known))
}

/// What a name stands for: a band of the spec, or one line of it.
#[derive(Clone, Copy, PartialEq)]
struct Named {
    band: usize,
    /// `None`: the whole band.
    harmonic: Option<u32>,
}

/// The names of all bands. The names of a row's lines are never spelled out: `name xN`
/// is taken apart instead, so that long rows cost nothing.
struct Names<'b, 'n> {
    bands: &'b [ReadBand<'n>],
    /// The first band of each name.
    first: HashMap<&'n str, usize>,
}

impl<'b, 'n> Names<'b, 'n> {
    fn new(bands: &'b [ReadBand<'n>]) -> Self {
        let mut first = HashMap::new();
        for (index, band) in bands.iter().enumerate() {
            if let Some(name) = band.name {
                first.entry(name).or_insert(index);
            }
        }
        Self { bands, first }
    }

    /// The line of a row that is reported by this name.
    fn line(&self, name: &str) -> Option<Named> {
        let (base, number) = name.rsplit_once(" x")?;
        let harmonic: u32 = number.parse().ok()?;
        let band = *self.first.get(base)?;
        let Some(Extent::Row(row)) = self.bands.get(band)?.extent else { return None };
        // `x03` and `x+3` are no names of lines.
        let is_line = row.harmonics > 1 && (1..=row.harmonics).contains(&harmonic) && harmonic.to_string() == number;
        is_line.then_some(Named { band, harmonic: Some(harmonic) })
    }

    fn resolve(&self, name: &str) -> Option<Named> {
        let whole = self.first.get(name).map(|&band| Named { band, harmonic: None });
        whole.or_else(|| self.line(name))
    }

    /// Two bands of one name; a band with the name of a row's line.
    fn check_unique(&self, problems: &mut Problems) {
        for (index, band) in self.bands.iter().enumerate() {
            let Some(name) = band.name else { continue };
            let repair = "give each band a name of its own";
            if let Some(first) = self.first.get(name).filter(|&&first| first != index).and_then(|&i| self.bands.get(i))
            {
                let message =
                    format!("the name {} is used twice, first in {}", quote(name), first.name_place.mention());
                problems.add(band.name_place, message, repair);
            } else if let Some(row) = self.line(name).and_then(|line| self.bands.get(line.band)) {
                let message = format!(
                    "the name {} is used twice: it is also a line of the row {} in {}",
                    quote(name),
                    quote(row.name.unwrap_or_default()),
                    row.name_place.mention()
                );
                problems.add(band.name_place, message, repair);
            }
        }
    }

    /// What the names in `except` stand for; nothing where one of them is wrong, since
    /// then it is not known what was to be excepted.
    fn resolve_except(&self, keep: &ReadBand<'_>, except: &[String], problems: &mut Problems) -> Option<Vec<Named>> {
        let mut all_known = true;
        let mut excepted = Vec::new();
        for (name, place) in except.iter().zip(&keep.except_name_places) {
            let named = self.resolve(name);
            let requirement = named.and_then(|named| self.bands.get(named.band)).map(|band| &band.requirement);
            let message = match (named, requirement) {
                (Some(named), Some(Some(Requirement::Reduce { .. }))) => {
                    excepted.push(named);
                    continue;
                }
                // That band has a problem of its own, or some band has no usable name.
                (_, Some(None)) => {
                    all_known = false;
                    continue;
                }
                (None, _) if self.bands.iter().any(|band| band.name.is_none()) => {
                    all_known = false;
                    continue;
                }
                (Some(_), _) => format!("except names {}, which has no reduce_db", quote(name)),
                (None, _) => format!("except names {}, which is no band of this spec", quote(name)),
            };
            all_known = false;
            let reduce = self.bands.iter().filter(|band| matches!(band.requirement, Some(Requirement::Reduce { .. })));
            let repair = match near_name(name, reduce.filter_map(|band| band.name)) {
                Some(near) => format!("did you mean {}?", quote(near)),
                None => "name a band that has reduce_db, or remove it".to_owned(),
            };
            problems.add(place, message, repair);
        }
        all_known.then_some(excepted)
    }
}

/// Every reduce band that shares frequencies with the keep band must be excepted: one
/// that merely reaches into it contradicts it there as one inside does.
fn check_keep(bands: &[ReadBand<'_>], keep_index: usize, excepted: &[Named], problems: &mut Problems) {
    let Some(keep) = bands.get(keep_index) else { return };
    let Some(keep_lines) = keep.extent.as_ref().map(Extent::lines) else { return };
    for (index, reduce) in bands.iter().enumerate() {
        // A band without a usable name can't be excepted yet: that comes first.
        let (Some(Requirement::Reduce { .. }), Some(extent), Some(_)) =
            (&reduce.requirement, &reduce.extent, reduce.name)
        else {
            continue;
        };
        if excepted.contains(&Named { band: index, harmonic: None }) {
            continue;
        }
        let is_excepted = |line: &Line| excepted.contains(&Named { band: index, harmonic: Some(line.harmonic) });
        let asked: Vec<Line> = extent.lines().into_iter().filter(|line| !is_excepted(line)).collect();
        if let Some((reduce_line, keep_line)) = first_overlap(&asked, &keep_lines) {
            report_overlap((reduce, &reduce_line), (keep, &keep_line), problems);
        }
    }
}

fn report_overlap(
    (reduce, reduce_line): (&ReadBand<'_>, &Line),
    (keep, keep_line): (&ReadBand<'_>, &Line),
    problems: &mut Problems,
) {
    let inside = reduce_line.from_hz >= keep_line.from_hz && reduce_line.to_hz <= keep_line.to_hz;
    let how = if inside { "lies inside" } else { "reaches into" };
    let message =
        format!("the reduce band {} {how} the keep band {}", shown(reduce, reduce_line), shown(keep, keep_line));
    let name = quote(reduce.name.unwrap_or_default());
    let (place, repair) = match keep.except_place {
        Some(place) => (place, format!("name {name} in except, or move one of the bands")),
        None => {
            let except = problems.assign("except", &format!("[{name}]"));
            (keep.place, format!("add {except} to the keep band, or move one of the bands"))
        }
    };
    problems.add(place, message, repair);
}

/// `"pump hum x2" (99.5 to 100.5 Hz)`.
fn shown(band: &ReadBand<'_>, line: &Line) -> String {
    let name = band.name.unwrap_or_default();
    let is_numbered = band.extent.is_some_and(|extent| extent.is_numbered());
    let name = if is_numbered { line_name(name, line.harmonic) } else { name.to_owned() };
    format!("{} ({} to {} Hz)", quote(&name), show_hz(line.from_hz), show_hz(line.to_hz))
}

/// The first pair that shares frequencies. A band owns `from <= f < to`, so bands that
/// only touch share none. Both lists rise, so whichever range ends first is done with.
fn first_overlap(left: &[Line], right: &[Line]) -> Option<(Line, Line)> {
    let (mut left, mut right) = (left.iter().peekable(), right.iter().peekable());
    while let (Some(a), Some(b)) = (left.peek(), right.peek()) {
        if a.to_hz <= b.from_hz {
            left.next();
        } else if b.to_hz <= a.from_hz {
            right.next();
        } else {
            return Some((**a, **b));
        }
    }
    None
}
