//! What the samples themselves tell while they pass: runs at full scale, and the
//! power of the rounding they carry.

use super::{Encoding, SampleFormat};

/// Counts runs of two or more samples in a row at full scale in one channel.
///
/// Full scale is the largest magnitude both signs reach, 1 - step for integers, so
/// that a converter or program that stops at the symmetric value is seen too; 1.0
/// for floats. Signs may change within a run.
#[derive(Clone, Debug)]
pub(crate) struct FullScale {
    threshold: f64,
    /// Whether the last sample, and the one before it, were at full scale.
    last: bool,
    before: bool,
    pub(crate) runs: u64,
}

impl FullScale {
    pub(crate) fn new(format: SampleFormat) -> Self {
        // With one valid bit, 1 - step would be 0: silence.
        FullScale { threshold: (1.0 - format.step()).max(0.5), last: false, before: false, runs: 0 }
    }

    pub(crate) fn add(&mut self, values: &[f64]) {
        let threshold = self.threshold;
        // Most blocks hold none: a count vectorizes, the walk below does not.
        let hits: u64 = values.iter().map(|v| u64::from(v.abs() >= threshold)).sum();
        if hits == 0 {
            if !values.is_empty() {
                (self.last, self.before) = (false, false);
            }
            return;
        }
        for value in values {
            let hit = value.abs() >= threshold;
            self.runs += u64::from(hit && self.last && !self.before);
            self.before = self.last;
            self.last = hit;
        }
    }
}

const LANES: usize = 8;

/// Mean square of the rounding error of `f32` samples: the mean of ulp^2/12, ulp
/// the spacing of `f32` at the sample.
#[derive(Clone, Debug, Default)]
pub(crate) struct UlpPower {
    /// Sums of ulp^2 by frame number modulo [`LANES`], so that the result does not
    /// depend on how the recording was cut into blocks.
    sums: [f64; LANES],
    frames: u64,
}

/// Square of the spacing of `f32` at `value`: 2^(2e - 46) for an exponent e, which
/// stays that of the smallest normal number (-126) below it.
fn ulp_squared(value: f64) -> f64 {
    let biased = u64::from((value as f32).to_bits() >> 23 & 0xff).max(1);
    // 2 (biased - 127) - 46, put into the exponent field of an f64 (bias 1023).
    f64::from_bits((2 * biased + 723) << 52)
}

impl UlpPower {
    pub(crate) fn add(&mut self, values: &[f64]) {
        let lane = (self.frames % LANES as u64) as usize;
        self.frames += values.len() as u64;
        let (head, rest) = values.split_at(values.len().min((LANES - lane) % LANES));
        for (sum, &value) in self.sums[lane..].iter_mut().zip(head) {
            *sum += ulp_squared(value);
        }
        let (blocks, tail) = rest.as_chunks::<LANES>();
        for block in blocks {
            for (sum, &value) in self.sums.iter_mut().zip(block) {
                *sum += ulp_squared(value);
            }
        }
        for (sum, &value) in self.sums.iter_mut().zip(tail) {
            *sum += ulp_squared(value);
        }
    }

    /// Full scale 1.0; 0 before the first sample.
    pub(crate) fn mean(&self) -> f64 {
        if self.frames == 0 { 0.0 } else { self.sums.iter().sum::<f64>() / (12.0 * self.frames as f64) }
    }
}

/// Rounding power of one channel's samples in `format`, without dither.
pub(crate) fn rounding_power(format: SampleFormat, ulp: &UlpPower) -> f64 {
    match format.encoding {
        Encoding::Float32 => ulp.mean(),
        _ => format.step() * format.step() / 12.0,
    }
}

/// Watches bits below the valid ones, where the container has more than are valid.
#[derive(Clone, Debug)]
pub(crate) struct BelowValid {
    /// Steps of the valid bits in full scale.
    steps: f64,
    /// What samples that stand in the lower part of the container by mistake stay
    /// within, their sign extended or not.
    lower: std::ops::Range<f64>,
    /// Samples with such bits set, and samples outside `lower`.
    pub(crate) set: u64,
    outside: u64,
}

impl BelowValid {
    /// `None` where every bit is valid.
    pub(crate) fn new(format: SampleFormat) -> Option<Self> {
        let spare = (format.encoding.bytes() * 8).saturating_sub(format.valid_bits);
        if spare == 0 {
            return None;
        }
        let top = 1.0 / (1u64 << spare.min(63)) as f64;
        Some(BelowValid { steps: 1.0 / format.step(), lower: -top..2.0 * top, set: 0, outside: 0 })
    }

    pub(crate) fn add(&mut self, values: &[f64]) {
        let (steps, lower) = (self.steps, &self.lower);
        // At most 31 valid bits: the steps fit.
        self.set += values.iter().map(|v| u64::from(f64::from((v * steps) as i32) != v * steps)).sum::<u64>();
        self.outside += values.iter().map(|v| u64::from(!lower.contains(v))).sum::<u64>();
    }

    /// Whether the samples must stand in the lower part of their container: bits set
    /// below the valid ones, and none of eight or more bits above. (Fewer spare bits
    /// prove nothing: a quiet recording leaves them unused too.)
    pub(crate) fn lower_part(&self) -> bool {
        self.lower.end <= 2.0 / 256.0 && self.set > 0 && self.outside == 0
    }
}
