//! What the bands of a spec ask of a cascade: lines to take out, ranges to keep, and how far
//! a stop may eat into a range that excepts it.

use super::error::AutoError;
use super::margin;
use crate::design::check::CAP_DB;
use crate::design::placement;
use crate::spec::{Band, BeyondHalfRate, Extent, NamedBand, Phase, Requirement, Row, Spec};

/// A stop takes at most this many times the extent of the line it is for out of a keep band
/// that excepts the line: half of what is beyond the line on either side.
pub const MOST_EXTENTS: f64 = 10.0;

/// Most of the gap between two lines that either of them may take.
const MOST_OF_GAP: f64 = 0.25;

/// Most of the gap between a line and the end of the keep band that the line may take.
const MOST_TO_END: f64 = 0.5;

/// What everything but the surroundings of the lines must be kept within where no band is
/// to be kept: half power, dB.
pub const UNSAID_KEEP_DB: f64 = 3.0;

/// A range to take out.
#[derive(Clone, Debug)]
pub struct Line {
    /// Name in reports.
    pub name: String,
    /// Lower end, Hz.
    pub from_hz: f64,
    /// Upper end, Hz.
    pub to_hz: f64,
    /// What is asked for, dB.
    pub reduce_db: f64,
    /// Index of its band in the spec, and its row with its number there, for a line of a row
    /// of two or more.
    pub row: Option<(usize, Row, u32)>,
}

impl Line {
    /// What it must be reduced by, margin included, dB.
    pub fn need_db(&self) -> f64 {
        margin::reduce_need_db(self.reduce_db)
    }

    /// Its width, Hz.
    pub fn extent_hz(&self) -> f64 {
        self.to_hz - self.from_hz
    }

    /// Whether it is there at the rate with this half.
    pub fn fits(&self, half_hz: f64) -> bool {
        if self.row.is_some() { self.to_hz < half_hz } else { self.to_hz <= half_hz * (1.0 + 1e-12) }
    }
}

/// What a keep band leaves to a line that it excepts, at most.
#[derive(Clone, Copy, Debug)]
struct Zone {
    /// The line itself, Hz.
    line: (f64, f64),
    /// How far below and above it, Hz.
    room: (f64, f64),
}

/// A range to keep.
#[derive(Clone, Debug)]
pub struct Keep {
    /// Name in reports.
    pub name: String,
    /// Lower end, Hz.
    pub from_hz: f64,
    /// Upper end, Hz.
    pub to_hz: f64,
    /// What is asked for, dB.
    pub keep_db: f64,
    reach: Reach,
    zones: Vec<Zone>,
}

/// What becomes of a range to keep that reaches beyond half a rate.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Reach {
    /// A band must fit, its end at half the rate included.
    Band,
    /// A line of a row must end below it.
    Row,
    /// Nobody wrote it: it ends at half of any rate.
    Unsaid,
}

impl Keep {
    /// Whether it has exceptions.
    pub fn has_exceptions(&self) -> bool {
        !self.zones.is_empty()
    }

    /// Whether it stands for the keep band that the spec has none of.
    pub fn is_unsaid(&self) -> bool {
        self.reach == Reach::Unsaid
    }

    /// What must be kept where lines take `part` (0 to 1) of what they may take at most, up
    /// to `half_hz`, rising.
    pub fn segments(&self, part: f64, half_hz: f64) -> Vec<(f64, f64)> {
        let end_hz = self.to_hz.min(half_hz);
        let mut from_hz = self.from_hz;
        let mut segments = Vec::new();
        let taken = |zone: &Zone| (zone.line.0 - part * zone.room.0, zone.line.1 + part * zone.room.1);
        let mut taken: Vec<(f64, f64)> = self.zones.iter().map(taken).collect();
        // A wide line may reach below what a narrow one before it takes.
        taken.sort_by(|a, b| a.0.total_cmp(&b.0));
        for (low_hz, high_hz) in taken {
            if low_hz > from_hz {
                segments.push((from_hz, low_hz.min(end_hz)));
            }
            from_hz = from_hz.max(high_hz);
        }
        if end_hz > from_hz {
            segments.push((from_hz, end_hz));
        }
        segments.retain(|segment| segment.0 < segment.1);
        segments
    }

    fn fits(&self, half_hz: f64) -> bool {
        match self.reach {
            Reach::Band => self.to_hz <= half_hz * (1.0 + 1e-12),
            Reach::Row => self.to_hz < half_hz,
            Reach::Unsaid => true,
        }
    }
}

/// All that is asked for.
#[derive(Clone, Debug)]
pub struct Needs {
    /// Sample rates, Hz, rising.
    pub rates_hz: Vec<u32>,
    /// How often the cascade runs.
    pub phase: Phase,
    /// Lines, rising by their lower ends.
    pub lines: Vec<Line>,
    /// Ranges to keep; made up where the spec has none.
    pub keeps: Vec<Keep>,
    /// No edge may lie at or above this, Hz.
    pub highest_edge_hz: f64,
    /// Whether a stage that does not fit at a rate is left out there; else there is no such stage.
    pub leaves_out: bool,
}

impl Needs {
    /// What the bands of `spec` ask for at `rates_hz`.
    ///
    /// # Errors
    /// A band that does not fit; a line in a range to keep that does not except it, or is all of
    /// it; a reduction deeper than attenuations are told.
    pub fn new(spec: &Spec, rates_hz: &[u32]) -> Result<Needs, AutoError> {
        let mut rates_hz = rates_hz.to_vec();
        rates_hz.sort_unstable();
        rates_hz.dedup();
        let bands_only = Spec { stages: Vec::new(), auto: None, ..spec.clone() };
        let mut placed = Vec::new();
        for &rate_hz in &rates_hz {
            placed = placement::place(&bands_only, rate_hz).map_err(|cause| AutoError::Bands(cause.to_string()))?.bands;
        }
        // Those of the highest rate: what fits at a lower one fits there too.
        let mut lines: Vec<Line> = placed.iter().filter_map(|band| line(band, &spec.bands)).collect();
        lines.sort_by(|a, b| a.from_hz.total_cmp(&b.from_hz).then(a.to_hz.total_cmp(&b.to_hz)));
        if let Some(deep) = lines.iter().find(|line| line.need_db() > CAP_DB) {
            return Err(AutoError::TooDeep { line: deep.name.clone(), reduce_db: deep.reduce_db });
        }
        let mut keeps = Vec::new();
        for band in &placed {
            if let Requirement::Keep { keep_db, except } = &band.requirement {
                keeps.push(keep(band, *keep_db, except, &placed)?);
            }
        }
        let (lowest_hz, highest_hz) =
            (rates_hz.first().copied().map_or(0.0, f64::from), rates_hz.last().copied().map_or(0.0, f64::from));
        if keeps.is_empty() {
            keeps.push(unsaid_keep(&lines, highest_hz / 2.0));
        }
        let leaves_out = spec.beyond_half_rate == BeyondHalfRate::LeaveOut;
        let edge_rate_hz = if leaves_out { highest_hz } else { lowest_hz };
        Ok(Needs { rates_hz, phase: spec.phase, lines, keeps, highest_edge_hz: 0.4999 * edge_rate_hz, leaves_out })
    }

    /// Whether no band is to be kept, and everything farther from the lines is instead.
    pub fn keeps_unsaid(&self) -> bool {
        self.keeps.iter().any(Keep::is_unsaid)
    }

    /// Whether a keep band leaves something to a line.
    pub fn has_exceptions(&self) -> bool {
        self.keeps.iter().any(Keep::has_exceptions)
    }

    /// The lines that are there at the rate with this half, by their indices.
    pub fn lines_at(&self, half_hz: f64) -> impl Iterator<Item = (usize, &Line)> {
        self.lines.iter().enumerate().filter(move |(_, line)| line.fits(half_hz))
    }

    /// The ranges to keep at the rate with this half.
    pub fn keeps_at(&self, half_hz: f64) -> impl Iterator<Item = &Keep> {
        self.keeps.iter().filter(move |keep| keep.fits(half_hz))
    }

    /// The lowest rate, Hz.
    pub fn lowest_hz(&self) -> u32 {
        self.rates_hz.first().copied().unwrap_or(0)
    }

    /// Half of the highest rate, Hz.
    pub fn top_hz(&self) -> f64 {
        self.rates_hz.last().copied().map_or(0.0, f64::from) / 2.0
    }

    /// What must be kept by anything, where lines take all that they may: rising and
    /// disjoint, Hz.
    pub fn kept_ranges(&self) -> Vec<(f64, f64)> {
        let mut all: Vec<(f64, f64)> = self.keeps.iter().flat_map(|keep| keep.segments(1.0, self.top_hz())).collect();
        all.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut merged: Vec<(f64, f64)> = Vec::new();
        for (from_hz, to_hz) in all {
            match merged.last_mut() {
                Some(last) if from_hz <= last.1 => last.1 = last.1.max(to_hz),
                _ => merged.push((from_hz, to_hz)),
            }
        }
        merged
    }
}

fn line(band: &NamedBand, bands: &[Band]) -> Option<Line> {
    let row = bands.iter().enumerate().find_map(|(index, all)| match all.extent {
        Extent::Row(row) if band.in_row && all.name == band.base_name => Some((index, row, band.line.harmonic)),
        _ => None,
    });
    Some(Line {
        name: band.name.clone(),
        from_hz: band.line.from_hz,
        to_hz: band.line.to_hz,
        reduce_db: band.requirement.reduce_db()?,
        row,
    })
}

fn keep(band: &NamedBand, keep_db: f64, except: &[String], placed: &[NamedBand]) -> Result<Keep, AutoError> {
    let (from_hz, to_hz) = (band.line.from_hz, band.line.to_hz);
    let inside = placed.iter().filter(|line| line.requirement.reduce_db().is_some());
    let inside = inside.filter(|line| line.line.to_hz > from_hz && line.line.from_hz < to_hz);
    let mut lines = Vec::new();
    for line in inside {
        if !except.iter().any(|name| *name == line.base_name || *name == line.name) {
            return Err(AutoError::Overlap {
                line: line.name.clone(),
                line_hz: (line.line.from_hz, line.line.to_hz),
                keep: band.name.clone(),
                keep_hz: (from_hz, to_hz),
            });
        }
        lines.push((line.line.from_hz, line.line.to_hz));
    }
    if lines.iter().any(|line| line.0 <= from_hz && line.1 >= to_hz) {
        return Err(AutoError::NothingKept { keep: band.name.clone(), keep_hz: (from_hz, to_hz) });
    }
    let zones = zones(&lines, (from_hz, to_hz));
    let reach = if band.in_row { Reach::Row } else { Reach::Band };
    Ok(Keep { name: band.name.clone(), from_hz, to_hz, keep_db, reach, zones })
}

/// How much room each of `lines` has inside a range.
fn zones(lines: &[(f64, f64)], (from_hz, to_hz): (f64, f64)) -> Vec<Zone> {
    let mut lines = lines.to_vec();
    lines.sort_by(|a, b| a.0.total_cmp(&b.0));
    let room = |side_hz: f64, gap_hz: f64, part: f64| side_hz.min(part * gap_hz.max(0.0));
    let one = |index: usize| {
        let line = lines[index];
        let side_hz = 0.5 * (MOST_EXTENTS - 1.0) * (line.1 - line.0);
        let below = match index.checked_sub(1).and_then(|before| lines.get(before)) {
            Some(before) => room(side_hz, line.0 - before.1, MOST_OF_GAP),
            None => room(side_hz, line.0 - from_hz, MOST_TO_END),
        };
        let above = match lines.get(index + 1) {
            Some(after) => room(side_hz, after.0 - line.1, MOST_OF_GAP),
            None => room(side_hz, to_hz - line.1, MOST_TO_END),
        };
        Zone { line, room: (below, above) }
    };
    (0..lines.len()).map(one).collect()
}

/// All but the lines and what is as far from them as their stops may reach.
fn unsaid_keep(lines: &[Line], top_hz: f64) -> Keep {
    let zone = |line: &Line| {
        let side_hz = 0.5 * (MOST_EXTENTS - 1.0) * line.extent_hz();
        Zone { line: (line.from_hz, line.to_hz), room: (side_hz, side_hz) }
    };
    Keep {
        name: "everything else".to_owned(),
        from_hz: 0.0,
        to_hz: top_hz,
        keep_db: UNSAID_KEEP_DB,
        reach: Reach::Unsaid,
        zones: lines.iter().map(zone).collect(),
    }
}
