//! The spec file: its types, and a reader that knows where everything stands.
//!
//! A file's bytes become a tree whose nodes know where they stand (`tree`), one
//! typed reader turns the tree into the normalized types (`read`, over
//! `fields`), `contradict` looks at what only shows between entries, and `demands` at what
//! the top level asks of them. TOML and JSON part ways in the tree alone, so both go through
//! the same checks. `kind` says which keys go with which kind of stage. `keys` has the tables
//! as they are written; from it `write` serializes a normalized spec, and `schema` makes the
//! JSON Schema.
//!
//! Every problem of a file is reported at once, each with its place and a repair.

mod conjugates;
mod contradict;
mod demands;
pub mod document;
mod error;
mod fields;
mod keys;
mod kind;
mod problems;
mod quantity;
mod read;
mod read_band;
mod read_equalizer;
mod read_filter;
mod read_roots;
mod read_stage;
mod read_transfer;
pub mod save;
mod schema;
mod schema_stage;
mod stages;
mod suggest;
mod transfer;
mod tree;
mod tree_json;
mod tree_toml;
mod types;
mod words;
mod write;

use crate::files::digest::hexadecimal;
pub use conjugates::conjugates;
pub use error::{Place, Problem, SpecError};
pub(crate) use schema::kind_schema;
pub use schema::schema;
pub use stages::*;
pub use transfer::*;
pub use types::*;

use std::fs::File;
use std::io::Read as _;
use std::path::Path;

use sha2::{Digest as _, Sha256};

/// A spec file holds a few kilobytes; more than this (bytes) is some other file.
const MAX_FILE_BYTES: u64 = 1 << 20;

/// A spec as read from a file.
#[derive(Clone, Debug, PartialEq)]
pub struct SpecFile {
    /// The spec with every default filled in.
    pub spec: Spec,
    /// SHA-256 of the file's bytes, lower-case hex.
    pub file_sha256: String,
}

/// The two notations of a spec file; the keys are the same.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SpecSyntax {
    /// TOML 1.1.
    Toml,
    /// JSON (RFC 8259).
    Json,
}

impl SpecSyntax {
    /// The notation that the file name's extension stands for, in any case.
    pub fn of_path(path: &Path) -> Option<Self> {
        let extension = path.extension()?.to_str()?;
        if extension.eq_ignore_ascii_case("toml") {
            Some(Self::Toml)
        } else if extension.eq_ignore_ascii_case("json") {
            Some(Self::Json)
        } else {
            None
        }
    }
}

/// Reads, checks and normalizes the spec file at `path` (`.toml` or `.json`).
///
/// # Errors
/// See [`SpecError`]. Messages call the file by `path` as given.
pub fn load(path: &Path) -> Result<SpecFile, SpecError> {
    let file = path.display().to_string();
    let Some(syntax) = SpecSyntax::of_path(path) else {
        return Err(SpecError::Extension { file });
    };
    let mut bytes = Vec::new();
    let read = File::open(path).and_then(|opened| opened.take(MAX_FILE_BYTES + 1).read_to_end(&mut bytes));
    match read {
        Err(source) if source.kind() == std::io::ErrorKind::NotFound => return Err(SpecError::NotFound { file }),
        Err(source) => return Err(SpecError::Unreadable { file, source }),
        Ok(_) if bytes.len() as u64 > MAX_FILE_BYTES => {
            return Err(SpecError::TooLarge { file, limit_bytes: MAX_FILE_BYTES });
        }
        Ok(_) => {}
    }
    let spec = parse(&bytes, syntax, &file)?;
    let file_sha256 = hexadecimal(&Sha256::digest(&bytes));
    Ok(SpecFile { spec, file_sha256 })
}

/// Checks and normalizes the bytes of a spec file; `file_name` is what messages call it.
///
/// # Errors
/// See [`SpecError`]; never the variants about finding and reading a file.
pub fn parse(bytes: &[u8], syntax: SpecSyntax, file_name: &str) -> Result<Spec, SpecError> {
    let text = std::str::from_utf8(bytes).map_err(|error| SpecError::NotUtf8 {
        file: file_name.to_owned(),
        offset: error.valid_up_to(),
        line: 1 + bytes.iter().take(error.valid_up_to()).filter(|&&byte| byte == b'\n').count(),
    })?;
    // Some editors put a byte order mark before UTF-8 text; it is no content.
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let root = match syntax {
        SpecSyntax::Toml => tree_toml::parse(text, file_name)?,
        SpecSyntax::Json => tree_json::parse(text, file_name)?,
    };
    read::spec(&root, syntax).map_err(|problems| SpecError::Invalid { file: file_name.to_owned(), problems })
}
