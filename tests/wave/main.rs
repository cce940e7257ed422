//! The WAV room: recordings built byte by byte, read, written, and read back.

// Helpers of tests are tests too.
#![allow(clippy::unwrap_used, clippy::panic)]

mod build;
mod run;

mod chunks;
mod damage;
mod errors;
mod figures;
mod formats;
mod huge;
mod kinds;
mod recovery;
mod rewriting;
mod rifx;
mod whole_job;
mod wide;
