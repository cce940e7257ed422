//! Delay, clock and polarity against signals whose truth is known exactly.
// Clippy allows these in `#[test]` functions only; here all is test.
#![allow(clippy::expect_used, clippy::unwrap_used, clippy::panic, clippy::disallowed_methods)]

mod edges;
mod filters;
mod follow;
mod lines;
mod signals;
