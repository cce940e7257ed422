//! Recordings in other forms than plain RIFF, and one whose header was never finished.

use crate::dataset::{Dataset, told};
use crate::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};

/// A plain 16-bit recording as hound writes it: a header of 44 bytes, then samples.
fn plain(seed: u64) -> Vec<u8> {
    wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.3, seed))
}

/// With sizes of 64 bits (EBU Tech 3306; ITU-R BS.2088 for the later name; from memory).
fn wide(form: &[u8; 4], plain: &[u8]) -> Vec<u8> {
    let samples = plain.len() as u64 - 44;
    let sizes = [plain.len() as u64 - 8 + 36, samples, samples / 2].map(u64::to_le_bytes).concat();
    let unknown = [0xff; 4];
    let parts: [&[u8]; 10] = [
        form,
        &unknown,
        b"WAVEds64",
        &28_u32.to_le_bytes(),
        &sizes,
        &[0; 4],
        &plain[12..36],
        b"data",
        &unknown,
        &plain[44..],
    ];
    parts.concat()
}

/// Every number big-endian.
fn rifx(plain: &[u8]) -> Vec<u8> {
    let mut bytes = plain.to_vec();
    bytes[..4].copy_from_slice(b"RIFX");
    for (at, length) in [(4, 4), (16, 4), (20, 2), (22, 2), (24, 4), (28, 4), (32, 2), (34, 2), (40, 4)] {
        bytes[at..at + length].reverse();
    }
    bytes[44..].chunks_mut(2).for_each(|sample| sample.reverse());
    bytes
}

/// As a flat battery leaves it: no sizes, and half a frame at the end.
fn unfinished(plain: &[u8]) -> Vec<u8> {
    let mut bytes = plain[..plain.len() - 1].to_vec();
    bytes[4..8].fill(0);
    bytes[40..44].fill(0);
    bytes
}

const NAMES: [&str; 4] = ["bw64.wav", "rf64.wav", "rifx.wav", "unfinished.wav"];

fn dataset(spec: &str) -> Dataset {
    let bench = Bench::new(spec);
    let contents = [wide(b"BW64", &plain(1)), wide(b"RF64", &plain(2)), rifx(&plain(3)), unfinished(&plain(4))];
    for (name, content) in NAMES.iter().zip(&contents) {
        bench.input(name, content);
    }
    let dataset = Dataset::filtered(bench);
    assert_eq!(dataset.bench.report()["summary"]["done"], 4);
    dataset
}

#[test]
fn every_form_comes_out_again_filtered_and_measured() {
    let history = "[output]\nhistory = true\n".to_owned() + NOTCH_SPEC;
    for spec in [NOTCH_SPEC, &history] {
        let dataset = dataset(spec);
        assert_eq!(dataset.found("--input in --replay --remeasure"), [""; 0], "{spec}");
        let (_, document) = dataset.json("--input in --replay --remeasure");
        assert_eq!((&document["replay"]["same"], &document["remeasure"]["same"]), (&4.into(), &4.into()));
    }
}

#[test]
fn a_changed_sample_is_found_in_every_form() {
    let dataset = dataset(NOTCH_SPEC);
    for name in NAMES {
        // The high byte of a sample, whichever comes first.
        let high = 20_000 + usize::from(name != "rifx.wav");
        dataset.harm(&format!("in/{name}"), |bytes| bytes[high] ^= 0x10);
        let (status, document) = dataset.json("--input in --replay");
        assert_eq!((status, told(&document)), (1, vec![format!("changed input {name}"), format!("replay - {name}")]));
        dataset.harm(&format!("in/{name}"), |bytes| bytes[high] ^= 0x10);
    }
}
