//! Whole runs of `measure` on pairs whose truth is known.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may panic, and its own recordings need no bit-for-bit sines"
)]

#[path = "../run/fixtures.rs"]
#[allow(dead_code, reason = "shared with other tests, each of which uses its part")]
mod fixtures;

mod bad_input;
mod devices;
mod files;
mod laws;
mod sound;
