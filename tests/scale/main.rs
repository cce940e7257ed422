//! Folders of thousands of recordings: one entry each, in order, safe as soon as it is made,
//! and memory that hardly grows with their number.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may panic, and its own recordings need no bit-for-bit sines"
)]

#[allow(dead_code, reason = "other tests use the rest")]
#[path = "../run/fixtures.rs"]
mod fixtures;

mod entries;
#[cfg(target_os = "linux")]
mod journal;
#[cfg(target_os = "linux")]
mod memory;

use fixtures::{Bench, wav16};

/// Frames of a recording that costs next to nothing and is not measured.
const FRAMES: usize = 16;

/// A folder with `count` recordings, a hundred to a subfolder, and their paths in order.
fn tiny_recordings(spec: &str, count: usize) -> (Bench, Vec<String>) {
    let bench = Bench::new(spec);
    let contents: Vec<Vec<u8>> = (0..7i32)
        .map(|seed| {
            let samples: Vec<f64> = (0..FRAMES as i32).map(|n| f64::from((n * (seed + 3)) % 11 - 5) / 64.0).collect();
            wav16(8000, 1, &samples)
        })
        .collect();
    // Numbers without leading zeros: the order of paths is not that of making.
    let mut paths: Vec<String> =
        (0..count).map(|index| format!("card-{}/{index}.wav", index % (count / 100))).collect();
    for (index, path) in paths.iter().enumerate() {
        bench.input(path, &contents[index % contents.len()]);
    }
    paths.sort();
    (bench, paths)
}
