//! One recording from bytes to bytes and verdicts.
//!
//! [`process`] is the only way samples go through the tool: recordings and the
//! witness alike.

use super::collector::Collector;
use super::segments::{self, Passing, block_frames};
use super::{Interrupted, Pass};
use crate::cascade::Cascade;
use crate::cascade::both_ways::{Passes, Reach};
use crate::evidence::{self, BandFigures, BandTask, Measured};
use crate::output::{Output, OutputFigures, OutputPlan};
use crate::spec::{Overload, Requirement};
use crate::spectrum::{SegmentPlan, Spectra, TransformCache, segment_frames};
use crate::wave::{Changes, Header, History, InputFigures, Reader, SampleFormat, WaveError, Writer, WrittenFigures};
use std::io::{self, Read, Seek, SeekFrom, Write};
use std::ops::Range;
use std::sync::Arc;

/// What is done to the recordings of one sample rate.
#[derive(Clone, Debug)]
pub struct Treatment {
    /// One pass of the filter.
    pub cascade: Arc<Cascade>,
    /// There where it runs forward and backward.
    pub both_ways: Option<Reach>,
    /// Nothing is done to the samples: they pass bit for bit.
    pub identity: bool,
    /// Frames at the start that figures leave out; where the filter runs both ways, as many
    /// at the end. See [`Treatment::settled`].
    pub settling_frames: u64,
    /// Bands to be judged.
    pub bands: Vec<BandTask>,
    /// Format of the output; `None` for the input's own.
    pub format: Option<SampleFormat>,
    /// A RIFF output longer than this becomes RF64.
    pub riff_limit_bytes: u64,
    /// What is appended to each recording's own metadata.
    pub history: Option<History>,
    /// Whether integer output is dithered.
    pub dither: bool,
    /// What happens when samples exceed full scale.
    pub overload: Overload,
    /// Gain for the whole dataset, dB.
    pub gain_db: f64,
    /// Windows and transforms that recordings share.
    pub transforms: Arc<TransformCache>,
}

/// What came of a recording.
#[derive(Clone, Debug)]
pub struct Processed {
    /// The input, read to its end.
    pub input: InputFigures,
    /// The output, written to its end.
    pub written: WrittenFigures,
    /// Format of the output.
    pub format: SampleFormat,
    /// Samples on their way out.
    pub output: OutputFigures,
    /// Gain in force, dB.
    pub gain_db: f64,
    /// Whether `overload = "scale"` filtered a second time.
    pub scaled: bool,
    /// Segment length and count; `None` where nothing was measured.
    pub segments: Option<(usize, usize)>,
    /// Figures by channel, then by band.
    pub channels: Vec<Vec<BandFigures>>,
}

/// Why a recording could not be processed.
#[derive(Debug, thiserror::Error)]
pub enum RecordingError {
    /// Its bytes can't be read or its output can't be written.
    #[error(transparent)]
    Wave(#[from] WaveError),
    /// Filtered samples exceed full scale under `overload = "refuse"`.
    #[error(
        "filtered samples peak at {peak_db:+.2} dB relative to full scale, and {clipped} of them do not fit {encoding}: {repair}"
    )]
    Overload {
        /// Largest sample relative to full scale, dB; slightly negative where it does not
        /// round to the highest step.
        peak_db: f64,
        /// The format that can't hold it.
        encoding: &'static str,
        /// Samples that do not fit.
        clipped: u64,
        /// Keys of the spec that would help.
        repair: String,
        /// The input, which was read to its end all the same.
        input: Box<InputFigures>,
    },
    /// The filter rings for longer than the witness can follow.
    #[error(
        "the filter rings for {seconds:.0} s, longer than the {longest_s:.0} s that can be followed; \
         widen the narrowest stage, or move its edges away from 0 Hz and half the sample rate"
    )]
    RingsTooLong {
        /// How long, seconds.
        seconds: f64,
        /// The longest that can be followed, seconds.
        longest_s: f64,
    },
    /// The witness's impulse recording can't be made.
    #[error("the impulse recording could not be written: {0}")]
    Impulse(String),
    /// The user asked for an end.
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
    /// The output can't be started again for `overload = "scale"`.
    #[error("the output can't be rewound to be written with another gain: {0}")]
    Rewind(io::Error),
}

/// Filters `input` into `sink` and measures both sides.
///
/// `pass` hears how many input bytes went through, block by block, and may end it.
pub fn process<R: Read + Seek + Send, W: Write + Seek + Send>(
    mut input: Reader<R>,
    mut sink: W,
    treatment: &Treatment,
    pass: &Pass<'_>,
) -> Result<(W, Processed), RecordingError> {
    let first = run(&mut input, &mut sink, treatment, treatment.gain_db, pass)?;
    if first.output.clipped_samples == 0 || treatment.overload == Overload::Clip {
        return Ok((sink, first));
    }
    let over_db = 20.0 * libm::log10(first.output.peak);
    if treatment.overload == Overload::Refuse {
        return Err(RecordingError::Overload {
            peak_db: over_db,
            encoding: first.format.encoding.name(),
            clipped: first.output.clipped_samples,
            repair: overload_repair(treatment.gain_db, over_db, first.format),
            input: Box::new(first.input),
        });
    }
    let gain_db = fitting_gain_db(treatment.gain_db, over_db, first.format);
    input.rewind();
    sink.seek(SeekFrom::Start(0)).map_err(RecordingError::Rewind)?;
    let mut second = run(&mut input, &mut sink, treatment, gain_db, &|_| pass(0))?;
    second.scaled = true;
    Ok((sink, second))
}

/// What to write into the spec so that a recording fits.
fn overload_repair(gain_db: f64, over_db: f64, format: SampleFormat) -> String {
    if format.encoding.is_float() {
        return "set [output] encoding = \"float64\", whose range is larger, or a lower gain_db".into();
    }
    // A tenth of a dB leaves room for full scale less one step, for 8 bits too.
    let fitting_db = libm::floor(gain_db - over_db - 0.1);
    format!("set [output] encoding = \"float32\", gain_db = {fitting_db}, or overload = \"clip\" or \"scale\"")
}

/// The largest gain in whole thousandths of a dB with which the peak and its dither
/// (at most one step) stay below full scale less one step. With three bits or fewer that
/// leaves no room: then the peak is taken to a quarter, which rounds to no more than the
/// highest step.
fn fitting_gain_db(gain_db: f64, over_db: f64, format: SampleFormat) -> f64 {
    let room_db = 20.0 * libm::log10((1.0 - 3.0 * format.step()).max(0.25));
    libm::floor((gain_db - over_db + room_db) * 1000.0) / 1000.0
}

fn run<R: Read + Seek + Send, W: Write + Send>(
    input: &mut Reader<R>,
    sink: &mut W,
    treatment: &Treatment,
    gain_db: f64,
    pass: &Pass<'_>,
) -> Result<Processed, RecordingError> {
    let header = input.header().clone();
    let channels = usize::from(header.channels);
    let format = treatment.format.unwrap_or(header.format);
    let gain = libm::exp10(gain_db / 20.0);
    let plan = plan_segments(&header, treatment);
    // Of what passes unchanged there is nothing to say.
    let unchanged = treatment.identity && format == header.format;
    let history = treatment.history.clone().filter(|_| !unchanged);
    let changes = Changes { format, riff_limit_bytes: treatment.riff_limit_bytes, history };

    let mut stream = Stream {
        writer: Writer::begin(sink, input, &changes)?,
        input,
        filter: Passes::new(&treatment.cascade, treatment.both_ways, channels, header.frames),
        output: Output::new(OutputPlan { format, dither: treatment.dither, gain, identity: unchanged }, channels),
        before: vec![Vec::new(); channels],
        after: vec![Vec::new(); channels],
        frame_bytes: header.data_bytes / header.frames.max(1),
        pass,
        all_read: false,
        ended: false,
    };
    let spectra = match &plan {
        Some(plan) => {
            let cross = evidence::cross_ranges(header.rate_hz, plan.segment_frames, &treatment.bands);
            segments::spectra(&mut stream, plan, channels, &cross, &treatment.transforms)?
        }
        None => Vec::new(),
    };
    stream.run_out()?;
    let Stream { writer, input, output, .. } = stream;
    let (_, written) = writer.finish(input)?;
    let figures = Processed {
        input: input.finish()?,
        written,
        format,
        output: output.figures(),
        gain_db,
        scaled: false,
        segments: plan.as_ref().map(|plan| (plan.segment_frames, plan.starts.len())),
        channels: Vec::new(),
    };
    let independent = plan.as_ref().map_or(0, SegmentPlan::independent_segments);
    let channels = judge(&figures, &spectra, independent, treatment, &header, gain);
    Ok(Processed { channels, ..figures })
}

/// Where the segments of a recording lie; `None` where nothing is settled or less
/// than the shortest segment.
fn plan_segments(header: &Header, treatment: &Treatment) -> Option<SegmentPlan> {
    let length = treatment.segment_frames(header.rate_hz, header.frames)?;
    Some(SegmentPlan::spread(length, treatment.settled(header.frames)?))
}

impl Treatment {
    /// The frames of a recording that figures speak of; `None` where none are left.
    pub fn settled(&self, frames: u64) -> Option<Range<u64>> {
        let at_end = if self.both_ways.is_some() { self.settling_frames } else { 0 };
        let settled = self.settling_frames..frames.saturating_sub(at_end);
        (!settled.is_empty()).then_some(settled)
    }

    /// Length of the segments for a recording; `None` where nothing is measured.
    ///
    /// The narrowest band decides (of those with a requirement, if any has one). Gains
    /// also need segments at least as long as the filter rings: what it delays out of a
    /// segment is missing there.
    pub fn segment_frames(&self, rate_hz: u32, frames: u64) -> Option<usize> {
        let settled = self.settled(frames)?;
        let width = |band: &BandTask| band.to_hz - band.from_hz;
        let judged = self.bands.iter().filter(|band| band.requirement != Requirement::Observe).map(width);
        let narrowest = judged.reduce(f64::min).or(self.bands.iter().map(width).reduce(f64::min))?;
        let rings = self.settling_frames > 0 && self.bands.iter().any(|band| evidence::shows_gains(&band.requirement));
        let ringing_hz = if rings { 10.0 * f64::from(rate_hz) / self.settling_frames as f64 } else { f64::INFINITY };
        segment_frames(rate_hz, Some(narrowest.min(ringing_hz)), settled.end - settled.start)
    }
}

fn judge(
    figures: &Processed,
    spectra: &[Spectra],
    independent_segments: usize,
    treatment: &Treatment,
    header: &Header,
    gain: f64,
) -> Vec<Vec<BandFigures>> {
    let seconds = header.frames as f64 / f64::from(header.rate_hz);
    if spectra.is_empty() {
        let unsettled = || treatment.bands.iter().map(|band| evidence::unsettled(seconds, band)).collect();
        return (0..header.channels).map(|_| unsettled()).collect();
    }
    let one = |(channel, spectra): (usize, &Spectra)| {
        let measured = Measured {
            rate_hz: header.rate_hz,
            seconds,
            spectra,
            independent_segments,
            rounding_power_before: figures.input.rounding_power[channel],
            rounding_power_after: figures.output.rounding_power[channel],
            gain,
            pair: None,
        };
        evidence::judge_all(&measured, &treatment.bands)
    };
    spectra.iter().enumerate().map(one).collect()
}

/// A recording on its way through, block by block.
struct Stream<'a, R, W> {
    input: &'a mut Reader<R>,
    writer: Writer<W>,
    filter: Passes,
    output: Output,
    before: Vec<Vec<f64>>,
    after: Vec<Vec<f64>>,
    frame_bytes: u64,
    pass: &'a Pass<'a>,
    all_read: bool,
    ended: bool,
}

impl<R: Read + Seek + Send, W: Write + Send> Passing for Stream<'_, R, W> {
    type Error = RecordingError;

    /// One block: read, filter, shape, write. After the last one read, what the filter
    /// still holds, block by block.
    fn step(&mut self, collector: Option<&mut Collector>) -> Result<(), RecordingError> {
        self.before.iter_mut().for_each(Vec::clear);
        self.after.iter_mut().for_each(Vec::clear);
        let block = block_frames(self.before.len());
        let frames = if self.all_read { 0 } else { self.input.read(block, &mut self.before)? };
        if frames > 0 {
            self.filter.process(&self.before, &mut self.after);
        } else {
            self.all_read = true;
            self.ended = self.filter.finish(block, &mut self.after);
        }
        self.output.shape(&mut self.after);
        self.writer.write(&self.after)?;
        if let Some(collector) = collector {
            collector.take(&self.before, &self.after);
        }
        (self.pass)(frames as u64 * self.frame_bytes)?;
        Ok(())
    }

    fn has_ended(&self) -> bool {
        self.ended
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::wave::Encoding;

    #[test]
    fn the_gain_that_fits_does_so_at_every_depth() {
        let (gain_db, peak) = (3.0, 1.7);
        for valid_bits in 1..=32 {
            let format = SampleFormat { encoding: Encoding::Pcm32, valid_bits };
            let fitting_db = fitting_gain_db(gain_db, 20.0 * libm::log10(peak), format);
            let steps = peak * libm::exp10((fitting_db - gain_db) / 20.0) / format.step();
            let highest = 1.0 / format.step() - 1.0;
            assert!(libm::rint(steps) <= highest, "{valid_bits} bits: {steps} steps, at most {highest}");
            // Dither takes up to one step more.
            assert!(valid_bits <= 3 || libm::rint(steps + 1.0) <= highest, "{valid_bits} bits: {steps} steps");
        }
    }
}
