//! The cascade against its definition, against outside references, and its laws.
//!
//! The chain of trust: [`plain`](bandproof::cascade::plain) is the recurrence as the
//! documentation states it; SciPy and analytic responses check it from outside; the
//! kernel at every vector width equals it bit for bit.
// Clippy allows these in `#[test]` functions only; here all is test.
#![allow(clippy::expect_used)]

mod both_ways;
mod helpers;
mod laws;
mod response;
mod rounding;
mod scipy;
mod scipy_both_ways;
mod silence;
mod start;
mod widths;
