//! Spectra against naive sums, closed forms and SciPy.
#![allow(clippy::disallowed_methods, reason = "test signals need not have the same bits on every machine")]

mod accumulate;
mod plan;
mod scipy;
mod support;
mod window;
