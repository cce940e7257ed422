//! The gain of a cascade as a chain of points between which it is monotone.
//!
//! Written as a sum over poles and zeros, log |H| can bend only as sharply as its
//! distance to the nearest of them allows. So the grid's step is a tenth of that
//! distance everywhere, and eight times finer where the slope may be passing through
//! zero; every summit and valley between its points is then sought out by golden
//! section. What a summit and a valley inside a single step could still hide is of
//! third order in the step.

use super::{golden, response, roots};
use crate::section::Section;
use core::f64::consts::TAU;

/// Step of the grid over the distance to the nearest pole or zero.
const STEP: f64 = 0.1;

/// Closer to a zero on the unit circle than this part of the distance to its nearest
/// neighbor, that zero alone decides and the gain is monotone.
const OWN_GROUND: f64 = 1e-3;

/// Smallest step, in parts of the sample rate; keeps the number of points finite
/// around double roots that rounding has pulled apart.
const SMALLEST: f64 = 1e-10;

/// Parts into which a step is cut where the slope may change its sign.
const PARTS: u32 = 8;

/// A summit or valley is sought until nothing stands out by more than this, dB.
const FLAT_DB: f64 = 1e-10;

/// A point of the response.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point {
    /// Frequency, Hz.
    pub hz: f64,
    /// Gain, dB; negative infinity at a zero on the unit circle.
    pub gain_db: f64,
}

/// A response from 0 to half the sample rate.
#[derive(Clone, Debug)]
pub struct Profile<'a> {
    sections: &'a [Section],
    rate_hz: f64,
    points: Vec<Point>,
}

impl<'a> Profile<'a> {
    /// Finds the turning points of the response of `sections`. The frequencies in
    /// `marks` (Hz) become points of their own.
    pub fn new(sections: &'a [Section], rate_hz: f64, marks: &[f64]) -> Profile<'a> {
        let mut grid = grid(sections, rate_hz);
        grid.extend(marks.iter().filter(|hz| (0.0..=rate_hz / 2.0).contains(*hz)));
        grid.sort_by(f64::total_cmp);
        grid.dedup();
        let gain_db = |hz: f64| response::gain_db(sections, hz, rate_hz);
        let at = |hz: f64| Point { hz, gain_db: gain_db(hz) };
        let mut grid = subdivided(grid.into_iter().map(at).collect(), at);
        // A zero on the unit circle is infinitely deep, but between two f64 frequencies.
        let zeros = roots::zeros_on_circle(sections).map(|angle| angle / TAU * rate_hz);
        grid.extend(zeros.map(|hz| Point { hz, gain_db: f64::NEG_INFINITY }));
        sort(&mut grid);
        let mut points = grid.clone();
        for three in grid.windows(3) {
            let [before, here, after] = [three[0], three[1], three[2]];
            // There is nothing deeper to find.
            if here.gain_db == f64::NEG_INFINITY {
                continue;
            }
            let (rise, fall) = (here.gain_db - before.gain_db, here.gain_db - after.gain_db);
            let found = if rise >= 0.0 && fall >= 0.0 && rise + fall > 0.0 {
                golden::maximum(before.hz, after.hz, FLAT_DB, gain_db)
            } else if rise <= 0.0 && fall <= 0.0 && rise + fall < 0.0 {
                let (hz, loss_db) = golden::maximum(before.hz, after.hz, FLAT_DB, |hz| -gain_db(hz));
                (hz, -loss_db)
            } else {
                continue;
            };
            points.push(Point { hz: found.0, gain_db: found.1 });
        }
        sort(&mut points);
        Profile { sections, rate_hz, points }
    }

    /// Half the sample rate, Hz.
    pub fn half_rate_hz(&self) -> f64 {
        self.rate_hz / 2.0
    }

    /// Gain at `hz`, dB.
    pub fn gain_db(&self, hz: f64) -> f64 {
        response::gain_db(self.sections, hz, self.rate_hz)
    }

    /// All points, frequencies rising.
    pub fn points(&self) -> &[Point] {
        &self.points
    }

    /// The points from `from_hz` to `to_hz`, both ends among them.
    pub fn within(&self, from_hz: f64, to_hz: f64) -> impl Iterator<Item = Point> {
        let first = self.points.partition_point(|point| point.hz <= from_hz);
        let inner = self.points[first..].iter().copied().take_while(move |point| point.hz < to_hz);
        let end = |hz: f64| Point { hz, gain_db: self.gain_db(hz) };
        let last = (to_hz > from_hz).then(|| end(to_hz));
        [end(from_hz)].into_iter().chain(inner).chain(last)
    }

    /// Upward from `hz`, the end of the range in which `holds` is true of the gain:
    /// the last frequency at which it holds and the first at which it does not, next
    /// to each other. `None` if it holds up to half the rate; `holds` is true at `hz`
    /// and changes at most once where the gain is monotone.
    pub fn end_above(&self, hz: f64, holds: impl Fn(f64) -> bool) -> Option<(f64, f64)> {
        let first = self.points.partition_point(|point| point.hz <= hz);
        self.cross(hz, self.points[first..].iter(), holds)
    }

    /// [`Profile::end_above`], downward to 0 Hz.
    pub fn end_below(&self, hz: f64, holds: impl Fn(f64) -> bool) -> Option<(f64, f64)> {
        let first = self.points.partition_point(|point| point.hz < hz);
        self.cross(hz, self.points[..first].iter().rev(), holds)
    }

    fn cross<'p>(
        &self,
        from_hz: f64,
        mut points: impl Iterator<Item = &'p Point>,
        holds: impl Fn(f64) -> bool,
    ) -> Option<(f64, f64)> {
        let mut inside = from_hz;
        let mut outside = points.find_map(|point| {
            if holds(point.gain_db) {
                inside = point.hz;
                None
            } else {
                Some(point.hz)
            }
        })?;
        loop {
            let middle = 0.5 * (inside + outside);
            if middle == inside || middle == outside {
                return Some((inside, outside));
            }
            if holds(self.gain_db(middle)) { inside = middle } else { outside = middle }
        }
    }
}

/// By frequency, each once; of two values at one frequency the lower stays.
fn sort(points: &mut Vec<Point>) {
    points.sort_by(|a, b| a.hz.total_cmp(&b.hz).then(a.gain_db.total_cmp(&b.gain_db)));
    points.dedup_by(|later, earlier| later.hz == earlier.hz);
}

/// Cuts the steps in which the slope may pass through zero: where the gain moves by
/// less than half of what its neighboring steps differ from it.
///
/// A summit and a valley in one step s make f' = k((x - a)^2 - b^2) there: the gain
/// moves by at most k s^3/3, while one of the neighbors differs by at least k s^3.
fn subdivided(points: Vec<Point>, at: impl Fn(f64) -> Point) -> Vec<Point> {
    let move_db = |i: usize| points[i + 1].gain_db - points[i].gain_db;
    let steps = points.len() - 1;
    let mut finer = Vec::with_capacity(points.len());
    for i in 0..steps {
        finer.push(points[i]);
        let here = move_db(i);
        let differs = |other: usize| here.abs() < 0.5 * (move_db(other) - here).abs();
        if (i > 0 && differs(i - 1)) || (i + 1 < steps && differs(i + 1)) {
            let part_hz = (points[i + 1].hz - points[i].hz) / f64::from(PARTS);
            finer.extend((1..PARTS).map(|part| at(points[i].hz + f64::from(part) * part_hz)));
        }
    }
    finer.extend(points.last());
    finer
}

/// Frequencies from 0 to half the rate, as dense as the poles and zeros ask for.
fn grid(sections: &[Section], rate_hz: f64) -> Vec<f64> {
    let hz_a_radian = rate_hz / TAU;
    let half_rate_hz = rate_hz / 2.0;
    let places: Vec<(f64, f64)> = roots::poles(sections)
        .chain(roots::zeros(sections))
        .map(|root| (root.angle * hz_a_radian, root.depth.abs() * hz_a_radian))
        .collect();
    // (frequency, sharpness) of each landmark.
    let landmarks: Vec<(f64, f64)> = places
        .iter()
        .map(|&(hz, depth_hz)| {
            let distance =
                |&(other_hz, other_depth_hz): &(f64, f64)| libm::hypot(other_hz - hz, other_depth_hz - depth_hz);
            // Its own images below 0 Hz and above half the rate are neighbors too.
            let images = [2.0 * hz, 2.0 * (half_rate_hz - hz)];
            let distances = places.iter().map(distance).chain(images);
            let neighbor = distances.filter(|&distance| distance > 0.0).fold(half_rate_hz, f64::min);
            (hz, depth_hz.max(OWN_GROUND * neighbor).max(SMALLEST * rate_hz))
        })
        .collect();
    let mut grid = vec![0.0];
    let mut hz = 0.0;
    loop {
        // Compared as squares: a root a landmark would be most of the time spent here.
        let nearest = landmarks
            .iter()
            .map(|&(at_hz, sharpness_hz)| (hz - at_hz) * (hz - at_hz) + sharpness_hz * sharpness_hz)
            .fold(half_rate_hz * half_rate_hz, f64::min);
        hz += STEP * nearest.sqrt();
        if hz >= half_rate_hz {
            grid.push(half_rate_hz);
            return grid;
        }
        grid.push(hz);
    }
}
