//! What an earlier run of the same job left, and what of it can be kept.
//!
//! An interrupted run leaves a report of what it did, a killed one its journal, a finished
//! one its report. Their entries are claims: an output stands for a recording only if the
//! bytes of both hash to what the entry says, and the entry was made from the same spec by
//! the same version of this program.

mod claims;
mod verify;

use super::FilterJob;
use super::journal::{self, Identity, Journal, Line, Older};
use super::paths;
use crate::files::comparing::Comparing;
use crate::files::digest::hexadecimal;
use crate::package::Item;
use crate::report::{
    Head, Highlights, Recording, SpecEntry, Status, Summary, SummaryBuilder, TableWriter, read_report,
};
use crate::spec::SpecFile;
use claims::{Claim, Claims};
use std::fs::File;
use std::io::{self, BufReader, BufWriter};
use std::path::{Path, PathBuf};

pub use verify::{Standing, verify};

/// The entries that an earlier run of the same job left.
#[derive(Debug)]
pub struct Earlier {
    identity: Identity,
    /// The folder whose journal was read.
    output: PathBuf,
    /// Where a report of this job may be, and what was found there.
    report: PathBuf,
    found: Found,
    claims: Claims,
    has_journal: bool,
    /// A recording of the journal that is not part of the run to come.
    stranger: Option<String>,
}

/// What is where the report goes.
#[derive(Clone, Debug, PartialEq)]
pub enum Found {
    /// No file.
    Nothing,
    /// A report of this very job.
    Ours(Box<Told>),
    /// A report of this job over more recordings, so that a run must not replace it unasked;
    /// its entries count all the same. What it lists besides.
    Wider(String),
    /// Something else, which a run must not replace unasked; why, if it can be said.
    Foreign(Option<String>),
}

impl Found {
    /// Whether there is a report whose entries were made by this job.
    fn counts(&self) -> bool {
        matches!(self, Found::Ours(_) | Found::Wider(_))
    }
}

/// What a report of this job tells besides its recordings.
#[derive(Clone, Debug, PartialEq)]
pub struct Told {
    /// What stands before them.
    pub head: Head,
    /// What stands after them; it is what they come to.
    pub summary: Summary,
    /// What a person has to know of them.
    pub highlights: Highlights,
}

/// Where a claim stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Source {
    Report,
    Journal,
}

impl Earlier {
    /// Reads what is there for `job` with `spec` in force, whose report goes to `report`. `listed` says whether
    /// a recording, by its path as reported and whether that is escaped, is part of the run
    /// to come.
    ///
    /// # Errors
    /// The journal can't be read; the spec does not go into JSON, which no spec that was read does.
    pub fn read(
        job: &FilterJob,
        spec: &SpecFile,
        report: &Path,
        listed: &dyn Fn(&str, bool) -> bool,
    ) -> io::Result<Self> {
        let identity = Identity::of(spec)?;
        let mut claims = Claims::default();
        let found = look(spec, report, listed, &mut claims)?;
        if !found.counts() {
            claims = Claims::default();
        }
        let (mut ordinal, mut stranger) = (0, None);
        let has_journal = journal::read(&job.output, &identity, &mut |line| {
            match line {
                Line::Entry(recording) => {
                    if recording.status == Status::Done && !listed(&recording.path, is_escaped(&recording)) {
                        stranger.get_or_insert_with(|| recording.path.clone());
                    }
                    claims.add(&recording, Source::Journal, ordinal);
                    ordinal += 1;
                }
                Line::Older(older) => claims.add_older(&older),
            }
            Ok(())
        })?;
        Ok(Earlier {
            identity,
            output: job.output.clone(),
            report: report.into(),
            found,
            claims,
            has_journal,
            stranger,
        })
    }

    /// What is where the report goes.
    pub fn report(&self) -> &Found {
        &self.found
    }

    /// What the report tells if every claim stands in it, none in a journal.
    pub fn told(&self) -> Option<&Told> {
        match &self.found {
            Found::Ours(told) if !self.has_journal => Some(told),
            _ => None,
        }
    }

    /// A recording that a killed run has done and that is not part of the run to come, whose
    /// journal would forget it.
    pub fn stranger(&self) -> Option<&str> {
        self.stranger.as_deref()
    }

    /// Whether nothing was left.
    pub fn is_empty(&self) -> bool {
        self.claims.is_empty()
    }

    /// What is claimed of the recording at `shown`, `escaped` or not.
    fn claim(&self, shown: &str, escaped: bool) -> Option<&Claim> {
        self.claims.get(shown, escaped)
    }

    /// Whether a recording at `shown` is claimed to have been done.
    pub fn claims(&self, shown: &str, escaped: bool) -> bool {
        self.claim(shown, escaped).is_some() || !self.claims.older(shown, escaped).is_empty()
    }

    /// All outputs that a recording at `shown` is claimed to have had.
    pub fn outputs(&self, shown: &str, escaped: bool) -> impl Iterator<Item = Older> {
        let latest = self.claim(shown, escaped).map(|claim| &claim.output);
        latest.into_iter().chain(self.claims.older(shown, escaped)).map(move |file| Older {
            path: shown.to_owned(),
            escaped,
            sha256: hexadecimal(&file.sha256),
            bytes: file.bytes,
        })
    }

    /// Hands over the latest entry of each recording that is claimed to be done, in no
    /// particular order.
    ///
    /// # Errors
    /// What can't be read any more, and what `each` does.
    pub fn entries(&self, each: &mut dyn FnMut(Recording) -> io::Result<()>) -> io::Result<()> {
        let mut latest = |recording: Recording, source: Source, ordinal: u64| {
            if self.claims.is_latest(&recording, source, ordinal) { each(recording) } else { Ok(()) }
        };
        if self.found.counts() {
            let mut ordinal = 0;
            self.reported(&mut |recording| {
                ordinal += 1;
                latest(recording, Source::Report, ordinal - 1)
            })?;
        }
        let mut ordinal = 0;
        journal::read(&self.output, &self.identity, &mut |line| {
            let Line::Entry(recording) = line else { return Ok(()) };
            ordinal += 1;
            latest(*recording, Source::Journal, ordinal - 1)
        })
        .map(drop)
    }

    /// Whether the table at `path` is the one that the earlier run wrote: what its report or
    /// its journal comes to, byte for byte.
    ///
    /// # Errors
    /// What can't be read.
    pub fn wrote_table(&self, path: &Path) -> io::Result<bool> {
        if self.found.counts() {
            let mut table = TableWriter::new(BufWriter::new(Comparing::with(path)?))?;
            self.reported(&mut |recording| table.add(&recording))?;
            if is_same(table)? {
                return Ok(true);
            }
        }
        // A run that is killed between its table and its report leaves its journal whole.
        let Some(journal) = Journal::reopen(&self.output, &self.identity)? else { return Ok(false) };
        let mut table = TableWriter::new(BufWriter::new(Comparing::with(path)?))?;
        for line in journal.sorted() {
            table.add(&serde_json::from_str(&line?)?)?;
        }
        is_same(table)
    }

    /// The outputs that the earlier report lists, in its order; `path` gives the path of one
    /// below the output folder by its path as reported and whether that is escaped.
    ///
    /// # Errors
    /// What can't be read.
    pub fn items(&self, path: &dyn Fn(&str, bool) -> Option<PathBuf>) -> io::Result<Vec<Item>> {
        let mut items = Vec::new();
        self.reported(&mut |recording| {
            let path = path(&recording.path, is_escaped(&recording));
            if let (Status::Done, Some(output), Some(path)) = (recording.status, recording.output, path) {
                items.push(Item { path, sha256: output.sha256, bytes: output.bytes });
            }
            Ok(())
        })?;
        Ok(items)
    }

    /// The entries of the earlier report in their order.
    fn reported(&self, each: &mut dyn FnMut(Recording) -> io::Result<()>) -> io::Result<()> {
        let file = BufReader::with_capacity(1 << 16, File::open(&self.report)?);
        let mut failed = None;
        let read = read_report(file, &mut |recording| {
            each(recording).map_err(|error| {
                let sentence = error.to_string();
                failed = Some(error);
                sentence
            })
        });
        match (failed, read) {
            (Some(error), _) => Err(error),
            (None, Err(error)) => Err(io::Error::other(error)),
            (None, Ok(_)) => Ok(()),
        }
    }
}

fn is_same(table: TableWriter<BufWriter<Comparing>>) -> io::Result<bool> {
    table.finish()?.into_inner().map_err(io::IntoInnerError::into_error)?.same()
}

/// Reads the report that is there.
fn look(spec: &SpecFile, report: &Path, listed: &dyn Fn(&str, bool) -> bool, claims: &mut Claims) -> io::Result<Found> {
    match report.symlink_metadata() {
        Ok(metadata) if metadata.is_file() => {}
        Ok(_) => return Ok(Found::Foreign(Some("no regular file".into()))),
        Err(_) => return Ok(Found::Nothing),
    }
    let file = match File::open(report) {
        Ok(file) => file,
        Err(cause) => return Ok(Found::Foreign(Some(format!("a file that can't be read: {cause}")))),
    };
    let Ok(mut seen) = SummaryBuilder::new(&spec.spec) else { return Ok(Found::Foreign(None)) };
    let mut ordinal = 0;
    let mut strangers: Option<(u64, String)> = None;
    let read = read_report(BufReader::with_capacity(1 << 16, file), &mut |recording| {
        // One that failed left nothing, and may have been taken away as it was told.
        if recording.status == Status::Done && !listed(&recording.path, is_escaped(&recording)) {
            strangers.get_or_insert_with(|| (0, recording.path.clone())).0 += 1;
        }
        seen.add(&recording);
        claims.add(&recording, Source::Report, ordinal);
        ordinal += 1;
        Ok(())
    });
    let (head, summary) = match read {
        Ok(parts) => parts,
        Err(_) => return Ok(Found::Foreign(Some("no whole report of this program".into()))),
    };
    let own = SpecEntry::new(spec)?;
    if head.spec.file_sha256 != own.file_sha256 {
        return Ok(Found::Foreign(Some("a report made with another spec".into())));
    }
    if head.spec.normalized != own.normalized {
        return Ok(Found::Foreign(Some(
            "a report made with another cascade from this spec, at other sample rates".into(),
        )));
    }
    if head.tool_version != env!("CARGO_PKG_VERSION") {
        return Ok(Found::Foreign(Some(format!("a report made by version {} of this program", head.tool_version))));
    }
    let (counted, highlights) = seen.finish(summary.skipped);
    if counted != summary {
        return Ok(Found::Foreign(Some("a report whose summary is not what its recordings come to".into())));
    }
    if let Some((count, first)) = strangers {
        return Ok(Found::Wider(format!(
            "a report that also lists what is not part of this run ({count} recording{}, the first {first})",
            if count == 1 { "" } else { "s" }
        )));
    }
    Ok(Found::Ours(Box::new(Told { head, summary, highlights })))
}

/// Whether the path of an entry is escaped, which two names can have in common otherwise.
pub fn is_escaped(recording: &Recording) -> bool {
    recording.notes.iter().any(|note| note == paths::ESCAPED_NOTE)
}
