//! Exported cascades: each form read, compiled or simulated as its user would, against the
//! design and the program's own filter.

// Clippy lets test functions panic, but not the functions they call.
#![allow(clippy::unwrap_used, clippy::panic)]

mod code;
mod command;
mod documents;
mod equations;
mod fewest;
mod fixed;
mod support;
mod titles;
