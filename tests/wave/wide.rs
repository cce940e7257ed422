//! RF64 and BW64 (EBU Tech 3306 v1.1, ITU-R BS.2088), and RIFF that grows into RF64.

use bandproof::wave::{Changes, ChunkFate, Encoding, Form, SampleFormat};
use proptest::prelude::*;

use crate::build::{Ds64, FLOAT, FmtFields, PCM, RawChunk, pcm16_mono, raw, riff, wide};
use crate::run::{copy, copy_changed, copy_with, error, samples};

fn fmt() -> RawChunk {
    FmtFields::plain(PCM, 1, 16).chunk()
}

fn data(frames: usize) -> RawChunk {
    let samples: Vec<u8> = (0..frames).flat_map(|k| ((k as i16).wrapping_mul(7919)).to_le_bytes()).collect();
    raw(b"data", &samples)
}

fn none() -> Vec<String> {
    Vec::new()
}

fn kept(chunks: &[ChunkFate]) -> Vec<bool> {
    chunks.iter().map(|c| c.kept).collect()
}

#[test]
fn a_file_written_out_by_hand_is_read() {
    let mut file = b"RF64\xff\xff\xff\xffWAVEds64\x1c\0\0\0".to_vec();
    file.extend(76u64.to_le_bytes()); // length of the file less 8
    file.extend(4u64.to_le_bytes()); // bytes in `data`
    file.extend(2u64.to_le_bytes()); // frames
    file.extend(0u32.to_le_bytes()); // no table
    file.extend(b"fmt \x10\0\0\0\x01\0\x01\0\x40\x1f\0\0\x80\x3e\0\0\x02\0\x10\0");
    file.extend(b"data\xff\xff\xff\xff\0\x40\0\x80");
    let copied = copy(&file).unwrap();
    assert_eq!((copied.header.form, copied.header.frames), (Form::Rf64, 2));
    assert_eq!(samples(&file).unwrap(), [vec![0.5, -1.0]]);
    assert_eq!(copied.header.notes, none());
    assert!(copied.output == file);
}

#[test]
fn both_forms_come_back_byte_for_byte_while_no_size_changes() {
    let table = vec![(*b"axml", 5u64), (*b"abcd", 7), (*b"axml", 3)];
    let chunks = [
        fmt(),
        raw(b"axml", b"<a/> ").declaring(u32::MAX),
        raw(b"JUNK", &[1; 40]),
        data(9),
        raw(b"abcd", b"1234567").declaring(u32::MAX),
        raw(b"axml", b"abc").declaring(u32::MAX),
        raw(b"cue ", &[0; 4]),
    ];
    for (id, form) in [(b"RF64", Form::Rf64), (b"BW64", Form::Bw64)] {
        for frames in [9, 0] {
            for more in [&b""[..], b"what follows the table"] {
                let ds64 = Ds64 { table: table.clone(), more: more.to_vec(), ..Ds64::frames(frames) };
                let file = wide(id, &ds64, &chunks);
                let copied = copy(&file).unwrap();
                assert!(copied.output == file);
                assert_eq!(copied.header.form, form);
                assert_eq!(copied.header.notes, none());
                assert_eq!(copied.written.notes, none());
                assert!(copied.written.chunks.iter().all(|c| c.kept));
                let bytes: Vec<u64> = copied.header.chunks.iter().skip(1).map(|c| c.bytes).collect();
                assert_eq!(bytes, [16, 5, 40, 18, 7, 3, 4]);
                let zeroed = copy_with(&file, None, 4, |_| 0.0).unwrap();
                assert_eq!(
                    zeroed.written.chunks.iter().filter(|c| !c.kept).map(|c| c.id).collect::<Vec<_>>(),
                    [*b"data"]
                );
            }
        }
    }
}

#[test]
fn other_encodings_keep_the_form_with_right_sizes() {
    for id in [b"RF64", b"BW64"] {
        let others = [raw(b"LIST", b"INFO"), raw(b"cue ", &[0; 4])];
        let chunks = |fmt: FmtFields, fact: &[RawChunk], data: RawChunk| {
            [&[fmt.chunk()], fact, &others[..1], &[data], &others[1..]].concat()
        };
        let file = wide(id, &Ds64::frames(21), &chunks(FmtFields::plain(PCM, 1, 16), &[], data(21)));
        for (encoding, tag, bits) in
            [(Encoding::Float64, FLOAT, 64), (Encoding::Pcm24, PCM, 24), (Encoding::Pcm8, PCM, 8)]
        {
            let copied =
                copy_with(&file, Some(SampleFormat::full(encoding)), 5, |x| if bits == 8 { 0.0 } else { x }).unwrap();
            let header = copy(&copied.output).unwrap().header;
            assert_eq!(header.notes, none());
            let body = &copied.output[header.data_offset as usize..][..header.data_bytes as usize];
            let fact = if tag == FLOAT { vec![raw(b"fact", &[21, 0, 0, 0])] } else { vec![] };
            let expected = chunks(FmtFields::plain(tag, 1, bits), &fact, raw(b"data", body));
            // 8 bits make a file smaller than any RF64 needs to be: it stays one.
            assert!(copied.output == wide(id, &Ds64::frames(21), &expected), "{encoding:?}");
            assert_eq!(kept(&copied.written.chunks), [false, false, true, false, true]);
            assert!(
                copied.written.notes.iter().any(|n| n.starts_with("`ds64` was rewritten")),
                "{:?}",
                copied.written.notes
            );
        }
    }
}

#[test]
fn a_sample_count_is_not_trusted_and_set_right_only_where_sizes_change() {
    let file = wide(b"RF64", &Ds64::frames(41_745), &[fmt(), data(10)]);
    let copied = copy(&file).unwrap();
    assert_eq!(copied.header.frames, 10);
    assert_eq!(copied.header.notes, ["`ds64` at byte 12 declares 41745 frames (byte 36), `data` holds 10; not used"]);
    assert!(copied.output == file);
    let wider = copy_with(&file, Some(SampleFormat::full(Encoding::Pcm32)), 5, |x| x).unwrap();
    assert_eq!(copy(&wider.output).unwrap().header.notes, none());
    assert_eq!(wider.output[36..44], 10u64.to_le_bytes());
}

#[test]
fn a_fact_beyond_32_bits_refers_to_ds64() {
    let fmt = FmtFields::plain(FLOAT, 1, 32).chunk();
    let file = wide(b"RF64", &Ds64::frames(5), &[fmt, raw(b"fact", &[0xff; 4]), raw(b"data", &[0; 20])]);
    let copied = copy(&file).unwrap();
    assert_eq!(copied.header.notes, none());
    let wider = copy_with(&file, Some(SampleFormat::full(Encoding::Float64)), 5, |x| x).unwrap();
    assert_eq!(copy(&wider.output).unwrap().header.notes, none());
    assert!(wider.written.chunks[2].kept);
}

#[test]
fn sizes_of_64_bits_never_written_take_whole_frames_to_the_end_of_the_file() {
    let sound = wide(b"RF64", &Ds64::frames(50), &[fmt(), data(50)]);
    for declared in [0, 101, 1 << 40, u64::MAX - 8, u64::MAX - 7, u64::MAX] {
        for riff in [0, 60, 1 << 50, u64::MAX] {
            for field in [u32::MAX, 0] {
                let mut file = wide(
                    b"RF64",
                    &Ds64 { data: Some(declared), riff: Some(riff), ..Ds64::frames(u64::MAX) },
                    &[fmt(), data(50)],
                );
                file[76..80].copy_from_slice(&field.to_le_bytes());
                let copied = copy(&file).unwrap();
                let found = format!("declares {declared} bytes, found 100 up to the end of the file: 50 whole frames");
                assert!(copied.header.notes.iter().any(|n| n.contains(&found)), "{:?}", copied.header.notes);
                let riff = format!("the RIFF size at byte 20 (`ds64`) declares {riff}, found {}", sound.len() - 8);
                assert!(copied.header.notes.iter().any(|n| n.contains(&riff)), "{:?}", copied.header.notes);
                assert!(copied.output == sound);
                assert_eq!(kept(&copied.written.chunks), [false, true, false]);
            }
        }
    }
}

#[test]
fn sizes_of_32_bits_count_where_they_are_given_and_ds64_is_set_right() {
    // EBU Tech 3306: a field other than 0xffffffff is the size.
    let file = wide(
        b"BW64",
        &Ds64 { data: Some(7), ..Ds64::frames(4) },
        &[fmt(), data(4).declaring(8), raw(b"cue ", &[0; 4])],
    );
    let copied = copy(&file).unwrap();
    assert_eq!(copied.header.frames, 4);
    assert!(
        copied.header.notes[0]
            .contains("`ds64` at byte 12 declares 7 bytes in `data` (byte 28), `data` itself 8 (byte 76)"),
        "{:?}",
        copied.header.notes
    );
    let expected = wide(
        b"BW64",
        &Ds64 { data: Some(8), ..Ds64::frames(4) },
        &[fmt(), data(4).declaring(8), raw(b"cue ", &[0; 4])],
    );
    assert!(copied.output == expected);
    assert_eq!(kept(&copied.written.chunks), [false, true, true, true]);
    // The same for the RIFF size.
    let mut file = wide(b"BW64", &Ds64::frames(4), &[fmt(), data(4)]);
    let sound = file.clone();
    let size = file.len() as u32 - 8;
    file[4..8].copy_from_slice(&size.to_le_bytes());
    assert!(copy(&file).unwrap().output == file);
    file[4..8].copy_from_slice(&(size - 4).to_le_bytes());
    let copied = copy(&file).unwrap();
    assert!(copied.header.notes[0].contains(&format!("the RIFF size at byte 4 declares {}, found {size}", size - 4)));
    assert!(copied.output == sound);
}

#[test]
fn a_table_that_claims_more_than_it_holds_is_set_right() {
    let table = vec![(*b"abcd", 5u64)];
    let chunks = [fmt(), raw(b"abcd", b"12345").declaring(u32::MAX), data(4)];
    for entries in [2, 1000, u32::MAX] {
        let ds64 = Ds64 { entries: Some(entries), table: table.clone(), more: vec![9; 11], ..Ds64::frames(4) };
        let copied = copy(&wide(b"RF64", &ds64, &chunks)).unwrap();
        assert_eq!(copied.header.chunks[2].bytes, 5);
        let note = format!("declares a table of {entries} chunks (byte 44), found room for 1");
        assert!(copied.header.notes[0].contains(&note), "{:?}", copied.header.notes);
        assert!(copied.output == wide(b"RF64", &Ds64 { entries: None, ..ds64 }, &chunks));
    }
}

#[test]
fn chunks_longer_than_the_file_fail_or_get_the_size_they_have() {
    let table = |size| Ds64 { table: vec![(*b"axml", size)], ..Ds64::frames(4) };
    let axml = raw(b"axml", b"12345678").declaring(u32::MAX);
    for size in [25, u64::MAX - 20, u64::MAX] {
        let text = error(&wide(b"RF64", &table(size), &[fmt(), axml.clone(), data(4)]));
        assert!(
            text.starts_with(&format!("byte 84: chunk `axml` claims {size} bytes, the file ends after ")),
            "{text}"
        );
        let copied = copy(&wide(b"RF64", &table(size), &[fmt(), data(4), axml.clone()])).unwrap();
        assert!(copied.output == wide(b"RF64", &table(8), &[fmt(), data(4), axml.clone()]));
        assert_eq!(kept(&copied.written.chunks), [false, true, true, false]);
        assert!(copied.header.notes[0].contains(&format!("claims {size} bytes, the file ends after 8")));
    }
}

#[test]
fn a_ds64_that_is_missing_short_or_elsewhere_is_named_with_its_place() {
    let with = |chunks: &[RawChunk]| {
        let mut file = riff(chunks);
        file[..4].copy_from_slice(b"RF64");
        error(&file)
    };
    let ds64 = Ds64::frames(4).chunk();
    let cases = [
        (with(&[fmt(), data(4)]), "byte 12: found `fmt ` and no `ds64` before the samples, expected a `ds64`"),
        (with(&[raw(b"ds64", &ds64.body[..24]), fmt(), data(4)]), "byte 12: `ds64` holds 24 bytes, expected"),
        (with(&[raw(b"ds64", &[]), fmt(), data(4)]), "byte 12: `ds64` holds 0 bytes, expected"),
        (with(&[fmt(), ds64.clone(), data(4)]), "byte 36: `ds64` stands after other chunks (found at byte 36)"),
        (with(&[]), "byte 12: the file ends, expected"),
        (with(&[raw(b"ds64", &ds64.body[..20]).declaring(28)]), "byte 12: `ds64` holds 20 bytes, expected"),
    ];
    for (text, expected) in cases {
        assert!(text.starts_with(expected) && text.contains("RF64"), "{text}");
    }
    let two = wide(b"RF64", &Ds64::frames(4), &[fmt(), ds64, data(4)]);
    assert!(copy(&two).unwrap().header.notes[0].contains("`ds64` at byte 72 does not belong there in RF64 files"));
    assert!(copy(&two).unwrap().output == two);
}

#[test]
fn a_ds64_in_a_riff_file_is_read_only_where_data_refers_to_it() {
    let after = raw(b"LIST", b"INFOISFT\x04\0\0\0abc\0");
    let ds64 = |data| Ds64 { data: Some(data), riff: Some(1), ..Ds64::frames(1) }.chunk();
    let file = |size, declared| riff(&[ds64(size), fmt(), data(50).declaring(declared), after.clone()]);
    // Not referred to: a chunk like others, but named.
    let copied = copy(&file(7, 100)).unwrap();
    assert!(copied.output == file(7, 100));
    assert_eq!(copied.header.notes, ["`ds64` at byte 12 does not belong there in RIFF files"]);
    // Referred to, and right.
    let copied = copy(&file(100, u32::MAX)).unwrap();
    assert!(
        copied.header.notes[1].contains("declares 4294967295 bytes, found 100 by the 64-bit size in `ds64`: 50 whole"),
        "{:?}",
        copied.header.notes
    );
    assert!(copied.output == file(100, 100));
    // Referred to, and wrong: as if it were not there.
    for wrong in [0, 98, 102, u64::MAX] {
        let copied = copy(&file(wrong, u32::MAX)).unwrap();
        assert_eq!(copied.header.frames, 50, "{:?}", copied.header.notes);
        assert!(copied.output == file(wrong, 100));
    }
}

#[test]
fn a_riff_output_beyond_the_limit_becomes_rf64_through_its_placeholder() {
    let format = SampleFormat::full(Encoding::Float32);
    for (first, more) in [(28usize, 0), (29, 0), (30, 0), (100, 0), (28, 1)] {
        let tail = vec![raw(b"abcd", b"1234"); 1 + more];
        let chunks =
            [&[raw(b"JUNK", &vec![0xa5; first]), raw(b"bext", &[3; 602]), fmt(), data(40)][..], &tail].concat();
        let file = riff(&chunks);
        let plain = copy_with(&file, Some(format), 9, |x| x).unwrap();
        let limit = plain.output.len() as u64;
        let at =
            copy_changed(&file, &Changes { riff_limit_bytes: limit, ..Changes::samples(format) }, 9, |x| x).unwrap();
        assert!(at.output == plain.output);
        let changes = Changes { riff_limit_bytes: limit - 1, ..Changes::samples(format) };
        let beyond = copy_changed(&file, &changes, 9, |x| x).unwrap();
        // Nothing moved: the two differ in head, placeholder and the size of `data`.
        assert_eq!(beyond.output.len(), plain.output.len());
        let header = copy(&beyond.output).unwrap().header;
        assert_eq!((header.form, header.notes.clone()), (Form::Rf64, none()));
        assert_eq!(samples(&beyond.output).unwrap(), samples(&file).unwrap());
        let mut expected = plain.output.clone();
        expected[..8].copy_from_slice(b"RF64\xff\xff\xff\xff");
        expected[12..16].copy_from_slice(b"ds64");
        expected[20..28].copy_from_slice(&(limit - 8).to_le_bytes());
        expected[28..36].copy_from_slice(&160u64.to_le_bytes());
        expected[36..44].copy_from_slice(&40u64.to_le_bytes());
        expected[44..48].fill(0);
        let size = header.data_offset as usize - 4;
        expected[size..size + 4].fill(0xff);
        assert!(beyond.output == expected);
        assert_eq!(kept(&beyond.written.chunks)[..4], [false, true, false, false]);
        let note = format!(
            "the output, longer than the {} bytes a RIFF file may take, became RF64: `JUNK` at byte 12 was",
            limit - 1
        );
        assert!(beyond.written.notes.iter().any(|n| n.starts_with(&note)), "{:?}", beyond.written.notes);
    }
}

#[test]
fn without_a_placeholder_that_stands_first_and_is_long_enough_a_ds64_is_put_in() {
    let unchanged = SampleFormat::full(Encoding::Pcm16);
    let cases = [
        vec![fmt(), data(40), raw(b"abcd", b"12345").padded(&[])],
        vec![raw(b"JUNK", &[0; 27]), fmt(), data(40)],
        vec![raw(b"junk", &[0; 28]), fmt(), data(40)],
        vec![raw(b"PAD ", &[0; 28]), fmt(), data(40)],
        vec![fmt(), raw(b"JUNK", &[0; 28]), data(40)],
    ];
    for chunks in cases {
        let file = riff(&chunks);
        let changes = Changes { riff_limit_bytes: file.len() as u64 - 1, ..Changes::samples(unchanged) };
        let copied = copy_changed(&file, &changes, 9, |x| x).unwrap();
        assert!(copied.output == wide(b"RF64", &Ds64::frames(40), &chunks));
        let fates = copied.written.chunks.iter();
        assert!(fates.clone().all(|c| c.kept == (c.id != *b"data")), "{:?}", copied.written.chunks);
        assert!(copied.written.notes[0].ends_with("a `ds64` of 36 bytes was put in after `WAVE`"));
    }
}

#[test]
fn bytes_after_the_last_chunk_count_for_no_size() {
    let format = SampleFormat::full(Encoding::Pcm16);
    let sound = pcm16_mono(&[], 30, &[raw(b"cue ", &[0; 4])]);
    let file = [&sound[..], b"\0\0\0\0\0 no chunk"].concat();
    let limit = |limit| {
        copy_changed(&file, &Changes { riff_limit_bytes: limit, ..Changes::samples(format) }, 9, |x| x).unwrap()
    };
    assert!(limit(sound.len() as u64).output == file);
    let wide = limit(sound.len() as u64 - 1).output;
    assert_eq!(wide[20..28], (sound.len() as u64 + 36 - 8).to_le_bytes());
    assert!(wide.ends_with(b"\0\0\0\0\0 no chunk"));
    let again = copy(&wide).unwrap();
    assert!(again.output == wide);
    assert_eq!(again.header.notes.len(), 1, "{:?}", again.header.notes);
}

fn id() -> impl Strategy<Value = [u8; 4]> {
    prop::array::uniform4(0x21u8..0x7f).prop_filter("structural", |id| {
        ![b"fmt ", b"data", b"wavl", b"slnt", b"RIFF", b"RIFX", b"RF64", b"BW64", b"fact", b"ds64"].contains(&id)
    })
}

fn tree() -> impl Strategy<Value = Vec<RawChunk>> {
    let chunk = (id(), prop::collection::vec(any::<u8>(), 0..40)).prop_map(|(id, body)| raw(&id, &body));
    prop::collection::vec(chunk, 0..6)
}

proptest! {
    #[test]
    fn every_legal_arrangement_of_chunks_survives_in_64_bit_form(
        before in tree(), after in tree(), frames in 1usize..50, tabled in any::<bool>(), later in any::<bool>(),
    ) {
        let mut chunks = [before, vec![data(frames)], after].concat();
        let at = chunks.iter().position(|c| c.id == *b"data").unwrap();
        chunks.insert(at + usize::from(later), fmt());
        let mut ds64 = Ds64::frames(frames as u64);
        if tabled {
            for chunk in chunks.iter_mut().filter(|c| c.id != *b"data" && c.id != *b"fmt ") {
                ds64.table.push((chunk.id, chunk.body.len() as u64));
                chunk.declared = Some(u32::MAX);
            }
        }
        let file = wide(b"RF64", &ds64, &chunks);
        let copied = copy(&file).unwrap();
        prop_assert_eq!(copied.header.chunks.len(), chunks.len() + 1);
        prop_assert_eq!(copied.header.frames, frames as u64);
        prop_assert!(copied.output == file);
        prop_assert_eq!(copied.header.notes.len(), usize::from(later));
        // Grown out of RIFF, the same chunks hold the same.
        let plain: Vec<RawChunk> = chunks.iter().map(|c| raw(&c.id, &c.body)).collect();
        let format = SampleFormat::full(Encoding::Pcm16);
        let grown = copy_changed(&riff(&plain), &Changes { riff_limit_bytes: 0, ..Changes::samples(format) }, 7, |x| x).unwrap();
        prop_assert_eq!(samples(&grown.output).unwrap(), samples(&file).unwrap());
        let again = copy(&grown.output).unwrap();
        prop_assert_eq!(again.header.form, Form::Rf64);
        prop_assert_eq!(again.header.notes.len(), usize::from(later));
        prop_assert!(again.output == grown.output);
    }
}
