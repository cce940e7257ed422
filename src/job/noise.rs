//! The idle device: what it adds by itself.

use super::collector::Collector;
use super::recording::Treatment;
use super::segments::{self, Passing, block_frames};
use crate::evidence::Idle;
use crate::files::open;
use crate::spectrum::SegmentPlan;
use crate::wave::{Header, InputFigures, RateMeaning, Reader, WaveError};
use std::collections::HashMap;
use std::fs::File;
use std::io;
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

/// Segment lengths whose spectra are kept: most recordings of a run share one.
const KEPT_LENGTHS: usize = 8;

/// What the idle device adds, in segments of one length.
#[derive(Debug)]
pub struct IdleSpectra {
    /// One-sided power spectra by channel.
    spectra: Vec<Vec<f64>>,
    independent_segments: usize,
    /// Of the recording itself, by channel.
    rounding_power: Vec<f64>,
}

impl IdleSpectra {
    /// For one channel of a pair; a single channel stands for all.
    pub fn channel(&self, channel: usize) -> Option<Idle<'_>> {
        let channel = if self.spectra.len() == 1 { 0 } else { channel };
        Some(Idle {
            spectrum: self.spectra.get(channel)?,
            independent_segments: self.independent_segments,
            rounding_power: *self.rounding_power.get(channel)?,
        })
    }
}

/// A recording of the idle device, measured for each segment length that a pair needs.
#[derive(Debug)]
pub struct IdleNoise {
    path: PathBuf,
    rate: Option<RateMeaning>,
    rate_hz: u32,
    channels: u16,
    frames: u64,
    figures: InputFigures,
    known: Mutex<HashMap<usize, Arc<IdleSpectra>>>,
}

/// Why a recording of the idle device does not serve.
#[derive(Debug, thiserror::Error)]
pub enum NoiseError {
    /// It can't be opened.
    #[error("the noise recording {path} can't be opened: {cause}")]
    Open {
        /// As given.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// It can't be read.
    #[error("the noise recording {path}: {cause}")]
    Read {
        /// As given.
        path: PathBuf,
        /// What is wrong.
        cause: WaveError,
    },
    /// It is not the recording any more that [`IdleNoise::open`] read.
    #[error("the noise recording {path} changed during the run: run again once nothing writes to it")]
    Changed {
        /// As given.
        path: PathBuf,
    },
    /// It has another sample rate or number of channels.
    #[error(
        "the noise recording {path} has {found}, this pair {expected}: record the idle device with the settings of \
         the recordings after"
    )]
    Unlike {
        /// As given.
        path: PathBuf,
        /// What it has.
        found: String,
        /// What the pair has.
        expected: String,
    },
    /// It is shorter than a segment of the spectrum.
    #[error(
        "the noise recording {path} has {found_s:.1} s, and the segments of this pair's spectrum {needed_s:.1} s: \
         record the idle device for longer"
    )]
    TooShort {
        /// As given.
        path: PathBuf,
        /// Its length, seconds.
        found_s: f64,
        /// A segment's, seconds.
        needed_s: f64,
    },
}

impl IdleNoise {
    /// Reads the recording at `path` once; `rate` is what frequencies mean if it is
    /// time-expanded.
    ///
    /// # Errors
    /// It is none.
    pub fn open(path: &Path, rate: Option<RateMeaning>) -> Result<Self, NoiseError> {
        let mut reader = reader(path, rate)?;
        let Header { rate_hz, channels, frames, .. } = *reader.header();
        let read = |cause| NoiseError::Read { path: path.into(), cause };
        let mut alone = Alone::new(&mut reader);
        alone.run_out().map_err(read)?;
        let figures = reader.finish().map_err(read)?;
        Ok(IdleNoise { path: path.into(), rate, rate_hz, channels, frames, figures, known: Mutex::default() })
    }

    /// SHA-256 of its file, lower-case hexadecimal.
    pub fn sha256(&self) -> &str {
        &self.figures.sha256
    }

    /// Its spectra in the segments that `plan` has for a pair with the header `pair`.
    ///
    /// # Errors
    /// See [`NoiseError`].
    pub fn spectra(
        &self,
        pair: &Header,
        plan: &SegmentPlan,
        treatment: &Treatment,
    ) -> Result<Arc<IdleSpectra>, NoiseError> {
        let unlike = |found, expected| NoiseError::Unlike { path: self.path.clone(), found, expected };
        if self.rate_hz != pair.rate_hz {
            return Err(unlike(format!("{} Hz", self.rate_hz), format!("{} Hz", pair.rate_hz)));
        }
        if self.channels != 1 && self.channels != pair.channels {
            return Err(unlike(format!("{} channels", self.channels), format!("{}", pair.channels)));
        }
        if let Some(spectra) = self.lock().get(&plan.segment_frames) {
            return Ok(Arc::clone(spectra));
        }
        let own = SegmentPlan::spread(plan.segment_frames, 0..self.frames);
        if own.starts.is_empty() {
            let seconds = |frames: f64| frames / f64::from(self.rate_hz);
            return Err(NoiseError::TooShort {
                path: self.path.clone(),
                found_s: seconds(self.frames as f64),
                needed_s: seconds(plan.segment_frames as f64),
            });
        }
        let read = |cause| NoiseError::Read { path: self.path.clone(), cause };
        let changed = || NoiseError::Changed { path: self.path.clone() };
        let mut reader = reader(&self.path, self.rate)?;
        let Header { rate_hz, channels, frames, .. } = *reader.header();
        if (rate_hz, channels, frames) != (self.rate_hz, self.channels, self.frames) {
            return Err(changed());
        }
        let channels = usize::from(channels);
        let mut alone = Alone::new(&mut reader);
        let spectra = segments::spectra(&mut alone, &own, channels, &[], &treatment.transforms).map_err(read)?;
        alone.run_out().map_err(read)?;
        // The report names it by the hash it had when it was opened.
        if reader.finish().map_err(read)?.sha256 != self.figures.sha256 {
            return Err(changed());
        }
        let spectra = Arc::new(IdleSpectra {
            spectra: spectra.into_iter().map(|spectra| spectra.syy).collect(),
            independent_segments: own.independent_segments(),
            rounding_power: self.figures.rounding_power.clone(),
        });
        let mut known = self.lock();
        if known.len() >= KEPT_LENGTHS {
            known.clear();
        }
        known.insert(plan.segment_frames, Arc::clone(&spectra));
        Ok(spectra)
    }

    /// Never to be held while measuring: a thread that waits there for the other half of a
    /// `join` may be given another pair to measure, which would wait for this lock for ever.
    /// Pairs that begin together measure the same twice instead, in the time that one of them
    /// would have waited.
    fn lock(&self) -> MutexGuard<'_, HashMap<usize, Arc<IdleSpectra>>> {
        self.known.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

fn reader(path: &Path, rate: Option<RateMeaning>) -> Result<Reader<File>, NoiseError> {
    let file = open::regular(path).map_err(|cause| NoiseError::Open { path: path.into(), cause })?;
    Reader::open_as(file, rate).map_err(|cause| NoiseError::Read { path: path.into(), cause })
}

/// One recording that stands on both sides.
struct Alone<'a> {
    reader: &'a mut Reader<File>,
    planes: Vec<Vec<f64>>,
    ended: bool,
}

impl<'a> Alone<'a> {
    fn new(reader: &'a mut Reader<File>) -> Self {
        let planes = vec![Vec::new(); usize::from(reader.header().channels)];
        Alone { reader, planes, ended: false }
    }
}

impl Passing for Alone<'_> {
    type Error = WaveError;

    fn step(&mut self, collector: Option<&mut Collector>) -> Result<(), WaveError> {
        self.planes.iter_mut().for_each(Vec::clear);
        self.ended = self.reader.read(block_frames(self.planes.len()), &mut self.planes)? == 0;
        if let Some(collector) = collector {
            collector.take(&self.planes, &self.planes);
        }
        Ok(())
    }

    fn has_ended(&self) -> bool {
        self.ended
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::design;
    use crate::job::plan::treatment;
    use crate::spec::{SpecSyntax, parse};

    const RATE_HZ: u32 = 8000;
    const FRAMES: u64 = 16_000;

    /// A recording of the idle device, whose samples are a ramp, at `path`.
    fn record(path: &Path, step: i16) {
        let spec = hound::WavSpec {
            channels: 1,
            sample_rate: RATE_HZ,
            bits_per_sample: 16,
            sample_format: hound::SampleFormat::Int,
        };
        let mut writer = hound::WavWriter::create(path, spec).unwrap();
        for frame in 0..FRAMES {
            writer.write_sample((frame % 100) as i16 * step).unwrap();
        }
        writer.finalize().unwrap();
    }

    fn any_treatment() -> Treatment {
        let text = b"[[band]]\nname = \"all\"\nfrom_hz = 100\nto_hz = 3000\n";
        let spec = parse(text, SpecSyntax::Toml, "spec.toml").unwrap();
        treatment(&spec, &design(&spec, RATE_HZ).unwrap())
    }

    fn header(path: &Path) -> Header {
        Reader::open(File::open(path).unwrap()).unwrap().header().clone()
    }

    #[test]
    fn a_recording_that_changed_since_it_was_opened_is_refused() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("idle.wav");
        record(&path, 1);
        let noise = IdleNoise::open(&path, None).unwrap();
        let (pair, plan, treatment) = (header(&path), SegmentPlan::spread(4096, 0..FRAMES), any_treatment());
        record(&path, 2);
        let refused = noise.spectra(&pair, &plan, &treatment).unwrap_err();
        assert!(matches!(refused, NoiseError::Changed { .. }), "{refused}");
        record(&path, 1);
        assert!(noise.spectra(&pair, &plan, &treatment).is_ok());
    }
}
