//! Every vector width, block division and number of channels gives the bits of
//! the cascade run section by section.

use crate::helpers::{WIDTHS, assert_same_bits, noise, random_sections, run, run_on, section};
use bandproof::cascade::{Cascade, Filter, plain};
use bandproof::section::Section;
use proptest::prelude::*;
use std::sync::Arc;

fn check(sections: &[Section], channels: &[Vec<f64>], blocks: &[usize]) {
    for width in WIDTHS {
        let found = run(sections, width, channels, blocks);
        for (channel, (found, input)) in found.iter().zip(channels).enumerate() {
            let what = format!("{} sections, {width:?}, channel {channel} of {}", sections.len(), channels.len());
            assert_same_bits(found, &plain::filter(sections, input), &what);
        }
    }
}

#[test]
fn every_number_of_sections_equals_section_by_section() {
    for count in 0..=70 {
        let sections = random_sections(count as u64, count);
        check(&sections, &[noise(1, 2500), noise(2, 2500), noise(3, 2500)], &[611]);
    }
}

#[test]
fn every_number_of_channels_equals_section_by_section() {
    for count in 1..=33 {
        let channels: Vec<Vec<f64>> = (0..count).map(|channel| noise(channel, 1100)).collect();
        for sections in [1, 5, 10, 16, 21] {
            check(&random_sections(count, sections), &channels, &[300, 0, 7]);
        }
    }
}

#[test]
fn every_short_recording_equals_section_by_section() {
    for count in [1, 4, 7, 16, 17, 35] {
        let sections = random_sections(9, count);
        for frames in 0..80 {
            check(&sections, &[noise(4, frames), noise(5, frames)], &[1, 0, 3, 30]);
        }
    }
}

#[test]
fn nothing_in_gives_nothing_out() {
    let mut filter = Filter::new(Arc::new(Cascade::new(&random_sections(1, 20))), 3);
    let mut out = vec![Vec::new(); 3];
    filter.finish(&mut out);
    filter.process(&vec![Vec::new(); 3], &mut out);
    filter.finish(&mut out);
    assert_eq!(out, vec![Vec::<f64>::new(); 3]);
    let mut filter = Filter::new(Arc::new(Cascade::new(&random_sections(1, 20))), 0);
    filter.process(&[], &mut []);
    filter.finish(&mut []);
}

#[test]
fn process_lags_by_the_latency_once_and_finish_makes_it_up() {
    for count in [0, 1, 2, 10, 16, 17, 33, 64] {
        let cascade = Arc::new(Cascade::new(&random_sections(3, count)));
        let latency = cascade.latency_frames();
        assert_eq!(latency, 2 * (count - count.div_ceil(16)));
        let mut filter = Filter::new(cascade, 2);
        let mut out = vec![vec![0.25], vec![0.25]];
        for fed in (10..500).step_by(10) {
            filter.process(&[noise(fed, 10), noise(fed + 1, 10)], &mut out);
            let expected = 1 + (fed as usize).saturating_sub(latency);
            assert_eq!(out.each_len(), [expected; 2], "{count} sections, {fed} frames in");
        }
        filter.finish(&mut out);
        assert_eq!(out.each_len(), [491; 2], "{count} sections");
        assert_eq!(out[0][0], 0.25, "what was there stays");
    }
}

trait EachLen {
    fn each_len(&self) -> Vec<usize>;
}

impl EachLen for Vec<Vec<f64>> {
    fn each_len(&self) -> Vec<usize> {
        self.iter().map(Vec::len).collect()
    }
}

#[test]
fn a_finished_filter_is_as_new() {
    let sections = random_sections(5, 18);
    let mut filter = Filter::new(Arc::new(Cascade::new(&sections)), 1);
    run_on(&mut filter, &[noise(1, 3000)], &[3000], &mut [Vec::new()]);
    let mut again = [Vec::new()];
    run_on(&mut filter, &[noise(2, 3000)], &[100], &mut again);
    assert_same_bits(&again[0], &plain::filter(&sections, &noise(2, 3000)), "second recording");
}

#[test]
fn an_empty_cascade_is_the_identity_bit_for_bit() {
    let mut input = noise(1, 3000);
    input[..6].copy_from_slice(&[-0.0, 0.0, 5e-324, -1e-310, f64::MAX, -f64::MIN_POSITIVE]);
    input[6] = f64::from_bits(0x7ff8_0000_dead_beef);
    for width in WIDTHS {
        let found = run(&[], width, &[input.clone(), input.clone(), input.clone()], &[7, 2000]);
        found.iter().for_each(|plane| assert_same_bits(plane, &input, "identity"));
    }
}

#[test]
fn zeros_keep_their_sign_as_section_by_section() {
    let sections = [Section { b: [-1.0, 0.0, 0.0], a: [1.0, -0.5, 0.0] }, section(0.5, 0.3, [1.0, -2.0, 1.0])];
    let input = [0.0, -0.0, 0.0, -0.0, 1e-320, -0.0, 0.0, -0.0];
    check(&sections, &[input.to_vec(), input.map(|x| -x).to_vec()], &[3]);
}

fn any_section() -> impl Strategy<Value = Section> {
    (0.0..1.0, 0.0..1.0, prop::array::uniform3(-1.0..1.0)).prop_map(|(r, w, b)| section(libm::sqrt(r), w, b))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(200))]

    #[test]
    fn any_cascade_in_any_blocks_equals_section_by_section(
        sections in prop::collection::vec(any_section(), 0..40),
        channels in 1_usize..6,
        frames in 0_usize..5000,
        blocks in prop::collection::vec(1_usize..3000, 1..8),
        exponent in -720_i32..300,
        seed in any::<u64>(),
    ) {
        let scale = libm::ldexp(1.0, exponent);
        let channels: Vec<Vec<f64>> = (0..channels as u64)
            .map(|c| noise(seed ^ c, frames).iter().map(|x| x * scale).collect())
            .collect();
        check(&sections, &channels, &blocks);
    }
}
