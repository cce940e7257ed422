//! Where the search begins: stages whose figures are about right.

use super::needs::Needs;
use super::slot::{Lines, Parameter, Shape, Slot, is_whole_row};
use crate::design::prototype;
use crate::design::transform::prewarp;
use crate::spec::{Family, Row, Width};
use core::f64::consts::LN_10;

/// Least and largest ripple that is looked at, dB.
const RIPPLE_DB: (f64, f64) = (1e-5, 3.0);
/// Largest stop attenuation, dB.
const MOST_STOP_DB: f64 = 200.0;
/// Least stop attenuation of one pass, dB: above half power.
const LEAST_STOP_DB: f64 = 3.2;

/// The room around the lines of a stage: where what must be kept ends below and begins above
/// them, Hz.
pub type Room = (Option<f64>, Option<f64>);

/// How a steep stop is aimed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Aim {
    /// As deep as it can be where the nearest line begins.
    Nearest,
    /// As deep as the deepest line asks.
    Deepest,
}

/// What all stages are begun with.
pub struct Starts<'n> {
    needs: &'n Needs,
    /// Family of all but notches.
    pub family: Family,
    /// Ripple of each stage, dB.
    ripple_db: f64,
}

impl<'n> Starts<'n> {
    /// Stages that each take `share` of what the strictest keep band may lose.
    pub fn new(needs: &'n Needs, family: Family, share: f64) -> Starts<'n> {
        let strictest_db = needs.keeps.iter().map(|keep| super::margin::keep_limit_db(keep.keep_db));
        let ripple_db = (strictest_db.fold(RIPPLE_DB.1, f64::min) * share).max(RIPPLE_DB.0);
        Starts { needs, family, ripple_db }
    }

    /// Whether a line reaches 0 Hz or half a rate, where no stop can go beyond it.
    pub fn reaches_end(&self, line: usize) -> bool {
        self.needs.lines.get(line).is_none_or(|line| line.from_hz <= 0.0 || line.to_hz >= self.needs.highest_edge_hz)
    }

    fn deepest_db(&self, targets: &[usize]) -> f64 {
        targets.iter().filter_map(|index| self.needs.lines.get(*index)).map(|line| line.need_db()).fold(1.0, f64::max)
    }

    fn extent(&self, targets: &[usize]) -> (f64, f64) {
        let lines = targets.iter().filter_map(|index| self.needs.lines.get(*index));
        lines.fold((f64::INFINITY, 0.0), |(from, to), line| (line.from_hz.min(from), line.to_hz.max(to)))
    }

    /// Relative width at which a Butterworth of this order has lost no more than the ripple
    /// where what is kept begins.
    fn flat(&self, order: u32) -> f64 {
        let epsilon_square = libm::expm1(self.ripple_db * LN_10 / 10.0);
        libm::exp(libm::log(epsilon_square) / f64::from(2 * order))
    }

    /// The largest stop attenuation with which a stage is that deep at `w` times its edge.
    fn depth_db(&self, order: u32, w: f64) -> f64 {
        let holds = |stop_db: f64| {
            let made = prototype::approximate(Family::Elliptic, order, Some(self.ripple_db), Some(stop_db));
            let edge = made.ok().and_then(|made| made.zeros_rad.iter().copied().reduce(f64::min));
            // The stop band begins a little before the first zero.
            edge.is_some_and(|first_zero| first_zero <= w)
        };
        let (mut low, mut high) = (LEAST_STOP_DB, MOST_STOP_DB);
        for _ in 0..24 {
            let middle = 0.5 * (low + high);
            if holds(middle) { low = middle } else { high = middle }
        }
        low
    }

    fn decibels(&self, order: u32, aim: Aim, w: f64, targets: &[usize]) -> Vec<Parameter> {
        let passes = f64::from(self.needs.phase.passes());
        let mut decibels = Vec::new();
        if self.family.takes_ripple() {
            decibels.push(Parameter::logarithmic(self.ripple_db, RIPPLE_DB));
        }
        if self.family.takes_stop() {
            let deepest_db = self.deepest_db(targets) + 1.0;
            let stop_db = match aim {
                Aim::Nearest if self.family == Family::Elliptic && w > 1.0 => passes * self.depth_db(order, w),
                _ => deepest_db,
            };
            decibels.push(Parameter::linear(stop_db, 8.0, (LEAST_STOP_DB * passes, MOST_STOP_DB)));
        }
        decibels
    }

    /// A high-pass (lines below `room`) or low-pass (above) for `targets`.
    pub fn edge(&self, shape: Shape, order: u32, targets: &[usize], room: Room, aim: Aim) -> Slot {
        let (from_hz, to_hz) = self.extent(targets);
        let top_hz = self.needs.highest_edge_hz;
        let rate_hz = 2.0 * self.needs.top_hz();
        let warped = |hz: f64| prewarp(hz.clamp(1e-9 * rate_hz, 0.499_9 * rate_hz), rate_hz);
        let flat = self.flat(order);
        let (pass_hz, stop_hz) = match shape {
            Shape::Highpass => (room.1.unwrap_or(1.5 * to_hz).min(top_hz), to_hz),
            _ => (room.0.unwrap_or(from_hz / 1.5), from_hz),
        };
        let w = match shape {
            Shape::Highpass => warped(pass_hz) / warped(stop_hz),
            _ => warped(stop_hz) / warped(pass_hz),
        };
        let edge_hz = match (self.family, shape) {
            (Family::Butterworth | Family::Bessel, Shape::Highpass) => pass_hz * flat,
            (Family::Butterworth | Family::Bessel, _) => pass_hz / flat,
            (Family::Chebyshev2, _) => stop_hz,
            (Family::Chebyshev1 | Family::Elliptic, _) => pass_hz,
        };
        let unit_hz = (pass_hz - stop_hz).abs().max(1e-4 * pass_hz);
        let range = match shape {
            Shape::Highpass => (1e-3 * pass_hz, (2.0 * pass_hz).min(top_hz)),
            _ => ((0.5 * pass_hz).min(0.5 * top_hz), top_hz),
        };
        let mut parameters = vec![Parameter::linear(edge_hz, unit_hz, range)];
        parameters.extend(self.decibels(order, aim, w, targets));
        Slot { shape, family: self.family, order, lines: Lines::Own, parameters, targets: targets.to_vec() }
    }

    /// A band-stop over all of `targets`.
    pub fn stop(&self, order: u32, targets: &[usize], room: Room, aim: Aim) -> Slot {
        let (from_hz, to_hz) = self.extent(targets);
        let extent_hz = to_hz - from_hz;
        let top_hz = self.needs.highest_edge_hz;
        let sides = (room.0.map(|end_hz| from_hz - end_hz), room.1.map(|begin_hz| begin_hz - to_hz));
        let widest_hz = 8.0 * extent_hz;
        let below_hz = sides.0.or(sides.1).unwrap_or(extent_hz).min(widest_hz).min(0.9 * from_hz).max(1e-6 * to_hz);
        let above_hz = sides.1.or(sides.0).unwrap_or(extent_hz).min(widest_hz).max(1e-6 * to_hz);
        let (low_hz, high_hz) = (from_hz - below_hz, (to_hz + above_hz).min(top_hz));
        let edges_hz = match self.family {
            Family::Butterworth | Family::Bessel => narrowed(low_hz, high_hz, self.flat(order)),
            Family::Chebyshev2 => (from_hz, to_hz),
            Family::Chebyshev1 | Family::Elliptic => (low_hz, high_hz),
        };
        let middle_hz = 0.5 * (from_hz + to_hz);
        let parted_hz = 1e-3 * extent_hz;
        let mut parameters = vec![
            Parameter::linear(edges_hz.0, below_hz, (1e-3 * from_hz, middle_hz - parted_hz)),
            Parameter::linear(edges_hz.1, above_hz, (middle_hz + parted_hz, top_hz.max(middle_hz + parted_hz))),
        ];
        let w = self.stop_w((low_hz, high_hz), (from_hz, to_hz));
        parameters.extend(self.decibels(order, aim, w, targets));
        Slot {
            shape: Shape::Stop,
            family: self.family,
            order,
            lines: Lines::Own,
            parameters,
            targets: targets.to_vec(),
        }
    }

    /// Where the ends of a line lie beyond the edges of a stop, over the prototype's edge.
    fn stop_w(&self, edges_hz: (f64, f64), line_hz: (f64, f64)) -> f64 {
        let rate_hz = 2.0 * self.needs.top_hz();
        let warped = |hz: f64| prewarp(hz.clamp(1e-9 * rate_hz, 0.499_9 * rate_hz), rate_hz);
        let (low, high) = (warped(edges_hz.0), warped(edges_hz.1));
        let w = |hz: f64| ((high - low) * warped(hz) / (low * high - warped(hz) * warped(hz))).abs();
        w(line_hz.0).min(w(line_hz.1))
    }

    /// `count` notches for one line, side by side.
    pub fn notches(&self, count: u32, target: usize) -> Vec<Slot> {
        let (from_hz, to_hz) = self.extent(&[target]);
        let (extent_hz, middle_hz) = (to_hz - from_hz, 0.5 * (from_hz + to_hz));
        let top_hz = self.needs.highest_edge_hz;
        let depth_db = self.deepest_db(&[target]) / f64::from(count);
        let width_hz = extent_hz * libm::sqrt(libm::expm1(depth_db * LN_10 / 10.0)) / f64::from(count);
        let widest_hz = (1.98 * from_hz).min(2.0 * (top_hz - to_hz)).max(1e-3 * extent_hz);
        (0..count)
            .map(|index| {
                let place = (f64::from(index) + 0.5) / f64::from(count);
                let center_hz = middle_hz + 0.7 * (2.0 * place - 1.0) * 0.5 * extent_hz;
                Slot {
                    shape: Shape::Notch,
                    family: self.family,
                    order: 1,
                    lines: Lines::Own,
                    parameters: vec![
                        Parameter::linear(center_hz, 0.5 * extent_hz, (from_hz, to_hz)),
                        Parameter::logarithmic(width_hz, (1e-3 * extent_hz, widest_hz)),
                    ],
                    targets: vec![target],
                }
            })
            .collect()
    }

    /// Stops of one order, or notches (order 1), for lines of a row, all of one width;
    /// `rooms` belong to `targets`.
    pub fn row(&self, order: u32, row: &Row, harmonics: &[u32], targets: &[usize], rooms: &[Room]) -> Option<Slot> {
        let last = f64::from(*harmonics.last()?);
        let lines = targets.iter().filter_map(|index| self.needs.lines.get(*index));
        let side = |line: &super::needs::Line, room: &Room| {
            let below_hz = room.0.map_or(f64::INFINITY, |end_hz| line.from_hz - end_hz);
            let above_hz = room.1.map_or(f64::INFINITY, |begin_hz| begin_hz - line.to_hz);
            let extent_hz = line.to_hz - line.from_hz;
            (extent_hz, below_hz.min(above_hz).min(8.0 * extent_hz))
        };
        let (extent_hz, side_hz) = lines
            .zip(rooms)
            .map(|(line, room)| side(line, room))
            .reduce(|a, b| if b.1 / b.0 < a.1 / a.0 { b } else { a })?;
        let grown = if order == 1 {
            libm::sqrt(libm::expm1(self.deepest_db(targets) * LN_10 / 10.0))
        } else {
            let pass = 1.0 + 2.0 * side_hz / extent_hz;
            match self.family {
                Family::Butterworth | Family::Bessel => pass * self.flat(order),
                Family::Chebyshev2 => 1.0,
                Family::Chebyshev1 | Family::Elliptic => pass,
            }
        };
        // Lines of a whole row are left out where they do not fit, those written one by one are not.
        let top_hz = if is_whole_row(harmonics) { self.needs.top_hz() } else { self.needs.highest_edge_hz };
        let width = match row.width {
            Width::Hz(hz) => {
                let widest_hz = (0.98 * row.center_hz).min(1.99 * (top_hz - last * row.center_hz)).max(hz * 1e-3);
                Parameter::logarithmic(hz * grown, (hz * 1e-3, widest_hz))
            }
            Width::Q(q) => {
                let below_half = 0.5 * last * row.center_hz / (top_hz - last * row.center_hz);
                let least = (last - 0.49).max(0.51).max(1.01 * below_half).min(q * 1e3);
                Parameter::logarithmic(q / grown, (least, q * 1e3))
            }
        };
        let mut parameters = vec![width];
        let shape = if order == 1 { Shape::Notch } else { Shape::Stop };
        if shape == Shape::Stop {
            parameters.extend(self.decibels(order, Aim::Nearest, 1.0 + 2.0 * side_hz / extent_hz, targets));
        }
        let lines = Lines::Row { row: *row, harmonics: harmonics.to_vec() };
        Some(Slot { shape, family: self.family, order, lines, parameters, targets: targets.to_vec() })
    }

    /// The same place with this family: its figures begun anew.
    pub fn again(&self, slot: &Slot, rooms: &[Room]) -> Option<Slot> {
        let room = (rooms.first()?.0, rooms.last()?.1);
        match (slot.shape, &slot.lines) {
            (Shape::Notch, _) => None,
            (Shape::Stop, Lines::Row { row, harmonics }) => self.row(slot.order, row, harmonics, &slot.targets, rooms),
            (Shape::Stop, Lines::Own) => Some(self.stop(slot.order, &slot.targets, room, Aim::Deepest)),
            (shape, _) => Some(self.edge(shape, slot.order, &slot.targets, room, Aim::Deepest)),
        }
    }
}

/// Edges around the same geometric middle, `part` as far apart.
fn narrowed(low_hz: f64, high_hz: f64, part: f64) -> (f64, f64) {
    let half_hz = 0.5 * part * (high_hz - low_hz);
    let middle_hz = libm::sqrt(low_hz * high_hz + half_hz * half_hz);
    (middle_hz - half_hz, middle_hz + half_hz)
}
