//! TOML text into the tree, places as line and column.

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::error::{Place, SpecError};
use super::transfer::Coefficient;
use super::tree::{Entry, Node, Value};

/// Parses TOML; `file` is what messages call the file.
///
/// # Errors
/// [`SpecError::Syntax`] at the first place that is not TOML.
pub(super) fn parse(text: &str, file: &str) -> Result<Node, SpecError> {
    let places = Places::new(text);
    let document = DeTable::parse(text).map_err(|error| {
        let span = error.span().unwrap_or(0..0);
        let (line, column) = places.line_and_column(span.start);
        // The parser does not say which key is there twice.
        let message = match (error.message(), text.get(span)) {
            (message @ "duplicate key", Some(key)) => format!("{message} `{key}`"),
            (message, _) => message.to_owned(),
        };
        SpecError::Syntax { file: file.to_owned(), notation: "TOML", line, column, message }
    })?;
    Ok(Node { place: Place::Whole, value: table(document.get_ref(), &places) })
}

/// Turns byte offsets into lines and columns.
struct Places<'t> {
    text: &'t str,
    line_starts: Vec<usize>,
}

impl<'t> Places<'t> {
    fn new(text: &'t str) -> Self {
        let after_breaks = text.bytes().enumerate().filter(|&(_, byte)| byte == b'\n').map(|(offset, _)| offset + 1);
        Self { text, line_starts: std::iter::once(0).chain(after_breaks).collect() }
    }

    /// Both from 1; the column counts characters.
    fn line_and_column(&self, offset: usize) -> (usize, usize) {
        let line = self.line_starts.partition_point(|&start| start <= offset);
        let start = line.checked_sub(1).and_then(|index| self.line_starts.get(index)).copied().unwrap_or(0);
        let before = self.text.get(start..offset).unwrap_or("");
        (line, before.chars().count() + 1)
    }

    fn at(&self, offset: usize) -> Place {
        let (line, column) = self.line_and_column(offset);
        Place::At { line, column }
    }
}

fn table(from: &DeTable<'_>, places: &Places<'_>) -> Value {
    // The parser's map is sorted by key; messages follow the file.
    let mut pairs: Vec<_> = from.iter().collect();
    pairs.sort_by_key(|(key, _)| key.span().start);
    let entry = |(key, value): (&Spanned<std::borrow::Cow<'_, str>>, &Spanned<DeValue<'_>>)| Entry {
        key: key.get_ref().to_string(),
        key_place: places.at(key.span().start),
        node: node(value, places),
    };
    Value::Table(pairs.into_iter().map(entry).collect())
}

fn node(from: &Spanned<DeValue<'_>>, places: &Places<'_>) -> Node {
    let value = match from.get_ref() {
        DeValue::String(text) => Value::Text(text.to_string()),
        DeValue::Integer(integer) => {
            let read = i128::from_str_radix(integer.as_str(), integer.radix());
            // One that is too long is too long for any key, which is what the reader then says.
            let value = read.map_or(f64::INFINITY, |number| number as f64);
            Value::Number(Coefficient { value, unit: 0.0 })
        }
        DeValue::Float(float) => match float.as_str().parse() {
            // The parser has taken out underscores.
            Ok(number) => Value::Number(Coefficient::written(float.as_str(), number)),
            Err(_) => Value::Other(float.as_str().to_owned()),
        },
        DeValue::Boolean(truth) => Value::Truth(*truth),
        DeValue::Datetime(_) => Value::Other("a date or time".to_owned()),
        DeValue::Array(list) => Value::List(list.iter().map(|item| node(item, places)).collect()),
        DeValue::Table(entries) => table(entries, places),
    };
    Node { place: places.at(from.span().start), value }
}
