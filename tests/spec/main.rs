//! The spec file: what is read, what is refused, and in which words.

// Clippy lets test functions panic, but not the functions they call.
#![allow(clippy::unwrap_used, clippy::panic)]

mod auto;
mod contradictions;
mod designs;
mod digits;
mod equalizers;
mod examples;
mod files;
mod limits;
mod mutations;
mod normalized;
mod places;
mod reference;
mod round_trip;
mod suggestions;
mod transfers;
mod values;

use bandproof::spec::{self, DigitalFilter, DigitalStage, Spec, SpecSyntax, Stage};

/// A stage in z that names no sample rate.
fn any_rate(filter: DigitalFilter) -> Stage {
    Stage::Digital(DigitalStage { filter, rate_hz: None })
}

/// Reads TOML that must be a valid spec.
fn read(text: &str) -> Spec {
    spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap_or_else(|error| panic!("{error}"))
}

/// What is said about TOML that must not be a valid spec.
fn refused(text: &str) -> String {
    match spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml") {
        Ok(spec) => panic!("accepted as {spec:#?}"),
        Err(error) => error.to_string(),
    }
}

/// What is said about JSON that must not be a valid spec.
fn refused_json(text: &str) -> String {
    match spec::parse(text.as_bytes(), SpecSyntax::Json, "spec.json") {
        Ok(spec) => panic!("accepted as {spec:#?}"),
        Err(error) => error.to_string(),
    }
}
