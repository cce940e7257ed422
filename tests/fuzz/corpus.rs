//! Legal files of every form, sample format and arrangement of chunks.

use bandproof::wave::{Encoding, Form};

use crate::document::{Document, Ds64, Piece, half, is_wide, piece, word};
use crate::random::Random;

pub const FORMS: [Form; 4] = [Form::Riff, Form::Rifx, Form::Rf64, Form::Bw64];

/// How samples are stored and announced.
#[derive(Clone, Copy, Debug)]
pub struct Layout {
    pub encoding: Encoding,
    pub channels: u16,
    pub rate_hz: u32,
    /// Bits in the plain field; the container may be wider.
    pub bits: u16,
    /// The extensible form, with its valid bits.
    pub extensible: Option<u16>,
}

const ENCODINGS: [Encoding; 6] =
    [Encoding::Pcm8, Encoding::Pcm16, Encoding::Pcm24, Encoding::Pcm32, Encoding::Float32, Encoding::Float64];

/// Every encoding plain and extensible, and the unusual ones: fewer valid bits than the
/// container has, under either tag.
pub fn layouts() -> Vec<Layout> {
    let mut layouts = Vec::new();
    for (index, &encoding) in ENCODINGS.iter().enumerate() {
        let bits = encoding.bytes() * 8;
        let plain = Layout {
            encoding,
            channels: [1, 2, 1, 3, 2, 1][index],
            rate_hz: [8000, 44_100, 48_000, 96_000, 250_000, 192_000][index],
            bits,
            extensible: None,
        };
        layouts.push(plain);
        layouts.push(Layout { channels: [2, 1, 6, 1, 1, 2][index], extensible: Some(bits), ..plain });
    }
    let of = |encoding, channels, bits, extensible| Layout { encoding, channels, rate_hz: 48_000, bits, extensible };
    layouts.extend([
        of(Encoding::Pcm24, 2, 20, None),
        of(Encoding::Pcm32, 1, 24, None),
        of(Encoding::Pcm24, 1, 24, Some(20)),
        of(Encoding::Pcm32, 2, 32, Some(24)),
        of(Encoding::Pcm16, 3, 16, Some(12)),
        of(Encoding::Pcm8, 40, 8, None),
    ]);
    layouts
}

/// The body of `fmt `.
pub fn fmt(form: Form, layout: Layout) -> Vec<u8> {
    let tag = if layout.encoding.is_float() { 3 } else { 1 };
    let align = layout.channels * layout.encoding.bytes();
    let mut body = Vec::new();
    body.extend(half(form, if layout.extensible.is_some() { 0xfffe } else { tag }));
    body.extend(half(form, layout.channels));
    body.extend(word(form, layout.rate_hz));
    body.extend(word(form, layout.rate_hz * u32::from(align)));
    body.extend(half(form, align));
    body.extend(half(form, layout.bits));
    if let Some(valid_bits) = layout.extensible {
        body.extend(half(form, 22));
        body.extend(half(form, valid_bits));
        body.extend(word(form, 3));
        // A GUID is a number of 32 bits, two of 16 and eight bytes.
        body.extend(word(form, u32::from(tag)));
        body.extend(half(form, 0));
        body.extend(half(form, 0x10));
        body.extend([0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]);
    } else if layout.encoding.is_float() {
        body.extend(half(form, 0));
    }
    body
}

/// Samples as bytes: finite, a few at full scale, and with nothing below the valid bits.
pub fn samples(form: Form, layout: Layout, frames: usize, random: &mut Random) -> Vec<u8> {
    let width = usize::from(layout.encoding.bytes());
    let valid_bits = layout.extensible.filter(|&bits| bits > 0).unwrap_or(layout.bits);
    let spare = layout.encoding.bytes() * 8 - valid_bits.min(layout.encoding.bytes() * 8);
    let mut bytes = Vec::new();
    for _ in 0..frames * usize::from(layout.channels) {
        let unit = (random.next() >> 11) as f64 / (1u64 << 52) as f64 - 1.0;
        let value = match random.below(16) {
            0 => unit.signum(),
            1 => 0.0,
            2 => unit * 3.0,
            _ => unit,
        };
        let little = match layout.encoding {
            Encoding::Float32 => (value as f32).to_le_bytes().to_vec(),
            Encoding::Float64 => value.to_le_bytes().to_vec(),
            Encoding::Pcm8 => vec![random.byte()],
            _ => {
                ((value * 2_147_483_648.0) as i32 >> (32 - 8 * width) >> spare << spare).to_le_bytes()[..width].to_vec()
            }
        };
        let order = |bytes: Vec<u8>| if form == Form::Rifx { bytes.into_iter().rev().collect() } else { bytes };
        bytes.extend(order(little));
    }
    bytes
}

/// A `bext` with text, a time, a version and loudness (EBU Tech 3285 v2).
fn bext(version: u16, loudness: i16, history: &str) -> Piece {
    let mut body = vec![0; 602];
    body[..12].copy_from_slice(b"Reed bed, 05");
    body[256..260].copy_from_slice(b"Rec\xff");
    body[320..338].copy_from_slice(b"2031-05-0206-10-00");
    body[346..348].copy_from_slice(&version.to_le_bytes());
    body[412..414].copy_from_slice(&loudness.to_le_bytes());
    body.extend_from_slice(history.as_bytes());
    piece(b"bext", body)
}

fn guan(text: &str) -> Piece {
    piece(b"guan", text.as_bytes())
}

fn cue() -> Piece {
    let mut body = vec![1, 0, 0, 0, 7, 0, 0, 0, 2, 0, 0, 0];
    body.extend_from_slice(b"data");
    body.resize(28, 0);
    piece(b"cue ", body)
}

/// What stands before and after the samples, by number.
fn arrangement(number: usize, form: Form, frames: u32) -> (Vec<Piece>, Vec<Piece>) {
    let fact = || piece(b"fact", word(form, frames));
    let list = || piece(b"LIST", b"INFOISFT\x04\0\0\0abc\0");
    match number % ARRANGEMENTS {
        0 => (vec![], vec![]),
        1 => (vec![fact()], vec![list()]),
        2 => (vec![bext(1, 0, "A=PCM,F=48000,W=16,M=mono,T=x\r\n"), piece(b"iXML", b"<BWFXML/>")], vec![cue()]),
        3 => (vec![piece(b"JUNK", [0; 28])], vec![guan("GUANO|Version: 1.0\nTE: 10\nSamplerate: 480000\n")]),
        4 => (vec![], vec![piece(b"smpl", [3; 36]), piece(b"inst", [1; 7])]),
        5 => (vec![piece(b"abcd", b"odd")], vec![piece(b"PEAK", [0; 16]), piece(b"x1 z", b"12345")]),
        6 => (vec![piece(b"JUNK", [0; 40]), bext(2, -2300, ""), fact()], vec![]),
        7 => (vec![guan("GUANO|Version:1.0\nTE:1")], vec![piece(b"levl", [0; 60]), list()]),
        8 => (vec![piece(b"PAD ", [0; 300])], vec![piece(b"LIST", b"adtllabl\x06\0\0\0\x07\0\0\0a\0"), cue()]),
        _ => (vec![piece(b"list", b"INFO"), piece(b"JUNK", [])], vec![piece(b"JUNK", [9; 1]), piece(b"JUNK", [])]),
    }
}

const ARRANGEMENTS: usize = 10;

/// Frames of the files: the smallest, odd ones, and one beyond a block of 64 KiB.
const FRAMES: [usize; 6] = [1, 2, 5, 17, 3, 33];

/// All of them, the same on every call.
pub fn documents() -> Vec<Document> {
    let mut random = Random::of_case(0, 0);
    let mut documents = Vec::new();
    for form in FORMS {
        for layout in layouts() {
            for _ in 0..ARRANGEMENTS / 2 {
                let number = documents.len();
                documents.push(document(form, layout, number, FRAMES[number % FRAMES.len()], &mut random));
            }
        }
    }
    documents
}

pub fn document(form: Form, layout: Layout, number: usize, frames: usize, random: &mut Random) -> Document {
    let (before, after) = arrangement(number / 2 + number % 7, form, frames as u32);
    let mut pieces = vec![piece(b"fmt ", fmt(form, layout))];
    if number % 5 == 4 {
        // `fmt ` need not be the first.
        pieces.splice(0..0, before);
    } else {
        pieces.extend(before);
    }
    pieces.push(piece(b"data", samples(form, layout, frames, random)));
    pieces.extend(after);
    let ds64 = is_wide(form).then(|| Ds64 {
        samples: number.is_multiple_of(2).then_some(frames as u64),
        table: if number.is_multiple_of(3) { vec![(*b"abcd", 3)] } else { vec![] },
        ..Ds64::default()
    });
    Document { form, riff_size: None, ds64, pieces, tail: Vec::new() }
}
