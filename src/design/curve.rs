//! The response as a table for plots.
//!
//! Rows are as dense as the gain bends: between two of them it is a straight line within
//! [`TOLERANCE_DB`], wherever it is above [`DEEP_DB`]. The edges of stages, bands and
//! exceptions, the frequencies of poles and zeros, 0 Hz and half the rate have rows of
//! their own. Where limits change there are two rows at the same frequency: the first
//! with the limits below it, the second with those above.

use super::check::CAP_DB;
use super::{Design, response, roots};
use crate::section::Section;
use crate::spec::Requirement;
use core::f64::consts::TAU;

/// Distance of the gain from a straight line between two rows, dB.
pub const TOLERANCE_DB: f64 = 0.01;

/// Below this, dB, the gain is not followed to [`TOLERANCE_DB`]: towards a zero on the
/// unit circle it falls without end.
pub const DEEP_DB: f64 = -100.0;

/// Most rows of one table; a cascade that asks for more gets a multiple of
/// [`TOLERANCE_DB`].
pub const MOST_ROWS: usize = 100_000;

/// What the tolerance is multiplied by while there are too many rows.
const COARSER: f64 = 4.0;

/// Rows a factor of ten that there are at least, from a ten-thousandth of half the rate.
const ROWS_A_DECADE: u32 = 40;

/// Narrowest step, in parts of the sample rate.
const SMALLEST: f64 = 1e-12;

/// The net response at one frequency and the limits around it.
#[derive(Clone, Debug, PartialEq)]
pub struct Row<'a> {
    /// Frequency, Hz.
    pub frequency_hz: f64,
    /// Gain before any output gain, dB; not below -[`CAP_DB`].
    pub gain_db: f64,
    /// Phase, degrees, continuous but for half a turn at each zero on the unit circle, and 0
    /// at 0 Hz for a positive gain; `None` at such a zero. 0 for forward and backward.
    pub phase_deg: Option<f64>,
    /// Group delay, seconds. 0 for forward and backward.
    pub group_delay_s: f64,
    /// Lowest gain that the bands allow here, dB.
    pub limit_low_db: Option<f64>,
    /// Highest gain that the bands allow here, dB.
    pub limit_high_db: Option<f64>,
    /// The bands that lie here, but for keep bands in their exceptions.
    pub bands: Vec<&'a str>,
}

/// The rows of `design`, frequencies rising from 0 Hz to half the rate.
pub fn curve(design: &Design) -> Vec<Row<'_>> {
    let response = Response::new(design);
    let points = response.points();
    let zone = |pair: &[Point]| Zone::at(design, 0.5 * (pair[0].hz + pair[1].hz));
    let zones: Vec<Zone<'_>> = points.windows(2).map(zone).collect();
    let mut rows = Vec::with_capacity(points.len());
    for (i, &point) in points.iter().enumerate() {
        let below = i.checked_sub(1).and_then(|below| zones.get(below));
        let above = zones.get(i).filter(|above| Some(*above) != below);
        rows.extend(below.into_iter().chain(above).map(|zone| response.row(point, zone)));
    }
    rows
}

/// Limits between two rows.
#[derive(Clone, Debug, PartialEq)]
struct Zone<'a> {
    low_db: Option<f64>,
    high_db: Option<f64>,
    bands: Vec<&'a str>,
}

impl Zone<'_> {
    fn at(design: &Design, hz: f64) -> Zone<'_> {
        let mut zone = Zone { low_db: None, high_db: None, bands: Vec::new() };
        let inside = |from_hz: f64, to_hz: f64| (from_hz..=to_hz).contains(&hz);
        for band in &design.bands {
            let line = band.band.line;
            let excepted = band.excepted_hz.iter().any(|&(from_hz, to_hz)| inside(from_hz, to_hz));
            if !inside(line.from_hz, line.to_hz) || excepted {
                continue;
            }
            zone.bands.push(&band.band.name);
            let (low_db, high_db) = match band.band.requirement {
                Requirement::Keep { keep_db, .. } => (Some(-keep_db), Some(keep_db)),
                Requirement::Reduce { reduce_db } => (None, Some(-reduce_db)),
                // What a level asks of the gain depends on the recording.
                Requirement::Residual { .. } | Requirement::Observe => (None, None),
            };
            zone.low_db = [zone.low_db, low_db].into_iter().flatten().reduce(f64::max);
            zone.high_db = [zone.high_db, high_db].into_iter().flatten().reduce(f64::min);
        }
        zone
    }
}

#[derive(Clone, Copy, Debug, PartialEq)]
struct Point {
    hz: f64,
    gain_db: f64,
    /// Whether it is a zero on the unit circle.
    zero: bool,
}

struct Response<'a> {
    design: &'a Design,
    net: Vec<Section>,
    rate_hz: f64,
}

impl Response<'_> {
    fn new(design: &Design) -> Response<'_> {
        Response { design, net: design.net_sections(), rate_hz: f64::from(design.rate_hz) }
    }

    fn at(&self, hz: f64) -> Point {
        let gain_db = response::gain_db(&self.net, hz, self.rate_hz);
        Point { hz, gain_db: gain_db.clamp(-CAP_DB, CAP_DB), zero: gain_db == f64::NEG_INFINITY }
    }

    fn row<'b>(&self, point: Point, zone: &Zone<'b>) -> Row<'b> {
        let both_ways = self.design.passes == 2;
        let turned = || response::phase_rad(&self.design.sections, point.hz, self.rate_hz).to_degrees();
        let phase_deg = if both_ways { 0.0 } else { turned() };
        let delay = || response::group_delay_s(&self.design.sections, point.hz, self.rate_hz);
        Row {
            frequency_hz: point.hz,
            gain_db: point.gain_db,
            phase_deg: Some(phase_deg).filter(|deg| !point.zero && deg.is_finite()),
            group_delay_s: if both_ways { 0.0 } else { delay() },
            limit_low_db: zone.low_db,
            limit_high_db: zone.high_db,
            bands: zone.bands.clone(),
        }
    }

    fn points(&self) -> Vec<Point> {
        let marks = self.marks();
        let mut tolerance_db = TOLERANCE_DB;
        loop {
            if let Some(points) = self.followed(&marks, tolerance_db) {
                return points;
            }
            tolerance_db *= COARSER;
        }
    }

    /// Where there is a row in any case, rising.
    fn marks(&self) -> Vec<Point> {
        let half_hz = self.rate_hz / 2.0;
        let in_hz = |angle: f64| angle / TAU * self.rate_hz;
        let sections = &self.design.sections;
        let mut marks = vec![0.0, half_hz];
        marks.extend((0..4 * ROWS_A_DECADE).map(|i| half_hz * libm::exp10(-f64::from(i) / f64::from(ROWS_A_DECADE))));
        let on_circle = |section: &Section| roots::zeros_on_circle(core::slice::from_ref(section)).next().is_some();
        let elsewhere: Vec<Section> = sections.iter().copied().filter(|section| !on_circle(section)).collect();
        marks.extend(roots::poles(sections).chain(roots::zeros(&elsewhere)).map(|root| in_hz(root.angle)));
        marks.extend(self.design.stages.iter().flat_map(|stage| &stage.placed.edges_hz));
        for band in &self.design.bands {
            let excepted = band.excepted_hz.iter().flat_map(|&(from_hz, to_hz)| [from_hz, to_hz]);
            marks.extend(excepted.chain([band.band.line.from_hz, band.band.line.to_hz]));
        }
        marks.retain(|hz| (0.0..=half_hz).contains(hz));
        let mut points: Vec<Point> = marks.into_iter().map(|hz| self.at(hz)).collect();
        // Between two f64 there may be a zero.
        let zeros = roots::zeros_on_circle(sections).map(in_hz);
        points.extend(zeros.map(|hz| Point { hz, gain_db: -CAP_DB, zero: true }));
        points.sort_by(|a, b| a.hz.total_cmp(&b.hz).then(a.gain_db.total_cmp(&b.gain_db)));
        points.dedup_by(|later, earlier| {
            let same = later.hz == earlier.hz;
            earlier.zero |= same && later.zero;
            same
        });
        points
    }

    /// `marks` and, between them, as many points as it takes; `None` for more than
    /// [`MOST_ROWS`].
    fn followed(&self, marks: &[Point], tolerance_db: f64) -> Option<Vec<Point>> {
        let mut points = Vec::with_capacity(marks.len());
        // The next step is the last of these.
        let mut steps: Vec<(Point, Point)> = marks.windows(2).rev().map(|pair| (pair[0], pair[1])).collect();
        while let Some((from, to)) = steps.pop() {
            // Half of it: between the quarters the line may be farther off.
            let middle =
                (to.hz - from.hz > SMALLEST * self.rate_hz).then(|| self.bent(from, to, 0.5 * tolerance_db)).flatten();
            match middle {
                Some(middle) => steps.extend([(middle, to), (from, middle)]),
                None => points.push(from),
            }
            if points.len() + steps.len() > MOST_ROWS / 2 && tolerance_db < CAP_DB {
                return None;
            }
        }
        points.extend(marks.last());
        Some(points)
    }

    /// The point in the middle of a step, where the gain at a quarter, the middle or three
    /// quarters is off a straight line by more than `tolerance_db`.
    fn bent(&self, from: Point, to: Point, tolerance_db: f64) -> Option<Point> {
        let within = |part: f64| self.at(from.hz + part * (to.hz - from.hz));
        let middle = within(0.5);
        // Between an end above and a point below there is some of it to be followed as well.
        let followed = from.gain_db.max(to.gain_db) > DEEP_DB;
        let off = |part: f64, point: Point| {
            let line_db = from.gain_db + part * (to.gain_db - from.gain_db);
            (followed || point.gain_db > DEEP_DB) && (point.gain_db - line_db).abs() > tolerance_db
        };
        (off(0.5, middle) || off(0.25, within(0.25)) || off(0.75, within(0.75))).then_some(middle)
    }
}
