//! Placement, settling and the design check, held against closed forms, simulations
//! of the difference equation and figures made outside the project.

#![allow(clippy::unwrap_used, reason = "a test that can't go on has failed")]
#![allow(clippy::disallowed_methods, reason = "tests compare within tolerances, not bit by bit")]

mod both_ways;
mod common;
mod curve;
mod design;
mod exceptions;
mod extremes;
mod limits;
mod placement;
mod pumping_station;
mod ringing;
mod rounding;
mod verdicts;
