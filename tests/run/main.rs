//! Whole runs of the binary on real folders: what a user types, what lies there
//! afterwards, what the exit status says.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may panic, and its own recordings need no bit-for-bit sines"
)]

mod bad_input;
mod batch;
mod fixtures;
mod found;
mod guard;
mod identity;
mod interrupted;
mod jobs;
mod overload;
mod recordings;
mod resume;
mod witness;
mod zero_phase;
