//! A spec as the text of a spec file that people read and edit.

use super::tree::{Entry, Node, Value};
use super::{Spec, SpecSyntax, tree_json};
use serde::ser::Error as _;

/// Columns of a comment.
const COLUMNS: usize = 98;

/// What stands beside the keys of a TOML file; JSON has no comments.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Comments {
    /// At the top, a paragraph each.
    pub head: Vec<String>,
    /// Above the bands of these names.
    pub bands: Vec<(String, String)>,
}

/// The text of a file that says what `spec` says, every default filled in.
///
/// # Errors
/// The spec does not go into JSON, which no spec that was read does.
pub fn document(spec: &Spec, syntax: SpecSyntax, comments: &Comments) -> serde_json::Result<String> {
    let text = serde_json::to_string_pretty(spec)?;
    if syntax == SpecSyntax::Json {
        return Ok(text + "\n");
    }
    // By way of text, which keeps the digits of coefficients.
    match tree_json::parse(&text, "the spec").map_err(serde_json::Error::custom)?.value {
        Value::Table(top) => Ok(toml(&top, comments)),
        _ => Err(serde_json::Error::custom("a spec is a table")),
    }
}

fn toml(top: &[Entry], comments: &Comments) -> String {
    let mut text = String::new();
    for paragraph in &comments.head {
        text.push_str(&comment(paragraph));
    }
    // Keys of the top come before any table.
    let plain: String = top.iter().filter(|entry| !is_table(entry)).map(line).collect();
    for part in [plain].into_iter().chain(top.iter().flat_map(|entry| tables(entry, comments))) {
        if !text.is_empty() && !part.is_empty() {
            text.push('\n');
        }
        text.push_str(&part);
    }
    text
}

/// Whether an entry of the top is a table or a list of nothing but tables.
fn is_table(entry: &Entry) -> bool {
    match &entry.node.value {
        Value::Table(_) => true,
        Value::List(items) => items.iter().all(|item| matches!(item.value, Value::Table(_))),
        _ => false,
    }
}

fn tables(entry: &Entry, comments: &Comments) -> Vec<String> {
    let key = &entry.key;
    let body = |table: &[Entry]| table.iter().map(line).collect::<String>();
    match &entry.node.value {
        Value::Table(table) => vec![format!("[{key}]\n{}", body(table))],
        Value::List(items) if is_table(entry) => items
            .iter()
            .filter_map(|item| match &item.value {
                Value::Table(table) => Some(table),
                _ => None,
            })
            .map(|table| {
                let name =
                    table.iter().find(|entry| entry.key == "name" && key == "band").map(|entry| &entry.node.value);
                let is_own = |band: &str| matches!(name, Some(Value::Text(name)) if name == band);
                let own = comments.bands.iter().filter(|(band, _)| is_own(band));
                let above: String = own.map(|(_, told)| comment(told)).collect();
                format!("{above}[[{key}]]\n{}", body(table))
            })
            .collect(),
        _ => Vec::new(),
    }
}

fn line(entry: &Entry) -> String {
    format!("{} = {}\n", entry.key, inline(&entry.node))
}

fn inline(node: &Node) -> String {
    match &node.value {
        Value::List(items) => format!("[{}]", items.iter().map(inline).collect::<Vec<_>>().join(", ")),
        Value::Table(table) => {
            let pairs: Vec<_> = table.iter().map(|entry| format!("{} = {}", entry.key, inline(&entry.node))).collect();
            format!("{{ {} }}", pairs.join(", "))
        }
        Value::Text(text) => toml::Value::String(text.clone()).to_string(),
        Value::Number(number) => {
            let text = number.literal();
            text.strip_suffix(".0").map_or_else(|| text.clone(), str::to_owned)
        }
        Value::Truth(truth) => truth.to_string(),
        Value::Other(words) => words.clone(),
    }
}

/// A paragraph as comment lines; control characters, which TOML forbids there, are replaced.
fn comment(paragraph: &str) -> String {
    let mut lines = vec![String::from("#")];
    for word in paragraph.split_whitespace() {
        let room = lines.last().map_or(0, |last| last.chars().count() + 1 + word.chars().count());
        if room > COLUMNS {
            lines.push(String::from("#"));
        }
        if let Some(last) = lines.last_mut() {
            last.push(' ');
            last.extend(word.chars().map(|c| if c.is_control() { char::REPLACEMENT_CHARACTER } else { c }));
        }
    }
    lines.join("\n") + "\n"
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::parse;

    const TEXT: &str = r#"
title = "Quay # \"north\""
beyond_half_rate = "leave-out"
[[stage]]
kind = "bandstop"
family = "elliptic"
order = 3
center_hz = 50
width_hz = 3.2
harmonics = 8
ripple_db = 0.1
stop_db = 40
[[stage]]
kind = "digital"
sections = [{ b = [1, -1.50, 1], a = [1, -1.250, 0.15000E-08] }]
[[band]]
name = "hum"
center_hz = 50
span_hz = 1
harmonics = 8
reduce_db = 30.5
[[band]]
name = "calls"
from_hz = 90
to_hz = 6000
keep_db = 0.5
except = ["hum"]
"#;

    #[test]
    fn what_is_written_reads_as_the_same_spec() {
        let spec = parse(TEXT.as_bytes(), SpecSyntax::Toml, "quay.toml").unwrap();
        let comments = Comments {
            head: vec!["Found.".to_owned(), "word ".repeat(60)],
            bands: vec![("calls".to_owned(), "0.1 dB to spare.".to_owned())],
        };
        for syntax in [SpecSyntax::Toml, SpecSyntax::Json] {
            let text = document(&spec, syntax, &comments).unwrap();
            assert_eq!(parse(text.as_bytes(), syntax, "again").unwrap(), spec, "{text}");
        }
        let text = document(&spec, SpecSyntax::Toml, &comments).unwrap();
        assert!(text.contains("b = [1, -1.50, 1], a = [1, -1.250, 1.5000e-9]"), "{text}");
        assert!(text.contains("# 0.1 dB to spare.\n[[band]]\nname = \"calls\"\nfrom_hz = 90\n"), "{text}");
        assert!(text.starts_with("# Found.\n# word"), "{text}");
        assert!(text.lines().all(|line| line.chars().count() <= 100), "{text}");
    }

    /// TOML 1.0, section "Comment": no control characters but tabs. File names have them.
    #[test]
    fn a_comment_with_control_characters_reads() {
        let spec = parse(TEXT.as_bytes(), SpecSyntax::Toml, "quay.toml").unwrap();
        let controls: String = ('\0'..='\u{9f}').filter(|c| c.is_control()).flat_map(|c| ['a', c]).collect();
        let comments =
            Comments { head: vec![controls.clone()], bands: vec![("calls".to_owned(), format!("b{controls}"))] };
        let text = document(&spec, SpecSyntax::Toml, &comments).unwrap();
        assert_eq!(parse(text.as_bytes(), SpecSyntax::Toml, "again").unwrap(), spec, "{text:?}");
        assert!(text.starts_with("# a\u{fffd}a\u{fffd}"), "{text:?}");
        assert!(!text.contains(|c: char| c.is_control() && c != '\n'), "{text:?}");
    }
}
