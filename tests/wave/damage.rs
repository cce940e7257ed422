//! Files as the field delivers them: cut short, with sizes never written, changed
//! while they are read.

use std::cell::Cell;
use std::io::{self, Cursor, Read, Seek, SeekFrom};

use bandproof::wave::{Changes, Encoding, Form, Header, Reader, SampleFormat, Writer};
use proptest::prelude::*;
use proptest::test_runner::TestRunner;

use crate::build::{Ds64, FLOAT, FmtFields, PCM, pcm16_mono, raw, riff, rifx, wide};
use crate::run::{copy, copy_changed, copy_with, error, samples};

/// Copies a damaged file; the output must be a sound one with the same samples.
fn repaired(file: &[u8]) -> (Vec<u8>, Vec<String>) {
    let copied = copy(file).unwrap();
    let again = copy(&copied.output).unwrap();
    assert!(again.output == copied.output);
    assert_eq!(again.header.notes, Vec::<String>::new());
    assert_eq!(samples(&copied.output).unwrap(), samples(file).unwrap());
    // With its size `data` changed, if not its samples.
    let changed: Vec<_> = copied.written.chunks.iter().filter(|c| !c.kept).map(|c| c.id).collect();
    assert_eq!(changed, [*b"data"]);
    (copied.output, copied.header.notes)
}

#[test]
fn a_data_size_never_written_takes_whole_frames_to_the_end_of_the_file() {
    let sound = pcm16_mono(&[raw(b"LIST", b"INFO")], 1000, &[]);
    let data_size = sound.len() - 2000 - 4;
    for declared in [0u32, 0xffff_ffff, 2001, 1_000_000] {
        let mut file = sound.clone();
        file[data_size..data_size + 4].copy_from_slice(&declared.to_le_bytes());
        for cut in [0, 1, 2, 999] {
            for riff_size in [sound.len() as u32 - 8, 0, 0xffff_ffff] {
                let mut file = file[..file.len() - cut].to_vec();
                file[4..8].copy_from_slice(&riff_size.to_le_bytes());
                let (output, notes) = repaired(&file);
                assert_eq!(output.len(), file.len() - cut % 2);
                assert!(output[8..data_size] == file[8..data_size]);
                assert_eq!(output[4..8], (output.len() as u32 - 8).to_le_bytes());
                assert_eq!(output[data_size..data_size + 4], ((2000 - cut as u32) & !1).to_le_bytes());
                let found = format!("declares {declared} bytes, found {}", 2000 - cut);
                assert!(notes.iter().any(|note| note.contains(&found)), "{notes:?}");
            }
        }
    }
}

#[test]
fn a_cut_recording_of_odd_frames_is_padded_again() {
    let fmt = FmtFields::plain(PCM, 1, 24);
    let file = riff(&[fmt.chunk(), raw(b"data", &[7; 10]).declaring(3000)]);
    let (output, notes) = repaired(&file);
    assert_eq!(output[40..], [9, 0, 0, 0, 7, 7, 7, 7, 7, 7, 7, 7, 7, 0]);
    assert!(notes[0].contains("3 whole frames taken; the last 1 bytes are no whole frame and left out"), "{notes:?}");
}

#[test]
fn data_declared_empty_before_further_chunks_is_empty() {
    let file = pcm16_mono(&[], 0, &[raw(b"LIST", b"INFOISFT\x04\0\0\0abc\0"), raw(b"abcd", b"odd")]);
    assert!(error(&file).starts_with("empty:"));
}

#[test]
fn a_fact_that_counts_frames_lost_is_set_right_with_the_sizes() {
    let data = raw(b"data", &[0; 100]).declaring(400);
    let file = riff(&[FmtFields::plain(FLOAT, 1, 32).chunk(), raw(b"fact", &[100, 0, 0, 0]), data]);
    let copied = copy(&file).unwrap();
    let at = copied.header.chunks[1].offset as usize;
    assert_eq!(copied.output[at..at + 12], *b"fact\x04\0\0\0\x19\0\0\0");
    assert_eq!(copied.written.notes, ["`fact` was corrected from 100 to 25 frames"]);
    assert!(copied.header.notes.iter().any(|n| n.contains("`fact` at byte 38 declares 100 frames, `data` holds 25")));
}

#[test]
fn a_wrong_riff_size_is_noted_and_set_right_and_nothing_else_changes() {
    let sound = pcm16_mono(&[], 20, &[raw(b"LIST", b"INFO"), raw(b"abcd", &[1; 30])]);
    // None, too small by whole chunks or within one, too large, "unknown".
    for declared in [0, 36 + 40, 36 + 41, sound.len() as u32, 0x7fff_ffff, 0xffff_ffff] {
        let mut file = sound.clone();
        file[4..8].copy_from_slice(&declared.to_le_bytes());
        let copied = copy(&file).unwrap();
        assert!(copied.output == sound, "{declared}");
        assert!(copied.written.chunks.iter().all(|c| c.kept));
        let found = format!("declares {declared}, found {}", sound.len() - 8);
        assert!(copied.header.notes[0].contains(&found), "{:?}", copied.header.notes);
        // `data` no longer counts as kept once a sample changed.
        let zeroed = copy_with(&file, None, 7, |_| 0.0).unwrap();
        assert_eq!(zeroed.written.chunks.iter().filter(|c| !c.kept).count(), 1);
    }
}

#[test]
fn a_last_chunk_cut_short_is_carried_over_with_the_size_it_has() {
    let sound = pcm16_mono(&[], 20, &[raw(b"smpl", &[1; 60])]);
    let file = &sound[..sound.len() - 25];
    let copied = copy(file).unwrap();
    assert!(copied.output == pcm16_mono(&[], 20, &[raw(b"smpl", &[1; 35]).padded(&[])]));
    assert_eq!(copied.written.chunks.iter().map(|c| c.kept).collect::<Vec<_>>(), [true, true, false]);
    assert!(copied.header.notes[0].contains("claims 60 bytes, the file ends after 35"), "{:?}", copied.header.notes);
    assert_eq!(copied.header.chunks[2].bytes, 35);
}

/// A file that is longer or shorter once its header was read.
struct Changing {
    file: Cursor<Vec<u8>>,
    later: Vec<u8>,
    reads: usize,
    after: usize,
}

impl Read for Changing {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        self.reads += 1;
        if self.reads == self.after {
            *self.file.get_mut() = self.later.clone();
        }
        self.file.read(buffer)
    }
}

impl Seek for Changing {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        self.file.seek(to)
    }
}

#[test]
fn a_file_that_changes_its_length_while_it_is_read_is_an_error_that_says_so() {
    let file = pcm16_mono(&[], 200_000, &[raw(b"LIST", b"INFO")]);
    let mut longer = file.clone();
    longer.extend([0; 10]);
    let mut seen = [0; 2];
    for (kind, later) in [file[..200_000].to_vec(), longer].into_iter().enumerate() {
        for after in 0..40 {
            let source = Changing { file: Cursor::new(file.clone()), later: later.clone(), reads: 0, after };
            let result = Reader::open(source).and_then(|mut reader| {
                let mut planes = [Vec::new()];
                reader.read(usize::MAX, &mut planes)?;
                reader.finish()
            });
            if let Err(error) = result {
                seen[kind] += 1;
                let text = error.to_string();
                let lengths = format!("expected {} bytes in all, found {}", file.len(), later.len());
                assert!(text.contains("changed while it was read") && text.contains(&lengths), "{text}");
            }
        }
    }
    // Seven blocks of samples are among the reads, so several of the moments count.
    assert!(seen.iter().all(|&n| n >= 5), "{seen:?}");
}

#[test]
fn a_failing_disk_is_named_with_what_was_done_and_where() {
    #[derive(Debug)]
    struct Full(usize);
    impl io::Write for Full {
        fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
            if self.0 == 0 {
                return Err(io::Error::other("no space left"));
            }
            let n = bytes.len().min(self.0);
            self.0 -= n;
            Ok(n)
        }
        fn flush(&mut self) -> io::Result<()> {
            Ok(())
        }
    }
    let file = pcm16_mono(&[], 100, &[]);
    let mut reader = Reader::open(Cursor::new(&file)).unwrap();
    let format = SampleFormat::full(Encoding::Pcm16);
    let error = Writer::begin(Full(10), &mut reader, &Changes::samples(format)).unwrap_err();
    assert_eq!(error.to_string(), "byte 0: writing the output: no space left");
    let mut writer = Writer::begin(Full(100), &mut reader, &Changes::samples(format)).unwrap();
    let error = writer.write(&[vec![0.0; 100]]).unwrap_err();
    assert_eq!(error.to_string(), "byte 44: writing the output: no space left");
}

/// One thing that can happen to a file.
#[derive(Clone, Debug)]
enum Blow {
    Cut(usize),
    Byte(usize, u8),
    Word(usize, u32),
    Insert(usize, Vec<u8>),
    Remove(usize, usize),
}

fn blow() -> impl Strategy<Value = Blow> {
    // Sizes and counts that lie near an edge, and any others.
    let word =
        prop_oneof![Just(0), Just(1), Just(0xffff_ffff), Just(0x7fff_ffff), Just(0x8000_0000), 0u32..300, any::<u32>()];
    prop_oneof![
        any::<usize>().prop_map(Blow::Cut),
        (any::<usize>(), any::<u8>()).prop_map(|(at, byte)| Blow::Byte(at, byte)),
        (any::<usize>(), word).prop_map(|(at, word)| Blow::Word(at, word)),
        (any::<usize>(), prop::collection::vec(any::<u8>(), 1..20)).prop_map(|(at, bytes)| Blow::Insert(at, bytes)),
        (any::<usize>(), 1usize..20).prop_map(|(at, n)| Blow::Remove(at, n)),
    ]
}

fn strike(file: &mut Vec<u8>, blow: &Blow) {
    let at = |at: &usize| at % (file.len() + 1);
    match blow {
        Blow::Cut(to) => file.truncate(at(to)),
        Blow::Byte(place, byte) => {
            let place = at(place);
            if let Some(b) = file.get_mut(place) {
                *b = *byte;
            }
        }
        Blow::Word(place, word) => {
            let place = at(place) & !1;
            if let Some(bytes) = file.get_mut(place..place + 4) {
                bytes.copy_from_slice(&word.to_le_bytes());
            }
        }
        Blow::Insert(place, bytes) => {
            let place = at(place);
            file.splice(place..place, bytes.iter().copied());
        }
        Blow::Remove(place, n) => {
            let place = at(place);
            let to = file.len().min(place + n);
            file.drain(place..to);
        }
    }
}

/// An independent reader that accepts a file finds in it what was claimed; whether it did.
fn same_to_hound(file: &[u8], header: &Header) -> Result<bool, TestCaseError> {
    let Ok(mut reader) = hound::WavReader::new(Cursor::new(file)) else { return Ok(false) };
    let spec = reader.spec();
    prop_assert_eq!((spec.channels, spec.sample_rate), (header.channels, header.header_rate_hz));
    if spec.sample_format == hound::SampleFormat::Float
        || header.format.encoding.bytes() * 8 != header.format.valid_bits
    {
        return Ok(false);
    }
    prop_assert_eq!(u64::from(reader.duration()), header.frames);
    let scale = libm::ldexp(1.0, i32::from(spec.bits_per_sample) - 1);
    let read: Vec<f64> = reader.samples::<i32>().map(|x| f64::from(x.unwrap()) / scale).collect();
    let planes = samples(file).unwrap();
    let ours: Vec<f64> = (0..planes[0].len()).flat_map(|k| planes.iter().map(move |plane| plane[k])).collect();
    prop_assert!(read == ours);
    Ok(true)
}

/// Whatever happens to a file, it ends in a sentence or in a sound output with the
/// same samples.
#[test]
fn no_damage_panics_hangs_or_writes_an_unsound_file() {
    let (read, refused, compared) = (Cell::new(0), Cell::new(0), Cell::new(0));
    let forms = prop::sample::select(vec![Form::Riff, Form::Rifx, Form::Rf64, Form::Bw64]);
    let damage = (prop::collection::vec(blow(), 1..5), any::<bool>(), any::<bool>(), forms);
    let mut runner = TestRunner::new(ProptestConfig::with_cases(8000));
    runner
        .run(&damage, |(blows, extensible, after, form)| {
            let fmt = FmtFields::plain(PCM, 2, 16);
            let fmt = if extensible { fmt.extensible(16, 3) } else { fmt };
            let big = form == Form::Rifx;
            let body = if big { fmt.big_endian(true) } else { fmt.body() };
            let fact = raw(b"fact", &if big { [0, 0, 0, 20] } else { [20, 0, 0, 0] });
            // No two samples alike: a shift by a byte shows.
            let data: Vec<u8> = (0..80u8).map(|k| k.wrapping_mul(37)).collect();
            // hound skips no pad byte.
            let list = raw(b"LIST", if after { &b"INFOa"[..] } else { b"INFO" });
            let mut chunks = vec![raw(b"fmt ", &body), list, fact, raw(b"data", &data)];
            if after {
                chunks.extend([raw(b"guan", b"GUANO|Version:1.0"), raw(b"cue ", &[0; 4])]);
            }
            let table = Ds64 { table: vec![(*b"abcd", 9)], ..Ds64::frames(20) };
            let mut file = match form {
                Form::Riff => riff(&chunks),
                Form::Rifx => rifx(&chunks),
                Form::Rf64 => wide(b"RF64", &table, &chunks),
                Form::Bw64 => wide(b"BW64", &table, &chunks),
            };
            for blow in &blows {
                strike(&mut file, blow);
            }
            let copied = match copy(&file) {
                Ok(copied) => copied,
                Err(error) => {
                    refused.set(refused.get() + 1);
                    let text = error.to_string();
                    prop_assert!(text.starts_with("byte ") || text.starts_with("empty: "), "{}", text);
                    return Ok(());
                }
            };
            read.set(read.get() + 1);
            let again = copy(&copied.output).unwrap();
            prop_assert!(again.output == copied.output);
            prop_assert_eq!(samples(&copied.output).unwrap(), samples(&file).unwrap());
            prop_assert_eq!(again.header.form, copied.header.form);
            compared.set(compared.get() + u32::from(same_to_hound(&copied.output, &copied.header)?));
            // And to another format, where everything but the samples is laid out anew.
            let grown = Changes { riff_limit_bytes: 0, ..Changes::samples(copied.header.format) };
            match copy_changed(&file, &grown, 7, |x| x) {
                Ok(grown) => {
                    prop_assert_eq!(samples(&grown.output).unwrap(), samples(&file).unwrap());
                    prop_assert!(copy(&grown.output).unwrap().output == grown.output);
                }
                Err(error) => prop_assert!(copied.header.form == Form::Rifx, "{}", error),
            }
            match copy_with(&file, Some(SampleFormat::full(Encoding::Float64)), 7, |x| x) {
                Ok(wide) => prop_assert_eq!(samples(&wide.output).unwrap(), samples(&file).unwrap()),
                Err(_) => prop_assert!(copied.header.channels > 8191),
            }
            Ok(())
        })
        .unwrap();
    // Neither side may become a rarity that no longer tests anything.
    assert!(read.get() > 800 && refused.get() > 800 && compared.get() > 200, "{read:?} {refused:?} {compared:?}");
}
