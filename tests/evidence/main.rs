//! Verdicts and figures against recordings whose truth is known.

// Helpers outside test functions may panic as test functions do.
#![allow(clippy::unwrap_used)]

mod chain;
mod edges;
mod floors;
mod gains;
mod grid;
mod pair_compare;
mod pair_laws;
mod pair_reference;
mod pair_support;
mod pair_trials;
mod pair_verdicts;
mod reference;
mod support;
mod traps;
mod trials;
