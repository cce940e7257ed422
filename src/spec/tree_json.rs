//! JSON text into the tree, places as paths.

use std::fmt;

use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};

use super::error::{Place, SpecError};
use super::transfer::Coefficient;
use super::tree::{Entry, Node, Value, quote};

/// Parses JSON; `file` is what messages call the file.
///
/// # Errors
/// [`SpecError::Syntax`] at the first place that is not JSON.
pub(super) fn parse(text: &str, file: &str) -> Result<Node, SpecError> {
    let raw: Raw = serde_json::from_str(text).map_err(|error| {
        let (line, column) = (error.line(), error.column());
        // The parser repeats the place at the end of its sentence.
        let full = error.to_string();
        let message = full.strip_suffix(&format!(" at line {line} column {column}")).unwrap_or(&full).to_owned();
        // Its columns count bytes.
        let line_bytes = text.split('\n').nth(line.saturating_sub(1)).unwrap_or("").bytes().take(column);
        let column = line_bytes.filter(|byte| byte & 0xC0 != 0x80).count().max(1);
        SpecError::Syntax { file: file.to_owned(), notation: "JSON", line, column, message }
    })?;
    Ok(node(raw, String::new(), &mut Literals { rest: text }))
}

/// The numbers of a JSON text as they are written, in the order of the text: the parser gives
/// their values alone. The text must be JSON.
struct Literals<'t> {
    rest: &'t str,
}

impl<'t> Iterator for Literals<'t> {
    type Item = &'t str;

    fn next(&mut self) -> Option<&'t str> {
        let is_start = |c: char| c == '"' || c == '-' || c.is_ascii_digit();
        loop {
            let found = self.rest.get(self.rest.find(is_start)?..)?;
            if let Some(text) = found.strip_prefix('"') {
                self.rest = text.get(text_length(text)?..)?;
                continue;
            }
            let is_part = |c: char| c.is_ascii_digit() || matches!(c, '+' | '-' | '.' | 'e' | 'E');
            let end = found.find(|c| !is_part(c)).unwrap_or(found.len());
            let (literal, rest) = found.split_at_checked(end)?;
            self.rest = rest;
            return Some(literal);
        }
    }
}

/// Bytes of a text from behind its first quotation mark to behind its last one.
fn text_length(text: &str) -> Option<usize> {
    let mut is_escaped = false;
    let end = text.bytes().position(|byte| {
        let is_end = byte == b'"' && !is_escaped;
        is_escaped = byte == b'\\' && !is_escaped;
        is_end
    })?;
    Some(end + 1)
}

/// A JSON value before paths are known. Unlike `serde_json::Value` it keeps a repeated
/// key, so that the reader can report it.
enum Raw {
    Text(String),
    Number(f64),
    List(Vec<Raw>),
    Object(Vec<(String, Raw)>),
    Truth(bool),
    Other(&'static str),
}

/// `literals` stand at the first number of `raw`.
fn node(raw: Raw, path: String, literals: &mut Literals<'_>) -> Node {
    let value = match raw {
        Raw::Text(text) => Value::Text(text),
        Raw::Number(number) => Value::Number(match literals.next() {
            Some(literal) => Coefficient::written(literal, number),
            None => Coefficient::shortest(number),
        }),
        Raw::Truth(truth) => Value::Truth(truth),
        Raw::Other(words) => Value::Other(words.to_owned()),
        Raw::List(items) => {
            let item = |(index, item)| node(item, format!("{path}[{index}]"), literals);
            Value::List(items.into_iter().enumerate().map(item).collect())
        }
        Raw::Object(pairs) => {
            let entry = |(key, value): (String, Raw)| {
                let key_path = join(&path, &key);
                Entry { node: node(value, key_path.clone(), literals), key_place: Place::Path(key_path), key }
            };
            Value::Table(pairs.into_iter().map(entry).collect())
        }
    };
    let place = if path.is_empty() { Place::Whole } else { Place::Path(path) };
    Node { place, value }
}

/// `path.key`; a key that is no plain word is quoted, so that a path is one line.
fn join(path: &str, key: &str) -> String {
    let plain = !key.is_empty() && key.chars().all(|c| c.is_alphanumeric() || c == '_' || c == '-');
    let key = if plain { key.to_owned() } else { quote(key) };
    if path.is_empty() { key } else { format!("{path}.{key}") }
}

impl<'de> Deserialize<'de> for Raw {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(RawVisitor)
    }
}

struct RawVisitor;

impl<'de> Visitor<'de> for RawVisitor {
    type Value = Raw;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_bool<E>(self, truth: bool) -> Result<Raw, E> {
        Ok(Raw::Truth(truth))
    }

    fn visit_i64<E>(self, number: i64) -> Result<Raw, E> {
        Ok(Raw::Number(number as f64))
    }

    fn visit_u64<E>(self, number: u64) -> Result<Raw, E> {
        Ok(Raw::Number(number as f64))
    }

    fn visit_f64<E>(self, number: f64) -> Result<Raw, E> {
        Ok(Raw::Number(number))
    }

    fn visit_str<E>(self, text: &str) -> Result<Raw, E> {
        Ok(Raw::Text(text.to_owned()))
    }

    fn visit_unit<E>(self) -> Result<Raw, E> {
        Ok(Raw::Other("null"))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Raw, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = items.next_element()? {
            list.push(item);
        }
        Ok(Raw::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut pairs: A) -> Result<Raw, A::Error> {
        let mut entries = Vec::new();
        while let Some(pair) = pairs.next_entry()? {
            entries.push(pair);
        }
        Ok(Raw::Object(entries))
    }
}
