//! Blocks of samples made ready for writing, and what was seen on the way.

use super::dither::Dither;
use crate::wave::{Encoding, SampleFormat, UlpPower, rounding_power};

/// How samples are made ready for writing.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OutputPlan {
    /// Format they are written in.
    pub format: SampleFormat,
    /// Whether triangular dither is added before rounding (integer formats only).
    pub dither: bool,
    /// Linear gain applied first, finite.
    pub gain: f64,
    /// The samples are those of an input in the same format, unchanged: they pass as
    /// they are, bits below the valid ones included, and only peaks are taken. Gain
    /// and dither are then not looked at.
    pub identity: bool,
}

/// What [`Output`] saw.
#[derive(Clone, Debug, PartialEq)]
pub struct OutputFigures {
    /// Largest absolute sample after gain and before dither, rounding and saturation.
    /// Infinite if the filter overflowed.
    pub peak: f64,
    /// Largest absolute value as written.
    pub written_peak: f64,
    /// Samples whose value before dither does not fit the format and was saturated:
    /// rounded, it lies outside -2^(n-1) to 2^(n-1) - 1 steps, or beyond the largest
    /// finite `f32`. Dither alone never counts.
    pub clipped_samples: u64,
    /// Mean square of the rounding error and dither, per channel, full scale 1.0:
    /// step^2/12, three times that with dither; for float32 from the samples' own
    /// steps; 0 for float64. For the identity what the input's samples carry.
    pub rounding_power: Vec<f64>,
}

/// Turns blocks of filtered samples into the values that are written.
#[derive(Debug)]
pub struct Output {
    plan: OutputPlan,
    channels: Vec<Channel>,
}

#[derive(Debug)]
struct Channel {
    dither: Dither,
    seen: Seen,
    ulp: UlpPower,
}

/// Lanes in which extremes are tracked: independent, so that they vectorize.
const LANES: usize = 8;

#[derive(Clone, Copy, Debug, Default)]
struct Seen {
    peak: [f64; LANES],
    written: [f64; LANES],
    clipped: [u64; LANES],
}

impl Seen {
    /// Takes note of one sample before (`value`) and after (`written`). NaN raises no
    /// peak; the writer refuses it.
    #[inline(always)]
    fn note(&mut self, lane: usize, value: f64, written: f64, clipped: bool) {
        let (value, written) = (value.abs(), written.abs());
        self.peak[lane] = if value > self.peak[lane] { value } else { self.peak[lane] };
        self.written[lane] = if written > self.written[lane] { written } else { self.written[lane] };
        self.clipped[lane] += u64::from(clipped);
    }
}

/// Rounds to the nearest integer, half to even: adding 1.5 * 2^52 leaves no bits for
/// the fraction. Right for |x| up to 2^51; beyond, the result is off by less than
/// 1 part in 2^51, and saturated anyway.
#[inline(always)]
fn round(x: f64) -> f64 {
    const SHIFT: f64 = 1.5 * 4_503_599_627_370_496.0;
    (x + SHIFT) - SHIFT
}

/// The grid of an integer format.
#[derive(Clone, Copy)]
struct Grid {
    steps: f64,
    step: f64,
    low: f64,
    high: f64,
}

impl Grid {
    fn new(format: SampleFormat) -> Self {
        let step = format.step();
        let steps = 1.0 / step;
        Grid { steps, step, low: -steps, high: steps - 1.0 }
    }

    /// `value` rounded with `dither` steps added, and whether it did not fit without.
    #[inline(always)]
    fn shape(self, value: f64, dither: f64) -> (f64, bool) {
        let exact = value * self.steps;
        let plain = round(exact);
        let clipped = plain < self.low || plain > self.high;
        let rounded = round(exact + dither);
        let rounded = if rounded < self.low { self.low } else { rounded };
        let rounded = if rounded > self.high { self.high } else { rounded };
        (rounded * self.step, clipped)
    }
}

/// Applies `shape` (value to value as written, and whether it was saturated) to a
/// plane, [`LANES`] samples at a time.
#[inline(always)]
fn each(plane: &mut [f64], seen: &mut Seen, gain: f64, mut shape: impl FnMut(f64) -> (f64, bool)) {
    let (blocks, tail) = plane.as_chunks_mut::<LANES>();
    let mut local = *seen;
    for block in blocks {
        for (lane, sample) in block.iter_mut().enumerate() {
            let value = *sample * gain;
            let (written, clipped) = shape(value);
            local.note(lane, value, written, clipped);
            *sample = written;
        }
    }
    for (lane, sample) in tail.iter_mut().enumerate() {
        let value = *sample * gain;
        let (written, clipped) = shape(value);
        local.note(lane, value, written, clipped);
        *sample = written;
    }
    *seen = local;
}

impl Output {
    /// Starts at frame 0 of a recording with `channels` channels.
    pub fn new(plan: OutputPlan, channels: usize) -> Self {
        let channel = |c| Channel { dither: Dither::new(c), seen: Seen::default(), ulp: UlpPower::default() };
        Output { plan, channels: (0..channels).map(channel).collect() }
    }

    /// Replaces each sample of a planar block by the value that is written: after
    /// gain, dither, rounding and saturation, full scale 1.0. Integer formats come
    /// out as exact multiples of their step, float32 as exact `f32` values, float64 as
    /// they are. Values beyond the largest finite `f32` are saturated there and
    /// counted as clipped: infinity is never written. NaN stays NaN, which
    /// [`crate::wave::Writer`] refuses with its place.
    ///
    /// The result does not depend on how the recording is cut into blocks. Planes
    /// beyond the number of channels are left alone.
    pub fn shape(&mut self, planes: &mut [Vec<f64>]) {
        let plan = self.plan;
        for (plane, channel) in planes.iter_mut().zip(&mut self.channels) {
            if plan.identity {
                each(plane, &mut channel.seen, 1.0, |value| (value, false));
            } else {
                channel.shape(plane, plan);
            }
            if plan.format.encoding == Encoding::Float32 {
                channel.ulp.add(plane);
            }
        }
    }

    /// Figures over all blocks so far.
    pub fn figures(&self) -> OutputFigures {
        let max = |get: fn(&Seen) -> [f64; LANES]| {
            self.channels
                .iter()
                .flat_map(|c| get(&c.seen))
                .fold(0.0, |max, value| if value > max { value } else { max })
        };
        let integer = !self.plan.format.encoding.is_float();
        let times = if integer && self.plan.dither && !self.plan.identity { 3.0 } else { 1.0 };
        OutputFigures {
            peak: max(|seen| seen.peak),
            written_peak: max(|seen| seen.written),
            clipped_samples: self.channels.iter().flat_map(|c| c.seen.clipped).sum(),
            rounding_power: self.channels.iter().map(|c| times * rounding_power(self.plan.format, &c.ulp)).collect(),
        }
    }
}

impl Channel {
    fn shape(&mut self, plane: &mut [f64], plan: OutputPlan) {
        match plan.format.encoding {
            Encoding::Float64 => each(plane, &mut self.seen, plan.gain, |value| (value, false)),
            Encoding::Float32 => each(plane, &mut self.seen, plan.gain, |value| {
                let max = f64::from(f32::MAX);
                let rounded = f64::from(value as f32);
                // `as` rounds to infinity from half a step beyond the largest value.
                let clipped = rounded.abs() > max;
                (if clipped { max.copysign(value) } else { rounded }, clipped)
            }),
            _ if plan.dither => {
                let grid = Grid::new(plan.format);
                let mut dither = self.dither;
                each(plane, &mut self.seen, plan.gain, |value| grid.shape(value, dither.next()));
                self.dither = dither;
            }
            _ => {
                let grid = Grid::new(plan.format);
                each(plane, &mut self.seen, plan.gain, |value| grid.shape(value, 0.0));
            }
        }
    }
}
