//! Transfer functions that a user gives: against exact responses, textbooks and tables, and
//! the laws they obey.

// Tests are not part of a design: std's functions and their last bits are good enough.
#![allow(clippy::disallowed_methods)]
// Helpers of tests may fail like the tests themselves.
#![allow(clippy::unwrap_used, clippy::panic)]

mod analog;
mod digits;
mod exact;
mod examples;
mod hostile;
mod rates;
mod refused;
mod reported;
mod support;
