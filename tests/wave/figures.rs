//! What the reader tells about the samples it saw.

use std::io::Cursor;

use bandproof::wave::{InputFigures, Reader};
use proptest::prelude::*;

use crate::build::{FLOAT, FmtFields, PCM, raw, riff};
use crate::run::sha256;

fn figures(file: &[u8], block: usize) -> InputFigures {
    let mut reader = Reader::open(Cursor::new(file)).unwrap();
    let mut planes = vec![Vec::new(); usize::from(reader.header().channels)];
    while reader.read(block, &mut planes).unwrap() > 0 {}
    reader.finish().unwrap()
}

fn pcm16(channels: u16, samples: &[i16]) -> Vec<u8> {
    let bytes: Vec<u8> = samples.iter().flat_map(|x| x.to_le_bytes()).collect();
    riff(&[FmtFields::plain(PCM, channels, 16).chunk(), raw(b"data", &bytes)])
}

fn float32(samples: &[f32]) -> Vec<u8> {
    let bytes: Vec<u8> = samples.iter().flat_map(|x| x.to_le_bytes()).collect();
    riff(&[FmtFields::plain(FLOAT, 1, 32).chunk(), raw(b"data", &bytes)])
}

#[test]
fn runs_at_full_scale_are_two_or_more_in_a_row_of_one_channel() {
    const T: i16 = 32767;
    const B: i16 = -32768;
    let cases: [(&[i16], u64); 9] = [
        (&[0, T, 0, T, 0], 0),
        (&[T, T], 1),
        (&[0, T, T, T, T, 0], 1),
        (&[T, T, 0, B, B, 0, T, T], 3),
        (&[T, B], 1),      // either sign
        (&[-T, -T, 0], 1), // stopped at the symmetric value
        (&[T - 1, T - 1, T - 1], 0),
        (&[T, T, 0, T], 1),
        (&[B, B, T - 1, B, B, B], 2),
    ];
    for (samples, runs) in cases {
        for block in 1..samples.len() + 1 {
            assert_eq!(figures(&pcm16(1, samples), block).full_scale_runs, runs, "{samples:?} by {block}");
        }
    }
    // Neighbors in the file, but of different channels.
    assert_eq!(figures(&pcm16(2, &[0, T, T, 0, 0, T]), 9).full_scale_runs, 0);
    assert_eq!(figures(&pcm16(2, &[0, T, T, T, T, 0]), 9).full_scale_runs, 2);
    // Full scale of floats is 1.0, and they may exceed it.
    assert_eq!(figures(&float32(&[0.999_999_9, 0.999_999_9, 0.0, 1.0, -1.5, 0.0]), 4).full_scale_runs, 1);
    // Valid bits count: 20 of 24 bits stop at 0x7ffff0.
    let fmt = FmtFields::plain(PCM, 1, 24).extensible(20, 4);
    let file = riff(&[fmt.chunk(), raw(b"data", &[0xf0, 0xff, 0x7f, 0xf0, 0xff, 0x7f])]);
    assert_eq!(figures(&file, 1).full_scale_runs, 1);
}

#[test]
fn rounding_power_is_a_twelfth_of_the_squared_step() {
    // Quantization noise of a uniform quantizer: W. R. Bennett, "Spectra of quantized
    // signals", Bell Syst. Tech. J. 27, 1948.
    let power = figures(&pcm16(2, &[5; 8]), 3).rounding_power;
    assert_eq!(power, [1.0 / (32768.0f64 * 32768.0 * 12.0); 2]);
    // One float in [0.5, 1): spacing 2^-24; in [0.25, 0.5): 2^-25; 0 and subnormals: 2^-149.
    let square = |exponent: i32| libm::ldexp(1.0, 2 * exponent) / 12.0;
    for (sample, exponent) in [(0.75f32, -24), (-0.5, -24), (0.3, -25), (1.0, -23), (3.9, -22), (0.0, -149)] {
        let power = figures(&float32(&[sample; 5]), 2).rounding_power[0];
        let expected = square(exponent);
        assert!((power - expected).abs() <= 2.0 * f64::EPSILON * expected, "{sample}: {power} {expected}");
        if sample != 0.0 {
            let above = f32::from_bits(sample.to_bits() + 1);
            assert_eq!(f64::from(above - sample).abs(), libm::ldexp(1.0, exponent));
        }
    }
    let mixed = figures(&float32(&[0.75, 0.3, 0.75, 0.3]), 3).rounding_power[0];
    let expected = (square(-24) + square(-25)) / 2.0;
    assert!((mixed - expected).abs() <= 2.0 * f64::EPSILON * expected); // two roundings, in another order
    let fmt = FmtFields::plain(FLOAT, 1, 64);
    assert_eq!(figures(&riff(&[fmt.chunk(), raw(b"data", &[0; 80])]), 3).rounding_power, [0.0]);
}

#[test]
fn rewinding_starts_afresh() {
    let file = pcm16(2, &[32767; 4000]);
    let mut reader = Reader::open(Cursor::new(&file)).unwrap();
    let once = figures(&file, 100);
    let mut planes = [Vec::new(), Vec::new()];
    reader.read(700, &mut planes).unwrap();
    reader.rewind();
    for _ in 0..2 {
        planes.iter_mut().for_each(Vec::clear);
        while reader.read(300, &mut planes).unwrap() > 0 {}
        assert_eq!(reader.read(1, &mut planes).unwrap(), 0);
        assert_eq!(planes, [vec![32767.0 / 32768.0; 2000], vec![32767.0 / 32768.0; 2000]]);
        assert_eq!(reader.finish().unwrap(), once);
        assert_eq!(reader.finish().unwrap(), once);
        reader.rewind();
    }
    assert_eq!(once.sha256, sha256(&file));
    assert_eq!(once.full_scale_runs, 2);
}

#[test]
fn skimming_gives_the_samples_and_no_figures() {
    let file = pcm16(2, &[32767; 4000]);
    let mut reader = Reader::open(Cursor::new(&file)).unwrap();
    let once = figures(&file, 100);
    let mut planes = [Vec::new(), Vec::new()];
    let read_all = |reader: &mut Reader<_>, planes: &mut [Vec<f64>; 2]| {
        planes.iter_mut().for_each(Vec::clear);
        while reader.read(300, planes).unwrap() > 0 {}
    };
    reader.skim();
    read_all(&mut reader, &mut planes);
    assert_eq!(planes, [vec![32767.0 / 32768.0; 2000], vec![32767.0 / 32768.0; 2000]]);
    assert!(reader.finish().is_err());
    reader.rewind();
    read_all(&mut reader, &mut planes);
    assert_eq!(reader.finish().unwrap(), once);
}

proptest! {
    #[test]
    fn figures_do_not_depend_on_blocks(
        // Exponents so far apart that sums of squared steps are rounded, in an order that shows.
        samples in prop::collection::vec((-2.0f32..2.0, -30i32..0), 1..300), one in 1usize..60, other in 1usize..60,
    ) {
        let samples: Vec<f32> = samples.iter().map(|&(x, e)| (f64::from(x) * libm::ldexp(1.0, e)) as f32).collect();
        let file = float32(&samples);
        prop_assert_eq!(figures(&file, one), figures(&file, other));
    }
}
