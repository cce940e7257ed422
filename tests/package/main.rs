//! Packages made of real folders, read again by readers of the test's own.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "helpers of tests are tests too, and their recordings need no bit-for-bit sines"
)]

#[path = "../run/fixtures.rs"]
#[allow(dead_code, reason = "shared with other tests, each of which uses its part")]
mod fixtures;

mod bag_reader;
mod bags;
mod continuing;
mod dataset;
mod descriptors;
mod interrupted;
mod odd_names;
mod package_rules;
mod refusals;
