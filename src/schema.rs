//! What the two JSON Schemas have in common: from a type to a document.

use schemars::JsonSchema;
use schemars::generate::SchemaSettings;
use serde_json::{Map, Value};

/// The schema of `T` as a document of its own.
pub(crate) fn document<T: JsonSchema>(settings: SchemaSettings, title: &str) -> Value {
    let mut schema = settings.into_generator().into_root_schema_for::<T>();
    schema.insert("title".to_owned(), title.into());
    let mut document = schema.to_value();
    tidy(&mut document);
    document
}

/// Makes what derives leave fit for readers in every language.
fn tidy(schema: &mut Value) {
    match schema {
        Value::Object(object) => {
            // Widths of Rust's numbers: no JSON Schema format, and no business of the reader.
            if object.get("type").is_some_and(is_numeric) {
                object.remove("format");
            }
            if let Some(Value::String(text)) = object.get_mut("description") {
                *text = reflowed(text);
            }
            first(object, &["$schema", "title", "description"]);
            object.values_mut().for_each(tidy);
        }
        Value::Array(items) => items.iter_mut().for_each(tidy),
        _ => {}
    }
}

/// Puts what people read first in front, where it is text: keys of the same name that a
/// schema describes are schemas themselves.
fn first(object: &mut Map<String, Value>, keys: &[&str]) {
    let mut rest = std::mem::take(object);
    for key in keys {
        if rest.get(*key).is_some_and(Value::is_string) {
            object.extend(rest.shift_remove_entry(*key));
        }
    }
    object.extend(rest);
}

/// Whether a `type` is that of numbers, or of numbers and null.
fn is_numeric(of: &Value) -> bool {
    let is = |of: &Value| of == "number" || of == "integer";
    is(of) || of.as_array().is_some_and(|types| types.iter().any(is))
}

/// Text whose lines end where a paragraph, a point of a list, a row of a table or a line of
/// code does: line breaks of a source file are no part of a description.
fn reflowed(text: &str) -> String {
    let mut flowed = String::new();
    let mut in_code = false;
    for line in text.lines() {
        let is_fence = line.trim_start().starts_with("```");
        let line = if in_code { line.trim_end() } else { line.trim() };
        let begins = in_code || is_fence || line.is_empty() || line.starts_with(['*', '|']) || flowed.ends_with('\n');
        if !flowed.is_empty() {
            flowed.push(if begins { '\n' } else { ' ' });
        }
        flowed.push_str(line);
        in_code ^= is_fence;
    }
    flowed
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_of_a_paragraph_flow_together_and_lists_and_tables_stay() {
        assert_eq!(reflowed("one\ntwo\n\nthree\nfour"), "one two\n\nthree four");
        assert_eq!(reflowed("of:\n\n* one\n  two\n* three\n\nend"), "of:\n\n* one two\n* three\n\nend");
        assert_eq!(
            reflowed("as\nin\n\n```text\n  b\n---\n```\n\nthe\nend"),
            "as in\n\n```text\n  b\n---\n```\n\nthe end"
        );
        assert_eq!(reflowed("| a |\n|---|\n| b |"), "| a |\n|---|\n| b |");
    }
}
