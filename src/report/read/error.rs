//! Why a report can't be read.

use super::super::{FORMAT, REPORT_NAME};
use serde_json::error::Category;
use std::io;

/// Why a report can't be read. Lines and columns are counted from 1, columns in bytes.
#[derive(Debug, thiserror::Error)]
pub enum ReadError {
    /// The file can't be read.
    #[error("{}", unreadable(.0))]
    Io(#[source] io::Error),
    /// Nothing in it.
    #[error("is empty, so it is no report")]
    Empty,
    /// It ends in the middle.
    #[error("is cut off: it ends in the middle, at line {line}, column {column}; get a whole copy of it")]
    CutOff {
        /// Line.
        line: usize,
        /// Column.
        column: usize,
    },
    /// It is not JSON.
    #[error("is not JSON: {what} at line {line}, column {column}; get an undamaged copy of it")]
    NotJson {
        /// What the parser says.
        what: String,
        /// Line.
        line: usize,
        /// Column.
        column: usize,
    },
    /// JSON, and nothing that this program wrote.
    #[error("is no report of {REPORT_NAME}: {found}; give the file that `filter` or `measure` wrote")]
    NotAReport {
        /// What stands there instead.
        found: String,
    },
    /// A report of another format.
    #[error("is a report of format {found}: this version reads format {FORMAT}; use the version that wrote it")]
    OtherFormat {
        /// The number found.
        found: String,
    },
    /// A key or a value that this format does not have.
    #[error("does not hold to format {FORMAT}: {}{what} at line {line}, column {column}", within(*.entry))]
    Malformed {
        /// What is wrong.
        what: String,
        /// Place in `recordings`, 1 for the first, where it is in one.
        entry: Option<usize>,
        /// Line.
        line: usize,
        /// Column.
        column: usize,
    },
    /// A value that has the right type and can't be right.
    #[error("can't be used: {}{what}", within(*.entry))]
    Unusable {
        /// What is wrong.
        what: String,
        /// Place in `recordings`, 1 for the first, where it is in one.
        entry: Option<usize>,
    },
}

fn within(place: Option<usize>) -> String {
    place.map_or(String::new(), |place| format!("in entry {place} of `recordings`, "))
}

/// The parser's error as one of ours.
pub(super) fn explained(error: serde_json::Error, entry: Option<usize>) -> ReadError {
    let (line, column) = (error.line(), error.column());
    // The parser repeats the place at the end of its sentence.
    let full = error.to_string();
    let what = full.strip_suffix(&format!(" at line {line} column {column}")).unwrap_or(&full).to_owned();
    match error.classify() {
        Category::Io => ReadError::Io(error.into()),
        Category::Eof if (line, column) == (1, 0) => ReadError::Empty,
        Category::Eof => ReadError::CutOff { line, column },
        Category::Syntax => ReadError::NotJson { what, line, column },
        Category::Data => ReadError::Malformed { what, entry, line, column },
    }
}

fn unreadable(error: &io::Error) -> String {
    match error.kind() {
        io::ErrorKind::IsADirectory => "is a folder: give the report that lies in it".to_owned(),
        _ => format!("can't be read: {error}; check the path and its permissions"),
    }
}
