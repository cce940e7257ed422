//! Sample formats: every encoding, form and channel count there and back.

use std::io::Cursor;

use bandproof::wave::{Encoding, SampleFormat};
use proptest::prelude::*;

use crate::build::{FLOAT, FmtFields, PCM, raw, riff};
use crate::run::{copy, copy_with, error, samples};

/// Every encoding with the fields of a plain `fmt `.
const ENCODINGS: [(Encoding, u16, u16); 6] = [
    (Encoding::Pcm8, PCM, 8),
    (Encoding::Pcm16, PCM, 16),
    (Encoding::Pcm24, PCM, 24),
    (Encoding::Pcm32, PCM, 32),
    (Encoding::Float32, FLOAT, 32),
    (Encoding::Float64, FLOAT, 64),
];

fn recording(fmt: FmtFields, samples: &[u8]) -> Vec<u8> {
    riff(&[fmt.chunk(), raw(b"data", samples)])
}

/// Bytes of any value, but no NaN or infinity for floats: the exponent's lowest bit
/// is cleared, so it is never all ones.
fn any_samples(tag: u16, container: u16, count: usize, mut seed: u64) -> Vec<u8> {
    let mut bytes = Vec::new();
    for _ in 0..count {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        let mut sample = (seed ^ seed >> 29).to_le_bytes()[..usize::from(container)].to_vec();
        if tag == FLOAT {
            let at = usize::from(container) - 2;
            sample[at] &= if container == 4 { 0x7f } else { 0xef };
        }
        bytes.extend(sample);
    }
    bytes
}

#[test]
fn smallest_middle_and_largest_integers_decode_to_their_fractions_of_full_scale() {
    // x / 2^(n-1), 8 bits unsigned about 128 (Multimedia Programming Interface and
    // Data Specifications 1.0, 1991).
    let cases: [(u16, Vec<u8>, [f64; 5]); 4] = [
        (8, vec![0, 127, 128, 129, 255], [-1.0, -1.0 / 128.0, 0.0, 1.0 / 128.0, 127.0 / 128.0]),
        (
            16,
            [i16::MIN, -1, 0, 1, i16::MAX].iter().flat_map(|x| x.to_le_bytes()).collect(),
            [-1.0, -1.0 / 32768.0, 0.0, 1.0 / 32768.0, 32767.0 / 32768.0],
        ),
        (
            24,
            [-8_388_608i32, -1, 0, 1, 8_388_607].iter().flat_map(|x| x.to_le_bytes()[..3].to_vec()).collect(),
            [-1.0, -1.0 / 8_388_608.0, 0.0, 1.0 / 8_388_608.0, 8_388_607.0 / 8_388_608.0],
        ),
        (
            32,
            [i32::MIN, -1, 0, 1, i32::MAX].iter().flat_map(|x| x.to_le_bytes()).collect(),
            [-1.0, -1.0 / 2_147_483_648.0, 0.0, 1.0 / 2_147_483_648.0, 2_147_483_647.0 / 2_147_483_648.0],
        ),
    ];
    for (bits, bytes, expected) in cases {
        let file = recording(FmtFields::plain(PCM, 1, bits), &bytes);
        assert_eq!(samples(&file).unwrap(), [expected.to_vec()], "{bits} bits");
        assert_eq!(copy(&file).unwrap().output, file, "{bits} bits");
    }
}

#[test]
fn float_zeros_of_both_signs_subnormals_and_extremes_survive() {
    let singles = [0.0, -0.0, f32::MIN_POSITIVE, f32::from_bits(1), -f32::from_bits(1), f32::MAX, f32::MIN, 1.5];
    let bytes: Vec<u8> = singles.iter().flat_map(|x| x.to_le_bytes()).collect();
    let file = recording(FmtFields::plain(FLOAT, 2, 32), &bytes);
    assert_eq!(copy(&file).unwrap().output, file);
    let doubles = [0.0, -0.0, f64::MIN_POSITIVE, f64::from_bits(1), -f64::from_bits(1), f64::MAX, f64::MIN, 1.5];
    let bytes: Vec<u8> = doubles.iter().flat_map(|x| x.to_le_bytes()).collect();
    let file = recording(FmtFields::plain(FLOAT, 1, 64), &bytes);
    assert_eq!(copy(&file).unwrap().output, file);
    let read = samples(&file).unwrap();
    assert!(read[0].iter().zip(&doubles).all(|(a, b)| a.to_bits() == b.to_bits()));
}

#[test]
fn every_pair_of_encodings_and_forms_is_read_back_the_same_by_an_independent_reader() {
    // 8-bit values are exact in every encoding.
    let bytes: Vec<u8> = (0..=255).collect();
    for channels in [1u16, 2, 4] {
        for extensible in [false, true] {
            let plain = FmtFields::plain(PCM, channels, 8);
            let fmt = if extensible { plain.extensible(8, 0x3) } else { plain };
            let source = recording(fmt, &bytes);
            for (encoding, tag, bits) in ENCODINGS {
                let first = copy_with(&source, Some(SampleFormat::full(encoding)), 7, |x| x).unwrap();
                for (encoding, _, bits) in ENCODINGS {
                    let second = copy_with(&first.output, Some(SampleFormat::full(encoding)), 9, |x| x).unwrap();
                    assert_eq!(samples(&second.output).unwrap(), samples(&source).unwrap());
                    read_by_hound(&second.output, encoding, bits, channels, &bytes);
                }
                assert_eq!(first.header.rate_hz, 48_000);
                let reread = copy(&first.output).unwrap();
                assert_eq!(reread.header.format, SampleFormat { encoding, valid_bits: bits });
                assert_eq!(reread.header.notes, Vec::<String>::new(), "{tag} {bits}");
            }
        }
    }
}

fn read_by_hound(file: &[u8], encoding: Encoding, bits: u16, channels: u16, bytes: &[u8]) {
    if encoding == Encoding::Float64 {
        return; // hound reads no 64-bit floats
    }
    let mut reader = hound::WavReader::new(Cursor::new(file)).unwrap();
    let spec = reader.spec();
    assert_eq!((spec.channels, spec.sample_rate, spec.bits_per_sample), (channels, 48_000, bits));
    let expected = bytes.iter().map(|&b| i64::from(b) - 128);
    if encoding == Encoding::Float32 {
        assert_eq!(spec.sample_format, hound::SampleFormat::Float);
        let read: Vec<f32> = reader.samples::<f32>().map(Result::unwrap).collect();
        assert_eq!(read, expected.map(|x| x as f32 / 128.0).collect::<Vec<_>>());
    } else {
        assert_eq!(spec.sample_format, hound::SampleFormat::Int);
        let read: Vec<i32> = reader.samples::<i32>().map(Result::unwrap).collect();
        assert_eq!(read, expected.map(|x| (x << (bits - 8)) as i32).collect::<Vec<_>>());
    }
}

#[test]
fn valid_bits_below_the_container_are_seen_and_the_bits_below_them_survive() {
    let cases = [
        // The form says so: 20 in 24, 24 in 32.
        (FmtFields::plain(PCM, 2, 24).extensible(20, 3), Encoding::Pcm24, 20),
        (FmtFields::plain(PCM, 1, 32).extensible(24, 4), Encoding::Pcm32, 24),
        // Plain tag: 20 bits in 3 bytes, 12 in 2, 24 in 4.
        (FmtFields::plain(PCM, 1, 20), Encoding::Pcm24, 20),
        (FmtFields::plain(PCM, 3, 12), Encoding::Pcm16, 12),
        (FmtFields { container: 4, ..FmtFields::plain(PCM, 2, 24) }, Encoding::Pcm32, 24),
    ];
    for (fmt, encoding, valid_bits) in cases {
        let bytes = any_samples(PCM, fmt.container, 60, 5);
        let file = recording(fmt, &bytes);
        let copied = copy(&file).unwrap();
        assert_eq!(copied.header.format, SampleFormat { encoding, valid_bits });
        assert_eq!(copied.output, file);
        let step = libm::ldexp(1.0, 1 - i32::from(valid_bits));
        for power in copied.input.rounding_power {
            assert_eq!(power, step * step / 12.0);
        }
        // To another format and back: the form says the same again.
        let wide = copy_with(&file, Some(SampleFormat::full(Encoding::Float64)), 11, |x| x).unwrap();
        let back = copy_with(&wide.output, Some(copied.header.format), 13, |x| x).unwrap();
        assert_eq!(copy(&back.output).unwrap().header.format, copied.header.format);
        assert_eq!(samples(&back.output).unwrap(), samples(&file).unwrap());
    }
}

#[test]
fn samples_in_the_lower_part_of_their_containers_are_refused_by_name() {
    // The independent writer puts 24 bits into the lower part of 4 bytes, its sign not
    // extended; with the sign extended they look no better.
    let spec = hound::WavSpec {
        channels: 1,
        sample_rate: 48_000,
        bits_per_sample: 24,
        sample_format: hound::SampleFormat::Int,
    };
    let spec = hound::WavSpecEx { spec, bytes_per_sample: 4 };
    let mut file = Cursor::new(Vec::new());
    let mut writer = hound::WavWriter::new_with_spec_ex(&mut file, spec).unwrap();
    let values = [0i32, 1, -1, 8_388_607, -8_388_608];
    values.iter().for_each(|&v| writer.write_sample(v).unwrap());
    writer.finalize().unwrap();
    let text = error(&file.into_inner());
    assert!(text.contains("the 24-bit samples stand in the lower part of their 4-byte containers"), "{text}");

    let fmt = FmtFields { container: 4, ..FmtFields::plain(PCM, 1, 24) };
    let file = |shift: u32| {
        let bytes: Vec<u8> = values.iter().flat_map(|v| (v << shift).to_le_bytes()).collect();
        recording(fmt, &bytes)
    };
    assert!(error(&file(0)).contains("lower part"));
    let upper = copy(&file(8)).unwrap();
    assert_eq!(upper.input.notes, Vec::<String>::new());
    assert_eq!(samples(&file(8)).unwrap(), [values.map(|v| f64::from(v) / 8_388_608.0).to_vec()]);
    // Silence, or a single loud sample, leaves no doubt of the other kind.
    copy(&recording(fmt, &[0; 40])).unwrap();
    let loud = copy(&recording(fmt, &[[1, 0, 0, 0], [0, 0, 0, 0x40]].concat())).unwrap();
    assert!(loud.input.notes[0].starts_with("1 samples carry bits below the 24 valid ones"), "{:?}", loud.input.notes);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn decoding_and_encoding_is_the_identity_for_every_format_channel_count_and_block(
        which in 0usize..6, channels in 1u16..7, frames in 1usize..700, block in 1usize..300, seed: u64,
    ) {
        let (_, tag, bits) = ENCODINGS[which];
        let fmt = FmtFields::plain(tag, channels, bits);
        let file = recording(fmt, &any_samples(tag, bits / 8, frames * usize::from(channels), seed));
        let copied = copy_with(&file, None, block, |x| x).unwrap();
        prop_assert_eq!(copied.header.frames, frames as u64);
        prop_assert!(copied.output == file);
        prop_assert!(copied.written.chunks.iter().all(|c| c.kept));
    }
}
