//! Packages made of real folders, read again by readers of the test's own.

// Helpers of tests are tests too.
#![allow(clippy::unwrap_used, clippy::panic)]

mod bag_reader;
mod bags;
mod dataset;
mod descriptors;
mod odd_names;
mod package_rules;
mod refusals;
