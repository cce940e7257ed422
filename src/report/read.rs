//! Reads a report as strictly as it is written: every key there, none that this format
//! does not have, hashes that are hashes, paths that stay below their root.
//!
//! Recordings are handed over one by one, so that a report's length does not matter.

mod check;
mod error;
mod strict;

use super::{DesignEntry, FORMAT, Head, REPORT_NAME, Recording, Run, SpecEntry, Summary};
use check::{check, check_hash};
pub use error::ReadError;
use error::explained;
use serde::de::{DeserializeSeed, Deserializer, Error as _, IgnoredAny, MapAccess, SeqAccess, Visitor};
use std::fmt;
use std::io::BufRead;
use std::marker::PhantomData;
use strict::StrictSeed;

/// Reads a report from `file` to its end. `each` is given one recording after the other
/// and may refuse one with a sentence.
///
/// # Errors
/// See [`ReadError`].
pub fn read_report(
    file: impl BufRead,
    each: &mut dyn FnMut(Recording) -> Result<(), String>,
) -> Result<(Head, Summary), ReadError> {
    let mut state = State { each, entries: 0, in_entry: false, refusal: None };
    let mut deserializer = serde_json::Deserializer::from_reader(file);
    let read = Report(&mut state).deserialize(&mut deserializer).and_then(|parts| deserializer.end().map(|()| parts));
    match (state.refusal.take(), read) {
        (Some(refusal), _) => Err(refusal),
        (None, Ok(parts)) => parts.finish(),
        (None, Err(error)) => Err(explained(error, state.in_entry.then_some(state.entries))),
    }
}

/// What goes on while a report is read.
struct State<'e> {
    each: &'e mut dyn FnMut(Recording) -> Result<(), String>,
    /// Entries of `recordings` begun.
    entries: usize,
    in_entry: bool,
    /// What the parser can't say in its own words.
    refusal: Option<ReadError>,
}

/// The top level as far as it was found.
#[derive(Default)]
struct Parts {
    report: Option<String>,
    format: Option<serde_json::Value>,
    tool_version: Option<String>,
    level_reference: Option<String>,
    run: Option<Run>,
    complete: Option<bool>,
    spec: Option<SpecEntry>,
    designs: Option<Vec<DesignEntry>>,
    recordings: Option<()>,
    summary: Option<Summary>,
    unknown: Option<String>,
}

impl Parts {
    fn finish(self) -> Result<(Head, Summary), ReadError> {
        fn there<T>(part: Option<T>, key: &str) -> Result<T, ReadError> {
            part.ok_or_else(|| ReadError::Unusable { what: format!("the key `{key}` is missing"), entry: None })
        }
        let no_report = || ReadError::NotAReport { found: "the key `report` is missing".to_owned() };
        let report = self.report.ok_or_else(no_report)?;
        let format = there(self.format, "format").and_then(|found| format_number(&found))?;
        if let Some(key) = self.unknown {
            let what = format!("the key `{key}` is unknown to format {FORMAT}");
            return Err(ReadError::Unusable { what, entry: None });
        }
        there(self.recordings, "recordings")?;
        let head = Head {
            report,
            format,
            tool_version: there(self.tool_version, "tool_version")?,
            level_reference: there(self.level_reference, "level_reference")?,
            run: there(self.run, "run")?,
            complete: there(self.complete, "complete")?,
            spec: there(self.spec, "spec")?,
            designs: there(self.designs, "designs")?,
        };
        let hash = check_hash(&head.spec.file_sha256, "spec.file_sha256");
        hash.map_err(|what| ReadError::Unusable { what, entry: None })?;
        Ok((head, there(self.summary, "summary")?))
    }
}

fn format_number(found: &serde_json::Value) -> Result<u32, ReadError> {
    match found.as_u64() {
        Some(number) if number == u64::from(FORMAT) => Ok(FORMAT),
        _ => Err(ReadError::OtherFormat { found: found.to_string() }),
    }
}

/// Reads the top level.
struct Report<'s, 'e>(&'s mut State<'e>);

impl<'de> DeserializeSeed<'de> for Report<'_, '_> {
    type Value = Parts;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Parts, D::Error> {
        deserializer.deserialize_map(self)
    }
}

impl<'de> Visitor<'de> for Report<'_, '_> {
    type Value = Parts;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a report, which is an object")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut pairs: A) -> Result<Parts, A::Error> {
        let state = self.0;
        let mut parts = Parts::default();
        while let Some(key) = pairs.next_key::<String>()? {
            match key.as_str() {
                "report" => {
                    take(&mut pairs, "report", &mut parts.report)?;
                    if let Some(name) = parts.report.as_ref().filter(|name| *name != REPORT_NAME) {
                        let found = format!("it calls itself a report of `{name}`");
                        return Err(refuse(state, ReadError::NotAReport { found }));
                    }
                }
                "format" => {
                    take(&mut pairs, "format", &mut parts.format)?;
                    // Before anything else that another format may write in another way.
                    if let Some(Err(error)) = parts.format.as_ref().map(format_number) {
                        return Err(refuse(state, error));
                    }
                }
                "tool_version" => take(&mut pairs, "tool_version", &mut parts.tool_version)?,
                "level_reference" => take(&mut pairs, "level_reference", &mut parts.level_reference)?,
                "run" => take(&mut pairs, "run", &mut parts.run)?,
                "complete" => take(&mut pairs, "complete", &mut parts.complete)?,
                "spec" => take(&mut pairs, "spec", &mut parts.spec)?,
                "designs" => take(&mut pairs, "designs", &mut parts.designs)?,
                "summary" => take(&mut pairs, "summary", &mut parts.summary)?,
                "recordings" if parts.recordings.is_some() => return Err(A::Error::duplicate_field("recordings")),
                "recordings" => parts.recordings = Some(pairs.next_value_seed(Recordings(state))?),
                // No report at all, or one of another format, is the better answer if it is one.
                _ => {
                    pairs.next_value::<IgnoredAny>()?;
                    parts.unknown.get_or_insert(key);
                }
            }
        }
        Ok(parts)
    }
}

/// Reads the value of `key`, once.
fn take<'de, A: MapAccess<'de>, T: serde::Deserialize<'de>>(
    pairs: &mut A,
    key: &'static str,
    part: &mut Option<T>,
) -> Result<(), A::Error> {
    if part.is_some() {
        return Err(A::Error::duplicate_field(key));
    }
    *part = Some(pairs.next_value_seed(StrictSeed(PhantomData))?);
    Ok(())
}

fn refuse<E: serde::de::Error>(state: &mut State<'_>, refusal: ReadError) -> E {
    let sentence = E::custom(&refusal);
    state.refusal = Some(refusal);
    sentence
}

/// Reads `recordings`, one at a time.
struct Recordings<'s, 'e>(&'s mut State<'e>);

impl<'de> DeserializeSeed<'de> for Recordings<'_, '_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<(), D::Error> {
        deserializer.deserialize_seq(self)
    }
}

impl<'de> Visitor<'de> for Recordings<'_, '_> {
    type Value = ();

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("the list of recordings")
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<(), A::Error> {
        let state = self.0;
        loop {
            // The parser may fail within the next entry.
            state.entries += 1;
            state.in_entry = true;
            let Some(recording) = items.next_element_seed(StrictSeed(PhantomData::<Recording>))? else { break };
            if let Err(what) = check(&recording).and_then(|()| (state.each)(recording)) {
                let entry = Some(state.entries);
                return Err(refuse(state, ReadError::Unusable { what, entry }));
            }
        }
        state.in_entry = false;
        Ok(())
    }
}
