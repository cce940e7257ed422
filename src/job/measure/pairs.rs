//! Which recordings before and after belong together.

use super::super::JobError;
use super::super::discover::{Discovered, Found, discover};
use super::super::paths;
use super::super::plan::Brief;
use crate::files::open;
use crate::report::{Skipped, Unpaired};
use crate::wave::{RateMeaning, Reader};
use rayon::prelude::*;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// Two recordings of the same sound.
#[derive(Clone, Debug)]
pub struct Pair {
    /// Before.
    pub before: Sided,
    /// After.
    pub after: Sided,
}

/// One recording of a pair.
#[derive(Clone, Debug)]
pub struct Sided {
    /// Where it is.
    pub found: Found,
    /// Relative path as the report shows it.
    pub shown: String,
    /// Whether [`Self::shown`] is escaped.
    pub escaped: bool,
    /// What its header says, or why it can't be processed.
    pub header: Result<Brief, String>,
}

/// Everything below both sides.
#[derive(Debug)]
pub struct Pairs {
    /// Recordings on both sides, sorted by path.
    pub pairs: Vec<Pair>,
    /// Recordings on one side.
    pub unpaired: Unpaired,
    /// Where those are.
    pub unpaired_files: Vec<PathBuf>,
    /// Folders and files that could not be looked at: side and path as shown, and why.
    pub unreadable: Vec<(String, String)>,
    /// Files of both sides that are no recordings.
    pub skipped: Skipped,
}

/// Pairs recordings by their paths below two folders, or takes two recordings as they are.
///
/// `rate` is what the spec's frequencies mean in time-expanded recordings.
pub fn find(
    before: &Path,
    after: &Path,
    include: &[String],
    exclude: &[String],
    rate: Option<RateMeaning>,
) -> Result<Pairs, JobError> {
    let is_folder = |path: &Path| {
        path.metadata().map(|metadata| metadata.is_dir()).map_err(|cause| JobError::Input { path: path.into(), cause })
    };
    let kinds = (is_folder(before)?, is_folder(after)?);
    if kinds.0 != kinds.1 {
        let kind = |folder| if folder { "a folder" } else { "a file" };
        return Err(JobError::Sides {
            before: before.into(),
            before_is: kind(kinds.0),
            after: after.into(),
            after_is: kind(kinds.1),
        });
    }
    let (one, other) = (discover(before, include, exclude)?, discover(after, include, exclude)?);
    let skipped = Skipped {
        dot_underscore: one.dot_underscore + other.dot_underscore,
        other_files: one.other_files + other.other_files,
    };
    let unreadable = unreadable("before", &one).chain(unreadable("after", &other)).collect();
    let counts = (one.recordings.len(), other.recordings.len());
    let Matched { pairs: found, unpaired, unpaired_files } = if kinds.0 {
        Matched::by_path(one.recordings, other.recordings)
    } else {
        Matched { pairs: one.recordings.into_iter().zip(other.recordings).collect(), ..Matched::default() }
    };
    if found.is_empty() {
        let found = format!("{} and {}", named(counts.0, &unpaired.before), named(counts.1, &unpaired.after));
        return Err(JobError::NoPairs { before: before.into(), after: after.into(), found });
    }
    let pairs = found
        .into_par_iter()
        .map(|(before, after)| Pair { before: Sided::new(before, rate), after: Sided::new(after, rate) })
        .collect();
    Ok(Pairs { pairs, unpaired, unpaired_files, unreadable, skipped })
}

/// `2 recordings (the first is a.wav)`.
fn named(count: usize, paths: &[String]) -> String {
    let first = paths.first().map_or(String::new(), |first| format!(" (the first is {first})"));
    format!("{count} recording{}{first}", if count == 1 { "" } else { "s" })
}

fn unreadable<'a>(side: &'a str, found: &'a Discovered) -> impl Iterator<Item = (String, String)> + 'a {
    found.unreadable.iter().map(move |(path, why)| (format!("{side}/{}", paths::shown(path).0), why.clone()))
}

/// Recordings of both sides, sorted out.
#[derive(Debug, Default)]
struct Matched {
    pairs: Vec<(Found, Found)>,
    unpaired: Unpaired,
    unpaired_files: Vec<PathBuf>,
}

impl Matched {
    fn by_path(before: Vec<Found>, after: Vec<Found>) -> Self {
        let mut partners: BTreeMap<PathBuf, Found> =
            after.into_iter().map(|found| (found.relative.clone(), found)).collect();
        let mut matched = Matched::default();
        for found in before {
            match partners.remove(&found.relative) {
                Some(partner) => matched.pairs.push((found, partner)),
                None => {
                    matched.unpaired.before.push(paths::shown(&found.relative).0);
                    matched.unpaired_files.push(found.path);
                }
            }
        }
        matched.unpaired.after = partners.keys().map(|path| paths::shown(path).0).collect();
        matched.unpaired.after.sort();
        matched.unpaired_files.extend(partners.into_values().map(|found| found.path));
        matched
    }
}

impl Sided {
    fn new(found: Found, rate: Option<RateMeaning>) -> Self {
        let (shown, escaped) = paths::shown(&found.relative);
        let header = open::regular(&found.path)
            .map_err(|error| format!("can't be opened: {error}"))
            .and_then(|file| Reader::open_as(file, rate).map_err(|error| error.to_string()))
            .map(|reader| Brief::of(reader.header()));
        Sided { found, shown, escaped, header }
    }
}
