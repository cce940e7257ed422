//! What the mutator found, in its smallest form.

use bandproof::wave::{Encoding, Form};

use crate::check::{Outcome, check};
use crate::corpus::{Layout, fmt};
use crate::document::{Document, Ds64, Piece, piece};
use crate::random::Random;

/// Mono of 8 bits: one byte a frame.
const BYTES: Layout = Layout { encoding: Encoding::Pcm8, channels: 1, rate_hz: 8000, bits: 8, extensible: None };

fn riff(pieces: Vec<Piece>) -> Document {
    Document { form: Form::Riff, riff_size: None, ds64: None, pieces, tail: Vec::new() }
}

/// Checks a file of these chunks after `fmt `, written in each of the encodings.
fn found(document: &Document) {
    for case in 0..40 {
        let outcome = check(&document.bytes(), false, &mut Random::of_case(2, case));
        assert!(matches!(outcome, Outcome::Identical | Outcome::Repaired), "{outcome:?}");
    }
}

fn after_fmt(pieces: impl IntoIterator<Item = Piece>) -> Document {
    let mut document = riff(vec![piece(b"fmt ", fmt(Form::Riff, BYTES))]);
    document.pieces.extend(pieces);
    document
}

fn with_pad(piece: Piece, pad: &[u8]) -> Piece {
    Piece { pad: Some(pad.to_vec()), ..piece }
}

/// Samples of an odd number of bytes became an even number, and what followed them and
/// its letters one byte on were weighed anew: the output was refused for a second `fmt `.
#[test]
fn an_unknown_chunk_that_passes_the_end_hides_no_other_when_the_samples_get_another_length() {
    for samples in [b"123".to_vec(), b"1234".to_vec()] {
        let unknown = Piece { declared: Some(10_272), ..piece(b"Efmt", *b" (\0\0\0") };
        found(&after_fmt([piece(b"data", samples.clone()), unknown]));
        // The same letters behind a byte that can't be one.
        let unknown = Piece { declared: Some(84_814), ..piece(b"\xdd,JU", *b"NK\x01\0\0\0") };
        found(&after_fmt([piece(b"data", samples), unknown]));
    }
}

/// With a pad byte too many after an odd size the rest was no chunk; once the samples were of
/// an even size it was one, and the RIFF size wrong.
#[test]
fn a_chunk_behind_two_pad_bytes_is_found() {
    let document = after_fmt([with_pad(piece(b"data", *b"123"), b"\0\0"), piece(b"LIST", *b"INFO")]);
    found(&document);
    let file = document.bytes();
    let reader = bandproof::wave::Reader::open(std::io::Cursor::new(&file)).unwrap();
    assert_eq!(reader.header().chunks[2].id, *b"LIST");
}

/// The pad byte of the last chunk went to what trails it, where that began like a chunk.
#[test]
fn letters_that_trail_an_odd_chunk_leave_it_its_pad_byte() {
    let mut document = after_fmt([piece(b"data", *b"123")]);
    document.riff_size = Some(1);
    for pad in [b"\0", b"a"] {
        document.pieces[1].pad = Some(pad.to_vec());
        document.tail = b"t (\0\xff\xff\xff\xff".to_vec();
        found(&document);
        document.tail = b"trails, and says nothing of it".to_vec();
        found(&document);
    }
}

/// One that left out the pad byte was kept where the output was as long as the input, though its
/// samples had grown by that byte.
#[test]
fn a_riff_size_without_the_last_pad_byte_is_right_for_no_other_samples() {
    let mut document = after_fmt([with_pad(piece(b"data", *b"D"), b"j")]);
    document.riff_size = Some(37);
    document.tail = b"\x87\xcf\xfep\nd\xdd\x0f\x8c".to_vec();
    found(&document);
}

/// The size of `data` stood in `ds64` alone, and the output kept it so.
#[test]
fn a_size_in_ds64_alone_is_announced_where_data_has_it() {
    let mut document = after_fmt([Piece { declared: Some(0), ..piece(b"data", *b"1234") }]);
    (document.form, document.ds64) = (Form::Rf64, Some(Ds64::default()));
    found(&document);
}

/// Samples taken up to the end of the file ended in a chunk cut short, which the pad byte
/// made whole again: the output was read as other samples.
#[test]
fn a_chunk_that_a_pad_byte_would_make_whole_is_refused() {
    let body = b"12345678901234567890123456789012345678901234567890inst\x0f\0\0\0\x01\x01\x01\x01\x01\x01\x01".to_vec();
    let document = after_fmt([Piece { declared: Some(u32::MAX - 2), pad: Some(Vec::new()), ..piece(b"data", body) }]);
    let outcome = check(&document.bytes(), false, &mut Random::of_case(2, 0));
    assert!(matches!(outcome, Outcome::Refused | Outcome::Repaired), "{outcome:?}");
}

/// A `fact` whose count was set right kept its wrong size.
#[test]
fn a_fact_with_a_wrong_size_and_a_wrong_count_gets_both_right() {
    let fact = Piece { declared: Some(4), ..piece(b"fact", [0; 12]) };
    found(&riff(vec![piece(b"data", *b"123456"), fact, piece(b"fmt ", fmt(Form::Riff, BYTES))]));
}
