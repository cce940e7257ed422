//! What to play through a device that is to be measured: an exponential sweep, then
//! pink noise, so that every band of a spec holds sound of known level.
//!
//! [`Plan::new`] decides everything from a spec, a sample rate and a length; equal
//! arguments give equal samples on every machine. [`Plan::write`] writes a mono WAV file
//! of 24 bits, [`file::save`] puts it in its place.
//!
//! # What it sounds like
//!
//! | part | share of the length | peak | level against a full-scale sine |
//! |---|---|---|---|
//! | [`Sweep`] | a twentieth, at most 5 s | as its level | that of the noise in the same octaves |
//! | [`Pink`] noise | the rest | -6.02 dBFS | about -15 dBFS, by its lowest frequency |
//!
//! Each fades in and out within 50 ms at most. The peak leaves 6 dB: filters turn phases,
//! and what comes out peaks higher than what went in, by 1 to 4 dB in most recordings.
//!
//! # Why so much noise and so little sweep
//!
//! A measurement cuts the recording into segments as long as its narrowest band is
//! narrow, often many seconds, and listens mostly to the middle of each. A sweep is through
//! a narrow band in a moment. If that lies in the middle of a segment, and a filter with
//! steep edges passes it on a second later, between two middles, the band seems to lose
//! more than it does; the other way round, less. Tried with bands that lose 6.6 to 7.3 dB by
//! design (`tests/reference/excite_sweep_share.py`): with a sweep that takes a quarter of
//! 60 s at a peak of -6 dBFS they read 3.0 to 10.2 dB by where the segments lay; with noise
//! alone 4.9 to 8.2 dB, by chance; with a sweep of a twentieth, moved from the start to the
//! middle, 5.3 to 8.4 dB. So it is kept to a twentieth of the energy in every octave, and
//! [`BandLevel`] counts the noise alone for what can be shown.
//!
//! What the sweep is for: it can be followed by ear and in any spectrogram, so that a
//! recording of the device is recognized, a wrong rate or a missing octave seen at once.
//! It comes first because a measurement leaves out the start, where the device still
//! settles; the noise holds whatever of the sweep is lost.
//!
//! Both parts have the same power density, which falls as 1/f: the same level in every
//! octave, and in a narrow band at 50 Hz, where hum lies, 25 dB more than in as narrow a one
//! at 16 kHz.

mod error;
mod fade;
pub mod file;
mod levels;
mod needs;
mod pink;
mod sweep;
mod write;

pub use error::ExciteError;
pub use fade::Fade;
pub use levels::BandLevel;
pub use needs::Needs;
pub use pink::{GENERATOR_NAME, Pink};
pub use sweep::Sweep;
pub use write::{PartLevel, Samples, Written};

use crate::design::placement::LeftOut;
use crate::design::{Design, design};
use crate::spec::Spec;
use crate::spectrum::MIN_SEGMENT_FRAMES;

/// Peak of the noise, full scale 1: -6.02 dBFS.
pub const PEAK: f64 = 0.5;

/// The sweep takes this part of the length, see [the module](self).
const SWEEP_PART: u64 = 20;

/// Longest sweep, seconds: slow enough to be followed by ear.
const LONGEST_SWEEP_S: f64 = 5.0;

/// The sweep ends below this share of the rate: devices have their own filters just below
/// half of it.
const HIGHEST_SHARE: f64 = 0.49;

/// Lowest frequency that counts in a band that begins at 0 Hz, as a share of its upper end.
const LOWEST_OF_BAND: f64 = 0.1;

/// Bytes before the samples that hound writes, or more.
const HEADER_BYTES: u64 = 128;

const FRAME_BYTES: u32 = 3;

/// One of the two parts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Part {
    /// The exponential sweep.
    Sweep,
    /// The pink noise.
    Noise,
}

/// What is known before levels are.
#[derive(Clone, Copy, Debug)]
struct Layout {
    rate_hz: u32,
    frames: u64,
    sweep: Sweep,
    pink: Pink,
    fade: Fade,
    segment_frames: usize,
}

impl Layout {
    fn noise_frames(&self) -> u64 {
        self.frames - self.sweep.frames
    }

    /// Mean over the whole recording of what has mean 1 in steady noise.
    fn noise_share(&self) -> f64 {
        self.noise_frames() as f64 / self.frames as f64 * self.fade.share(self.noise_frames())
    }
}

/// An excitation for a spec, a sample rate and a length.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Length, frames: even, so that no pad byte is needed.
    pub frames: u64,
    /// The first part.
    pub sweep: Sweep,
    /// The second part.
    pub pink: Pink,
    /// At both ends of both parts.
    pub fade: Fade,
    /// The spec's bands at this rate, in its order.
    pub bands: Vec<BandLevel>,
    /// What of the spec does not fit at this rate.
    pub left_out: Vec<LeftOut>,
    /// Lengths from which more can be told.
    pub needs: Needs,
    /// Sentences on what can't be shown with this excitation, and what to do about it.
    pub notes: Vec<String>,
}

impl Plan {
    /// Plans an excitation of `seconds` at `rate_hz`, rounded up to an even number of
    /// frames. It covers from an octave below the lowest edge of a band (above 0 Hz) to an
    /// octave above the highest, the sweep to 0.49 of the rate at most; noise is there up
    /// to half the rate.
    ///
    /// # Errors
    /// A spec that does not fit the rate; no bands; a length in which no band could be
    /// judged, or that no WAV file holds. A length in which only some bands can be
    /// judged is no error: see [`Self::notes`].
    pub fn new(spec: &Spec, rate_hz: u32, seconds: f64) -> Result<Self, ExciteError> {
        if !(seconds.is_finite() && seconds > 0.0) {
            return Err(ExciteError::Seconds(seconds));
        }
        let design = design(spec, rate_hz)?;
        let no_bands = || ExciteError::NoBands { rate_hz, half_hz: f64::from(rate_hz) / 2.0 };
        let needs = Needs::new(&design).ok_or_else(no_bands)?;
        let frames = frames(rate_hz, seconds)?;
        // Rounding up must not make too short a length fit.
        if seconds < needs.least_s {
            return Err(ExciteError::TooShort {
                seconds,
                least_s: tenths_up(needs.least_s),
                every_band_s: tenths_up(needs.every_band_s),
                device_noise_s: tenths_up(needs.device_noise_s),
            });
        }
        let layout = layout(&design, frames).ok_or_else(no_bands)?;
        let net_sections = design.net_sections();
        let bands: Vec<_> = design.bands.iter().map(|band| BandLevel::new(&layout, band, &net_sections)).collect();
        Ok(Plan {
            rate_hz,
            frames,
            sweep: layout.sweep,
            pink: layout.pink,
            fade: layout.fade,
            notes: needs::notes(&bands, &needs, seconds),
            bands,
            left_out: design.left_out,
            needs,
        })
    }

    /// Length, seconds.
    pub fn seconds(&self) -> f64 {
        self.frames as f64 / f64::from(self.rate_hz)
    }

    /// Length of a part, frames.
    pub fn part_frames(&self, part: Part) -> u64 {
        match part {
            Part::Sweep => self.sweep.frames,
            Part::Noise => self.frames - self.sweep.frames,
        }
    }

    /// Mean square of a part, fades included, (full scale)^2: of the sweep exactly, of the
    /// noise its expectation.
    pub fn mean_square(&self, part: Part) -> f64 {
        match part {
            Part::Sweep => self.sweep.mean_square(self.fade),
            Part::Noise => self.pink.mean_square() * self.fade.share(self.part_frames(part)),
        }
    }

    /// The part that a frame belongs to, and its place in it; `None` after the end.
    fn place(&self, frame: u64) -> Option<(Part, u64)> {
        match frame.checked_sub(self.sweep.frames) {
            None => Some((Part::Sweep, frame)),
            Some(frame) if frame < self.part_frames(Part::Noise) => Some((Part::Noise, frame)),
            Some(_) => None,
        }
    }
}

fn tenths_up(seconds: f64) -> f64 {
    libm::ceil(seconds * 10.0) / 10.0
}

/// Frames of so many seconds, even.
fn frames(rate_hz: u32, seconds: f64) -> Result<u64, ExciteError> {
    let highest_hz = u32::MAX / FRAME_BYTES;
    if rate_hz > highest_hz {
        return Err(ExciteError::Rate { rate_hz, highest_hz });
    }
    let most = (u64::from(u32::MAX) - HEADER_BYTES) / u64::from(FRAME_BYTES);
    let frames = libm::rint(seconds * f64::from(rate_hz));
    if frames >= most as f64 {
        let longest_s = most / u64::from(rate_hz.max(1));
        return Err(ExciteError::TooLong { seconds, rate_hz, longest_s });
    }
    Ok((frames as u64).next_multiple_of(2))
}

fn layout(design: &Design, frames: u64) -> Option<Layout> {
    let rate_hz = design.rate_hz;
    let settled = frames.saturating_sub(design.unsettled_frames());
    let wanted = needs::wanted_segment(design)?;
    let longest_sweep = libm::rint(f64::from(rate_hz) * LONGEST_SWEEP_S) as u64;
    let sweep_frames = (frames / SWEEP_PART).min(longest_sweep);
    let (lowest_hz, highest_hz) = covered(design);
    let pink = Pink::new(rate_hz, lowest_hz, PEAK);
    // While it runs, as loud in each octave it covers as the noise is later.
    let in_band = pink.line(highest_hz) * highest_hz * libm::log(highest_hz / lowest_hz);
    let peak = libm::sqrt(2.0 * in_band);
    let sweep = Sweep { from_hz: lowest_hz, to_hz: highest_hz, frames: sweep_frames, rate_hz, peak };
    Some(Layout {
        rate_hz,
        frames,
        sweep,
        pink,
        fade: Fade::new(rate_hz, sweep_frames),
        // Where the recording is the cap, it is one segment.
        segment_frames: usize::try_from(settled).map_or(wanted, |settled| settled.clamp(MIN_SEGMENT_FRAMES, wanted)),
    })
}

/// From an octave below the lowest edge to an octave above the highest, Hz.
fn covered(design: &Design) -> (f64, f64) {
    let lowest = |from_hz: f64, to_hz: f64| if from_hz > 0.0 { from_hz } else { to_hz * LOWEST_OF_BAND };
    let lines = || design.bands.iter().map(|band| band.band.line);
    let lowest_hz = lines().map(|line| lowest(line.from_hz, line.to_hz)).fold(f64::INFINITY, f64::min);
    let highest_hz = lines().map(|line| line.to_hz).fold(0.0, f64::max);
    (lowest_hz / 2.0, (2.0 * highest_hz).min(HIGHEST_SHARE * f64::from(design.rate_hz)))
}
