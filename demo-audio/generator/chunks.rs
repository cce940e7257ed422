//! RIFF chunks around the samples.

/// A chunk: four letters and what it holds.
pub struct Chunk {
    /// Identifier.
    pub id: [u8; 4],
    /// Contents, without the pad byte that follows an odd length.
    pub body: Vec<u8>,
}

impl Chunk {
    /// A chunk of these contents.
    pub fn new(id: &[u8; 4], body: impl Into<Vec<u8>>) -> Self {
        Self { id: *id, body: body.into() }
    }

    /// Identifier, size, contents, pad byte.
    pub fn bytes(&self) -> Vec<u8> {
        let mut out = self.id.to_vec();
        out.extend((self.body.len() as u32).to_le_bytes());
        out.extend(&self.body);
        if self.body.len() % 2 == 1 {
            out.push(0);
        }
        out
    }
}

/// A plain recording with chunks put in before and after its samples.
///
/// `plain` is a RIFF file of whole chunks, as just written; anything from its `data` chunk
/// on but that chunk is dropped.
pub fn insert(plain: &[u8], before: &[Chunk], after: &[Chunk]) -> Vec<u8> {
    let mut body = b"WAVE".to_vec();
    let mut rest = plain.get(12..).unwrap_or_default();
    while let Some((head, following)) = rest.split_first_chunk::<8>() {
        let [a, b, c, d, size @ ..] = *head;
        let size = (u32::from_le_bytes(size) as usize).min(following.len());
        let chunk = Chunk::new(&[a, b, c, d], &following[..size]);
        let is_data = chunk.id == *b"data";
        if is_data {
            before.iter().for_each(|c| body.extend(c.bytes()));
        }
        body.extend(chunk.bytes());
        if is_data {
            break;
        }
        rest = following.get(size + size % 2..).unwrap_or_default();
    }
    after.iter().for_each(|c| body.extend(c.bytes()));
    let mut out = b"RIFF".to_vec();
    out.extend((body.len() as u32).to_le_bytes());
    out.extend(body);
    out
}

/// `plain` as a recorder leaves it whose battery ends before it has gone back to write the
/// sizes: both 0, and the last frame half on the card.
pub fn unfinished(plain: &[u8]) -> Vec<u8> {
    let (head, samples) = split(plain);
    let mut out = head.to_vec();
    for size in [4..8, head.len() - 4..head.len()] {
        out[size].fill(0);
    }
    out.extend(&samples[..samples.len() - 1]);
    out
}

/// `plain`, which has `frames` frames, with 64-bit sizes: RF64 as in EBU Tech 3306, `ds64`
/// in front and 0xffffffff where sizes of 32 bits stood.
pub fn rf64(plain: &[u8], frames: usize) -> Vec<u8> {
    /// What `ds64` takes with its header.
    const DS64_BYTES: usize = 36;
    let (head, samples) = split(plain);
    let riff_bytes = DS64_BYTES + plain.len() - 8;
    let mut sizes = [riff_bytes, samples.len(), frames].map(|size| (size as u64).to_le_bytes()).concat();
    // No other chunk needs a size of 64 bits.
    sizes.extend(0u32.to_le_bytes());
    let unknown = [0xff; 4];
    let between = &head[12..head.len() - 4];
    let parts: [&[u8]; 7] =
        [b"RF64", &unknown, b"WAVE", &Chunk::new(b"ds64", sizes).bytes(), between, &unknown, samples];
    parts.concat()
}

/// The file up to the samples, and those; nothing follows them where hound wrote the file.
fn split(plain: &[u8]) -> (&[u8], &[u8]) {
    let data = plain.windows(4).position(|id| id == b"data").unwrap_or(0);
    plain.split_at(data + 8)
}
