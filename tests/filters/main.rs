//! Filters as designed, against references from outside, layer by layer.
//!
//! Prototypes against 25-digit closed forms; finished sections against exact responses
//! (characteristic functions, no poles), against SciPy, against published designs and
//! a published standard's masks; then the laws every design obeys.

// Tests are not part of a design: std's functions and their last bits are good enough.
#![allow(clippy::disallowed_methods)]
// Helpers of tests may fail like the tests themselves.
#![allow(clippy::unwrap_used, clippy::panic)]

mod accuracy;
mod double;
mod exact;
mod laws;
mod limited;
mod limits;
mod masks;
mod prototypes;
mod published;
mod scipy;
mod support;
mod tables;
mod zero_edges;
