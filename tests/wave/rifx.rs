//! RIFX: the same files with the highest byte first.

use bandproof::wave::{Changes, Encoding, Form, SampleFormat};
use proptest::prelude::*;

use crate::build::{FLOAT, FmtFields, PCM, RawChunk, raw, riff, rifx};
use crate::run::{copy, copy_changed, copy_with, samples};

const ENCODINGS: [(Encoding, u16, u16); 6] = [
    (Encoding::Pcm8, PCM, 8),
    (Encoding::Pcm16, PCM, 16),
    (Encoding::Pcm24, PCM, 24),
    (Encoding::Pcm32, PCM, 32),
    (Encoding::Float32, FLOAT, 32),
    (Encoding::Float64, FLOAT, 64),
];

/// The samples of `bytes` in the other byte order.
fn reversed(bytes: &[u8], container: u16) -> Vec<u8> {
    bytes.chunks(usize::from(container)).flat_map(|sample| sample.iter().rev().copied()).collect()
}

/// The same recording in both byte orders.
fn both(fmt: FmtFields, bytes: &[u8], others: &[RawChunk]) -> (Vec<u8>, Vec<u8>) {
    let chunks = |fmt: Vec<u8>, data: &[u8]| [&[raw(b"fmt ", &fmt)], others, &[raw(b"data", data)]].concat();
    let little = riff(&chunks(fmt.body(), bytes));
    (little, rifx(&chunks(fmt.big_endian(true), &reversed(bytes, fmt.container))))
}

#[test]
fn a_file_written_out_by_hand_is_read() {
    // Two frames of two channels, 16 bits, 8000 Hz (Multimedia Programming Interface and
    // Data Specifications 1.0, 1991: RIFX is RIFF in Motorola byte order).
    let mut file = b"RIFX\0\0\0\x2cWAVEfmt \0\0\0\x10".to_vec();
    file.extend(b"\0\x01\0\x02\0\0\x1f\x40\0\0\x7d\0\0\x04\0\x10");
    file.extend(b"data\0\0\0\x08\x40\x00\xc0\x00\x00\x01\x80\x00");
    let copied = copy(&file).unwrap();
    assert_eq!(copied.header.form, Form::Rifx);
    assert_eq!((copied.header.rate_hz, copied.header.channels, copied.header.frames), (8000, 2, 2));
    assert_eq!(samples(&file).unwrap(), [vec![0.5, 1.0 / 32768.0], vec![-0.5, -1.0]]);
    assert!(copied.output == file);
    assert_eq!(copied.header.notes, Vec::<String>::new());
}

#[test]
fn rifx_comes_back_as_rifx_in_every_encoding() {
    let bytes: Vec<u8> = (0..=239).collect();
    let others = [raw(b"bext", &[7; 603]), raw(b"LIST", b"INFO")];
    for channels in [1u16, 2, 3] {
        for extensible in [false, true] {
            let fmt = FmtFields::plain(PCM, channels, 8);
            let fmt = if extensible { fmt.extensible(8, 0x0102_0304) } else { fmt };
            let (little, big) = both(fmt, &bytes, &others);
            for (encoding, tag, bits) in ENCODINGS {
                let format = Some(SampleFormat::full(encoding));
                let from_little = copy_with(&little, format, 7, |x| x).unwrap();
                let from_big = copy_with(&big, format, 7, |x| x).unwrap();
                assert_eq!(from_big.written.notes, from_little.written.notes);
                assert_eq!(from_big.written.chunks, from_little.written.chunks);
                let header = copy(&from_big.output).unwrap().header;
                assert_eq!((header.form, header.format), (Form::Rifx, SampleFormat::full(encoding)));
                assert_eq!(header.notes, Vec::<String>::new());
                assert_eq!(samples(&from_big.output).unwrap(), samples(&little).unwrap());
                // Byte for byte: the little-endian output, turned.
                let data = copy(&from_little.output).unwrap().header;
                let to = |fmt: FmtFields| if extensible { fmt.extensible(bits, 0x0102_0304) } else { fmt };
                let mut chunks = vec![raw(b"fmt ", &to(FmtFields::plain(tag, channels, bits)).big_endian(true))];
                if tag == FLOAT {
                    chunks.push(raw(b"fact", &(240 / u32::from(channels)).to_be_bytes()));
                }
                chunks.extend(others.clone());
                let from = data.data_offset as usize;
                let samples = &from_little.output[from..from + data.data_bytes as usize];
                chunks.push(raw(b"data", &reversed(samples, bits / 8)));
                assert!(from_big.output == rifx(&chunks), "{encoding:?} {channels} {extensible}");
            }
        }
    }
}

#[test]
fn the_guid_of_an_extensible_rifx_may_have_either_byte_order_and_keeps_it() {
    // No source says which; both are written (common practice, no source).
    for guid in [true, false] {
        let fmt = FmtFields::plain(PCM, 1, 24).extensible(20, 4);
        let file = rifx(&[raw(b"fmt ", &fmt.big_endian(guid)), raw(b"data", &[0x40, 0, 0, 0xc0, 0, 0])]);
        let copied = copy(&file).unwrap();
        assert_eq!(copied.header.format, SampleFormat { encoding: Encoding::Pcm24, valid_bits: 20 });
        assert_eq!(samples(&file).unwrap(), [vec![0.5, -0.5]]);
        assert!(copied.output == file);
        let float = copy_with(&file, Some(SampleFormat::full(Encoding::Float32)), 7, |x| x).unwrap();
        let expected = FmtFields::plain(FLOAT, 1, 32).extensible(32, 4).big_endian(guid);
        assert_eq!(float.output[20..60], expected);
    }
}

#[test]
fn damage_of_rifx_is_repaired_in_its_own_byte_order() {
    let fmt = FmtFields::plain(FLOAT, 1, 32);
    let fact = raw(b"fact", &[0, 0, 0, 100]);
    let data = |declared| raw(b"data", &[0; 101]).padded(&[]).declaring(declared);
    let sound = rifx(&[raw(b"fmt ", &fmt.big_endian(true)), raw(b"fact", &[0, 0, 0, 25]), raw(b"data", &[0; 100])]);
    for declared in [0, 400, u32::MAX] {
        let mut file = rifx(&[raw(b"fmt ", &fmt.big_endian(true)), fact.clone(), data(declared)]);
        file[4..8].fill(0);
        let copied = copy(&file).unwrap();
        assert!(copied.output == sound, "{declared}");
        assert!(copied.header.notes.iter().any(|n| n.contains(&format!("declares {declared} bytes, found 101"))));
        assert!(copied.header.notes.iter().any(|n| n.contains("`fact` at byte 38 declares 100 frames")));
    }
}

#[test]
fn rifx_has_no_64_bit_form_to_grow_into() {
    let (_, file) = both(FmtFields::plain(PCM, 1, 16), &[0; 200], &[raw(b"JUNK", &[0; 28])]);
    let format = SampleFormat::full(Encoding::Float32);
    let bytes = file.len() as u64 + 200 + 2 + 12;
    for limit in [bytes, bytes - 1] {
        let changes = Changes { riff_limit_bytes: limit, ..Changes::samples(format) };
        match copy_changed(&file, &changes, 9, |x| x) {
            Ok(copied) => assert_eq!((limit, copied.output.len() as u64), (bytes, bytes)),
            Err(error) => {
                assert_eq!(limit, bytes - 1);
                let expected = format!("the output would take {bytes} bytes, expected at most {limit}: RIFX");
                assert!(error.to_string().starts_with(&expected), "{error}");
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn both_byte_orders_give_the_same_samples_for_every_format_channel_count_and_block(
        which in 0usize..6, channels in 1u16..6, frames in 1usize..300, block in 1usize..200,
        bytes in prop::collection::vec(any::<u8>(), 64),
    ) {
        let (_, tag, bits) = ENCODINGS[which];
        let container = usize::from(bits / 8);
        let mut bytes: Vec<u8> = bytes.into_iter().cycle().take(frames * usize::from(channels) * container).collect();
        if tag == FLOAT {
            // Neither NaN nor infinity: an exponent bit is cleared.
            bytes.chunks_mut(container).for_each(|sample| sample[container - 1] &= 0xbf);
        }
        let (little, big) = both(FmtFields::plain(tag, channels, bits), &bytes, &[]);
        prop_assert_eq!(samples(&big).unwrap(), samples(&little).unwrap());
        prop_assert!(copy_with(&big, None, block, |x| x).unwrap().output == big);
    }
}
