//! Laws that hold whatever stands in the chunks.

use crate::build::{FmtFields, PCM, RawChunk, raw, riff};
use crate::chunks::{BEXT_BYTES, all_chunks, bext, bodies, riff_size_fits};
use crate::history::rewritten;
use bandproof::wave::{RateMeaning, Reader};
use proptest::prelude::*;
use std::io::Cursor;

fn recording(chunk: RawChunk) -> Vec<u8> {
    riff(&[FmtFields::plain(PCM, 1, 16).chunk(), chunk, raw(b"data", &[0; 40])])
}

/// Pieces of which GUANO texts, sound and damaged, are made.
fn piece() -> impl Strategy<Value = Vec<u8>> {
    let words: Vec<&[u8]> = vec![
        b"GUANO|Version: 1.0",
        b"TE",
        b"TE: ",
        b"Samplerate: ",
        b"10",
        b"1",
        b"0",
        b"-3",
        b"10.0",
        b"10,0",
        b"480000",
        b"48000",
        b"48000.5",
        b"1e3",
        b"1e400",
        b"nan",
        b":",
        b"|",
        b"\n",
        b"\n",
        b"\r\n",
        b"\r",
        b"\0",
        b"\0\0\0\0",
        b" ",
        b"\t",
        b"Bandproof|History",
        b"Bandproof|History: x",
        b"Bandproof|History 4294967295: x",
        b"\xef\xbb\xbf",
        b"Note: caf\xc3\xa9",
        b"\xff\xfe",
    ];
    prop_oneof![
        6 => proptest::sample::select(words).prop_map(<[u8]>::to_vec),
        1 => proptest::collection::vec(any::<u8>(), 0..20),
    ]
}

fn text() -> impl Strategy<Value = Vec<u8>> {
    proptest::collection::vec(piece(), 0..20).prop_map(|pieces| pieces.concat())
}

fn without_padding(body: &[u8]) -> &[u8] {
    &body[..body.len() - body.iter().rev().take_while(|&&byte| byte == 0).count()]
}

/// What was appended to a body: it must begin as that did, and what is left behind must be
/// padding.
fn appended<'b>(then: &[u8], now: &'b [u8]) -> &'b [u8] {
    assert!(now.len() >= then.len());
    now.strip_prefix(then).unwrap()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn any_text_is_read_and_any_meaning_ends_in_a_rate_or_a_sentence(text in text()) {
        let file = recording(raw(b"guan", &text));
        let plain = Reader::open(Cursor::new(&file)).unwrap().header().clone();
        prop_assert_eq!((plain.rate_hz, plain.header_rate_hz), (48_000, 48_000));
        let open = |meaning| Reader::open_as(Cursor::new(&file), meaning).map(|reader| reader.header().clone());
        let [none, header, acoustic] = [None, Some(RateMeaning::Header), Some(RateMeaning::Acoustic)].map(open);
        // The header's rate can always be meant.
        prop_assert_eq!(header.unwrap().rate_hz, 48_000);
        match (none, acoustic) {
            // Not time-expanded: no meaning changes anything.
            (Ok(none), acoustic) => {
                prop_assert_eq!(none.rate_hz, 48_000);
                prop_assert_eq!(acoustic.unwrap(), none);
            }
            (Err(why), Ok(acoustic)) => {
                prop_assert!(acoustic.rate_hz > 0);
                prop_assert!(why.to_string().contains("rate = \"acoustic\""), "{}", why);
            }
            (Err(why), Err(other)) => {
                for error in [why, other] {
                    let said = error.to_string();
                    prop_assert!(said.starts_with("byte ") && said.contains("rate = \"header\""), "{}", said);
                }
            }
        }
    }

    #[test]
    fn a_field_more_leaves_every_other_byte(text in text()) {
        let file = recording(raw(b"guan", &text));
        let (output, figures) = rewritten(&file, None);
        prop_assert!(riff_size_fits(&output));
        prop_assert_eq!(figures.notes.len(), 1);
        let body = bodies(&output, b"guan")[0];
        let bare = without_padding(&text);
        if bare.is_empty() {
            prop_assert_eq!(output, file);
            return Ok(());
        }
        let added = without_padding(appended(bare, body));
        let line = String::from_utf8(added.to_vec()).unwrap();
        prop_assert_eq!(line.trim().lines().count(), 1);
        prop_assert!(line.trim_start().starts_with("Bandproof|History"), "{:?}", line);
        // Padding shrinks by what was added, or is used up but for one byte.
        let padding = text.len() - bare.len();
        let left = body.len() - bare.len() - added.len();
        prop_assert_eq!(left, if padding == 0 { 0 } else { padding.saturating_sub(added.len()).max(1) });
        let others = |file: &[u8]| {
            let chunks = all_chunks(file).into_iter().filter(|(id, _)| id != b"guan");
            chunks.map(|(id, body)| (id.to_vec(), body.to_vec())).collect::<Vec<_>>()
        };
        prop_assert_eq!(others(&output), others(&file));
        // The key is new.
        let key = line.trim().split(':').next().unwrap().to_owned();
        let keys = String::from_utf8_lossy(bare).split(['\n', '\r']).filter_map(|line| {
            Some(line.split_once(':')?.0.trim_matches(|c: char| c.is_ascii_whitespace() || c == '\0').to_owned())
        }).collect::<Vec<_>>();
        prop_assert!(!keys.contains(&key), "{} in {:?}", key, keys);
    }

    #[test]
    fn a_line_more_leaves_every_other_byte(history in text(), version in 0..4_u16) {
        let body = bext(version, [1, 2, 3, 4, 5], &history);
        let (output, _) = rewritten(&recording(raw(b"bext", &body)), None);
        let new = bodies(&output, b"bext")[0];
        let bare = &body[..BEXT_BYTES + without_padding(&history).len()];
        let line = String::from_utf8(without_padding(appended(bare, new)).to_vec()).unwrap();
        prop_assert!(line.ends_with("\r\n") && line.trim().starts_with("A=PCM,F=48000,W=16,M=mono,T="), "{:?}", line);
        // Nothing runs into the new line.
        let before = bare.last().copied().filter(|_| bare.len() > BEXT_BYTES);
        prop_assert!(matches!(before, None | Some(b'\n')) == line.starts_with('A'), "{:?} {:?}", before, line);
    }
}
