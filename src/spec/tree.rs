//! The tree both notations are read into: values that know their place.

use super::error::Place;
use super::transfer::Coefficient;

/// A value and where it stands.
#[derive(Clone, Debug)]
pub(super) struct Node {
    /// Where the value stands.
    pub place: Place,
    /// The value.
    pub value: Value,
}

/// What TOML and JSON have in common, and the rest by name.
#[derive(Clone, Debug)]
pub(super) enum Value {
    /// Text.
    Text(String),
    /// A number, whole or not, possibly not finite, with the place of its last digit. Whole
    /// numbers above 2^53 are rounded; no key takes one but coefficients.
    Number(Coefficient),
    /// A list.
    List(Vec<Node>),
    /// Keys and values in the order of the file. JSON can repeat a key.
    Table(Vec<Entry>),
    /// Yes or no.
    Truth(bool),
    /// Anything no key takes, in words (`null`, `a date`).
    Other(String),
}

/// A key, its place, and its value.
#[derive(Clone, Debug)]
pub(super) struct Entry {
    /// The key.
    pub key: String,
    /// Where the key stands.
    pub key_place: Place,
    /// Its value.
    pub node: Node,
}

/// Longest piece of a user's text that a message repeats, characters.
const MAX_QUOTE: usize = 60;

/// `text` in quotation marks with control characters escaped, cut where it is long.
pub(super) fn quote(text: &str) -> String {
    let mut shown = String::new();
    for c in text.chars().take(MAX_QUOTE) {
        // Only what would break a line, a terminal or the quotation: accents stay readable.
        if c.is_control() || c == '"' || c == '\\' {
            shown.extend(c.escape_default());
        } else {
            shown.push(c);
        }
    }
    if text.chars().nth(MAX_QUOTE).is_some() {
        shown.push_str("...");
    }
    format!("\"{shown}\"")
}

/// A user's number with all its digits, in powers of ten where it would be long.
pub(super) fn show_number(number: f64) -> String {
    let size = number.abs();
    let is_long = number.is_finite() && size != 0.0 && !(1e-6..1e15).contains(&size);
    if is_long { format!("{number:e}") } else { format!("{number}") }
}

/// A computed frequency (Hz), from 1 Hz up rounded to 0.001 Hz.
pub(super) fn show_hz(hz: f64) -> String {
    show_number(if hz.abs() < 1.0 { hz } else { (hz * 1000.0).round() / 1000.0 })
}

impl Value {
    /// The value as a message shows it.
    pub fn show(&self) -> String {
        match self {
            Self::Text(text) => format!("the text {}", quote(text)),
            Self::Number(number) => show_number(number.value),
            Self::List(_) => "a list".to_owned(),
            Self::Table(_) => "a table".to_owned(),
            Self::Truth(truth) => truth.to_string(),
            Self::Other(words) => words.clone(),
        }
    }
}
