//! Writing the output: the input with the samples of `data` replaced.

use std::io::{Read, Seek, Write};

use sha2::{Digest, Sha256};

use super::codec;
use super::error::WaveError;
use super::plan::{self, Piece, Plan};
use super::reader::Reader;
use super::{BLOCK_BYTES, Changes, ChunkFate, SampleFormat, WrittenFigures, hex};

/// Writes the output recording: the input with the samples of `data` replaced.
///
/// Needs no seeking: all sizes are known when the first byte is written.
#[derive(Debug)]
pub struct Writer<W> {
    sink: Sink<W>,
    format: SampleFormat,
    big_endian: bool,
    channels: usize,
    frames: u64,
    written: u64,
    plan: Plan,
    buffer: Vec<u8>,
    /// First byte of the samples in the output.
    samples_at: u64,
    /// Hash of the input's bytes before the samples and the output's samples, kept
    /// apart only where the output's bytes before the samples are others.
    echo: Option<Sha256>,
}

#[derive(Debug)]
struct Sink<W> {
    inner: W,
    hasher: Sha256,
    bytes: u64,
}

impl<W: Write> Sink<W> {
    fn put(&mut self, bytes: &[u8]) -> Result<(), WaveError> {
        self.inner.write_all(bytes).map_err(|source| WaveError::Io {
            doing: "writing the output",
            offset: self.bytes,
            source,
        })?;
        self.hasher.update(bytes);
        self.bytes += bytes.len() as u64;
        Ok(())
    }

    fn put_pieces<R: Read + Seek>(&mut self, pieces: &[Piece], input: &mut Reader<R>) -> Result<(), WaveError> {
        for piece in pieces {
            match piece {
                Piece::Copy { from, to } => input.copy(*from, *to, |bytes| self.put(bytes))?,
                Piece::Bytes(bytes) => self.put(bytes)?,
            }
        }
        Ok(())
    }
}

impl<W: Write> Writer<W> {
    /// Writes everything up to the first sample, taken from `input`'s file. `fmt `
    /// (and, where the new format needs it, `fact`) is rewritten only where `format`
    /// differs from the input's; sizes are always right. `input` is left standing
    /// where it was.
    ///
    /// # Errors
    /// An output beyond 32-bit sizes or with frames beyond 65535 bytes, an input that
    /// changed, and errors of the system.
    pub fn begin<R: Read + Seek>(inner: W, input: &mut Reader<R>, changes: &Changes) -> Result<Self, WaveError> {
        let plan = plan::plan(input, changes)?;
        let data_offset = input.header().data_offset;
        let mut sink = Sink { inner, hasher: Sha256::new(), bytes: 0 };
        sink.put_pieces(&plan.head, input)?;
        let samples_at = sink.bytes;
        let echo = if plan.head == [Piece::Copy { from: 0, to: data_offset }] {
            None
        } else {
            let mut hasher = Sha256::new();
            input.copy(0, data_offset, |bytes| {
                hasher.update(bytes);
                Ok(())
            })?;
            Some(hasher)
        };
        let header = input.header();
        Ok(Writer {
            sink,
            format: changes.format,
            big_endian: header.form.is_big_endian(),
            channels: usize::from(header.channels),
            frames: header.frames,
            written: 0,
            // The head is written; what it took need not be kept.
            plan: Plan { head: Vec::new(), ..plan },
            buffer: Vec::new(),
            samples_at,
            echo,
        })
    }

    /// Writes a planar block; the values are exact in the output's format (see
    /// [`crate::output::Output::shape`]).
    ///
    /// # Errors
    /// A value that is not (off the grid, out of range, not finite): nothing is ever
    /// cut off silently. Planes that do not match the recording, more frames than the
    /// input has, and errors of the system.
    pub fn write(&mut self, planes: &[Vec<f64>]) -> Result<(), WaveError> {
        let frames = planes.first().map_or(0, Vec::len);
        if planes.len() != self.channels || planes.iter().any(|p| p.len() != frames) {
            let lengths: Vec<usize> = planes.iter().map(Vec::len).take(8).collect();
            return Err(WaveError::Block {
                found: format!("{} channels of {lengths:?} frames", planes.len()),
                expected: format!("{} of equal length", self.channels),
            });
        }
        let after = self.written + frames as u64;
        if after > self.frames {
            return Err(WaveError::FrameCount { verb: "written", found: after, expected: self.frames });
        }
        let encoding = self.format.encoding;
        let first = planes
            .iter()
            .enumerate()
            .filter_map(|(c, plane)| codec::first_inexact(encoding, plane).map(|k| (k, c, plane[k])))
            .min_by_key(|&(frame, channel, _)| (frame, channel));
        if let Some((k, c, value)) = first {
            return Err(WaveError::Inexact {
                frame: self.written + k as u64,
                channel: c + 1,
                value,
                encoding: encoding.name(),
            });
        }
        let frame_bytes = usize::from(encoding.bytes()) * self.channels;
        let per_block = (BLOCK_BYTES / frame_bytes).max(1);
        let mut from = 0;
        while from < frames {
            let to = frames.min(from + per_block);
            self.buffer.resize((to - from) * frame_bytes, 0);
            codec::encode(encoding, self.big_endian, planes, from, to, &mut self.buffer);
            self.sink.put(&self.buffer)?;
            if let Some(echo) = &mut self.echo {
                echo.update(&self.buffer);
            }
            from = to;
        }
        self.written = after;
        Ok(())
    }

    /// Writes everything after the samples and flushes.
    ///
    /// `data` counts as kept if the samples written are, byte for byte, those that
    /// `input` read in the pass that just ended.
    ///
    /// # Errors
    /// Fewer frames written than the input has, an input that changed, and errors of
    /// the system.
    pub fn finish<R: Read + Seek>(mut self, input: &mut Reader<R>) -> Result<(W, WrittenFigures), WaveError> {
        if self.written != self.frames {
            return Err(WaveError::FrameCount { verb: "written", found: self.written, expected: self.frames });
        }
        let samples_end: [u8; 32] = self.echo.unwrap_or_else(|| self.sink.hasher.clone()).finalize().into();
        let data_kept = self.plan.data_frame_kept && input.samples_end() == Some(samples_end);
        self.sink.put_pieces(&self.plan.tail, input)?;
        self.sink.inner.flush().map_err(|source| WaveError::Io {
            doing: "writing the last of the output",
            offset: self.sink.bytes,
            source,
        })?;
        let data = input.layout().data;
        let chunks = input.header().chunks.iter().enumerate();
        let chunks = chunks.map(|(index, chunk)| ChunkFate {
            id: chunk.id,
            bytes: chunk.bytes,
            kept: if index == data { data_kept } else { !self.plan.rewritten.contains(&index) },
        });
        let figures = WrittenFigures {
            sha256: hex(&self.sink.hasher.finalize()),
            bytes: self.sink.bytes,
            data_offset: self.samples_at,
            chunks: chunks.collect(),
            notes: self.plan.notes,
        };
        Ok((self.sink.inner, figures))
    }
}
