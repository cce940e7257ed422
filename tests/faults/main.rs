//! What a run leaves when it is killed, interrupted, refused, or short of room, and when
//! its files go away under it: nothing lost, nothing half, everything else done.
//!
//! Signals, rights and limits as Unix has them.

#![cfg(unix)]
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may panic, and its own recordings need no bit-for-bit sines"
)]

#[allow(dead_code, reason = "other tests use the rest")]
#[path = "../run/fixtures.rs"]
mod fixtures;

mod changing;
mod kill;
mod leftovers;
mod limits;
mod links;
mod lock;
mod names;
mod rights;
mod season;
mod signals;
mod stream;
