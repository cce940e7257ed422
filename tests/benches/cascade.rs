//! Criterion benches of the cascade: `cargo bench --bench cascade`.
//!
//! Throughput is in samples (elements) a second, channels counted one by one.
#![allow(missing_docs)] // criterion's macros make undocumented functions

use bandproof::cascade::{Cascade, Filter, Width, plain};
use bandproof::section::Section;
use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use std::hint::black_box;
use std::sync::Arc;

const BLOCK_FRAMES: usize = 16_384;

/// 2 Hz wide notches at 50, 100, ... Hz at 48 kHz.
fn notches(count: usize) -> Vec<Section> {
    let half_width = std::f64::consts::PI * 2.0 / 48_000.0;
    let gain = 1.0 / (1.0 + half_width);
    (1..=count)
        .map(|line| {
            let middle = -2.0 * gain * libm::cos(2.0 * std::f64::consts::PI * 50.0 * line as f64 / 48_000.0);
            Section { b: [gain, middle, gain], a: [1.0, middle, (1.0 - half_width) * gain] }
        })
        .collect()
}

fn block(channels: usize) -> Vec<Vec<f64>> {
    (0..channels).map(|c| (0..BLOCK_FRAMES).map(|i| ((i * 7919 + c) % 2003) as f64 / 1001.5 - 1.0).collect()).collect()
}

fn sections_and_channels(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("cascade");
    for count in [1, 4, 8, 10, 16, 32] {
        for channels in [1, 2, 8] {
            let input = block(channels);
            let mut out = vec![Vec::with_capacity(BLOCK_FRAMES); channels];
            let mut filter = Filter::new(Arc::new(Cascade::new(&notches(count))), channels);
            group.throughput(Throughput::Elements((BLOCK_FRAMES * channels) as u64));
            group.bench_function(BenchmarkId::new(format!("{count} sections"), format!("{channels} channels")), |b| {
                b.iter(|| {
                    out.iter_mut().for_each(Vec::clear);
                    filter.process(black_box(&input), &mut out);
                });
            });
        }
    }
    group.finish();
}

/// The kernel without its vector instructions, and the recurrence section by section.
fn ways(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("ways, 10 sections");
    group.throughput(Throughput::Elements(BLOCK_FRAMES as u64));
    let sections = notches(10);
    let input = block(1);
    for width in [Width::Portable, Width::Widest] {
        let mut out = [Vec::with_capacity(BLOCK_FRAMES)];
        let mut filter = Filter::with_width(Arc::new(Cascade::new(&sections)), 1, width);
        group.bench_function(format!("{width:?}"), |b| {
            b.iter(|| {
                out[0].clear();
                filter.process(black_box(&input), &mut out);
            });
        });
    }
    group.bench_function("section by section", |b| b.iter(|| plain::filter(&sections, black_box(&input[0]))));
    group.finish();
}

/// A tone, then silence: the part after it must cost no more than the tone itself.
fn tone_then_silence(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("tone, then digital silence, 10 sections");
    group.throughput(Throughput::Elements(BLOCK_FRAMES as u64));
    let tone = vec![(0..BLOCK_FRAMES).map(|i| libm::sin(0.3 * i as f64)).collect::<Vec<f64>>()];
    let silence = vec![vec![0.0; BLOCK_FRAMES]];
    // From the tone into 10 s of silence (480 000 frames), where the slowest pole,
    // of radius 0.99987, is down by 540 dB, and on into 200 s, where all is cleared.
    for (name, blocks_before) in [("tone", None), ("after 10 s", Some(30)), ("after 200 s", Some(586))] {
        let mut filter = Filter::new(Arc::new(Cascade::new(&notches(10))), 1);
        let mut out = [Vec::with_capacity(BLOCK_FRAMES)];
        filter.process(&tone, &mut out);
        for _ in 0..blocks_before.unwrap_or(0) {
            out[0].clear();
            filter.process(&silence, &mut out);
        }
        let input = if blocks_before.is_some() { &silence } else { &tone };
        group.bench_function(name, |b| {
            b.iter(|| {
                out[0].clear();
                filter.process(black_box(input), &mut out);
            });
        });
    }
    group.finish();
}

criterion_group!(benches, sections_and_channels, ways, tone_then_silence);
criterion_main!(benches);
