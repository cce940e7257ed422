//! The witness: a recording of one impulse goes through the code that filters
//! recordings, and what comes out must be what the sections' exact response says.
//!
//! It shows for each sample rate of a run that the samples that come out are those
//! of the designed transfer function, whatever the recordings contain.

use super::recording::{RecordingError, Treatment, process};
use crate::cascade::both_ways::Reach;
use crate::design::check::CAP_DB;
use crate::design::{BandDesign, Design, settling};
use crate::spec::Overload;
use crate::wave::{Encoding, Reader, SampleFormat};
use num_complex::Complex64;
use rayon::prelude::*;
use rustfft::FftPlanner;
use std::io::Cursor;

/// In one pass the impulse stands at frame 1: the start state belongs to frame 0.
const IMPULSE_FRAME: usize = 1;
/// Largest complex deviation allowed at any frequency, full scale 1. Rounding
/// inside a correct f64 cascade reaches 1e-8 (1 Hz notch at 384 kHz).
const DEVIATION_LIMIT: f64 = 1e-7;
/// Largest deviation in dB allowed where the response is above -40 dB.
const LEVEL_LIMIT_DB: f64 = 1e-5;
/// -40 dB as a ratio of powers.
const LEVEL_FROM: f64 = 1e-4;
/// Fall of the response's tail that is waited for: 1e-11, a thousandth of the
/// tightest of the limits above (1e-5 dB at -40 dB is 1.2e-8).
const TAIL_FALL_DB: f64 = 220.0;
/// Bins asked for in the narrowest band, and the length at which that stops.
const BINS_PER_BAND: f64 = 4.0;
const LONGEST_FOR_BANDS: f64 = 16_777_216.0;
/// Longest impulse recording that is made for the sake of two blocks of the backward pass.
const LONGEST_FOR_BLOCKS: u64 = 1 << 24;
const SHORTEST: u64 = 4096;
/// Longest impulse recording: 3 GB of working memory. Beyond it [`settling`] does not
/// follow the tail frame by frame either.
const LONGEST: u64 = 1 << 26;

/// What the witness of one sample rate showed.
#[derive(Clone, Debug, PartialEq)]
pub struct Witness {
    /// Whether both limits hold.
    pub agrees: bool,
    /// Largest complex deviation, full scale 1.
    pub deviation: f64,
    /// Frequency of that deviation, Hz.
    pub deviation_at_hz: f64,
    /// Largest deviation where the response is above -40 dB, dB.
    pub deviation_db: f64,
    /// Least and largest attenuation seen in each band of the design, dB, in its
    /// order; `None` where its exceptions cover the band.
    pub bands: Vec<Option<(f64, f64)>>,
}

/// Sends the impulse through `treatment`'s cascade and compares.
pub fn witness(design: &Design, treatment: &Treatment) -> Result<Witness, RecordingError> {
    Ok(compare(&respond(design, treatment)?, design))
}

/// The impulse recording after the cascade.
#[derive(Clone, Debug, PartialEq)]
pub struct Response {
    /// Its samples from frame 0 on, as float64 holds them.
    pub samples: Vec<f64>,
    /// Where the impulse stood.
    pub impulse_frame: usize,
}

/// Sends the impulse recording through `treatment`'s cascade.
pub fn respond(design: &Design, treatment: &Treatment) -> Result<Response, RecordingError> {
    let layout = Layout::new(design, treatment.both_ways)?;
    let treatment = Treatment {
        identity: false,
        bands: Vec::new(),
        format: Some(SampleFormat::full(Encoding::Float64)),
        history: None,
        dither: false,
        overload: Overload::Clip,
        gain_db: 0.0,
        ..treatment.clone()
    };
    let recording = impulse_recording(design.rate_hz, layout)?;
    let reader = Reader::open(Cursor::new(recording))?;
    let (written, _) = process(reader, Cursor::new(Vec::new()), &treatment, &|_| Ok(()))?;
    let mut reader = Reader::open(Cursor::new(written.into_inner()))?;
    let mut planes = vec![Vec::new()];
    while reader.read(1 << 20, &mut planes)? > 0 {}
    Ok(Response { samples: planes.swap_remove(0), impulse_frame: layout.impulse_frame })
}

/// The impulse recording: how long it is, and where the impulse stands.
#[derive(Clone, Copy, Debug)]
struct Layout {
    frames: usize,
    impulse_frame: usize,
}

impl Layout {
    /// Long enough for the response to fall into rounding, and for the narrowest band to hold
    /// some bins. With two passes it does so on both sides of the impulse, which stands,
    /// where that does not take too long a recording, at the first frame of the backward
    /// pass' second block: half of what it leaves before it is the first block's.
    fn new(design: &Design, both_ways: Option<Reach>) -> Result<Self, RecordingError> {
        let rate_hz = f64::from(design.rate_hz);
        let widths = design.bands.iter().map(|band| band.band.line.to_hz - band.band.line.from_hz);
        let for_bands =
            widths.reduce(f64::min).map_or(0.0, |width_hz| (BINS_PER_BAND * rate_hz / width_hz).min(LONGEST_FOR_BANDS));
        let (before, after) = match both_ways {
            None => (IMPULSE_FRAME as u64, settling::settling_frames(&design.sections, TAIL_FALL_DB)),
            Some(reach) => {
                let tail = settling::settling_frames_both_ways(&design.sections, TAIL_FALL_DB);
                let (block, ring) = (reach.block_frames as u64, reach.ring_frames as u64);
                let in_blocks = tail <= block && block.saturating_add(ring.max(tail)) < LONGEST_FOR_BLOCKS;
                if in_blocks { (block, ring.max(tail)) } else { (tail, tail) }
            }
        };
        let least = before.saturating_add(after.max(SHORTEST).saturating_add(1)).max(for_bands as u64);
        match (usize::try_from(least), usize::try_from(before)) {
            (Ok(frames), Ok(impulse_frame)) if least <= LONGEST => {
                Ok(Layout { frames: smooth_at_least(frames), impulse_frame })
            }
            _ => Err(RecordingError::RingsTooLong {
                seconds: least as f64 / rate_hz,
                longest_s: LONGEST as f64 / rate_hz,
            }),
        }
    }
}

/// The next power of two or three times one: lengths an FFT takes quickly.
fn smooth_at_least(least: usize) -> usize {
    let power = least.next_power_of_two();
    if power / 4 * 3 >= least { power / 4 * 3 } else { power }
}

fn impulse_recording(rate_hz: u32, layout: Layout) -> Result<Vec<u8>, RecordingError> {
    let spec = hound::WavSpec {
        channels: 1,
        sample_rate: rate_hz,
        bits_per_sample: 32,
        sample_format: hound::SampleFormat::Float,
    };
    let mut bytes = Cursor::new(Vec::with_capacity(layout.frames * 4 + 128));
    let write = |bytes: &mut Cursor<Vec<u8>>| -> hound::Result<()> {
        let mut writer = hound::WavWriter::new(bytes, spec)?;
        for frame in 0..layout.frames {
            writer.write_sample(if frame == layout.impulse_frame { 1.0f32 } else { 0.0 })?;
        }
        writer.finalize()
    };
    write(&mut bytes).map_err(|error| RecordingError::Impulse(error.to_string()))?;
    Ok(bytes.into_inner())
}

/// Holds the spectrum of an impulse response against the design's exact response.
pub fn compare(response: &Response, design: &Design) -> Witness {
    let samples = response.samples.as_slice();
    let length = samples.len();
    let rate_hz = f64::from(design.rate_hz);
    let mut spectrum: Vec<Complex64> = samples.iter().map(|&sample| Complex64::new(sample, 0.0)).collect();
    FftPlanner::new().plan_fft_forward(length).process(&mut spectrum);
    let bin_hz = rate_hz / length as f64;
    let exact = |bin: usize| {
        let turned = (bin as u64 * response.impulse_frame as u64) % length as u64;
        let turn = -std::f64::consts::TAU * turned as f64 / length as f64;
        design.response_at(bin as f64 * bin_hz) * Complex64::new(libm::cos(turn), libm::sin(turn))
    };
    let worst = (0..=length / 2)
        .into_par_iter()
        .map(|bin| Deviation::of(spectrum[bin], exact(bin), bin as f64 * bin_hz))
        .reduce(|| Deviation { full_scale: 0.0, at_hz: 0.0, ratio: 1.0 }, Deviation::worse);
    let deviation_db = 10.0 * libm::log10(worst.ratio);
    Witness {
        agrees: worst.full_scale <= DEVIATION_LIMIT && deviation_db <= LEVEL_LIMIT_DB,
        deviation: worst.full_scale,
        deviation_at_hz: worst.at_hz,
        deviation_db,
        bands: design.bands.par_iter().map(|band| extremes(band, samples, &spectrum[..=length / 2], rate_hz)).collect(),
    }
}

/// Worst deviations seen so far; a NaN counts as infinite.
#[derive(Clone, Copy)]
struct Deviation {
    full_scale: f64,
    at_hz: f64,
    /// Of powers, the larger over the smaller.
    ratio: f64,
}

impl Deviation {
    fn of(found: Complex64, exact: Complex64, at_hz: f64) -> Self {
        let or_infinite = |value: f64| if value.is_nan() { f64::INFINITY } else { value };
        let expected = exact.norm_sqr();
        let ratio = if expected > LEVEL_FROM { or_infinite(found.norm_sqr() / expected) } else { 1.0 };
        let full_scale = or_infinite((found - exact).norm_sqr().sqrt());
        // A level that is gone is as far off as one that is without bound.
        Deviation { full_scale, at_hz, ratio: if ratio < 1.0 { 1.0 / ratio } else { ratio } }
    }

    fn worse(self, other: Self) -> Self {
        let (largest, at_hz) = if other.full_scale > self.full_scale {
            (other.full_scale, other.at_hz)
        } else {
            (self.full_scale, self.at_hz)
        };
        Deviation { full_scale: largest, at_hz, ratio: self.ratio.max(other.ratio) }
    }
}

/// Extremes over the bins in the band, at its ends and its center, which lie between bins.
fn extremes(band: &BandDesign, samples: &[f64], spectrum: &[Complex64], rate_hz: f64) -> Option<(f64, f64)> {
    let line = &band.band.line;
    let bin_hz = rate_hz / samples.len() as f64;
    let excepted = |at_hz: f64| band.excepted_hz.iter().any(|&(from_hz, to_hz)| from_hz <= at_hz && at_hz <= to_hz);
    let first = libm::ceil(line.from_hz / bin_hz) as usize;
    let last = (libm::floor(line.to_hz / bin_hz) as usize).min(spectrum.len() - 1);
    let bins = (first..=last).filter(|&bin| !excepted(bin as f64 * bin_hz)).map(|bin| spectrum[bin].norm_sqr());
    let ends = [line.from_hz, line.center_hz, line.to_hz].into_iter().filter(|&at_hz| !excepted(at_hz));
    let powers = bins.chain(ends.map(|at_hz| power_at(samples, at_hz / rate_hz)));
    let (least, largest) = powers.fold((f64::INFINITY, 0.0f64), |(least, largest), p| (least.min(p), largest.max(p)));
    let attenuation_db = |power: f64| (-10.0 * libm::log10(power)).clamp(-CAP_DB, CAP_DB);
    (least <= largest).then(|| (attenuation_db(largest), attenuation_db(least)))
}

/// |H|^2 at `turns` cycles a sample: the Fourier sum over the samples, block by block.
fn power_at(samples: &[f64], turns: f64) -> f64 {
    const BLOCK: usize = 256;
    const LANES: usize = 4;
    let factor = |n: usize| {
        let (sin, cos) = libm::sincos(-std::f64::consts::TAU * (n as f64 * turns % 1.0));
        Complex64::new(cos, sin)
    };
    let factors: [Complex64; BLOCK] = std::array::from_fn(factor);
    let (cos, sin) = (factors.map(|z| z.re), factors.map(|z| z.im));
    let mut sum = Complex64::new(0.0, 0.0);
    for (index, block) in samples.chunks(BLOCK).enumerate() {
        // Sums of their own in each lane: none waits for the one before.
        let (mut re, mut im) = ([0.0; LANES], [0.0; LANES]);
        for ((samples, cos), sin) in block.chunks(LANES).zip(cos.chunks(LANES)).zip(sin.chunks(LANES)) {
            for (lane, sample) in samples.iter().enumerate() {
                re[lane] += sample * cos[lane];
                im[lane] += sample * sin[lane];
            }
        }
        sum += factor(index * BLOCK) * Complex64::new(re.iter().sum(), im.iter().sum());
    }
    sum.norm_sqr()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::design;
    use crate::spec::{SpecSyntax, parse};

    fn notch(width_hz: f64) -> Design {
        let text = format!("[[stage]]\nkind = \"notch\"\ncenter_hz = 1000\nwidth_hz = {width_hz}\n");
        design(&parse(text.as_bytes(), SpecSyntax::Toml, "notch.toml").unwrap(), 48_000).unwrap()
    }

    /// The ring of a notch falls by 1 neper in rate / (pi width) frames, and 220 dB are
    /// 25.3 nepers: at 48 kHz 2^26 frames are reached at a width of 0.0058 Hz.
    #[test]
    fn a_filter_that_rings_for_hours_is_refused_before_memory_is_asked_for() {
        assert!(Layout::new(&notch(0.01), None).unwrap().frames as u64 <= LONGEST);
        for width_hz in [0.005, 1e-5, 1e-7] {
            let refused = Layout::new(&notch(width_hz), None);
            assert!(matches!(refused, Err(RecordingError::RingsTooLong { .. })), "{width_hz} Hz: {refused:?}");
        }
    }

    #[test]
    fn lengths_are_products_of_two_and_three() {
        assert_eq!([1, 5, 6, 7, 4097, 6145].map(smooth_at_least), [1, 6, 6, 8, 6144, 8192]);
        assert_eq!(smooth_at_least(LONGEST as usize) as u64, LONGEST);
    }
}
