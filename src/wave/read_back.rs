//! Whether an output is read as it was written.

use std::io::{Read, Seek};

use super::error::WaveError;
use super::reader::Reader;
use super::{Header, SampleFormat, WrittenFigures};

/// Opens what [`super::Writer`] wrote for the recording with the header `input` and holds
/// it against what was written: format, frames, where they begin, chunks, and sizes that need
/// no repair.
///
/// Of a sound recording, and of every kind of damage that is known, the output passes. Damage
/// of several kinds at once can leave bytes that mean one thing beside the input's sizes
/// and another beside right ones; nobody should be handed such a file as whole.
///
/// # Errors
/// [`WaveError::NotReadBack`] with what is read instead, and errors of the system.
pub fn reads_back<R: Read + Seek>(
    output: R,
    input: &Header,
    format: SampleFormat,
    written: &WrittenFigures,
) -> Result<(), WaveError> {
    let differs = |found: String| {
        let offset = input.data_offset.saturating_sub(8);
        Err(WaveError::NotReadBack { offset, found })
    };
    let reader = match Reader::open(output) {
        Ok(reader) => reader,
        Err(error @ WaveError::Io { .. }) => return Err(error),
        Err(error) => return differs(format!("it would be refused: {error}")),
    };
    let (header, layout) = (reader.header(), reader.layout());
    let read = (header.format, header.channels, header.header_rate_hz, header.frames, header.data_offset);
    if read != (format, input.channels, input.header_rate_hz, input.frames, written.data_offset) {
        return differs(format!(
            "{} frames from byte {}, written were {} from byte {}",
            header.frames, header.data_offset, input.frames, written.data_offset
        ));
    }
    // Another form or encoding may add or rename these.
    let named = |id: &[u8; 4]| !matches!(id, b"fact" | b"ds64" | b"JUNK");
    let written_ids = written.chunks.iter().map(|chunk| chunk.id).filter(named);
    let read_ids = header.chunks.iter().map(|chunk| chunk.id).filter(named);
    if !written_ids.eq(read_ids) {
        return differs(format!("other chunks than were written, {} in all", header.chunks.len()));
    }
    match layout.spans.iter().find(|span| span.size_wrong) {
        Some(span) => differs(format!("a wrong size of the chunk at byte {}", span.offset)),
        None if layout.riff_size_wrong => differs("a wrong RIFF size".into()),
        None => Ok(()),
    }
}
