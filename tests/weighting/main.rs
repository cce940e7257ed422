//! Standard curves, peaks and shelves, against printed tables, formulas and other
//! arithmetic, then as laws at any rate.

// Tests are not part of a design: std's functions and their last bits are good enough.
#![allow(clippy::disallowed_methods)]
// Helpers of tests may fail like the tests themselves.
#![allow(clippy::unwrap_used, clippy::panic)]

mod any_rate;
mod bs1770;
mod equalizer_laws;
mod equalizer_reference;
mod iec61672;
mod riaa;
mod runs;
mod stages;
mod support;
