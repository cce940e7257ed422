//! Cascades found from bands: that they hold, that none with fewer sections is found by other
//! means, what is said where there is none, and what is written.
//!
//! `BANDPROOF_AUTO_EFFORT=20 cargo test --test auto` looks for smaller cascades from more
//! starts.
#![allow(clippy::unwrap_used, clippy::panic)] // also in functions that are no #[test]
#![allow(clippy::disallowed_methods)] // what is held against the program may use the platform's functions

mod conflicts;
mod independent;
mod laws;
mod magnitude;
mod minimal;
mod simplex;
mod tasks;
mod written;
