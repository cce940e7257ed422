//! Typed access to one table of the tree: every key is asked for by name and kind, and
//! whatever is wrong with it becomes a problem with its place.

use std::collections::HashSet;

use super::SpecSyntax;
use super::error::Place;
use super::problems::Problems;
use super::quantity::{Quantity, number};
use super::suggest;
use super::tree::{Entry, Node, Value, quote, show_number};
use super::words::Word;

/// What a key gave.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Got<T> {
    /// It is not there.
    Absent,
    /// It is there, or was meant, and a problem says what is wrong with it.
    Bad,
    /// Its value.
    Is(T),
}

impl<T> Got<T> {
    /// Whether the key is there, right or wrong.
    pub fn is_there(&self) -> bool {
        !matches!(self, Self::Absent)
    }

    /// What a good value comes to.
    pub fn map<U>(self, of: impl FnOnce(T) -> U) -> Got<U> {
        match self {
            Self::Absent => Got::Absent,
            Self::Bad => Got::Bad,
            Self::Is(value) => Got::Is(of(value)),
        }
    }

    /// The value where there is a good one.
    pub fn value(self) -> Option<T> {
        match self {
            Self::Is(value) => Some(value),
            Self::Absent | Self::Bad => None,
        }
    }

    /// The value; `default` where the key is not there; nothing where it is wrong.
    pub fn or(self, default: T) -> Option<T> {
        match self {
            Self::Is(value) => Some(value),
            Self::Absent => Some(default),
            Self::Bad => None,
        }
    }
}

/// One table of the file.
pub(super) struct Fields<'n> {
    /// What messages call it: `the highpass stage`.
    pub what: String,
    /// Where it begins.
    pub place: &'n Place,
    entries: &'n [Entry],
    /// Known keys that some unknown key was probably meant to be.
    meant: Vec<&'static str>,
}

impl<'n> Fields<'n> {
    /// Opens `node` as a table, or says that it is none.
    pub fn open(node: &'n Node, what: &str, problems: &mut Problems) -> Option<Self> {
        let Value::Table(entries) = &node.value else {
            let repair = match problems.syntax {
                SpecSyntax::Toml => "write a table of keys",
                SpecSyntax::Json => "write an object of keys: { ... }",
            };
            problems.add(&node.place, format!("{what} is {}, not a table", node.value.show()), repair);
            return None;
        };
        let mut seen = HashSet::new();
        for entry in entries {
            if !seen.insert(&entry.key) {
                problems.add(
                    &entry.key_place,
                    format!("the key {} stands twice in {what}", quote(&entry.key)),
                    "keep one of them",
                );
            }
        }
        Some(Self { what: what.to_owned(), place: &node.place, entries, meant: Vec::new() })
    }

    /// Reports every key that is not among `known`; suggestions come from `fitting`,
    /// the known keys that make sense in this very table.
    pub fn only(&mut self, known: &[&'static str], fitting: &[&'static str], problems: &mut Problems) {
        for entry in self.entries.iter().filter(|entry| !known.contains(&entry.key.as_str())) {
            if problems.is_full() {
                // Looking for what was meant takes time, and would be for nothing.
                problems.cut();
                return;
            }
            let repair = match suggest::key(&entry.key, fitting) {
                Some(near) => {
                    self.meant.push(near);
                    format!("did you mean {near}?")
                }
                None => match suggest::home(&entry.key) {
                    Some(home) => format!("{} belongs {home}", entry.key),
                    None => format!("known keys here: {}", fitting.join(", ")),
                },
            };
            let message = format!("unknown key {} in {}", quote(&entry.key), self.what);
            problems.add(&entry.key_place, message, repair);
        }
    }

    /// Whether the key is written in the file.
    pub fn has(&self, key: &str) -> bool {
        self.entries.iter().any(|entry| entry.key == key)
    }

    /// Whether an unknown key was probably meant to be this one.
    pub fn is_meant(&self, key: &str) -> bool {
        self.meant.contains(&key)
    }

    /// Whether any key of the table is unknown and near a known one.
    pub fn any_meant(&self) -> bool {
        !self.meant.is_empty()
    }

    /// The key's entry, the first where it stands twice.
    pub fn entry(&self, key: &str) -> Option<&'n Entry> {
        self.entries.iter().find(|entry| entry.key == key)
    }

    /// Where the key stands, or the table where it is not there.
    pub fn key_place(&self, key: &str) -> &'n Place {
        self.entry(key).map_or(self.place, |entry| &entry.key_place)
    }

    /// Where the key's value stands, or the table where it is not there.
    pub fn value_place(&self, key: &str) -> &'n Place {
        self.entry(key).map_or(self.place, |entry| &entry.node.place)
    }

    /// Reports a known key that has no business in this table.
    pub fn refuse(&self, key: &str, why: &str, repair: &str, problems: &mut Problems) {
        if let Some(entry) = self.entry(key) {
            problems.add(&entry.key_place, format!("{key} in {}: {why}", self.what), repair);
        }
    }

    /// Reports a key that should be there, unless an unknown one was meant to be it.
    pub fn missing(&self, key: &str, repair: &str, problems: &mut Problems) {
        if !self.is_meant(key) {
            problems.add(self.place, format!("{} has no {key}", self.what), repair);
        }
    }

    /// Looks a key up and reads it with `read`, which reports and gives nothing where
    /// the value is no good.
    pub fn get<T>(&self, key: &str, read: impl FnOnce(&'n Node) -> Option<T>) -> Got<T> {
        match self.entry(key) {
            Some(entry) => read(&entry.node).map_or(Got::Bad, Got::Is),
            None if self.is_meant(key) => Got::Bad,
            None => Got::Absent,
        }
    }

    /// A finite number within the quantity's range.
    pub fn number(&self, key: &str, quantity: &Quantity, problems: &mut Problems) -> Got<f64> {
        self.get(key, |node| number(node, key, quantity, problems))
    }

    /// A whole number within the quantity's range.
    pub fn whole(&self, key: &str, quantity: &Quantity, problems: &mut Problems) -> Got<u32> {
        self.get(key, |node| {
            let value = number(node, key, quantity, problems)?;
            if value.fract() != 0.0 {
                problems.add(
                    &node.place,
                    format!("{key} is {}, not a whole number", show_number(value)),
                    format!("give {}", quantity.describe(value)),
                );
                return None;
            }
            // The quantity's range lies within u32, and the value is whole.
            Some(value as u32)
        })
    }

    /// Two numbers within the quantity's range.
    pub fn pair(&self, key: &str, quantity: &Quantity, problems: &mut Problems) -> Got<[f64; 2]> {
        self.get(key, |node| {
            let repair = format!("write the lower and the upper one: {}", problems.assign(key, "[48.4, 51.6]"));
            let Value::List(items) = &node.value else {
                problems.add(&node.place, format!("{key} is {}, not a list of two numbers", node.value.show()), repair);
                return None;
            };
            let [low, high] = items.as_slice() else {
                let message = format!("{key} is a list of {}, not of two numbers", items.len());
                problems.add(&node.place, message, repair);
                return None;
            };
            let low = number(low, key, quantity, problems);
            let high = number(high, key, quantity, problems);
            Some([low?, high?])
        })
    }

    /// Text.
    pub fn text(&self, key: &str, problems: &mut Problems) -> Got<&'n str> {
        self.get(key, |node| text(node, key, problems))
    }

    /// A list of texts with their places.
    pub fn texts(&self, key: &str, problems: &mut Problems) -> Got<Vec<(&'n str, &'n Place)>> {
        self.get(key, |node| {
            let Value::List(items) = &node.value else {
                let example = match &node.value {
                    Value::Text(one) => format!("[{}]", quote(one)),
                    _ => "[\"a name\"]".to_owned(),
                };
                let repair = format!("write a list of names: {}", problems.assign(key, &example));
                problems.add(&node.place, format!("{key} is {}, not a list", node.value.show()), repair);
                return None;
            };
            let read: Vec<_> = items.iter().map(|item| Some((text(item, key, problems)?, &item.place))).collect();
            read.into_iter().collect()
        })
    }

    /// Yes or no.
    pub fn flag(&self, key: &str, problems: &mut Problems) -> Got<bool> {
        self.get(key, |node| {
            if let Value::Truth(truth) = node.value {
                return Some(truth);
            }
            let repair = match &node.value {
                // `history = "true"` is a near miss.
                Value::Text(text) if text.eq_ignore_ascii_case("true") => "write true without quotation marks",
                Value::Text(text) if text.eq_ignore_ascii_case("false") => "write false without quotation marks",
                _ => "write true or false",
            };
            problems.add(&node.place, format!("{key} is {}, not true or false", node.value.show()), repair);
            None
        })
    }

    /// One of a choice of words.
    pub fn word<W: Word>(&self, key: &str, problems: &mut Problems) -> Got<W> {
        self.get(key, |node| {
            let found = match &node.value {
                Value::Text(text) => text.clone(),
                // `encoding = 16` and `dither = false` are near misses too.
                Value::Number(number) => show_number(number.value),
                Value::Truth(truth) => truth.to_string(),
                Value::Other(words) => words.clone(),
                Value::List(_) | Value::Table(_) => String::new(),
            };
            let is_text = matches!(node.value, Value::Text(_));
            if let Some(&choice) = W::ALL.iter().find(|choice| is_text && choice.word() == found) {
                return Some(choice);
            }
            let choices = W::ALL.iter().map(|choice| choice.word()).collect::<Vec<_>>().join(", ");
            let shown = if is_text { quote(&found) } else { node.value.show() };
            let repair = match (suggest::word::<W>(&found), W::ALL) {
                (Some(near), [_]) => format!("did you mean \"{}\"?", near.word()),
                (Some(near), _) => format!("did you mean \"{}\"? (one of {choices})", near.word()),
                (None, [_]) => format!("write \"{choices}\", or remove it"),
                (None, _) => format!("choose one of {choices}"),
            };
            problems.add(&node.place, format!("{key} can't be {shown}"), repair);
            None
        })
    }
}

fn text<'n>(node: &'n Node, key: &str, problems: &mut Problems) -> Option<&'n str> {
    match &node.value {
        Value::Text(text) => Some(text),
        other => {
            problems.add(&node.place, format!("{key} is {}, not text", other.show()), "write text in quotation marks");
            None
        }
    }
}
