//! What is wrong with a spec, collected while it is read.

use super::SpecSyntax;
use super::error::{Place, Problem};

/// Most problems that are listed: nobody reads more, and a file of another kind that
/// happens to be JSON may hold any number.
const MAX_PROBLEMS: usize = 200;

/// The problems found so far.
pub(super) struct Problems {
    /// In the order found, [`MAX_PROBLEMS`] at most.
    list: Vec<Problem>,
    /// Whether there were more.
    is_cut: bool,
    /// Notation in which repairs are written.
    pub syntax: SpecSyntax,
}

impl Problems {
    pub fn new(syntax: SpecSyntax) -> Self {
        Self { list: Vec::new(), is_cut: false, syntax }
    }

    /// Whether nothing is wrong so far.
    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }

    /// Whether further problems would not be listed.
    pub fn is_full(&self) -> bool {
        self.list.len() >= MAX_PROBLEMS
    }

    /// Notes that there are more problems than are listed.
    pub fn cut(&mut self) {
        self.is_cut = true;
    }

    /// All problems, TOML ones in the order of the file.
    pub fn finish(mut self) -> Vec<Problem> {
        // Stable: JSON paths have no order of their own and stay as they were found.
        self.list.sort_by_key(|problem| problem.place.line_and_column());
        if self.is_cut {
            self.list.push(Problem {
                place: Place::Whole,
                message: format!("there are more than these {MAX_PROBLEMS} problems"),
                repair: "check that this file is a spec".to_owned(),
            });
        }
        self.list
    }

    /// Notes one problem.
    pub fn add(&mut self, place: &Place, message: impl Into<String>, repair: impl Into<String>) {
        if self.is_full() {
            self.is_cut = true;
            return;
        }
        self.list.push(Problem { place: place.clone(), message: message.into(), repair: repair.into() });
    }

    /// `key = value` in the file's notation.
    pub fn assign(&self, key: &str, value: &str) -> String {
        match self.syntax {
            SpecSyntax::Toml => format!("{key} = {value}"),
            SpecSyntax::Json => format!("\"{key}\": {value}"),
        }
    }
}
