//! From filtered f64 to what is written: gain, dither, rounding, overload.
//!
//! The order is gain, peak, dither, rounding, saturation. Whether an overload may be
//! saturated, or the recording fails, or is scaled, is decided by whoever runs this,
//! from [`OutputFigures`].

mod dither;
mod shape;

pub use dither::{DITHER_NAME, triangular};
pub(crate) use dither::{GOLDEN, mix};
pub use shape::{Output, OutputFigures, OutputPlan};
