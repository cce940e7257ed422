//! The output room: gain, dither, rounding, saturation, and their figures.

// Helpers of tests are tests too.
#![allow(clippy::unwrap_used, clippy::panic)]

mod dither;
mod shape;
