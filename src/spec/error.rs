//! Why a spec can't be used, and where in the file.

use std::fmt;

/// Where in a spec file something stands.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Place {
    /// In TOML: line and column, both counted from 1, the column in characters.
    At {
        /// Line, from 1.
        line: usize,
        /// Column in characters, from 1.
        column: usize,
    },
    /// In JSON: the path of keys, list positions counted from 0, as `stage[1].edge_hz`.
    Path(String),
    /// The file as a whole.
    Whole,
}

impl Place {
    /// What places are sorted by; 0 where there is no line.
    pub(super) fn line_and_column(&self) -> (usize, usize) {
        match self {
            Self::At { line, column } => (*line, *column),
            Self::Path(_) | Self::Whole => (0, 0),
        }
    }

    /// The place as a sentence mentions it: `line 12` or `stage[1].edge_hz`.
    pub(super) fn mention(&self) -> String {
        match self {
            Self::At { line, .. } => format!("line {line}"),
            Self::Path(path) => path.clone(),
            Self::Whole => "the file".to_owned(),
        }
    }
}

/// `12:1`, `stage[1].edge_hz`, or nothing for the file as a whole.
impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::At { line, column } => write!(f, "{line}:{column}"),
            Self::Path(path) => f.write_str(path),
            Self::Whole => Ok(()),
        }
    }
}

/// One thing that is wrong with a spec.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Problem {
    /// The key or value it is about.
    pub place: Place,
    /// What was found and what is wrong with it.
    pub message: String,
    /// What to do about it.
    pub repair: String,
}

/// `12:1: message; repair`, without the place where it is the whole file.
impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.place != Place::Whole {
            write!(f, "{}: ", self.place)?;
        }
        write!(f, "{}; {}", self.message, self.repair)
    }
}

/// Why a spec can't be used. `file` is the file's name as it was given.
#[derive(Debug, thiserror::Error)]
pub enum SpecError {
    /// There is no such file.
    #[error("{file}: no such spec file; check the path")]
    NotFound {
        /// The file.
        file: String,
    },
    /// The file exists and can't be read.
    #[error("{file}: the spec file can't be read: {source}; it must be a readable file")]
    Unreadable {
        /// The file.
        file: String,
        /// What the system said.
        source: std::io::Error,
    },
    /// The name says neither TOML nor JSON.
    #[error("{file}: the name must end in .toml or .json, which says how the spec is written; rename the file")]
    Extension {
        /// The file.
        file: String,
    },
    /// Far too large for a spec.
    #[error("{file}: larger than {limit_bytes} bytes, which no spec is; check the path")]
    TooLarge {
        /// The file.
        file: String,
        /// The limit, bytes.
        limit_bytes: u64,
    },
    /// Some byte is not UTF-8.
    #[error("{file}:{line}: not UTF-8 at byte {offset}; save the file as UTF-8 text")]
    NotUtf8 {
        /// The file.
        file: String,
        /// Offset of the first wrong byte, from 0.
        offset: usize,
        /// Its line, from 1.
        line: usize,
    },
    /// The text is not TOML, or not JSON.
    #[error("{file}:{line}:{column}: not valid {notation}: {message}; correct this place")]
    Syntax {
        /// The file.
        file: String,
        /// `TOML` or `JSON`.
        notation: &'static str,
        /// Line, from 1.
        line: usize,
        /// Column, from 1.
        column: usize,
        /// What the parser says.
        message: String,
    },
    /// It can be read, and says something that can't be meant: everything found, in the
    /// order of the file for TOML.
    #[error("{}", lines(file, problems))]
    Invalid {
        /// The file.
        file: String,
        /// At least one.
        problems: Vec<Problem>,
    },
}

impl SpecError {
    /// The problems of [`SpecError::Invalid`]; none for the other variants.
    pub fn problems(&self) -> &[Problem] {
        match self {
            Self::Invalid { problems, .. } => problems,
            _ => &[],
        }
    }
}

/// One line a problem: `file:12:1: message; repair`.
fn lines(file: &str, problems: &[Problem]) -> String {
    let line = |problem: &Problem| match &problem.place {
        Place::At { .. } => format!("{file}:{problem}"),
        Place::Path(_) | Place::Whole => format!("{file}: {problem}"),
    };
    problems.iter().map(line).collect::<Vec<_>>().join("\n")
}
