//! The four forms of a file and how each writes its numbers.

use super::Form;

/// Stands in a 32-bit size field for "see `ds64`" (EBU Tech 3306), and for "not known
/// yet" in files never finished.
pub(crate) const ELSEWHERE: u32 = u32::MAX;

impl Form {
    /// The four letters a file begins with.
    pub fn name(self) -> &'static str {
        match self {
            Form::Riff => "RIFF",
            Form::Rifx => "RIFX",
            Form::Rf64 => "RF64",
            Form::Bw64 => "BW64",
        }
    }

    pub(crate) const ALL: [Form; 4] = [Form::Riff, Form::Rifx, Form::Rf64, Form::Bw64];

    /// The form whose files begin with `id`.
    pub(crate) fn of(id: &[u8]) -> Option<Form> {
        Form::ALL.into_iter().find(|form| form.name().as_bytes() == id)
    }

    /// Whether numbers have their highest byte first.
    pub fn is_big_endian(self) -> bool {
        self == Form::Rifx
    }

    /// Whether sizes may be of 64 bits.
    pub fn is_wide(self) -> bool {
        matches!(self, Form::Rf64 | Form::Bw64)
    }

    /// A number of 32 bits as the file has it.
    pub(crate) fn read_u32(self, bytes: [u8; 4]) -> u32 {
        if self.is_big_endian() { u32::from_be_bytes(bytes) } else { u32::from_le_bytes(bytes) }
    }

    /// A number of 32 bits as the file is to have it.
    pub(crate) fn write_u32(self, value: u32) -> [u8; 4] {
        if self.is_big_endian() { value.to_be_bytes() } else { value.to_le_bytes() }
    }
}
