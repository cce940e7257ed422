//! The sizes of the output: RIFF, `data`, and the `ds64` that holds them where 32 bits
//! do not.

use super::chunks::Layout;
use super::ds64::{Ds64, LEAST_BYTES, OFFSET};
use super::error::WaveError;
use super::form::ELSEWHERE;
use super::plan::Draft;
use super::{Form, Header, RIFF_LIMIT_BYTES};

/// What stands first in files that leave room for `ds64` (EBU Tech 3306): a filler
/// whose content means nothing (Multimedia Programming Interface and Data
/// Specifications 1.0, 1991). Fillers of other names are not in those sources; they stay.
const PLACEHOLDER: &[u8; 4] = b"JUNK";

/// What the sizes follow from.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Lengths {
    /// Bytes of the whole output.
    pub(crate) total: u64,
    /// Bytes of the body of `data`.
    pub(crate) data: u64,
    /// Whether that body is as long as the input's, and rightly declared there.
    pub(crate) same_data: bool,
}

/// Sets every size right; whether the output is of another form than the input.
pub(crate) fn settle(
    draft: &mut Draft<'_>,
    input: &Header,
    lengths: Lengths,
    limit_bytes: u64,
) -> Result<bool, WaveError> {
    let layout = draft.layout;
    // Bytes that trail the last chunk are outside the RIFF.
    let bytes = lengths.total - layout.trailing_bytes;
    let limit = limit_bytes.min(RIFF_LIMIT_BYTES);
    // A RIFF size that leaves out the pad byte of the last chunk is right for the input
    // alone, even if the output is as long.
    let changed = !lengths.same_data || draft.growth() != (0, 0);
    match input.form {
        Form::Rf64 | Form::Bw64 => wide(draft, layout, input, lengths, bytes, changed)?,
        Form::Riff if bytes > limit => {
            widen(draft, layout, input, lengths, bytes, limit);
            return Ok(true);
        }
        Form::Rifx if bytes > limit => return Err(WaveError::TooLong { bytes, limit }),
        Form::Riff | Form::Rifx => {
            if !lengths.same_data {
                let data = layout.spans[layout.data];
                draft.overwrite(data.offset + 4, &draft.size_field(lengths.data)?);
            }
            if layout.riff_size_wrong || changed {
                draft.overwrite(4, &draft.size_field(bytes - 8)?);
            }
        }
    }
    Ok(false)
}

/// Sizes of a file that has a `ds64`. It stays byte for byte while it is right; its
/// frame count is set right when it is written anew, and only then.
fn wide(
    draft: &mut Draft<'_>,
    layout: &Layout,
    input: &Header,
    lengths: Lengths,
    bytes: u64,
    changed: bool,
) -> Result<(), WaveError> {
    let Some(ds64) = &layout.sizes.ds64 else { return Ok(()) };
    let same_length = !layout.riff_size_wrong && !changed;
    let riff_bytes = if same_length { layout.riff_declared } else { bytes - 8 };
    let riff_field = u64::from(layout.riff_field);
    if layout.riff_field != ELSEWHERE && riff_field != riff_bytes {
        draft.overwrite(4, &ELSEWHERE.to_le_bytes());
    }
    if !lengths.same_data {
        let data = layout.spans[layout.data];
        draft.overwrite(data.offset + 4, &ELSEWHERE.to_le_bytes());
    }
    let right = Ds64 { riff_bytes, data_bytes: lengths.data, declared_entries: ds64.present_entries, ..ds64.clone() };
    if right.figures() != ds64.figures() {
        let right = Ds64 { frames: input.frames, ..right };
        draft.overwrite(OFFSET + 8, &right.figures());
        draft.rewritten.push(0);
        draft.notes.push(format!(
            "`ds64` was rewritten: {riff_bytes} bytes after the first 8, {} in `data`, {} frames",
            lengths.data, input.frames
        ));
    }
    Ok(())
}

/// Makes RF64 of RIFF: a placeholder becomes the `ds64`, so that nothing moves; without
/// one a `ds64` is put in.
fn widen(draft: &mut Draft<'_>, layout: &Layout, input: &Header, lengths: Lengths, bytes: u64, limit: u64) {
    let first = layout.spans[0];
    let room = first.bytes >= LEAST_BYTES as u64 && !draft.rewritten.contains(&0);
    let place = room && (first.id == *PLACEHOLDER || first.id == *b"ds64");
    let bytes_put_in = if place { 0 } else { 8 + LEAST_BYTES as u64 };
    let ds64 = Ds64 {
        riff_bytes: bytes + bytes_put_in - 8,
        data_bytes: lengths.data,
        frames: input.frames,
        declared_entries: 0,
        present_entries: 0,
        entries: Vec::new(),
    };
    let how = if place {
        draft.overwrite(OFFSET, b"ds64");
        draft.overwrite(OFFSET + 8, &ds64.figures());
        draft.rewritten.push(0);
        format!("{} at byte {OFFSET} was turned into its `ds64`", super::error::show_bytes(&first.id))
    } else {
        let size = (LEAST_BYTES as u32).to_le_bytes();
        draft.splice(OFFSET, OFFSET, [&b"ds64"[..], &size, &ds64.figures()].concat());
        format!("a `ds64` of {bytes_put_in} bytes was put in after `WAVE`")
    };
    draft.overwrite(0, b"RF64\xff\xff\xff\xff");
    draft.overwrite(layout.spans[layout.data].offset + 4, &ELSEWHERE.to_le_bytes());
    draft.notes.push(format!("the output, longer than the {limit} bytes a RIFF file may take, became RF64: {how}"));
}
