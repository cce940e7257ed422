//! What a walk through a file finds: where each chunk begins and ends.

use super::ds64::Sizes;
use super::format::Fmt;

/// Chunks accepted in one file. Recorders write fewer than twenty; the limit keeps a
/// damaged file of zero-sized chunks from holding the walk for hours.
pub(crate) const MAX_CHUNKS: usize = 4096;

/// One chunk and where the next thing begins.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Span {
    pub(crate) id: [u8; 4],
    /// Of the id.
    pub(crate) offset: u64,
    /// Of the body, as present in the file.
    pub(crate) bytes: u64,
    /// First byte of the next chunk, of what trails, or the end of the file.
    pub(crate) next: u64,
    /// Which entry of the table in `ds64` gives its size.
    pub(crate) entry: Option<usize>,
    /// Whether another size is declared than found.
    pub(crate) size_wrong: bool,
}

impl Span {
    pub(crate) fn body(&self) -> u64 {
        self.offset + 8
    }

    pub(crate) fn end(&self) -> u64 {
        self.body() + self.bytes
    }
}

/// A walked file.
#[derive(Clone, Debug)]
pub(crate) struct Layout {
    /// Form of the file, and its `ds64` where the form has one.
    pub(crate) sizes: Sizes,
    pub(crate) spans: Vec<Span>,
    /// Index of `fmt ` and of `data` among them.
    pub(crate) fmt: usize,
    pub(crate) data: usize,
    /// What `fmt ` says, and its body.
    pub(crate) parsed: Fmt,
    pub(crate) fmt_body: Vec<u8>,
    /// Index of the first `fact`, and the number of frames it declares.
    pub(crate) fact: Option<(usize, u32)>,
    /// Bytes of whole frames in `data`.
    pub(crate) data_bytes: u64,
    /// The 32-bit RIFF size, and what is declared there or in `ds64`.
    pub(crate) riff_field: u32,
    pub(crate) riff_declared: u64,
    /// Whether the RIFF size is not what the file holds.
    pub(crate) riff_size_wrong: bool,
    /// Bytes after the last chunk that are no chunk.
    pub(crate) trailing_bytes: u64,
    pub(crate) notes: Vec<String>,
}

impl Layout {
    pub(crate) fn frame_bytes(&self) -> u64 {
        u64::from(self.parsed.channels) * u64::from(self.parsed.format.encoding.bytes())
    }
}
