//! The recording, sample by sample, and into a WAV file.

use super::pink::PinkSamples;
use super::{Part, Plan};
use std::io::{self, Seek, Write};

/// Full scale of 24 bits.
const SCALE: f64 = 8_388_608.0;

/// Frames between two looks at whether to go on.
const BLOCK_FRAMES: u64 = 1 << 16;

/// The samples of a [`Plan`] as they are written: 24-bit integers, rounded to nearest
/// without dither. Dither would only add noise: this is not the rounding of something
/// finer, the samples as written are the excitation.
#[derive(Clone, Debug)]
pub struct Samples<'a> {
    plan: &'a Plan,
    frame: u64,
    pink: PinkSamples,
}

impl Iterator for Samples<'_> {
    type Item = i32;

    fn next(&mut self) -> Option<i32> {
        let plan = self.plan;
        let (part, frame) = plan.place(self.frame)?;
        let raw = match part {
            Part::Sweep => plan.sweep.sample(frame),
            Part::Noise => self.pink.next(),
        };
        self.frame += 1;
        let sample = raw * plan.fade.factor(frame, plan.part_frames(part));
        // At most half of full scale, so it is in range.
        Some(libm::rint(sample * SCALE) as i32)
    }
}

/// Peak and mean square of a part as written.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct PartLevel {
    /// Largest magnitude, full scale 1.
    pub peak: f64,
    /// Mean square, (full scale)^2.
    pub mean_square: f64,
}

/// What was written: sweep and noise.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Written {
    /// The sweep.
    pub sweep: PartLevel,
    /// The noise.
    pub noise: PartLevel,
}

impl Plan {
    /// The samples from the first on, with [`Self::frames`] of them.
    pub fn samples(&self) -> Samples<'_> {
        Samples { plan: self, frame: 0, pink: self.pink.samples() }
    }

    /// Writes the recording: mono, 24 bit, RIFF/WAVE. Memory does not grow with its
    /// length. Equal plans give equal bytes on every machine.
    ///
    /// # Errors
    /// Those of `out`.
    pub fn write(&self, out: impl Write + Seek) -> io::Result<Written> {
        self.write_while(out, &|| true).map(|written| written.unwrap_or_default())
    }

    /// [`Self::write`] that asks now and then whether to go on; `None` once told not to.
    pub(super) fn write_while(&self, out: impl Write + Seek, go_on: &dyn Fn() -> bool) -> io::Result<Option<Written>> {
        let spec = hound::WavSpec {
            channels: 1,
            sample_rate: self.rate_hz,
            bits_per_sample: 24,
            sample_format: hound::SampleFormat::Int,
        };
        let mut writer = hound::WavWriter::new(out, spec).map_err(cause)?;
        let (mut sweep, mut noise) = (Tally::default(), Tally::default());
        for (frame, sample) in (0..).zip(self.samples()) {
            if frame % BLOCK_FRAMES == 0 && !go_on() {
                return Ok(None);
            }
            if frame < self.sweep.frames {
                sweep.take(sample)
            } else {
                noise.take(sample)
            }
            writer.write_sample(sample).map_err(cause)?;
        }
        // Sizes go into the header here: an error must not get lost in a drop.
        writer.finalize().map_err(cause)?;
        Ok(Some(Written { sweep: sweep.level(), noise: noise.level() }))
    }
}

/// Sums over the samples of a part: integers, so their order does not matter.
#[derive(Clone, Copy, Debug, Default)]
struct Tally {
    peak: u32,
    squares: u128,
    frames: u64,
}

impl Tally {
    fn take(&mut self, sample: i32) {
        self.peak = self.peak.max(sample.unsigned_abs());
        self.squares += u128::from(sample.unsigned_abs()) * u128::from(sample.unsigned_abs());
        self.frames += 1;
    }

    fn level(self) -> PartLevel {
        let mean_square = self.squares as f64 / self.frames.max(1) as f64;
        PartLevel { peak: f64::from(self.peak) / SCALE, mean_square: mean_square / (SCALE * SCALE) }
    }
}

/// The system's reason behind hound's.
fn cause(error: hound::Error) -> io::Error {
    match error {
        hound::Error::IoError(error) => error,
        other => io::Error::other(other.to_string()),
    }
}
