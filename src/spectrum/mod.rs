//! Averaged spectra of a recording before and after.
//!
//! # Conventions
//!
//! - **Window**: [4-term Blackman-Harris](window), periodic, applied without
//!   detrending: taking the mean out of each segment would fake the lowest bins.
//! - **Bins**: bin `k` of a segment of L frames lies at `k * rate / L` Hz, for
//!   `k` from 0 to L/2.
//! - **Scaling**: one-sided power spectra, see [`Spectra`]. Powers are in units of
//!   (full scale)^2; 0 dBFS is the level of a full-scale sine, a mean square of 0.5.
//! - **Transform**: `X[k] = sum over n of w[n] x[n] exp(-2 pi i k n / L)`,
//!   unnormalized.
//!
//! [`SegmentPlan`] says where segments lie, [`Accumulator`] sums their spectra in
//! the order given, so the result never depends on scheduling. Between machines
//! the last bits of the transform differ (vector path, twiddle factors).
//!
//! This module knows windows, segments and bins; what a band requires is decided
//! elsewhere.

mod accumulate;
mod leakage;
mod packed;
mod plan;
mod transform;
pub mod window;

pub use accumulate::{Accumulator, Spectra};
pub use leakage::{LeakageKernel, leakage_kernel};
pub use packed::Packed;
pub use plan::{MAX_SEGMENT_FRAMES, MIN_SEGMENT_FRAMES, SegmentPlan, WIDEST_BIN_HZ, band_bins, segment_frames};
pub use transform::{Transform, TransformCache};
pub use window::{MAIN_LOBE_BINS, NOISE_BANDWIDTH_BINS, VARIANCE_BINS};

/// Bins 0 to 4 hold a recording's offset and the main lobe around it; they belong
/// to no band.
pub const FIRST_BAND_BIN: usize = 5;
