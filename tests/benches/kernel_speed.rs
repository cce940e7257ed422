//! Prints the cascade's nanoseconds a sample: `kernel_speed SECTIONS CHANNELS FRAMES [WIDTH]`.
//!
//! For `sosfilt.py`, which times SciPy in turn with it. Run by `cargo bench` without
//! arguments it prints a small table.
#![allow(clippy::print_stdout)]

use bandproof::cascade::{Cascade, Filter, Width};
use bandproof::section::Section;
use std::sync::Arc;
use std::time::Instant;

/// Frames a block, as a recording is read.
const BLOCK_FRAMES: usize = 16_384;

/// A row of 2 Hz wide notches at 50, 100, ... Hz at 48 kHz; `sosfilt.py` makes the same.
fn sections(count: usize) -> Vec<Section> {
    (1..=count)
        .map(|line| {
            let angle = 2.0 * std::f64::consts::PI * 50.0 * line as f64 / 48_000.0;
            let half_width = std::f64::consts::PI * 2.0 / 48_000.0;
            let gain = 1.0 / (1.0 + half_width);
            let cosine = libm::cos(angle);
            Section { b: [gain, -2.0 * gain * cosine, gain], a: [1.0, -2.0 * gain * cosine, (1.0 - half_width) * gain] }
        })
        .collect()
}

fn nanoseconds_a_sample(count: usize, channels: usize, frames: usize, width: Width) -> f64 {
    let cascade = Arc::new(Cascade::new(&sections(count)));
    let block: Vec<Vec<f64>> = (0..channels)
        .map(|channel| (0..BLOCK_FRAMES).map(|i| ((i * 7919 + channel) % 2003) as f64 / 1001.5 - 1.0).collect())
        .collect();
    let mut filter = Filter::with_width(cascade, channels, width);
    let mut out = vec![Vec::with_capacity(BLOCK_FRAMES); channels];
    let blocks = frames.div_ceil(BLOCK_FRAMES);
    let started = Instant::now();
    for _ in 0..blocks {
        out.iter_mut().for_each(Vec::clear);
        filter.process(&block, &mut out);
    }
    let seconds = started.elapsed().as_secs_f64();
    std::hint::black_box(&out);
    seconds * 1e9 / (blocks * BLOCK_FRAMES * channels) as f64
}

fn best(count: usize, channels: usize, frames: usize, width: Width) -> f64 {
    (0..5).map(|_| nanoseconds_a_sample(count, channels, frames, width)).fold(f64::INFINITY, f64::min)
}

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|argument| argument != "--bench").collect();
    let number = |index: usize| arguments.get(index).and_then(|text| text.parse().ok());
    if let (Some(count), Some(channels), Some(frames)) = (number(0), number(1), number(2)) {
        let width = match arguments.get(3).map(String::as_str) {
            Some("portable") => Width::Portable,
            _ => Width::Widest,
        };
        println!("{:.4}", nanoseconds_a_sample(count, channels, frames, width));
        return;
    }
    println!("sections channels portable   widest  (ns a sample)");
    for count in [1, 4, 8, 10, 16, 32] {
        for channels in [1, 2, 8] {
            let [portable, widest] =
                [Width::Portable, Width::Widest].map(|width| best(count, channels, 500_000, width));
            println!("{count:8} {channels:8} {portable:8.2} {widest:8.2}");
        }
    }
}
