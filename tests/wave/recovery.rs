//! Which bytes are samples where sizes and chunks do not agree.

use bandproof::wave::{Encoding, SampleFormat};

use crate::build::{FmtFields, PCM, RawChunk, pcm16_mono, raw, riff};
use crate::run::{copy, copy_with, error, samples};

fn fmt() -> RawChunk {
    FmtFields::plain(PCM, 1, 16).chunk()
}

fn data(bytes: usize) -> RawChunk {
    raw(b"data", &vec![3; bytes])
}

#[test]
fn fmt_after_data_is_read_and_order_kept() {
    let tail = raw(b"abcd", b"12345");
    let file = |fmt: RawChunk, more: &[RawChunk], data: RawChunk| {
        riff(&[&[raw(b"LIST", b"INFO"), data, fmt], more, std::slice::from_ref(&tail)].concat())
    };
    let plain = file(fmt(), &[], data(20));
    let copied = copy(&plain).unwrap();
    assert!(copied.output == plain);
    assert_eq!(copied.header.frames, 10);
    assert_eq!(copied.header.notes, ["`fmt ` at byte 52 stands after `data`; order kept"]);
    assert!(copied.written.chunks.iter().all(|c| c.kept));
    let wide = copy_with(&plain, Some(SampleFormat::full(Encoding::Float32)), 3, |_| 0.0).unwrap();
    let float = FmtFields::plain(crate::build::FLOAT, 1, 32).chunk();
    assert!(wide.output == file(float, &[raw(b"fact", &[10, 0, 0, 0])], raw(b"data", &[0; 40])));
    assert_eq!(samples(&wide.output).unwrap(), [vec![0.0; 10]]);
    // Without the size of `data` there is no telling where `fmt ` is; from its end there is.
    for declared in [0, 4000, u32::MAX] {
        let copied = copy(&file(fmt(), &[], data(20).declaring(declared))).unwrap();
        assert!(copied.output == plain, "{declared}");
    }
    // Without any it is missing wherever it might have stood.
    let text = error(&riff(&[data(20), tail.clone()]));
    assert!(text.starts_with("byte 12: `data` without a `fmt ` chunk before it, nor one after it"), "{text}");
}

#[test]
fn a_data_size_that_swallows_the_chunks_after_it_ends_where_they_begin() {
    let list = raw(b"LIST", b"INFOISFT\x04\0\0\0abc\0");
    let bext = raw(b"bext", &[9; 603]);
    let guan = raw(b"guan", b"GUANO|Version: 1.0").padded(&[]);
    for (tail, bits) in [
        (vec![list.clone()], 16),
        (vec![guan.clone()], 16),
        (vec![raw(b"guan", b"GUANO|Version:1.0").padded(&[])], 24),
        (vec![bext.clone(), raw(b"mine", b"123"), list.clone()], 24),
    ] {
        let fmt = FmtFields::plain(PCM, 1, bits).chunk();
        // Three frames: an odd number of bytes with 24 bits.
        let bytes = usize::from(bits) / 8 * 3;
        let file = |declared: Option<u32>| {
            let data = RawChunk { declared, ..data(bytes) };
            riff(&[vec![fmt.clone(), data], tail.clone()].concat())
        };
        let sound = file(None);
        let to_the_end = (sound.len() - 44) as u32;
        let declared = [0, bytes as u32 + 2, bytes as u32 + 7, to_the_end - 3, to_the_end, to_the_end + 1, u32::MAX];
        for declared in declared {
            let copied = copy(&file(Some(declared))).unwrap();
            assert!(copied.output == sound, "{declared} {bits}");
            assert_eq!(copied.header.frames, 3);
            let (first, at) = (&copied.header.chunks[2], 44 + bytes + bytes % 2);
            assert_eq!((first.id, first.offset as usize), (tail[0].id, at));
            let note = format!(
                "`data` at byte 36 declares {declared} bytes, found {} up to `{}` at byte {at}",
                at - 44,
                first.name()
            );
            assert!(copied.header.notes[0].starts_with(&note), "{:?}", copied.header.notes);
            assert_eq!(copied.written.chunks.iter().filter(|c| !c.kept).count(), 1);
        }
    }
}

#[test]
fn chunks_are_looked_for_near_the_end_only_and_must_end_with_the_file() {
    let list = raw(b"LIST", b"INFOISFT\x04\0\0\0abc\0");
    // One byte more or less: samples that happen to spell a name.
    for cut in [1, 5] {
        let sound = pcm16_mono(&[], 20, std::slice::from_ref(&list));
        let mut file = sound[..sound.len() - cut].to_vec();
        file[40..44].copy_from_slice(&u32::MAX.to_le_bytes());
        assert_eq!(copy(&file).unwrap().header.data_bytes as usize, (file.len() - 44) & !1);
    }
    // A chunk that ends with the file exactly needs no name.
    let unknown = |tail: &[u8]| {
        let file = riff(&[fmt(), data(20).declaring(u32::MAX), raw(b"zzzz", b"1234")]);
        copy(&[&file, tail].concat()).unwrap().header.data_bytes
    };
    assert_eq!((unknown(b""), unknown(b"xy")), (20, 34));
    // A known one may be followed by zeros that were reserved.
    let file = riff(&[fmt(), data(20).declaring(u32::MAX), raw(b"cue ", b"\0\0\0\0")]);
    assert_eq!(copy(&[&file[..], &[0; 500]].concat()).unwrap().header.data_bytes, 20);
    // Silence is no room that was reserved, and far from the end a name must be known.
    let silent = copy(&[&file[..], &[0; 200_000]].concat()).unwrap();
    assert_eq!(silent.header.data_bytes, 200_032);
    let far = riff(&[fmt(), data(20).declaring(u32::MAX), raw(b"zzzz", &[7; 70_000])]);
    assert_eq!(copy(&far).unwrap().header.data_bytes, 70_028);
    // A picture of two megabytes.
    let picture = [&b"id3 "[..], &2_000_000u32.to_le_bytes(), &vec![7; 2_000_000]].concat();
    let file = riff(&[fmt(), data(20).declaring(0)]);
    assert_eq!(copy(&[file, picture].concat()).unwrap().header.data_bytes, 20);
}

#[test]
fn bytes_of_a_cut_frame_decide_nothing() {
    // Whether chunks end with the file does not change once its last cut frame is left
    // out: found by damaging files at random. Here 9 bytes follow `guan`, of which 3 are
    // no whole frame of 4 bytes.
    let samples: Vec<u8> = (0..80u8).map(|k| k.wrapping_mul(37)).collect();
    for left in 0..80 {
        let body = [&samples[..], b"guan\x11\0\0\0GUANO|Version:1.0", &vec![b'u'; left]].concat();
        let file = riff(&[FmtFields::plain(PCM, 2, 16).chunk(), raw(b"data", &body).declaring(200).padded(&[])]);
        let copied = copy(&file).unwrap();
        // A pad byte, seven that have no room for a chunk, and 64 that may be of a cut frame.
        assert_eq!(copied.header.frames == 20, left <= 72, "{left}");
        let again = copy(&copied.output).unwrap();
        assert!(again.output == copied.output, "{left}");
    }
}

#[test]
fn bytes_after_data_that_may_be_samples_are_carried_over_with_the_repair() {
    // A size that was last brought up to date some time before the end.
    let file = riff(&[fmt(), data(100).declaring(60)]);
    let copied = copy(&file).unwrap();
    assert!(copied.output == file);
    assert_eq!(copied.header.frames, 30);
    assert_eq!(
        copied.header.notes,
        [
            "40 bytes after the last chunk (byte 104) are no chunk; carried over unchanged; if they are samples, the size at byte 40 should be 100 instead of 60"
        ]
    );
    // Done as it says.
    let mut done = file;
    done[40] = 100;
    assert_eq!(copy(&done).unwrap().header.notes, Vec::<String>::new());
}

#[test]
fn bytes_between_data_and_the_chunks_after_it_fail_by_place() {
    let file = riff(&[fmt(), data(100).declaring(60), raw(b"guan", b"GUANO|Version: 1.0")]);
    let text = error(&file);
    let expected = "byte 104: 40 bytes that are no chunk stand between the end of `data` (byte 36, declared 60 bytes) and \
                    `guan` (byte 144), expected a chunk; if they are samples, the size at byte 40 should be 100, else take them out";
    assert_eq!(text, expected);
    let mut done = file.clone();
    done[40] = 100;
    assert_eq!(copy(&done).unwrap().header.notes, Vec::<String>::new());
    let mut done = file;
    done.drain(104..144);
    assert_eq!(copy(&done).unwrap().header.frames, 30);
}

#[test]
fn a_wrong_size_after_data_is_set_right_where_the_next_chunks_show_it() {
    let list = b"INFOISFT\x04\0\0\0abc\0";
    let tail = [raw(b"guan", b"GUANO|Version: 1.0"), raw(b"mine", b"123"), raw(b"cue ", &[0; 4])];
    let sound = pcm16_mono(&[], 20, &[&[raw(b"LIST", list)][..], &tail].concat());
    for declared in [5, 10, 14, 20, 40] {
        let file = pcm16_mono(&[], 20, &[&[raw(b"LIST", list).declaring(declared)][..], &tail].concat());
        let copied = copy(&file).unwrap();
        assert!(copied.output == sound, "{declared}: {:?}", copied.header);
        let ids: Vec<String> = copied.header.chunks.iter().map(|c| c.name()).collect();
        assert_eq!(ids, ["fmt ", "data", "LIST", "guan", "mine", "cue "], "{declared}");
        let note = format!("chunk `LIST` at byte 84 declares {declared} bytes, found 16 up to `guan` at byte 108");
        assert!(copied.header.notes[0].starts_with(&note), "{:?}", copied.header.notes);
        let kept: Vec<bool> = copied.written.chunks.iter().map(|c| c.kept).collect();
        assert_eq!(kept, [true, true, false, true, true, true]);
    }
    // One of a name nobody knows that runs past the end of the file may be samples or a text: no
    // size is written into it.
    let file = |declared| pcm16_mono(&[], 20, &[&[raw(b"abcd", b"1234").declaring(declared)][..], &tail].concat());
    for declared in [5000, u32::MAX] {
        let text = error(&file(declared));
        assert!(text.starts_with("byte 84: 12 bytes that are no chunk stand between the end of `data`"), "{text}");
    }
    let file = pcm16_mono(&[], 20, &[raw(b"abcd", b"1234").declaring(5000)]);
    let copied = copy(&file).unwrap();
    assert!(copied.output[8..] == file[8..]);
    assert!(copied.header.notes[0].starts_with("12 bytes after the last chunk (byte 84) are no chunk; carried over"));
}

#[test]
fn what_follows_the_samples_and_may_be_samples_is_not_passed_over() {
    // A recorder that writes sizes now and then: 100 ms, of which 50 are declared.
    let sound: Vec<u8> = (0..9600u32).map(|k| (k.wrapping_mul(2_654_435_761) >> 24) as u8).collect();
    let letters: Vec<u8> = sound.iter().map(|byte| b'a' + byte % 26).collect();
    for samples in [&sound, &letters] {
        let file = riff(&[fmt(), raw(b"data", samples).declaring(4800)]);
        let text = error(&file);
        assert!(text.starts_with("byte 4844: 4800 bytes that are no chunk"), "{text}");
        assert!(text.contains("if they are samples, the size at byte 40 should be 9600"), "{text}");
        let mut done = file;
        done[40..44].copy_from_slice(&9600u32.to_le_bytes());
        assert_eq!(copy(&done).unwrap().header.frames, 4800);
    }
    // Zeros, a tag, and less than a hundredth of a second are carried over and noted.
    let tag = [&b"TAG"[..], &[b'x'; 4000]].concat();
    for tail in [&[0; 4800][..], &tag, &sound[..958]] {
        let file = riff(&[fmt(), raw(b"data", &sound)]);
        let copied = copy(&[&file, tail].concat()).unwrap();
        assert!(copied.output.ends_with(tail) && copied.header.frames == 4800);
        assert!(copied.header.notes[0].contains("are no chunk; carried over unchanged"), "{:?}", copied.header.notes);
    }
}

#[test]
fn a_wrong_size_before_data_names_its_chunk() {
    let text = error(&pcm16_mono(&[raw(b"LIST", b"INFO\0\0\0\0").declaring(2)], 20, &[]));
    assert!(text.starts_with("byte 46: found "), "{text}");
    assert!(text.contains("the size of chunk `LIST` at byte 36, 2 bytes, is wrong"), "{text}");
}

#[test]
fn lists_of_samples_and_silence_are_refused_by_name_wherever_they_stand() {
    for chunk in [raw(b"LIST", b"wavldata\0\0\0\0"), raw(b"list", b"wavl"), raw(b"wavl", &[]), raw(b"slnt", &[9; 4])] {
        let text = error(&riff(&[fmt(), chunk.clone(), data(4)]));
        assert!(text.starts_with("byte 36: a `wavl` list of samples and silence is not read"), "{text}");
        let text = error(&riff(&[fmt(), data(4), chunk]));
        assert!(text.starts_with("byte 48: a `wavl` list of samples and silence is not read"), "{text}");
    }
    // Other lists are chunks like any.
    for id in [b"LIST", b"list"] {
        let file = pcm16_mono(&[raw(id, b"INFO")], 5, &[raw(id, b"adtl")]);
        assert!(copy(&file).unwrap().output == file);
    }
}

#[test]
fn several_data_chunks_and_joined_files_fail_with_what_to_do() {
    let text = error(&riff(&[fmt(), data(6), raw(b"LIST", b"INFO"), data(4)]));
    assert!(
        text.starts_with("byte 62: a second `data` chunk is not read; it holds 4 bytes, the first, at byte 36, 6"),
        "{text}"
    );
    let one = pcm16_mono(&[], 5, &[]);
    for other in [b"RIFF", b"RIFX", b"RF64", b"BW64"] {
        let mut two = [&one[..], &one].concat();
        two[one.len()..][..4].copy_from_slice(other);
        let text = error(&two);
        let name = String::from_utf8_lossy(other).into_owned();
        let expected = format!("byte {}: a second `{name}` in one file is not read", one.len());
        assert!(text.starts_with(&expected) && text.ends_with("the first takes 54 bytes"), "{text}");
    }
}
