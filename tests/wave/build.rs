//! Builds WAV files byte by byte, sound and otherwise.

/// One chunk as it is to stand in the file.
#[derive(Clone, Debug)]
pub struct RawChunk {
    pub id: [u8; 4],
    pub body: Vec<u8>,
    /// What the size field says, if not the length of the body.
    pub declared: Option<u32>,
    /// What follows the body; by default a zero byte after an odd one.
    pub pad: Option<Vec<u8>>,
}

pub fn raw(id: &[u8; 4], body: &[u8]) -> RawChunk {
    RawChunk { id: *id, body: body.to_vec(), declared: None, pad: None }
}

impl RawChunk {
    pub fn declaring(mut self, size: u32) -> Self {
        self.declared = Some(size);
        self
    }

    pub fn padded(mut self, pad: &[u8]) -> Self {
        self.pad = Some(pad.to_vec());
        self
    }

    fn put(&self, file: &mut Vec<u8>, big_endian: bool) {
        let size = self.declared.unwrap_or(self.body.len() as u32);
        file.extend_from_slice(&self.id);
        file.extend_from_slice(&if big_endian { size.to_be_bytes() } else { size.to_le_bytes() });
        file.extend_from_slice(&self.body);
        match &self.pad {
            Some(pad) => file.extend_from_slice(pad),
            None if self.body.len() % 2 == 1 => file.push(0),
            None => {}
        }
    }
}

/// A file of these chunks with the RIFF size that fits.
pub fn riff(chunks: &[RawChunk]) -> Vec<u8> {
    let mut file = body(b"RIFF", chunks, false);
    let size = file.len() as u32 - 8;
    file[4..8].copy_from_slice(&size.to_le_bytes());
    file
}

/// The same with big-endian sizes; bodies are the caller's.
pub fn rifx(chunks: &[RawChunk]) -> Vec<u8> {
    let mut file = body(b"RIFX", chunks, true);
    let size = file.len() as u32 - 8;
    file[4..8].copy_from_slice(&size.to_be_bytes());
    file
}

fn body(form: &[u8; 4], chunks: &[RawChunk], big_endian: bool) -> Vec<u8> {
    let mut file = [&form[..], &[0xff; 4], b"WAVE"].concat();
    for chunk in chunks {
        chunk.put(&mut file, big_endian);
    }
    file
}

/// What a `ds64` is to say, where that is not what fits.
#[derive(Clone, Debug, Default)]
pub struct Ds64 {
    pub riff: Option<u64>,
    pub data: Option<u64>,
    pub frames: u64,
    /// What the count says, if not the length of the table.
    pub entries: Option<u32>,
    pub table: Vec<([u8; 4], u64)>,
    /// Bytes after the table.
    pub more: Vec<u8>,
}

impl Ds64 {
    pub fn frames(frames: u64) -> Self {
        Ds64 { frames, ..Ds64::default() }
    }

    pub fn chunk(&self) -> RawChunk {
        let mut body = Vec::new();
        body.extend(self.riff.unwrap_or(0).to_le_bytes());
        body.extend(self.data.unwrap_or(0).to_le_bytes());
        body.extend(self.frames.to_le_bytes());
        body.extend(self.entries.unwrap_or(self.table.len() as u32).to_le_bytes());
        for (id, size) in &self.table {
            body.extend(id);
            body.extend(size.to_le_bytes());
        }
        body.extend(&self.more);
        raw(b"ds64", &body)
    }
}

/// A file of 64-bit form (EBU Tech 3306, ITU-R BS.2088): `ds64` and these chunks, the
/// size of `data` in `ds64` unless it declares another. The sizes fit unless `ds64` has others.
pub fn wide(form: &[u8; 4], ds64: &Ds64, chunks: &[RawChunk]) -> Vec<u8> {
    let mut chunks = chunks.to_vec();
    let mut ds64 = ds64.clone();
    for data in chunks.iter_mut().filter(|chunk| chunk.id == *b"data") {
        ds64.data = ds64.data.or(Some(data.body.len() as u64));
        data.declared = data.declared.or(Some(u32::MAX));
    }
    let length = body(form, &[&[ds64.chunk()][..], &chunks].concat(), false).len() as u64;
    ds64.riff = ds64.riff.or(Some(length - 8));
    body(form, &[&[ds64.chunk()][..], &chunks].concat(), false)
}

/// The fields of `fmt `.
#[derive(Clone, Copy, Debug)]
pub struct FmtFields {
    pub tag: u16,
    pub channels: u16,
    pub rate: u32,
    pub bits: u16,
    /// Bytes a sample takes.
    pub container: u16,
    /// Extensible: valid bits and channel mask.
    pub extensible: Option<(u16, u32)>,
}

pub const PCM: u16 = 1;
pub const FLOAT: u16 = 3;

impl FmtFields {
    /// Plain form, as many bits as the container has.
    pub fn plain(tag: u16, channels: u16, bits: u16) -> Self {
        FmtFields { tag, channels, rate: 48_000, bits, container: bits.div_ceil(8), extensible: None }
    }

    pub fn extensible(self, valid_bits: u16, mask: u32) -> Self {
        FmtFields { extensible: Some((valid_bits, mask)), ..self }
    }

    pub fn body(self) -> Vec<u8> {
        let align = self.channels * self.container;
        let mut body = Vec::new();
        body.extend(if self.extensible.is_some() { 0xfffe } else { self.tag }.to_le_bytes());
        body.extend(self.channels.to_le_bytes());
        body.extend(self.rate.to_le_bytes());
        body.extend((self.rate * u32::from(align)).to_le_bytes());
        body.extend(align.to_le_bytes());
        body.extend(self.bits.to_le_bytes());
        if let Some((valid_bits, mask)) = self.extensible {
            body.extend(22u16.to_le_bytes());
            body.extend(valid_bits.to_le_bytes());
            body.extend(mask.to_le_bytes());
            body.extend(self.tag.to_le_bytes());
            body.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]);
        } else if self.tag != PCM {
            body.extend(0u16.to_le_bytes());
        }
        body
    }

    pub fn chunk(self) -> RawChunk {
        raw(b"fmt ", &self.body())
    }

    /// The same body with every number big-endian, those of the GUID too if `guid`.
    pub fn big_endian(self, guid: bool) -> Vec<u8> {
        let mut body = self.body();
        let mut at = 0;
        let guid = if guid { &[4, 2, 2][..] } else { &[] };
        for bytes in [2, 2, 4, 4, 2, 2, 2, 2, 4].iter().chain(guid) {
            if let Some(field) = body.get_mut(at..at + bytes) {
                field.reverse();
            }
            at += bytes;
        }
        body
    }
}

/// A 16-bit mono recording of `frames` frames, with whatever else goes before and after.
pub fn pcm16_mono(before: &[RawChunk], frames: usize, after: &[RawChunk]) -> Vec<u8> {
    let samples: Vec<u8> = (0..frames).flat_map(|k| ((k as i16).wrapping_mul(7919)).to_le_bytes()).collect();
    let mut chunks = vec![FmtFields::plain(PCM, 1, 16).chunk()];
    chunks.extend_from_slice(before);
    chunks.push(raw(b"data", &samples));
    chunks.extend_from_slice(after);
    riff(&chunks)
}
