//! Two recordings of the same sound, before and after, measured against each other.
//!
//! [`measure`] reads both twice: once to lay them against each other ([`crate::align`]),
//! once for their spectra. [`remeasure`] knows how they lie.

mod error;

use super::Pass;
use super::collector::Collector;
use super::noise::{IdleNoise, IdleSpectra};
use super::recording::Treatment;
use super::segments::{self, Passing, block_frames};
use crate::align::{Alignment, Finder, Follower, Search, Side};
use crate::design::Design;
use crate::evidence::{self, BandFigures, Deviation, Measured, Pairing};
use crate::spectrum::{SegmentPlan, Spectra};
use crate::wave::{Header, InputFigures, RateMeaning, Reader};
pub use error::PairError;
use std::io::{Read, Seek};
use std::ops::Range;
use std::sync::Arc;

/// What is asked of the pairs of one sample rate.
#[derive(Clone, Debug)]
pub struct PairTask {
    /// Bands, settling time and transforms; nothing is filtered.
    pub treatment: Treatment,
    /// What the spec's stages come to; `None` where it has none.
    pub filter: Option<Arc<Design>>,
    /// Place among the bands of the one whose gain counts as 0 dB.
    pub reference: Option<usize>,
    /// Largest delay to look for, seconds.
    pub max_delay_s: f64,
    /// The delay, where it is known, frames.
    pub delay_frames: Option<f64>,
    /// The idle device.
    pub noise: Option<Arc<IdleNoise>>,
    /// Which sample rate frequencies mean in time-expanded recordings.
    pub rate: Option<RateMeaning>,
}

/// What a pair showed.
#[derive(Clone, Debug)]
pub struct PairMeasured {
    /// The recording before, read to its end.
    pub before: InputFigures,
    /// The recording after, read to its end.
    pub after: InputFigures,
    /// How they lie against each other.
    pub alignment: Alignment,
    /// Frames before that have a partner after.
    pub overlap: Range<u64>,
    /// Segment length and count; `None` where nothing was measured.
    pub segments: Option<(usize, usize)>,
    /// Gain of the reference band by channel, linear.
    pub reference_gains: Option<Vec<f64>>,
    /// Largest deviation from the design.
    pub deviation: Option<Deviation>,
    /// Figures by channel, then by band.
    pub channels: Vec<Vec<BandFigures>>,
}

impl PairTask {
    /// For pairs at the sample rate of `design`.
    pub fn new(spec: &crate::spec::Spec, design: &Design) -> Self {
        let treatment = super::plan::treatment(spec, design);
        let named = |name: &String| treatment.bands.iter().position(|band| band.name == *name);
        PairTask {
            reference: spec.reference_band.as_ref().and_then(named),
            filter: (!design.sections.is_empty()).then(|| Arc::new(design.clone())),
            treatment,
            max_delay_s: DEFAULT_MAX_DELAY_S,
            delay_frames: None,
            noise: None,
            rate: spec.rate,
        }
    }
}

/// Largest delay that is looked for unless another is asked for, seconds.
pub const DEFAULT_MAX_DELAY_S: f64 = 10.0;

/// Lays `after` against `before` and measures both.
///
/// `pass` hears how many bytes of samples went through, and may end it; each recording is read twice.
///
/// # Errors
/// See [`PairError`].
pub fn measure<R: Read + Seek + Send, S: Read + Seek + Send>(
    mut before: Reader<R>,
    mut after: Reader<S>,
    task: &PairTask,
    pass: &Pass<'_>,
) -> Result<PairMeasured, PairError> {
    alike(before.header(), after.header())?;
    let alignment = align(&mut before, &mut after, task, pass)?;
    before.rewind();
    after.rewind();
    let seen = Passage::run(&mut before, &mut after, &alignment, &task.treatment, true, pass)?;
    let Passage { overlap, plan, spectra, reaches_share } = seen;
    let (before_figures, after_figures) =
        (before.finish().map_err(PairError::Before)?, after.finish().map_err(PairError::After)?);
    let header = before.header();
    let mut measured = PairMeasured {
        before: before_figures,
        after: after_figures,
        alignment,
        segments: plan.as_ref().map(|plan| (plan.segment_frames, plan.starts.len())),
        overlap,
        reference_gains: None,
        deviation: None,
        channels: Vec::new(),
    };
    let Some(plan) = plan else {
        measured.channels = unsettled(&measured.overlap, &task.treatment, header);
        return Ok(measured);
    };
    // Whether an integer recording was dithered nobody knows: the larger floor calls fewer
    // bands missed and none met.
    let dithered = if after.header().format.encoding.is_float() { 1.0 } else { DITHERED };
    let seen = Seen {
        rate_hz: header.rate_hz,
        seconds: (measured.overlap.end - measured.overlap.start) as f64 / f64::from(header.rate_hz),
        spectra,
        independent_segments: plan.independent_segments(),
        rounding_power_before: measured.before.rounding_power.clone(),
        rounding_power_after: measured.after.rounding_power.iter().map(|power| dithered * power).collect(),
        noise: task.noise.as_ref().map(|noise| noise.spectra(header, &plan, &task.treatment)).transpose()?,
        // Of a sweep alone no scatter is known, and none matters: each frequency sounds once, and
        // a sub-band finds its own delay.
        delay_scatter_s: measured.alignment.scatter_s.unwrap_or(0.0),
        delay_certain: measured.alignment.certain,
        reaches_hz: reaches_share * f64::from(header.rate_hz),
    };
    judge(&mut measured, &seen, task)?;
    Ok(measured)
}

/// Measures an output that [`super::recording::process`] wrote with `treatment` and
/// `gain_db` against its input: the same figures without filtering.
///
/// # Errors
/// What can't be read; recordings that do not have the same rate, channels and frames.
pub fn remeasure<R: Read + Seek + Send, S: Read + Seek + Send>(
    mut input: Reader<R>,
    mut output: Reader<S>,
    treatment: &Treatment,
    gain_db: f64,
    pass: &Pass<'_>,
) -> Result<Vec<Vec<BandFigures>>, PairError> {
    alike(input.header(), output.header())?;
    let (before, after) = (input.header().frames, output.header().frames);
    if before != after {
        let (before, after) = (format!("{before} frames"), format!("{after} frames"));
        return Err(PairError::Unlike { what: "length", before, after });
    }
    let still = Alignment {
        delay_frames: 0.0,
        clock_ppm: 0.0,
        clock_error_ppm: None,
        inverted: false,
        scatter_s: None,
        certain: true,
        notes: Vec::new(),
    };
    let Passage { overlap, plan, spectra, .. } = Passage::run(&mut input, &mut output, &still, treatment, false, pass)?;
    let header = input.header();
    let Some(plan) = plan else { return Ok(unsettled(&overlap, treatment, header)) };
    let (before, after) = (input.finish().map_err(PairError::Before)?, output.finish().map_err(PairError::After)?);
    let header = input.header();
    let format = output.header().format;
    let unchanged = treatment.identity && format == header.format;
    let dithered = treatment.dither && !unchanged && !format.encoding.is_float();
    let one = |(channel, spectra): (usize, &Spectra)| {
        let measured = Measured {
            rate_hz: header.rate_hz,
            seconds: header.frames as f64 / f64::from(header.rate_hz),
            spectra,
            independent_segments: plan.independent_segments(),
            rounding_power_before: before.rounding_power[channel],
            rounding_power_after: after.rounding_power[channel] * if dithered { DITHERED } else { 1.0 },
            gain: libm::exp10(gain_db / 20.0),
            pair: None,
        };
        evidence::judge_all(&measured, &treatment.bands)
    };
    Ok(spectra.iter().enumerate().map(one).collect())
}

/// Rounding with triangular dither has three times the power of rounding alone.
const DITHERED: f64 = 3.0;

/// The sample rate, and what the header states where that is another.
fn rate(header: &Header) -> String {
    let Header { rate_hz, header_rate_hz, .. } = header;
    let stated =
        if rate_hz == header_rate_hz { String::new() } else { format!(" (time-expanded to {header_rate_hz} Hz)") };
    format!("{rate_hz} Hz{stated}")
}

fn alike(before: &Header, after: &Header) -> Result<(), PairError> {
    let unlike = |what, before, after| Err(PairError::Unlike { what, before, after });
    if before.rate_hz != after.rate_hz {
        return unlike("sample rate", rate(before), rate(after));
    }
    if before.channels != after.channels {
        let channels = |count: u16| format!("{count} channel{}", if count == 1 { "" } else { "s" });
        return unlike("number of channels", channels(before.channels), channels(after.channels));
    }
    Ok(())
}

/// Reads both once and says how they lie.
fn align<R: Read + Seek, S: Read + Seek>(
    before: &mut Reader<R>,
    after: &mut Reader<S>,
    task: &PairTask,
    pass: &Pass<'_>,
) -> Result<Alignment, PairError> {
    let channels = usize::from(before.header().channels);
    let bytes = [frame_bytes(before.header()), frame_bytes(after.header())];
    let mut finder = Finder::new(Search {
        rate_hz: before.header().rate_hz,
        channels,
        frames_before: before.header().frames,
        frames_after: after.header().frames,
        max_delay_s: task.max_delay_s,
        given_frames: task.delay_frames,
    });
    let block = block_frames(channels);
    before.skim();
    after.skim();
    let mut planes = vec![Vec::new(); channels];
    while let Some(side) = finder.wants() {
        planes.iter_mut().for_each(Vec::clear);
        let (frames, bytes) = match side {
            Side::Before => (before.read(block, &mut planes).map_err(PairError::Before)?, bytes[0]),
            Side::After => (after.read(block, &mut planes).map_err(PairError::After)?, bytes[1]),
        };
        finder.take(side, &planes);
        pass(frames as u64 * bytes)?;
    }
    Ok(finder.finish()?)
}

fn frame_bytes(header: &Header) -> u64 {
    header.data_bytes / header.frames.max(1)
}

fn unsettled(overlap: &Range<u64>, treatment: &Treatment, header: &Header) -> Vec<Vec<BandFigures>> {
    let seconds = (overlap.end - overlap.start) as f64 / f64::from(header.rate_hz);
    let all = || treatment.bands.iter().map(|band| evidence::unsettled(seconds, band)).collect();
    (0..header.channels).map(|_| all()).collect()
}

/// All that verdicts on a pair rest on.
struct Seen {
    rate_hz: u32,
    /// Length of the overlap.
    seconds: f64,
    /// By channel, like the three below.
    spectra: Vec<Spectra>,
    independent_segments: usize,
    rounding_power_before: Vec<f64>,
    rounding_power_after: Vec<f64>,
    noise: Option<Arc<IdleSpectra>>,
    delay_scatter_s: f64,
    delay_certain: bool,
    reaches_hz: f64,
}

impl Seen {
    fn channel(&self, channel: usize) -> Measured<'_> {
        Measured {
            rate_hz: self.rate_hz,
            seconds: self.seconds,
            spectra: &self.spectra[channel],
            independent_segments: self.independent_segments,
            rounding_power_before: self.rounding_power_before[channel],
            rounding_power_after: self.rounding_power_after[channel],
            gain: 1.0,
            pair: Some(Pairing {
                noise: self.noise.as_ref().and_then(|noise| noise.channel(channel)),
                delay_scatter_s: self.delay_scatter_s,
                delay_certain: self.delay_certain,
                reaches_hz: self.reaches_hz,
            }),
        }
    }
}

/// Reference gains first, then everything else taken back by them.
fn judge(pair: &mut PairMeasured, seen: &Seen, task: &PairTask) -> Result<(), PairError> {
    let bands = &task.treatment.bands;
    let reference = task.reference.and_then(|place| bands.get(place));
    for channel in 0..seen.spectra.len() {
        // What the spec's `gain_db` is to do is taken back as in `filter`.
        let mut measured = Measured { gain: libm::exp10(task.treatment.gain_db / 20.0), ..seen.channel(channel) };
        if let Some(band) = reference {
            let none = || PairError::NoReference { band: band.name.clone(), channel: channel + 1 };
            measured.gain = evidence::reference_gain(&measured, band).ok_or_else(none)?;
            pair.reference_gains.get_or_insert_default().push(measured.gain);
        }
        if let Some(filter) = &task.filter {
            let shown = |hz: f64| filter.response_at(hz);
            let farthest = evidence::deviation(&measured, bands, &shown);
            let farther =
                |one: &Deviation, other: &Deviation| one.beyond_chance_db().total_cmp(&other.beyond_chance_db());
            pair.deviation = pair.deviation.into_iter().chain(farthest).max_by(farther);
        }
        pair.channels.push(evidence::judge_all(&measured, bands));
    }
    Ok(())
}

/// What came of both sides streaming past together.
struct Passage {
    overlap: Range<u64>,
    plan: Option<SegmentPlan>,
    spectra: Vec<Spectra>,
    reaches_share: f64,
}

impl Passage {
    /// Reads both to their ends. With `all_cross` the cross-spectrum is kept for every band.
    fn run<R: Read + Seek + Send, S: Read + Seek + Send>(
        before: &mut Reader<R>,
        after: &mut Reader<S>,
        alignment: &Alignment,
        treatment: &Treatment,
        all_cross: bool,
        pass: &Pass<'_>,
    ) -> Result<Self, PairError> {
        let rate_hz = before.header().rate_hz;
        let channels = usize::from(before.header().channels);
        let (frames_before, frames_after) = (before.header().frames, after.header().frames);
        let follower = Follower::new(alignment, frames_before, frames_after, channels);
        let overlap = follower.overlap();
        if overlap.is_empty() {
            let delay_frames = alignment.delay_frames;
            return Err(PairError::NoOverlap { delay_frames, frames_before, frames_after });
        }
        let reaches_share = follower.reaches_share();
        let frames = overlap.end - overlap.start;
        let plan = treatment
            .segment_frames(rate_hz, frames)
            .zip(treatment.settled(frames))
            .map(|(length, settled)| SegmentPlan::spread(length, settled));
        let bytes = [frame_bytes(before.header()), frame_bytes(after.header())];
        let mut sides = Sides {
            before,
            after,
            follower,
            overlap: overlap.clone(),
            bytes,
            planes: vec![Vec::new(); channels],
            raw: vec![Vec::new(); channels],
            partners: vec![Vec::new(); channels],
            read_before: 0,
            given_after: 0,
            before_ended: false,
            after_ended: false,
            pass,
        };
        let spectra = match &plan {
            Some(plan) => {
                let cross = if all_cross { evidence::pair_ranges } else { evidence::cross_ranges };
                let cross = cross(rate_hz, plan.segment_frames, &treatment.bands);
                segments::spectra(&mut sides, plan, channels, &cross, &treatment.transforms)?
            }
            None => Vec::new(),
        };
        sides.run_out()?;
        Ok(Passage { overlap, plan, spectra, reaches_share })
    }
}

/// Both sides on their way, the one before always far enough ahead.
struct Sides<'a, R, S> {
    before: &'a mut Reader<R>,
    after: &'a mut Reader<S>,
    follower: Follower,
    overlap: Range<u64>,
    /// Bytes of a frame, before and after.
    bytes: [u64; 2],
    planes: Vec<Vec<f64>>,
    raw: Vec<Vec<f64>>,
    partners: Vec<Vec<f64>>,
    /// Frames read of the recording before.
    read_before: u64,
    /// Partners given to the collector.
    given_after: u64,
    before_ended: bool,
    after_ended: bool,
    pass: &'a Pass<'a>,
}

impl<R: Read + Seek + Send, S: Read + Seek + Send> Sides<'_, R, S> {
    /// Frames of the overlap that the recording before has given.
    fn given_before(&self) -> u64 {
        self.read_before.clamp(self.overlap.start, self.overlap.end) - self.overlap.start
    }

    fn read_before(&mut self, frames: usize) -> Result<u64, PairError> {
        let frames = self.before.read(frames, &mut self.planes).map_err(PairError::Before)? as u64;
        self.before_ended = frames == 0;
        let (from, to) = (self.read_before, self.read_before + frames);
        self.read_before = to;
        // Both lie within the block.
        let first = (self.overlap.start.clamp(from, to) - from) as usize;
        let end = (self.overlap.end.clamp(from, to) - from) as usize;
        for plane in &mut self.planes {
            plane.truncate(end);
            plane.drain(..first.min(end));
        }
        Ok(frames * self.bytes[0])
    }

    fn read_after(&mut self, frames: usize) -> Result<u64, PairError> {
        let frames = self.after.read(frames, &mut self.raw).map_err(PairError::After)? as u64;
        if frames > 0 {
            self.follower.process(&self.raw, &mut self.partners);
        } else {
            self.follower.finish(&mut self.partners);
            self.after_ended = true;
        }
        self.given_after += self.partners.first().map_or(0, Vec::len) as u64;
        Ok(frames * self.bytes[1])
    }
}

impl<R: Read + Seek + Send, S: Read + Seek + Send> Passing for Sides<'_, R, S> {
    type Error = PairError;

    fn step(&mut self, collector: Option<&mut Collector>) -> Result<(), PairError> {
        for planes in [&mut self.planes, &mut self.raw, &mut self.partners] {
            planes.iter_mut().for_each(Vec::clear);
        }
        let block = block_frames(self.planes.len());
        // What a block after may bring at most, clock difference and kernel included.
        let brings = (block + block / 64 + 4096) as u64;
        let ahead = self.given_before() - self.given_after;
        let bytes = if !self.before_ended && (ahead < brings || self.after_ended) {
            self.read_before(block)?
        } else {
            self.read_after(block)?
        };
        if let Some(collector) = collector {
            collector.take(&self.planes, &self.partners);
        }
        (self.pass)(bytes)?;
        Ok(())
    }

    fn has_ended(&self) -> bool {
        self.before_ended && self.after_ended
    }
}
