//! The excitation: its samples against a second writing of the formulas in Python, its
//! spectrum against what it promises, its use from end to end, and what is refused.

// Tests are not part of the sample path: std's functions are good enough.
#![allow(clippy::disallowed_methods)]
// Helpers of tests may fail like the tests themselves.
#![allow(clippy::unwrap_used, clippy::panic)]

mod coverage;
mod files;
mod levels;
mod program;
mod refusals;
mod samples;
mod support;
mod whole_job;
