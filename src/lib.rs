//! Filters folders of WAV recordings by a written spec and measures, band by
//! band, whether what had to go went and what had to stay stayed.
//!
//! A recording passes through the modules in this order: [`job`] finds it,
//! [`wave`] turns its bytes into samples, [`cascade`] filters them, [`output`]
//! rounds them to what is written, [`wave`] writes them; [`spectrum`] listens on
//! both sides, [`evidence`] turns spectra into verdicts, [`report`] serializes
//! them. What the filter is comes from [`spec`] and [`design`].
//!
//! Recordings that something else filtered skip `cascade` and `output`: [`align`] lays
//! each against what went in, and from [`spectrum`] on the way is the same. [`excite`]
//! writes what to send through a device for that. [`package`] puts what others need
//! around finished outputs, and [`recheck`] holds a dataset against its report, on request
//! with the code of [`job`] once more. [`export`] hands the cascade itself to other programs.
//!
//! Nothing checks itself: `design`, `cascade`, and `spectrum` with `evidence` and `align`
//! do not call one another.
//!
//! # Conventions
//! * Samples are `f64`, full scale is 1.0; an n-bit integer sample is divided by
//!   2^(n-1) and multiplied by the same on the way out.
//! * 0 dBFS is the level of a full-scale sine (mean square 0.5). Levels are
//!   relative to full scale, never sound pressure.
//! * Attenuation in dB is positive when the level falls; gain is its negative.
//! * Multi-channel blocks are planar: one `Vec<f64>` a channel.
//! * Spectra are one-sided sums over segments, periodic window, no detrending.

pub mod align;
pub mod cascade;
pub mod design;
pub mod evidence;
pub mod excite;
pub mod export;
mod files;
pub mod job;
pub mod output;
pub mod package;
pub mod recheck;
pub mod report;
mod schema;
pub mod section;
pub mod spec;
pub mod spectrum;
pub mod wave;
