//! A WAV file as its parts, each of which may lie.

use bandproof::wave::Form;

/// A file before it is bytes.
#[derive(Clone, Debug)]
pub struct Document {
    pub form: Form,
    /// What the size at byte 4 says, if not the truth.
    pub riff_size: Option<u32>,
    /// Written as the first chunk.
    pub ds64: Option<Ds64>,
    pub pieces: Vec<Piece>,
    /// Bytes behind the last chunk, outside the RIFF.
    pub tail: Vec<u8>,
}

/// 64-bit sizes (EBU Tech 3306, ITU-R BS.2088); `None` for the true figure.
#[derive(Clone, Debug, Default)]
pub struct Ds64 {
    pub riff: Option<u64>,
    pub data: Option<u64>,
    pub samples: Option<u64>,
    pub table: Vec<([u8; 4], u64)>,
    /// Length of the table, if not the truth.
    pub entries: Option<u32>,
    pub more: Vec<u8>,
}

/// One chunk.
#[derive(Clone, Debug)]
pub struct Piece {
    pub id: [u8; 4],
    pub body: Vec<u8>,
    /// What the size says, if not the truth.
    pub declared: Option<u32>,
    /// What follows the body, if not a zero byte after an odd one.
    pub pad: Option<Vec<u8>>,
}

pub fn piece(id: &[u8; 4], body: impl Into<Vec<u8>>) -> Piece {
    Piece { id: *id, body: body.into(), declared: None, pad: None }
}

/// An integer in the byte order of a form.
pub fn word(form: Form, value: u32) -> [u8; 4] {
    if form == Form::Rifx { value.to_be_bytes() } else { value.to_le_bytes() }
}

pub fn half(form: Form, value: u16) -> [u8; 2] {
    if form == Form::Rifx { value.to_be_bytes() } else { value.to_le_bytes() }
}

/// The four letters at byte 0.
pub fn letters(form: Form) -> &'static [u8; 4] {
    match form {
        Form::Riff => b"RIFF",
        Form::Rifx => b"RIFX",
        Form::Rf64 => b"RF64",
        Form::Bw64 => b"BW64",
    }
}

/// Whether sizes are those of `ds64`.
pub fn is_wide(form: Form) -> bool {
    matches!(form, Form::Rf64 | Form::Bw64)
}

impl Document {
    pub fn bytes(&self) -> Vec<u8> {
        let mut file = Vec::with_capacity(1024);
        file.extend_from_slice(letters(self.form));
        file.extend_from_slice(b"\0\0\0\0WAVE");
        if let Some(ds64) = &self.ds64 {
            let entries = ds64.entries.unwrap_or(ds64.table.len() as u32);
            file.extend_from_slice(b"ds64");
            file.extend_from_slice(&word(self.form, (28 + 12 * ds64.table.len() + ds64.more.len()) as u32));
            file.resize(file.len() + 24, 0);
            file.extend_from_slice(&word(self.form, entries));
            for (id, size) in &ds64.table {
                file.extend_from_slice(id);
                file.extend_from_slice(&size.to_le_bytes());
            }
            file.extend_from_slice(&ds64.more);
            if ds64.more.len() % 2 == 1 {
                file.push(0);
            }
        }
        let mut data_bytes = 0;
        for piece in &self.pieces {
            let in_ds64 = &piece.id == b"data" && is_wide(self.form) && self.ds64.is_some();
            let truth = if in_ds64 { u32::MAX } else { piece.body.len() as u32 };
            if &piece.id == b"data" {
                data_bytes = piece.body.len() as u64;
            }
            file.extend_from_slice(&piece.id);
            file.extend_from_slice(&word(self.form, piece.declared.unwrap_or(truth)));
            file.extend_from_slice(&piece.body);
            match &piece.pad {
                Some(pad) => file.extend_from_slice(pad),
                None if piece.body.len() % 2 == 1 => file.push(0),
                None => {}
            }
        }
        let riff = file.len() as u64 - 8;
        let truth = if is_wide(self.form) { u32::MAX } else { riff as u32 };
        file[4..8].copy_from_slice(&word(self.form, self.riff_size.unwrap_or(truth)));
        if let Some(ds64) = &self.ds64 {
            for (at, value) in [ds64.riff.unwrap_or(riff), ds64.data.unwrap_or(data_bytes), ds64.samples.unwrap_or(0)]
                .into_iter()
                .enumerate()
            {
                file[20 + 8 * at..28 + 8 * at].copy_from_slice(&value.to_le_bytes());
            }
        }
        file.extend_from_slice(&self.tail);
        file
    }
}
