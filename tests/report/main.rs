//! The report as a public format: its keys, their order, its bytes, its counts.
#![allow(clippy::unwrap_used, clippy::panic)] // also in functions that are no #[test]

mod builders;
mod format;
mod layout;
mod limits;
mod methods;
mod samples;
mod sentences;
mod summary;
mod table;
