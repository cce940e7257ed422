//! Whole rechecks by the binary, on datasets that it made and that were then harmed.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may panic, and its own recordings need no bit-for-bit sines"
)]

#[path = "../run/fixtures.rs"]
#[allow(dead_code, reason = "shared with other tests, each of which uses its part")]
mod fixtures;

mod bad_reports;
mod dataset;
mod files;
mod forms;
mod interrupt;
mod pairs;
mod places;
mod remeasure;
mod replay;
mod text;
