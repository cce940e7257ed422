//! Reader and writer of the container, and the reader of specs, under seeded damage.
//!
//! No tool beyond the toolchain is needed: a corpus of legal files is built in code,
//! a generator of pseudo-random numbers damages it, and each case is held against
//! what must be true of any bytes at all. Cases are numbered; see `runner` for the
//! variables that choose them. What was found stands in `findings` for good.

// Clippy lets test functions panic, but not the functions they call.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic, clippy::print_stdout)]

mod bounded;
mod check;
mod container;
mod corpus;
mod document;
mod findings;
mod independent;
mod laws;
mod mutate;
mod random;
mod runner;
mod specs;
mod walk;
