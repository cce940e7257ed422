//! The `fmt ` chunk: what it says about samples, and the same chunk for another format.

use super::error::WaveError;
use super::{Encoding, Form, SampleFormat, hex};

const TAG_PCM: u16 = 1;
const TAG_FLOAT: u16 = 3;
const TAG_EXTENSIBLE: u16 = 0xfffe;

/// Bytes of `fmt ` this module looks at; what follows is carried along unread.
pub(crate) const FMT_READ_BYTES: usize = 40;

/// What follows the tag in a sub-format GUID made from a format tag
/// ("Multiple Channel Audio Data and WAVE Files", Microsoft).
const GUID_TAIL: [u8; 14] = [0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71];

/// Where the numbers of `fmt ` begin and how many bytes each takes.
const FIELDS: [(usize, usize); 9] = [(0, 2), (2, 2), (4, 4), (8, 4), (12, 2), (14, 2), (16, 2), (18, 2), (20, 4)];

/// The three numbers a GUID begins with; its last eight bytes are bytes.
const GUID_FIELDS: [(usize, usize); 3] = [(24, 4), (28, 2), (30, 2)];

/// What `fmt ` says.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Fmt {
    pub(crate) channels: u16,
    pub(crate) rate_hz: u32,
    pub(crate) format: SampleFormat,
    pub(crate) notes: Vec<String>,
}

impl Encoding {
    /// Bytes of one sample.
    pub fn bytes(self) -> u16 {
        match self {
            Encoding::Pcm8 => 1,
            Encoding::Pcm16 => 2,
            Encoding::Pcm24 => 3,
            Encoding::Pcm32 | Encoding::Float32 => 4,
            Encoding::Float64 => 8,
        }
    }

    /// Whether samples are IEEE floats, which have no full scale they stop at.
    pub fn is_float(self) -> bool {
        matches!(self, Encoding::Float32 | Encoding::Float64)
    }

    fn pcm(bytes: u16) -> Option<Encoding> {
        match bytes {
            1 => Some(Encoding::Pcm8),
            2 => Some(Encoding::Pcm16),
            3 => Some(Encoding::Pcm24),
            4 => Some(Encoding::Pcm32),
            _ => None,
        }
    }
}

impl SampleFormat {
    /// The format whose valid bits fill the container.
    pub fn full(encoding: Encoding) -> SampleFormat {
        SampleFormat { encoding, valid_bits: encoding.bytes() * 8 }
    }

    /// Distance of two neighboring values, full scale 1.0: 2^-(valid bits - 1) for
    /// integers; 0 for floats, whose step follows the sample.
    pub fn step(self) -> f64 {
        // At most 32 valid bits, so the shift stays below 64.
        if self.encoding.is_float() { 0.0 } else { 2.0 / (1u64 << self.valid_bits.min(63)) as f64 }
    }
}

fn u16_at(bytes: &[u8], at: usize) -> u16 {
    match bytes.get(at..at + 2) {
        Some(&[a, b]) => u16::from_le_bytes([a, b]),
        _ => 0,
    }
}

fn u32_at(bytes: &[u8], at: usize) -> u32 {
    u32::from(u16_at(bytes, at)) | u32::from(u16_at(bytes, at + 2)) << 16
}

/// The body of `fmt ` in the other byte order, the GUID of the extensible form too if
/// `guid`. Doing it twice gives back the first.
fn swapped(body: &[u8], guid: bool) -> Vec<u8> {
    let mut body = body.to_vec();
    let guid_fields = if guid { &GUID_FIELDS[..] } else { &[] };
    for &(at, bytes) in FIELDS.iter().chain(guid_fields) {
        if let Some(field) = body.get_mut(at..at + bytes) {
            field.reverse();
        }
    }
    body
}

/// Whether the GUID of a big-endian body is big-endian too. Both are met (common
/// practice, no source), and the 0x0010 at its byte 6 tells them apart.
fn big_endian_guid(body: &[u8]) -> bool {
    body.get(30..32) != Some(&GUID_TAIL[4..6])
}

/// Names of codings by format tag, from the multimedia registry of RFC 2361.
fn coding_name(tag: u16) -> String {
    let name = match tag {
        0x0002 => "Microsoft ADPCM",
        0x0006 => "A-law",
        0x0007 => "mu-law",
        0x0010 => "OKI ADPCM",
        0x0011 => "IMA ADPCM",
        0x0014 => "G.723 ADPCM",
        0x0031 => "GSM 6.10",
        0x0040 => "G.721 ADPCM",
        0x0050 => "MPEG layer 1 or 2",
        0x0055 => "MPEG layer 3",
        0x0064 => "G.726 ADPCM",
        _ => return format!("format tag 0x{tag:04x}"),
    };
    format!("{name} (format tag 0x{tag:04x})")
}

/// Reads the body of `fmt `, whose id stands at `offset` and which holds `bytes`
/// bytes; `body` are the first [`FMT_READ_BYTES`] of them, or all.
pub(crate) fn parse(body: &[u8], bytes: u64, offset: u64, form: Form) -> Result<Fmt, WaveError> {
    if form.is_big_endian() {
        return parse(&swapped(body, big_endian_guid(body)), bytes, offset, Form::Riff);
    }
    // Tag, channels, rate, byte rate, block align, bits: 16 bytes.
    if body.len() < 16 {
        return Err(WaveError::FmtShort { offset, found: bytes, expected: 16, what: "the plain form" });
    }
    let at = |field: u64| offset + 8 + field;
    let mut notes = Vec::new();
    let tag = u16_at(body, 0);
    let fields = Fields::read(body);
    let Fields { channels, rate_hz, align, bits, .. } = fields;

    let extensible = tag == TAG_EXTENSIBLE;
    let coding = if extensible { sub_format(body, bytes, offset)? } else { tag };
    if coding != TAG_PCM && coding != TAG_FLOAT {
        let field = if extensible { 24 } else { 0 };
        return Err(WaveError::Coding { offset: at(field), coding: coding_name(coding) });
    }
    let value = |field: u64, found: String, expected: &str| WaveError::FmtValue {
        offset: at(field),
        found,
        expected: expected.to_owned(),
    };
    if channels == 0 {
        return Err(value(2, "0 channels".into(), "at least 1"));
    }
    if rate_hz == 0 {
        return Err(value(4, "a sample rate of 0 Hz".into(), "at least 1 Hz"));
    }
    let float = coding == TAG_FLOAT;
    if float && bits != 32 && bits != 64 {
        return Err(value(14, format!("{bits} bits a sample for IEEE float"), "32 or 64"));
    }
    if !float && !(1..=32).contains(&bits) {
        return Err(value(14, format!("{bits} bits a sample for PCM"), "1 to 32"));
    }
    let container = container_bytes(fields, float, offset, &mut notes)?;
    let encoding = match (float, container) {
        (true, 4) => Encoding::Float32,
        (true, _) => Encoding::Float64,
        (false, bytes) => Encoding::pcm(bytes).ok_or_else(|| {
            value(12, format!("a block align of {align} for {channels} channels"), "1 to 4 bytes a sample")
        })?,
    };

    let mut valid_bits = bits;
    if extensible {
        let declared = u16_at(body, 18);
        if float {
            if declared != bits && declared != 0 {
                notes.push(format!(
                    "`fmt ` declares {declared} valid bits (byte {}) for {bits}-bit float samples; read as {bits}",
                    at(18)
                ));
            }
        } else if declared == 0 {
            notes.push(format!("`fmt ` declares 0 valid bits (byte {}); read as {bits}", at(18)));
        } else if declared > bits {
            return Err(value(18, format!("{declared} valid bits"), &format!("1 to {bits}")));
        } else {
            valid_bits = declared;
        }
    }
    Ok(Fmt { channels, rate_hz, format: SampleFormat { encoding, valid_bits }, notes })
}

/// What both forms of `fmt ` hold after the tag.
#[derive(Clone, Copy)]
struct Fields {
    channels: u16,
    rate_hz: u32,
    /// Bytes a second.
    byte_rate: u32,
    /// Bytes a frame.
    align: u16,
    /// A sample.
    bits: u16,
}

impl Fields {
    fn read(body: &[u8]) -> Self {
        Fields {
            channels: u16_at(body, 2),
            rate_hz: u32_at(body, 4),
            byte_rate: u32_at(body, 8),
            align: u16_at(body, 12),
            bits: u16_at(body, 14),
        }
    }
}

/// The format tag inside the extension of the extensible form.
fn sub_format(body: &[u8], bytes: u64, offset: u64) -> Result<u16, WaveError> {
    if body.len() < 40 {
        return Err(WaveError::FmtShort { offset, found: bytes, expected: 40, what: "the extensible form" });
    }
    let extension = u16_at(body, 16);
    if extension < 22 || u64::from(extension) + 18 > bytes {
        return Err(WaveError::FmtValue {
            offset: offset + 24,
            found: format!("an extension of {extension} bytes in a chunk of {bytes}"),
            expected: "at least 22 and as many as the chunk holds".into(),
        });
    }
    if body[26..40] != GUID_TAIL {
        let coding = format!("sub-format {}", hex(&body[24..40]));
        return Err(WaveError::Coding { offset: offset + 32, coding });
    }
    Ok(u16_at(body, 24))
}

/// Bytes a sample takes. Bits, block align and byte rate each imply it; where they
/// disagree the majority is believed, and failing that a block align that can hold
/// the bits (24 bits in 4 bytes is legal under the plain tag).
fn container_bytes(fields: Fields, float: bool, offset: u64, notes: &mut Vec<String>) -> Result<u16, WaveError> {
    let Fields { channels, rate_hz, byte_rate, align, bits } = fields;
    let from_bits = bits.div_ceil(8);
    let frame = u64::from(channels) * u64::from(from_bits);
    let second = frame * u64::from(rate_hz);
    if u64::from(align) == frame {
        if u64::from(byte_rate) != second {
            notes.push(format!(
                "`fmt ` declares {byte_rate} bytes a second (byte {}), the other fields make {second}; not used",
                offset + 16
            ));
        }
        return Ok(from_bits);
    }
    if u64::from(byte_rate) == second {
        notes.push(format!(
            "`fmt ` declares a block align of {align} (byte {}), but bits and byte rate agree on {frame}; read as {frame}",
            offset + 20
        ));
        return Ok(from_bits);
    }
    let fits = align != 0 && align.is_multiple_of(channels) && (from_bits..=4).contains(&(align / channels)) && !float;
    if fits {
        let container = align / channels;
        notes.push(format!(
            "`fmt ` declares {bits} bits and a block align of {align} (byte {}): read as {bits} bits in the upper part of {container} bytes",
            offset + 20
        ));
        return Ok(container);
    }
    Err(WaveError::FmtValue {
        offset: offset + 20,
        found: format!(
            "a block align of {align} for {channels} channels of {bits} bits and {byte_rate} bytes a second"
        ),
        expected: format!("a block align of {frame}"),
    })
}

/// The body of a `fmt ` chunk changed to `format`: the form stays (extensible with
/// its channel mask, or plain), and so does whatever follows the known fields. A
/// plain 16-byte body gets the 2-byte extension size that the RIFF rules ask for
/// with any coding but PCM, and an empty extension goes again where PCM needs none:
/// some readers refuse it there with more than 16 bits.
pub(crate) fn rewrite(body: &[u8], channels: u16, rate_hz: u32, format: SampleFormat, form: Form) -> Vec<u8> {
    if form.is_big_endian() {
        let guid = big_endian_guid(body);
        return swapped(&rewrite(&swapped(body, guid), channels, rate_hz, format, Form::Riff), guid);
    }
    let mut new = body.to_vec();
    let extensible = u16_at(body, 0) == TAG_EXTENSIBLE;
    let tag = if format.encoding.is_float() { TAG_FLOAT } else { TAG_PCM };
    if format.encoding.is_float() && new.len() < 18 {
        new.resize(18, 0);
        new[16..18].fill(0);
    }
    if !format.encoding.is_float() && !extensible && new.len() == 18 && u16_at(body, 16) == 0 {
        new.truncate(16);
    }
    // A frame of more than 65535 bytes (thousands of channels) has no honest block
    // align; the byte rate, where it fits, still tells.
    let frame = u64::from(channels) * u64::from(format.encoding.bytes());
    let second = frame.saturating_mul(u64::from(rate_hz));
    let mut put = |at: usize, bytes: &[u8]| {
        if let Some(place) = new.get_mut(at..at + bytes.len()) {
            place.copy_from_slice(bytes);
        }
    };
    put(8, &u32::try_from(second).unwrap_or(u32::MAX).to_le_bytes());
    put(12, &u16::try_from(frame).unwrap_or(u16::MAX).to_le_bytes());
    if extensible {
        put(14, &(format.encoding.bytes() * 8).to_le_bytes());
        put(18, &format.valid_bits.to_le_bytes());
        put(24, &tag.to_le_bytes());
    } else {
        put(0, &tag.to_le_bytes());
        put(14, &format.valid_bits.to_le_bytes());
    }
    new
}
