//! What can happen to a file: to its parts, where they are known, and to its bytes.

use crate::corpus::FORMS;
use crate::document::{Document, Ds64, Piece, half, piece, word};
use crate::random::Random;

/// Ids that mean something, and some that do not.
const IDS: [&[u8; 4]; 20] = [
    b"fmt ",
    b"data",
    b"fact",
    b"LIST",
    b"list",
    b"wavl",
    b"ds64",
    b"JUNK",
    b"bext",
    b"guan",
    b"cue ",
    b"smpl",
    b"PEAK",
    b"RIFF",
    b"RF64",
    b"abcd",
    b"a  \0",
    b" abc",
    b"\0\0\0\0",
    b"DATA",
];

/// Sizes and counts where something may turn over.
fn size(near: u64, random: &mut Random) -> u64 {
    match random.below(12) {
        0 => 0,
        1 => 1,
        2 => u64::from(u32::MAX),
        3 => u64::from(u32::MAX) - 1 - random.below(16) as u64,
        4 => 0x7fff_ffff + random.below(2) as u64,
        5 => near.wrapping_add(1),
        6 => near.wrapping_sub(1),
        7 => near.wrapping_add(random.below(17) as u64).wrapping_sub(8),
        8 => near / 2,
        9 => near.wrapping_mul(2),
        10 => random.below(300) as u64,
        _ => random.next() >> random.below(64),
    }
}

/// The same for fields of 64 bits.
fn wide_size(near: u64, random: &mut Random) -> u64 {
    match random.below(8) {
        0 => u64::MAX,
        1 => u64::MAX - random.below(64) as u64,
        2 => i64::MAX as u64 + random.below(2) as u64,
        3 => 1 << (32 + random.below(32)),
        4 => (1 << 32) + near,
        _ => size(near, random),
    }
}

/// Does something to the parts of a file. `others` lend theirs.
pub fn restructure(document: &mut Document, others: &[Document], random: &mut Random) {
    let at = random.below(document.pieces.len());
    let total = document.pieces.iter().map(|piece| piece.body.len() as u64 + 8).sum::<u64>();
    match random.below(21) {
        20 => change_guano(document, random),
        0 => document.riff_size = Some(size(total + 4, random) as u32),
        1..4 => {
            // What a size says: near the truth, or near the end of the file.
            let to_end: u64 = document.pieces[at..].iter().map(|piece| piece.body.len() as u64 + 8).sum();
            let near = if random.one_in(2) { document.pieces[at].body.len() as u64 } else { to_end - 8 };
            document.pieces[at].declared = Some(size(near, random) as u32);
        }
        4 | 5 => {
            // Of `data` above all.
            if let Some(data) = document.pieces.iter_mut().find(|piece| &piece.id == b"data") {
                data.declared = Some(size(data.body.len() as u64, random) as u32);
            }
        }
        6 => {
            let pads: [&[u8]; 5] = [b"", b"\0", b"x", b"\0\0", b"\0\0\0"];
            document.pieces[at].pad = Some(random.pick(&pads).to_vec());
        }
        7 => {
            // A pad byte that is counted, or a body cut or grown, its size told truly.
            let body = &mut document.pieces[at].body;
            match random.below(3) {
                0 => body.push(0),
                1 => body.truncate(random.below(body.len() + 1)),
                _ => body.resize(body.len() + random.below(9), random.byte()),
            }
        }
        8 => {
            let again = document.pieces[at].clone();
            document.pieces.insert(random.below(document.pieces.len() + 1), again);
        }
        9 => {
            document.pieces.remove(at);
        }
        10 => {
            let other = random.below(document.pieces.len());
            document.pieces.swap(at, other);
        }
        11 | 12 => {
            // The end of another file, or one of its chunks.
            let lender = &others[random.below(others.len())];
            let from = random.below(lender.pieces.len());
            if random.one_in(2) {
                document.pieces.truncate(at + 1);
                document.pieces.extend_from_slice(&lender.pieces[from..]);
            } else {
                document.pieces.insert(at, lender.pieces[from].clone());
            }
        }
        13 => document.pieces[at].id = *random.pick(&IDS),
        14 => {
            let inserted = piece(random.pick(&IDS), random_body(random));
            document.pieces.insert(at, inserted);
        }
        15 => {
            document.tail = match random.below(3) {
                0 => vec![0; random.below(20)],
                1 => piece_bytes(&piece(random.pick(&IDS), random_body(random))),
                _ => random_body(random),
            }
        }
        16 => change_fmt(document, random),
        17 => document.form = random.pick(&FORMS),
        _ => change_ds64(document, total, random),
    }
    if document.pieces.is_empty() {
        document.pieces.push(piece(b"data", *b"\0\0"));
    }
}

fn random_body(random: &mut Random) -> Vec<u8> {
    let count = random.below(40);
    random.bytes(count)
}

fn piece_bytes(piece: &Piece) -> Vec<u8> {
    [&piece.id[..], &(piece.body.len() as u32).to_le_bytes(), &piece.body].concat()
}

/// Another value in one field of `fmt `.
fn change_fmt(document: &mut Document, random: &mut Random) {
    let form = document.form;
    let Some(fmt) = document.pieces.iter_mut().find(|piece| &piece.id == b"fmt ") else { return };
    let (at, wide) = random.pick(&[
        (0, false),
        (2, false),
        (4, true),
        (8, true),
        (12, false),
        (14, false),
        (16, false),
        (18, false),
        (20, true),
        (24, false),
        (26, true),
        (32, true),
    ]);
    let values = [0, 1, 2, 3, 4, 7, 8, 9, 16, 20, 22, 24, 31, 32, 33, 64, 0x11, 0x7fff, 0x8000, 0xfffe, 0xffff];
    let value: u32 = random.pick(&values);
    let bytes = if wide {
        word(form, size(u64::from(value), random) as u32).to_vec()
    } else {
        half(form, value as u16).to_vec()
    };
    if let Some(field) = fmt.body.get_mut(at..at + bytes.len()) {
        field.copy_from_slice(&bytes);
    }
}

/// Another number in the fields of GUANO that decide on the rate, or another end of line.
fn change_guano(document: &mut Document, random: &mut Random) {
    let numbers = [
        "10",
        "1",
        "0",
        "-1",
        "1e9",
        "1e-9",
        "nan",
        "inf",
        "1,5",
        "",
        " ",
        "480000",
        "9.999999999999999",
        "1e400",
        "x",
        "4294967295",
        "\u{0}",
        "0x10",
    ];
    let ends = ["\n", "\r\n", "\r", "\n\n", "\0"];
    let end = random.pick(&ends);
    let mut text =
        format!("GUANO|Version: 1.0{end}TE:{}{end}Samplerate: {}", random.pick(&numbers), random.pick(&numbers));
    if random.one_in(2) {
        text += random.pick(&ends);
    }
    let mut body = text.into_bytes();
    body.resize(body.len() + random.below(3) * random.below(90), 0);
    match document.pieces.iter_mut().find(|piece| &piece.id == b"guan") {
        Some(guan) => guan.body = body,
        None => document.pieces.push(piece(b"guan", body)),
    }
}

fn change_ds64(document: &mut Document, total: u64, random: &mut Random) {
    let data = document.pieces.iter().find(|piece| &piece.id == b"data").map_or(0, |piece| piece.body.len() as u64);
    let ids: Vec<_> = document.pieces.iter().map(|piece| piece.id).collect();
    let Some(ds64) = &mut document.ds64 else {
        // Where it does not belong, now and then; else another size for `data`.
        if random.one_in(8) {
            document.ds64 = Some(Ds64::default());
        } else if let Some(data) = document.pieces.iter_mut().find(|piece| &piece.id == b"data") {
            data.declared = Some(size(total, random) as u32);
        }
        return;
    };
    match random.below(8) {
        0 => ds64.riff = Some(wide_size(total + 4, random)),
        1 | 2 => ds64.data = Some(wide_size(data, random)),
        3 => ds64.samples = Some(wide_size(data, random)),
        4 => ds64.entries = Some(size(ds64.table.len() as u64, random) as u32),
        5 => {
            // A size of 64 bits for a chunk that asks for it, or for none.
            let at = random.below(ids.len());
            let near = document.pieces[at].body.len() as u64;
            let entry = if random.one_in(3) { wide_size(near, random) } else { near };
            ds64.table.push((ids[at], entry));
            if !random.one_in(3) {
                document.pieces[at].declared = Some(u32::MAX);
            }
        }
        6 => ds64.more = random_body(random),
        _ => document.ds64 = None,
    }
}

/// Does something to the bytes of a file, with an eye on what may be sizes.
pub fn strike(file: &mut Vec<u8>, other: &[u8], random: &mut Random) {
    let at = random.below(file.len() + 1);
    let bytes = file.len();
    match random.below(12) {
        0 => {
            if let Some(byte) = file.get_mut(at) {
                *byte ^= 1 << random.below(8);
            }
        }
        1 => {
            let any = random.byte();
            let value = random.pick(&[0, 1, 0x7f, 0x80, 0xfe, 0xff, b' ', any]);
            if let Some(byte) = file.get_mut(at) {
                *byte = value;
            }
        }
        2 | 3 => {
            // A word that may be a size, in either byte order; near the end of the file.
            let near = if random.one_in(2) { bytes.saturating_sub(at + 4) } else { bytes.saturating_sub(8) };
            let value = size(near as u64, random) as u32;
            let word = if random.one_in(4) { value.to_be_bytes() } else { value.to_le_bytes() };
            let at = if random.one_in(4) { at } else { at & !1 };
            if let Some(field) = file.get_mut(at..at + 4) {
                field.copy_from_slice(&word);
            }
        }
        4 => file.truncate(at),
        // Within a few bytes of the end, where pad bytes and last frames are.
        5 => file.truncate(bytes.saturating_sub(random.below(20))),
        6 => {
            let end = (at + random.below(24)).min(bytes);
            file.drain(at..end);
        }
        7 => {
            let count = 1 + random.below(24);
            let inserted = if random.one_in(2) { random.bytes(count) } else { vec![0; count] };
            file.splice(at..at, inserted);
        }
        8 => {
            let end = (at + random.below(60)).min(bytes);
            let again = file[at..end].to_vec();
            let to = random.below(bytes + 1);
            file.splice(to..to, again);
        }
        9 => {
            // The end of another file in place of this one's.
            file.truncate(at);
            file.extend_from_slice(&other[random.below(other.len() + 1)..]);
        }
        10 => {
            let id = random.pick(&IDS);
            let at = at & !1;
            if let Some(field) = file.get_mut(at..at + 4) {
                field.copy_from_slice(id);
            }
        }
        _ => {
            let end = (at + random.below(16)).min(bytes);
            let value = random.pick(&[0, 0xff]);
            file[at..end].fill(value);
        }
    }
}
