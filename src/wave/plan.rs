//! What the output holds outside the samples, decided before its first byte.

use std::io::{Read, Seek};

use super::chunks::Layout;
use super::error::WaveError;
use super::reader::Reader;
use super::{Header, SampleFormat, format};

/// One piece of the output outside the samples.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) enum Piece {
    /// Bytes of the input.
    Copy { from: u64, to: u64 },
    /// Bytes of our own.
    Bytes(Vec<u8>),
}

impl Piece {
    fn bytes(&self) -> u64 {
        match self {
            Piece::Copy { from, to } => to - from,
            Piece::Bytes(bytes) => bytes.len() as u64,
        }
    }
}

/// What stands before and after the samples.
#[derive(Clone, Debug)]
pub(crate) struct Plan {
    pub(crate) head: Vec<Piece>,
    pub(crate) tail: Vec<Piece>,
    pub(crate) data_bytes: u64,
    /// Whether `data` as a whole (its size, and what is left after its last frame)
    /// would be the input's if the samples were.
    pub(crate) data_frame_kept: bool,
    /// Indices of chunks that were rewritten.
    pub(crate) rewritten: Vec<usize>,
    pub(crate) notes: Vec<String>,
}

impl Plan {
    fn total(&self) -> u64 {
        self.head.iter().chain(&self.tail).map(Piece::bytes).sum::<u64>() + self.data_bytes
    }
}

/// A chunk with its header and, for an odd body, a zero pad byte.
fn chunk(id: &[u8; 4], body: &[u8]) -> Vec<u8> {
    // Bodies written here are at most the 65535 bytes of a `fmt `.
    let mut bytes = [&id[..], &(body.len() as u32).to_le_bytes(), body].concat();
    if body.len() % 2 == 1 {
        bytes.push(0);
    }
    bytes
}

/// Decides every byte outside the samples. An unchanged layout is copied whole;
/// otherwise `fmt `, `fact` and sizes are written anew and all else is copied.
pub(crate) fn plan<R: Read + Seek>(input: &Reader<R>, format: SampleFormat) -> Result<Plan, WaveError> {
    let layout = input.layout();
    let header = input.header();
    let data = layout.spans[layout.data];
    let samples_end = header.data_offset + header.data_bytes;
    let same_format = format == header.format;
    let same_layout = same_format && !layout.data_size_wrong;
    let mut plan = Plan {
        head: Vec::new(),
        tail: Vec::new(),
        data_bytes: header.data_bytes,
        data_frame_kept: same_layout,
        rewritten: Vec::new(),
        notes: Vec::new(),
    };
    if same_layout {
        plan.tail.push(Piece::Copy { from: samples_end, to: header.file_bytes });
        if !layout.riff_size_wrong {
            plan.head.push(Piece::Copy { from: 0, to: header.data_offset });
            return Ok(plan);
        }
        plan.head.push(Piece::Copy { from: 12, to: header.data_offset });
    } else {
        let frame_bytes = u64::from(header.channels) * u64::from(format.encoding.bytes());
        if frame_bytes > u64::from(u16::MAX) {
            return Err(WaveError::FrameTooWide { bytes: frame_bytes });
        }
        plan.data_bytes = header.frames * frame_bytes;
        head_pieces(header, layout, format, &mut plan);
        plan.head.push(Piece::Bytes([b"data", &size_field(plan.data_bytes)?[..]].concat()));
        if plan.data_bytes % 2 == 1 {
            plan.tail.push(Piece::Bytes(vec![0]));
        }
        plan.tail.push(Piece::Copy { from: data.next, to: header.file_bytes });
        if !same_format && !layout.data_size_wrong && data.bytes > header.data_bytes {
            plan.notes.push(format!(
                "{} bytes after the last whole frame were left out with the change of encoding",
                data.bytes - header.data_bytes
            ));
        }
    }
    // Bytes that trail the last chunk are outside the RIFF.
    let riff_bytes = 4 + plan.total() - layout.trailing_bytes;
    let riff = [b"RIFF", &size_field(riff_bytes)?[..], b"WAVE"].concat();
    plan.head.insert(0, Piece::Bytes(riff));
    Ok(plan)
}

fn size_field(bytes: u64) -> Result<[u8; 4], WaveError> {
    // 0xffffffff is what unfinished files and 64-bit relatives write.
    match u32::try_from(bytes) {
        Ok(size) if size != u32::MAX => Ok(size.to_le_bytes()),
        _ => Err(WaveError::TooLong { bytes: bytes.saturating_add(8) }),
    }
}

/// Everything between the RIFF header and `data`. Float samples need a `fact` chunk
/// with their number (Multimedia Programming Interface and Data Specifications 1.0,
/// 1991: required for any coding but PCM); one that is there is set right.
fn head_pieces(input: &Header, layout: &Layout, format: SampleFormat, plan: &mut Plan) {
    let data = layout.spans[layout.data];
    // A count beyond 32 bits would need a file beyond 32-bit sizes.
    let count = u32::try_from(input.frames).unwrap_or(u32::MAX).to_le_bytes();
    let mut copied = 12;
    for (index, span) in layout.spans[..layout.data].iter().enumerate() {
        if index == layout.fmt && format != input.format {
            plan.head.push(Piece::Copy { from: copied, to: span.offset });
            let body = format::rewrite(&layout.fmt_body, input.channels, input.rate_hz, format);
            plan.head.push(Piece::Bytes(chunk(b"fmt ", &body)));
            copied = span.next;
            plan.rewritten.push(index);
            plan.notes.push(format!("`fmt ` was rewritten for {}", format.encoding.name()));
            if format.encoding.is_float() && layout.fact.is_none() {
                plan.head.push(Piece::Bytes(chunk(b"fact", &count)));
                plan.notes.push("a `fact` chunk was added after `fmt `, as float samples require one".into());
            }
        } else if let Some((fact, declared)) = layout.fact
            && fact == index
            && declared.to_le_bytes() != count
        {
            plan.head.push(Piece::Copy { from: copied, to: span.body() });
            plan.head.push(Piece::Bytes(count.to_vec()));
            copied = span.body() + 4;
            plan.rewritten.push(index);
            plan.notes.push(format!("`fact` was corrected from {declared} to {} frames", input.frames));
        }
    }
    plan.head.push(Piece::Copy { from: copied, to: data.offset });
}
