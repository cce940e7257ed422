//! What recordings say of themselves: sample rates that are not those of the header, a
//! history that grows, and everything else that has to stay as it is.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may panic, and its own recordings need no bit-for-bit sines"
)]

#[path = "../run/fixtures.rs"]
#[allow(dead_code, reason = "shared with other tests, each of which uses its part")]
mod fixtures;

#[path = "../wave/build.rs"]
#[allow(dead_code, reason = "shared with other tests, each of which uses its part")]
mod build;

mod chunks;
mod forms;
mod history;
mod kept;
mod pairs;
mod properties;
mod rates;
mod runs;
mod stale;
