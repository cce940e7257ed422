//! Chunks other than the samples survive byte for byte and in order.

use bandproof::wave::stale_chunks;
use proptest::prelude::*;

use crate::build::{FmtFields, PCM, RawChunk, pcm16_mono, raw, riff};
use crate::run::{copy, copy_with, samples};

/// Runs the identity and a run that changes every sample; both must leave every byte
/// outside `data` alone. Returns the notes.
fn survives(file: &[u8]) -> Vec<String> {
    let same = copy(file).unwrap();
    assert!(same.output == file, "the identity changed the file");
    assert!(same.written.chunks.iter().all(|c| c.kept));
    assert_eq!(same.written.notes, Vec::<String>::new());

    let other = copy_with(file, None, 10, |x| -0.5 * x - 0.25).unwrap_err();
    // 16-bit grids do not hold halves of odd steps: the writer says so instead of rounding.
    assert!(other.to_string().contains("can't be stored exactly as pcm16"), "{other}");

    let zeroed = copy_with(file, None, 10, |_| 0.0).unwrap();
    let from = same.header.data_offset as usize;
    let to = from + same.header.data_bytes as usize;
    assert!(zeroed.output[..from] == file[..from] && zeroed.output[to..] == file[to..]);
    assert!(zeroed.output[from..to].iter().all(|&b| b == 0));
    let changed: Vec<_> = zeroed.written.chunks.iter().filter(|c| !c.kept).map(|c| c.id).collect();
    assert_eq!(changed, [*b"data"]);
    same.header.notes
}

fn none() -> Vec<String> {
    Vec::new()
}

#[test]
fn chunks_before_and_after_data_survive() {
    let bext: Vec<u8> = (0..622u32).map(|k| (k * 31 % 251) as u8).collect(); // text fields with garbage after the NUL
    let file = pcm16_mono(
        &[raw(b"bext", &bext), raw(b"JUNK", &[0; 28]), raw(b"PAD ", &vec![0xa5; 124_664])],
        25,
        &[
            raw(b"list", b"INFOISFT\x04\0\0\0abc\0"),
            raw(b"cue ", &[0; 4]),
            raw(b"xyzw", b"12345"),
            raw(b"guan", b"GUANO|Version: 1.0"),
        ],
    );
    assert_eq!(survives(&file), none());
    let header = copy(&file).unwrap().header;
    let ids: Vec<String> = header.chunks.iter().map(|c| c.name()).collect();
    assert_eq!(ids, ["fmt ", "bext", "JUNK", "PAD ", "data", "list", "cue ", "xyzw", "guan"]);
    let data = &header.chunks[4];
    assert_eq!((data.offset + 8, data.bytes), (header.data_offset, 50));
    for chunk in &header.chunks {
        assert_eq!(&file[chunk.offset as usize..][..4], chunk.id);
    }
}

#[test]
fn a_last_chunk_of_odd_size_may_lack_its_pad_byte() {
    // As field recorders end their files, the RIFF size counting what is there.
    let file = pcm16_mono(&[], 9, &[raw(b"guan", b"GUANO|Version: 1.0\n").padded(&[])]);
    assert_eq!(file.len() % 2, 1);
    assert_eq!(survives(&file), none());
    // The same with a RIFF size that counts the pad byte all the same.
    let mut counted = file.clone();
    counted[4] += 1;
    let notes = survives(&counted);
    assert_eq!(notes.len(), 1);
    assert!(notes[0].contains(&format!("declares {}, found {}", counted.len() - 7, counted.len() - 8)), "{notes:?}");
    // Or one that leaves out a pad byte that is there.
    let mut left_out = pcm16_mono(&[], 9, &[raw(b"guan", b"GUANO|Version: 1.0\n")]);
    left_out[4] -= 1;
    assert_eq!(survives(&left_out).len(), 1);
}

#[test]
fn pad_bytes_within_the_file_may_be_missing_nonzero_or_too_many() {
    let odd = b"odd size.";
    for pad in [&[][..], &[0], &[0x7f], b"x", b"l"] {
        for chunk in [raw(b"LIST", odd), raw(b"note", odd)] {
            let chunk = chunk.padded(pad);
            let name = String::from_utf8_lossy(&chunk.id).into_owned();
            let missing = |places: &[usize]| -> Vec<String> {
                let note = |at: &usize| {
                    format!("chunk `{name}` at byte {at} of 9 bytes has no pad byte (byte {}); kept as it is", at + 17)
                };
                if pad.is_empty() { places.iter().map(note).collect() } else { none() }
            };
            let before = pcm16_mono(std::slice::from_ref(&chunk), 5, &[raw(b"cue ", &[0; 4])]);
            assert_eq!(survives(&before), missing(&[36]));
            let after = pcm16_mono(&[], 5, &[chunk.clone(), raw(b"cue ", &[0; 4]), chunk, raw(b"mine", b"1234")]);
            assert_eq!(survives(&after), missing(&[54, 83]));
            assert_eq!(copy(&after).unwrap().header.chunks.len(), 6);
        }
    }
    // An even size that counts the pad, and a pad after an even size.
    let counted = pcm16_mono(&[raw(b"LIST", b"odd size.\0")], 5, &[]);
    assert_eq!(survives(&counted), none());
    let superfluous = pcm16_mono(&[raw(b"LIST", b"even size!").padded(&[0])], 5, &[raw(b"cue ", &[0; 4])]);
    let note = "chunk `LIST` at byte 36 of 10 bytes is followed by a byte that its even size leaves no room for (byte 54); kept as it is";
    assert_eq!(survives(&superfluous), [note]);
}

#[test]
fn letters_that_spell_a_known_id_by_chance_move_no_chunk_that_follows_the_rules() {
    // `xgua` with a size of 0x6e bytes reads `guan` one byte on; `zdat` of 0x61 `data`.
    let chunks = [raw(b"xgua", &[0; 0x6e]), raw(b"zdat", &[0; 0x61]), raw(b"ycue", &[0; 0x20])];
    for file in [pcm16_mono(&chunks, 5, &[]), pcm16_mono(&[], 5, &chunks)] {
        assert_eq!(survives(&file), none());
        assert_eq!(copy(&file).unwrap().header.chunks.len(), 5);
    }
    // The other way round: after a missing pad byte, `data` of 0x40 zero bytes also
    // reads `ata@` of 0 bytes.
    let file =
        riff(&[FmtFields::plain(PCM, 1, 16).chunk(), raw(b"note", b"odd").padded(&[]), raw(b"data", &[0; 0x40])]);
    assert_eq!(copy(&file).unwrap().header.frames, 0x20);
}

#[test]
fn odd_data_may_be_padded_or_not() {
    let fmt = FmtFields::plain(PCM, 1, 24);
    let bytes = [1, 2, 3, 4, 5, 6, 7, 8, 9];
    for pad in [&[][..], &[0], &[0xff]] {
        let data = raw(b"data", &bytes).padded(pad);
        for tail in [vec![], vec![raw(b"guan", b"GUANO|Version:1.0")]] {
            let chunks = [vec![fmt.chunk(), data.clone()], tail].concat();
            let copied = copy(&riff(&chunks)).unwrap();
            assert_eq!(copied.output, riff(&chunks));
            assert_eq!(copied.header.frames, 3);
            assert_eq!(copied.header.chunks.len(), chunks.len());
        }
    }
    // A pad counted in the size: the byte is no sample.
    let file = riff(&[fmt.chunk(), raw(b"data", &[1, 2, 3, 0])]);
    let copied = copy(&file).unwrap();
    assert_eq!(copied.output, file);
    assert_eq!(copied.header.frames, 1);
    assert!(
        copied.header.notes[0].contains("1 bytes after its last whole frame (byte 47)"),
        "{:?}",
        copied.header.notes
    );
}

#[test]
fn bytes_after_the_last_chunk_survive_and_are_noted() {
    for tail in
        [&b"\0\0\0"[..], b"\0\0\0\0\0\0\0\0\0\0\0\0", b"TAGtitle and so on, no chunk of these many bytes", b"abc"]
    {
        let mut file = pcm16_mono(&[], 5, &[raw(b"cue ", &[0; 4])]);
        file.extend_from_slice(tail);
        let notes = survives(&file);
        assert_eq!(notes.len(), 1, "{notes:?}");
        assert!(notes[0].starts_with(&format!("{} bytes after the last chunk", tail.len())), "{notes:?}");
    }
}

#[test]
fn chunks_that_describe_the_samples_are_named_as_stale() {
    let bext = |version: u16, loudness: i16| {
        let mut body = vec![0; 602];
        body[346..348].copy_from_slice(&version.to_le_bytes());
        body[412..422].copy_from_slice(&[0xff, 0x7f, 0xff, 0x7f, 0xff, 0x7f, 0xff, 0x7f, 0xff, 0x7f]);
        body[412..414].copy_from_slice(&loudness.to_le_bytes());
        raw(b"bext", &body)
    };
    let stale = |chunks: &[RawChunk]| stale_chunks(&copy(&pcm16_mono(chunks, 3, &[])).unwrap().header);
    assert_eq!(stale(&[raw(b"cue ", &[0; 4]), raw(b"fact", &[3, 0, 0, 0]), raw(b"iXML", b"<BWFXML/>")]), none());
    assert_eq!(stale(&[bext(1, -2300), bext(2, 0x7fff), bext(2, 0)]), none());
    let sentences = stale(&[raw(b"PEAK", &[0; 16]), raw(b"levl", &[0; 12]), bext(2, -2300), raw(b"MD5 ", &[0; 16])]);
    assert_eq!(sentences.len(), 4);
    for (sentence, id) in sentences.iter().zip(["PEAK", "levl", "bext", "MD5 "]) {
        assert!(sentence.contains(&format!("`{id}`")), "{sentence}");
    }
}

/// Chunk ids that are neither structural nor the start of another file.
fn id() -> impl Strategy<Value = [u8; 4]> {
    prop::array::uniform4(0x21u8..0x7f)
        .prop_filter("structural", |id| ![b"fmt ", b"data", b"wavl", b"RIFF", b"fact"].contains(&id))
}

fn tree() -> impl Strategy<Value = Vec<RawChunk>> {
    let chunk = (id(), prop::collection::vec(any::<u8>(), 0..40)).prop_map(|(id, body)| raw(&id, &body));
    prop::collection::vec(chunk, 0..8)
}

proptest! {
    #[test]
    fn every_legal_arrangement_of_chunks_survives(before in tree(), after in tree(), frames in 1usize..50) {
        let file = pcm16_mono(&before, frames, &after);
        let copied = copy(&file).unwrap();
        prop_assert_eq!(copied.header.chunks.len(), before.len() + after.len() + 2);
        prop_assert_eq!(copied.header.frames, frames as u64);
        prop_assert_eq!(&copied.header.notes, &none());
        prop_assert!(copied.output == file);
        let expected: Vec<f64> = (0..frames).map(|k| f64::from((k as i16).wrapping_mul(7919)) / 32768.0).collect();
        prop_assert_eq!(samples(&file).unwrap(), [expected]);
    }
}
