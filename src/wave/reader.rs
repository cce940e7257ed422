//! Reading a recording: samples in order, every byte of the file hashed on the way.

use std::io::{Read, Seek};

use sha2::{Digest, Sha256};

use super::chunks::Layout;
use super::codec;
use super::error::WaveError;
use super::figures::{BelowValid, FullScale, UlpPower, rounding_power};
use super::form::ELSEWHERE;
use super::guano::{self, RateMeaning};
use super::source::Source;
use super::{BLOCK_BYTES, Chunk, Encoding, Header, InputFigures, hex, stale, walk};

/// Reads a recording's samples in order, hashing every byte of the file on the way.
///
/// Memory does not grow with the recording: bytes pass in blocks of 64 KiB.
#[derive(Debug)]
pub struct Reader<R> {
    source: Source<R>,
    header: Header,
    layout: Layout,
    pass: Pass,
    buffer: Vec<u8>,
}

/// What one pass over the samples has gathered.
#[derive(Debug)]
struct Pass {
    next_frame: u64,
    /// Whether samples only pass, neither hashed nor counted.
    skimming: bool,
    /// Whether the bytes before the samples are in `hasher` yet.
    head_hashed: bool,
    hasher: Sha256,
    /// The hash of everything up to the end of the last frame.
    samples_end: Option<[u8; 32]>,
    full_scale: Vec<FullScale>,
    ulp: Vec<UlpPower>,
    below_valid: Option<BelowValid>,
    figures: Option<InputFigures>,
}

impl Pass {
    fn new(header: &Header) -> Self {
        let channels = usize::from(header.channels);
        Pass {
            next_frame: 0,
            skimming: false,
            head_hashed: false,
            hasher: Sha256::new(),
            samples_end: None,
            full_scale: vec![FullScale::new(header.format); channels],
            ulp: vec![UlpPower::default(); channels],
            below_valid: BelowValid::new(header.format),
            figures: None,
        }
    }
}

impl<R: Read + Seek> Reader<R> {
    /// Reads the chunk structure and stands before the first sample.
    ///
    /// # Errors
    /// Whatever makes the recording unreadable (see [`WaveError`]); damage that leaves
    /// whole frames to be read is no error but a note in the [`Header`].
    pub fn open(inner: R) -> Result<Self, WaveError> {
        let mut source = Source::new(inner)?;
        let layout = walk::walk(&mut source)?;
        let header = header(&mut source, &layout)?;
        let pass = Pass::new(&header);
        Ok(Reader { source, header, layout, pass, buffer: Vec::new() })
    }

    /// As [`Self::open`], and settles which sample rate frequencies mean: the header's,
    /// unless GUANO metadata says that the recording is time-expanded. With
    /// [`RateMeaning::Acoustic`] [`Header::rate_hz`] is then the rate at which sound was
    /// sampled. Recordings that are not time-expanded are the same under any `meaning`.
    ///
    /// # Errors
    /// Those of [`Self::open`]. A time-expanded recording without a `meaning`; a `TE` (or,
    /// where that is missing, a `Samplerate`) that can't be read, unless the header's rate is
    /// meant; fields that contradict each other, or an acoustic rate that is no whole number
    /// of Hz within 32 bits, where it is the one meant.
    pub fn open_as(inner: R, meaning: Option<RateMeaning>) -> Result<Self, WaveError> {
        let mut reader = Self::open(inner)?;
        guano::resolve(&mut reader.header, meaning)?;
        Ok(reader)
    }

    /// What the header says.
    pub fn header(&self) -> &Header {
        &self.header
    }

    /// Appends up to `frames` frames to `planes` (one `Vec` a channel) and returns
    /// how many; 0 after the last.
    ///
    /// Integers are divided by 2^(n-1) with n the bits of the container, so that bits
    /// below the valid ones come through; floats as they are. All conversions are
    /// exact.
    ///
    /// # Errors
    /// A NaN or infinite sample (the first one, by its frame and channel), a file that
    /// changed since it was opened, and errors of the system.
    pub fn read(&mut self, frames: usize, planes: &mut [Vec<f64>]) -> Result<usize, WaveError> {
        if planes.len() != usize::from(self.header.channels) {
            return Err(WaveError::Block {
                found: format!("{} channels", planes.len()),
                expected: format!("{}", self.header.channels),
            });
        }
        if !self.pass.head_hashed && !self.pass.skimming {
            let hasher = &mut self.pass.hasher;
            self.source.copy(0, self.header.data_offset, "reading the header", |bytes| {
                hasher.update(bytes);
                Ok(())
            })?;
            self.pass.head_hashed = true;
        }
        let frame_bytes = self.layout.frame_bytes();
        let per_block = (BLOCK_BYTES as u64 / frame_bytes).max(1);
        let mut done = 0;
        loop {
            let n = per_block.min((frames - done) as u64).min(self.header.frames - self.pass.next_frame);
            if n == 0 {
                return Ok(done);
            }
            self.read_block(n, frame_bytes, planes)?;
            done += n as usize;
        }
    }

    fn read_block(&mut self, frames: u64, frame_bytes: u64, planes: &mut [Vec<f64>]) -> Result<(), WaveError> {
        let offset = self.header.data_offset + self.pass.next_frame * frame_bytes;
        self.buffer.resize((frames * frame_bytes) as usize, 0);
        self.source.read_at(offset, &mut self.buffer, "reading samples")?;
        if !self.pass.skimming {
            self.pass.hasher.update(&self.buffer);
        }
        let starts: Vec<usize> = planes.iter().map(Vec::len).collect();
        codec::decode(self.header.format.encoding, self.header.form.is_big_endian(), &self.buffer, planes);

        let blocks = || planes.iter().zip(&starts).map(|(plane, &start)| &plane[start..]);
        if self.header.format.encoding.is_float() {
            let first = blocks()
                .enumerate()
                .filter_map(|(c, block)| codec::first_where(block, f64::is_finite).map(|k| (k, c, block[k])))
                .min_by_key(|&(frame, channel, _)| (frame, channel));
            if let Some((k, c, value)) = first {
                let frame = self.pass.next_frame + k as u64;
                let sample = u64::from(self.header.format.encoding.bytes()) * c as u64;
                let offset = self.header.data_offset + frame * frame_bytes + sample;
                return Err(WaveError::NotFinite { offset, frame, channel: c + 1, value });
            }
        }
        if self.pass.skimming {
            self.pass.next_frame += frames;
            return Ok(());
        }
        for (block, full_scale) in blocks().zip(&mut self.pass.full_scale) {
            full_scale.add(block);
        }
        if self.header.format.encoding == Encoding::Float32 {
            for (block, ulp) in blocks().zip(&mut self.pass.ulp) {
                ulp.add(block);
            }
        }
        if let Some(below_valid) = &mut self.pass.below_valid {
            blocks().for_each(|block| below_valid.add(block));
        }
        self.pass.next_frame += frames;
        if self.pass.next_frame == self.header.frames {
            self.pass.samples_end = Some(self.pass.hasher.clone().finalize().into());
        }
        Ok(())
    }

    /// Stands before the first sample again for a pass that only looks at samples: nothing is
    /// hashed or counted, so [`Self::finish`] needs another [`Self::rewind`] first.
    pub fn skim(&mut self) {
        self.pass = Pass { skimming: true, ..Pass::new(&self.header) };
    }

    /// Stands before the first sample again, with nothing hashed or counted; the next
    /// read seeks.
    pub fn rewind(&mut self) {
        self.pass = Pass::new(&self.header);
    }

    /// Hashes what follows the samples and gives the figures of the whole file.
    /// To be called after the last sample has been read; a second call gives the same.
    ///
    /// # Errors
    /// Samples not read yet; samples that stand in the lower part of their containers,
    /// which only all of them together can show; a file that changed since it was opened, and errors of
    /// the system.
    pub fn finish(&mut self) -> Result<InputFigures, WaveError> {
        if let Some(figures) = &self.pass.figures {
            return Ok(figures.clone());
        }
        let read = if self.pass.skimming { 0 } else { self.pass.next_frame };
        if read != self.header.frames {
            return Err(WaveError::FrameCount { verb: "read", found: read, expected: self.header.frames });
        }
        let end = self.header.data_offset + self.header.data_bytes;
        let hasher = &mut self.pass.hasher;
        self.source.copy(end, self.header.file_bytes, "reading what follows the samples", |bytes| {
            hasher.update(bytes);
            Ok(())
        })?;
        self.source.check_length()?;
        let mut notes = Vec::new();
        if let Some(below_valid) = &self.pass.below_valid {
            let valid_bits = self.header.format.valid_bits;
            if below_valid.lower_part() {
                return Err(WaveError::LowerPart {
                    offset: self.header.data_offset,
                    valid_bits,
                    container_bytes: self.header.format.encoding.bytes(),
                });
            }
            if below_valid.set > 0 {
                notes.push(format!(
                    "{} samples carry bits below the {valid_bits} valid ones; filtering rounds them away",
                    below_valid.set
                ));
            }
        }
        let figures = InputFigures {
            sha256: hex(&self.pass.hasher.clone().finalize()),
            bytes: self.header.file_bytes,
            full_scale_runs: self.pass.full_scale.iter().map(|f| f.runs).sum(),
            rounding_power: self.pass.ulp.iter().map(|ulp| rounding_power(self.header.format, ulp)).collect(),
            notes,
        };
        self.pass.figures = Some(figures.clone());
        Ok(figures)
    }

    pub(crate) fn layout(&self) -> &Layout {
        &self.layout
    }

    /// The hash of everything up to the end of the last frame, once that was read.
    pub(crate) fn samples_end(&self) -> Option<[u8; 32]> {
        self.pass.samples_end
    }

    /// Hands the file's bytes from `from` to `to` to `take`; samples go on where they
    /// were.
    pub(crate) fn copy(
        &mut self,
        from: u64,
        to: u64,
        take: impl FnMut(&[u8]) -> Result<(), WaveError>,
    ) -> Result<(), WaveError> {
        self.source.copy(from, to, "copying chunks of the input", take)
    }
}

fn header<R: Read + Seek>(source: &mut Source<R>, layout: &Layout) -> Result<Header, WaveError> {
    let data = layout.spans[layout.data];
    let frames = layout.data_bytes / layout.frame_bytes();
    let mut notes = layout.notes.clone();
    let form = layout.sizes.form;
    let mut stale = Vec::new();
    for (index, span) in layout.spans.iter().enumerate() {
        stale.extend(stale::gives(source, span, form)?.map(|what| (index, what)));
    }
    // EBU Tech 3306: a count that needs more than 32 bits stands in `ds64`.
    if let Some((index, declared)) = layout.fact
        && u64::from(declared) != frames
        && !(form.is_wide() && declared == ELSEWHERE)
    {
        notes.push(format!(
            "`fact` at byte {} declares {declared} frames, `data` holds {frames}; not used",
            layout.spans[index].offset
        ));
    }
    let guano = guano::read(source, &layout.spans)?;
    notes.extend(guano.iter().flat_map(|guano| guano.notes.iter().cloned()));
    Ok(Header {
        form,
        channels: layout.parsed.channels,
        rate_hz: layout.parsed.rate_hz,
        header_rate_hz: layout.parsed.rate_hz,
        format: layout.parsed.format,
        frames,
        chunks: layout.spans.iter().map(|s| Chunk { id: s.id, offset: s.offset, bytes: s.bytes }).collect(),
        data_offset: data.body(),
        data_bytes: layout.data_bytes,
        file_bytes: source.bytes(),
        stale,
        guano,
        notes,
    })
}
