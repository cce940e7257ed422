//! The demo recordings and the specs that go with them.

#[path = "../../demo-audio/generator/mod.rs"]
mod generator;
mod recordings;
mod runs;
mod specs;

use std::path::{Path, PathBuf};

/// A folder at the top of the project.
fn folder(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(name)
}
