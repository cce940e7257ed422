//! Outputs in another format: `fmt `, `fact` and sizes are written anew, all else
//! stays.

use std::io::Cursor;

use bandproof::wave::{Changes, Encoding, Reader, SampleFormat, Writer};

use crate::build::{FLOAT, FmtFields, PCM, RawChunk, pcm16_mono, raw, riff};
use crate::run::{copy, copy_with, samples};

fn body<'a>(file: &'a [u8], id: &[u8; 4]) -> Option<&'a [u8]> {
    let header = copy(file).unwrap().header;
    let chunk = header.chunks.iter().find(|c| c.id == *id)?;
    Some(&file[chunk.offset as usize + 8..][..chunk.bytes as usize])
}

fn to(file: &[u8], encoding: Encoding) -> (Vec<u8>, Vec<String>) {
    let copied = copy_with(file, Some(SampleFormat::full(encoding)), 11, |x| x).unwrap();
    let sizes = u32::from_le_bytes(copied.output[4..8].try_into().unwrap());
    assert_eq!(sizes as usize + 8, copied.output.len());
    (copied.output, copied.written.notes)
}

#[test]
fn plain_pcm_to_float_gets_an_extension_size_and_a_fact() {
    let others = [raw(b"bext", &[7; 603]), raw(b"LIST", b"INFO")];
    let tail = [raw(b"guan", b"GUANO|Version: 1.0\n"), raw(b"abcd", b"1234")];
    let file = pcm16_mono(&others, 21, &tail);
    let (output, notes) = to(&file, Encoding::Float32);
    let bytes: Vec<u8> = samples(&file).unwrap()[0].iter().flat_map(|&x| (x as f32).to_le_bytes()).collect();
    let expected: Vec<RawChunk> = [
        &[FmtFields::plain(FLOAT, 1, 32).chunk(), raw(b"fact", &[21, 0, 0, 0])][..],
        &others,
        &[raw(b"data", &bytes)],
        &tail,
    ]
    .concat();
    assert!(output == riff(&expected));
    assert_eq!(notes.len(), 2, "{notes:?}");
    assert!(notes[0].contains("`fmt ` was rewritten for float32"));
    assert!(notes[1].contains("a `fact` chunk was added"));
    let copied = copy_with(&file, Some(SampleFormat::full(Encoding::Float32)), 11, |x| x).unwrap();
    let kept: Vec<bool> = copied.written.chunks.iter().map(|c| c.kept).collect();
    assert_eq!(kept, [false, true, true, false, true, true]);
    // And back: what PCM does not need goes, but for the harmless count.
    let (back, _) = to(&output, Encoding::Pcm16);
    let mut expected = vec![FmtFields::plain(PCM, 1, 16).chunk(), raw(b"fact", &[21, 0, 0, 0])];
    expected.extend(others);
    let data = copy(&file).unwrap().header;
    expected.push(raw(b"data", &file[data.data_offset as usize..][..data.data_bytes as usize]));
    expected.extend(tail);
    assert!(back == riff(&expected));
}

#[test]
fn a_fact_that_is_right_is_kept_and_one_that_is_wrong_is_corrected() {
    for (count, kept) in [(21u32, true), (7, false)] {
        let file = pcm16_mono(&[raw(b"fact", &count.to_le_bytes())], 21, &[]);
        let (output, notes) = to(&file, Encoding::Float32);
        assert_eq!(body(&output, b"fact"), Some(&[21, 0, 0, 0][..]));
        assert_eq!(notes.len(), if kept { 1 } else { 2 }, "{notes:?}");
        // With the format unchanged it stays, whatever it says.
        assert!(copy(&file).unwrap().output == file);
    }
}

#[test]
fn extensible_stays_extensible_with_its_channel_mask_and_what_follows() {
    let mask = 0x0003_0104;
    let mut fmt = FmtFields::plain(PCM, 3, 24).extensible(20, mask).chunk();
    fmt.body.extend(b"more");
    fmt.body[16] = 26;
    let file = riff(&[fmt, raw(b"data", &[9; 27])]);
    let (output, _) = to(&file, Encoding::Float64);
    let mut expected = FmtFields::plain(FLOAT, 3, 64).extensible(64, mask).body();
    expected.extend(b"more");
    expected[16] = 26;
    assert_eq!(body(&output, b"fmt "), Some(&expected[..]));
    let format = SampleFormat { encoding: Encoding::Pcm32, valid_bits: 24 };
    let copied = copy_with(&file, Some(format), 2, |x| x).unwrap();
    let mut expected = FmtFields::plain(PCM, 3, 32).extensible(24, mask).body();
    expected.extend(b"more");
    expected[16] = 26;
    assert_eq!(body(&copied.output, b"fmt "), Some(&expected[..]));
    assert_eq!(copy(&copied.output).unwrap().header.format, format);
}

#[test]
fn data_of_odd_length_is_padded_in_the_new_format() {
    let file = pcm16_mono(&[], 3, &[raw(b"abcd", b"1234")]);
    let (output, _) = to(&file, Encoding::Pcm24);
    assert_eq!(output[40..44], [9, 0, 0, 0]);
    assert_eq!(output[44 + 9..], *b"\0abcd\x04\0\0\x001234");
    let (output, _) = to(&output, Encoding::Pcm16);
    assert!(output == file);
}

#[test]
fn bytes_after_the_last_chunk_stay_outside_the_riff() {
    let trail = b"\0\0\0 no chunk";
    let sound = pcm16_mono(&[], 3, &[raw(b"abcd", b"1234")]);
    let wide = to(&sound, Encoding::Float64).0;
    let with_trail = |file: &[u8]| [file, trail].concat();
    let copied = copy_with(&with_trail(&sound), Some(SampleFormat::full(Encoding::Float64)), 11, |x| x).unwrap();
    assert!(copied.output == with_trail(&wide));
    let mut wrong = with_trail(&sound);
    wrong[4..8].fill(0xff);
    assert!(copy(&wrong).unwrap().output == with_trail(&sound));
}

#[test]
fn a_cut_frame_is_left_out_of_a_new_format_and_said_so() {
    let file = riff(&[FmtFields::plain(PCM, 1, 16).chunk(), raw(b"data", &[1, 1, 2, 2, 3]), raw(b"abcd", b"1234")]);
    let (output, notes) = to(&file, Encoding::Pcm24);
    assert_eq!(output[40..50], [6, 0, 0, 0, 0, 1, 1, 0, 2, 2]);
    assert_eq!(output[50..54], *b"abcd");
    assert!(notes.iter().any(|n| n.starts_with("1 bytes after the last whole frame were left out")), "{notes:?}");
}

#[test]
fn recordings_written_by_an_independent_writer_are_read() {
    for (bits, format) in [
        (8, hound::SampleFormat::Int),
        (16, hound::SampleFormat::Int),
        (24, hound::SampleFormat::Int),
        (32, hound::SampleFormat::Int),
        (32, hound::SampleFormat::Float),
    ] {
        let spec = hound::WavSpec { channels: 2, sample_rate: 96_000, bits_per_sample: bits, sample_format: format };
        let mut file = Cursor::new(Vec::new());
        let mut writer = hound::WavWriter::new(&mut file, spec).unwrap();
        let values: Vec<i32> = (0..200).map(|k| (k - 100) << (bits - 8)).collect();
        for &value in &values {
            match format {
                hound::SampleFormat::Int => writer.write_sample(value).unwrap(),
                hound::SampleFormat::Float => writer.write_sample(value as f32).unwrap(),
            }
        }
        writer.finalize().unwrap();
        let scale = if format == hound::SampleFormat::Float { 1.0 } else { libm::ldexp(1.0, i32::from(bits) - 1) };
        let file = file.into_inner();
        let read = samples(&file).unwrap();
        for (channel, plane) in read.iter().enumerate() {
            let expected = values.iter().skip(channel).step_by(2).map(|&x| f64::from(x) / scale);
            assert_eq!(*plane, expected.collect::<Vec<_>>());
        }
        let copied = copy(&file).unwrap();
        assert_eq!(copied.header.rate_hz, 96_000);
        assert!(copied.output == file);
    }
}

#[test]
fn outputs_beyond_what_the_sizes_can_say_are_refused_before_anything_is_written() {
    // 5000 channels of 16 bits make a frame of 10000 bytes; of 64 bits, 40000; 9000
    // channels of 64 bits pass the 16 bits of the block align.
    for (channels, fits) in [(5000, true), (9000, false)] {
        let mut file = riff(&[FmtFields::plain(PCM, 1, 8).chunk(), raw(b"data", &vec![128; 9000 * 2])]);
        file[22..24].copy_from_slice(&u16::to_le_bytes(channels));
        file[28..32].copy_from_slice(&(u32::from(channels) * 48_000).to_le_bytes());
        file[32..34].copy_from_slice(&u16::to_le_bytes(channels));
        let mut reader = Reader::open(Cursor::new(&file)).unwrap();
        let mut written = Vec::new();
        let result = Writer::begin(&mut written, &mut reader, &Changes::samples(SampleFormat::full(Encoding::Float64)))
            .map(|_| ());
        assert_eq!(result.is_ok(), fits);
        if let Err(error) = result {
            assert!(error.to_string().contains("72000 bytes, expected at most 65535"), "{error}");
            assert_eq!(written.len(), 0);
        }
    }
}
