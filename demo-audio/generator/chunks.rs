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
