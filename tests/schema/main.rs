//! The two JSON Schemas against the files they describe, and against the code that reads
//! and writes those files.

// Clippy lets test functions panic, but not the functions they call.
#![allow(clippy::unwrap_used, clippy::panic)]

mod agreement;
mod command;
mod documents;
mod files;
mod generator;
mod generator_stage;
mod mutations;
mod reports;
mod rules;
mod samples;

use bandproof::spec::{self, SpecSyntax};
use jsonschema::Validator;
use serde_json::Value;
use std::path::{Path, PathBuf};
use std::sync::LazyLock;

/// The schema of spec files.
static SPEC: LazyLock<Validator> = LazyLock::new(|| jsonschema::draft202012::new(&spec::schema()).unwrap());

/// The schema of reports.
static REPORT: LazyLock<Validator> =
    LazyLock::new(|| jsonschema::draft202012::new(&bandproof::report::schema()).unwrap());

/// Panics with everything that is wrong with `document`.
#[track_caller]
fn assert_valid(schema: &Validator, document: &Value) {
    let errors: Vec<_> =
        schema.iter_errors(document).map(|error| format!("{}: {error}", error.instance_path)).take(5).collect();
    assert!(errors.is_empty(), "{}", errors.join("\n"));
}

/// What the reader of spec files makes of a document.
fn read(document: &Value) -> Result<spec::Spec, spec::SpecError> {
    spec::parse(document.to_string().as_bytes(), SpecSyntax::Json, "spec.json")
}

/// A file or folder of the project.
fn project(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(name)
}
