//! Where the recordings of a report lie now, and which lie beside them.

use super::listing::{Listed, Listing};
use super::{Command, RecheckError, RecheckJob, Side, Unreadable};
use crate::job::discover::{Discovered, Found, discover};
use crate::job::paths;
use std::collections::{HashMap, HashSet};
use std::path::{Path, PathBuf};

/// The folder of one side and what lies below it.
#[derive(Debug)]
pub(super) struct Root {
    pub(super) path: PathBuf,
    side: Side,
    /// The path is the one recording itself.
    single: bool,
    /// With links resolved.
    real: PathBuf,
    found: Discovered,
    /// Files whose names are not UTF-8, by what reports show for them.
    escaped: HashMap<String, PathBuf>,
}

impl Root {
    /// Looks below `path` for recordings.
    fn open(path: &Path, side: Side, listed: usize) -> Result<Self, RecheckError> {
        let (option, holds) = match side {
            Side::Input => ("--input", "before"),
            Side::Output => ("--output", "after"),
        };
        let unreadable = |cause: String| RecheckError::Root { option, path: path.into(), cause, holds };
        let real = path.canonicalize().map_err(|cause| unreadable(cause.to_string()))?;
        let single = real.is_file();
        if single && listed != 1 {
            return Err(RecheckError::OneFile { option, path: path.into(), listed: listed as u64 });
        }
        let found = discover(path, &[], &[]).map_err(|error| unreadable(error.to_string()))?;
        let escaped = found.recordings.iter().filter_map(|found| match paths::shown(&found.relative) {
            (shown, true) => Some((shown, found.path.clone())),
            (_, false) => None,
        });
        let escaped = escaped.collect();
        Ok(Root { path: path.into(), side, single, real, found, escaped })
    }

    /// Where the recording of an entry is to be; `None` where a name that is not UTF-8 is
    /// nowhere to be found.
    pub(super) fn locate(&self, entry: &Listed) -> Option<PathBuf> {
        if self.single {
            return Some(self.path.clone());
        }
        let shown = self.shown(entry);
        if entry.escaped { self.escaped.get(shown).cloned() } else { Some(self.path.join(shown)) }
    }

    /// The entry's path on this side, as the report has it.
    pub(super) fn shown<'e>(&self, entry: &'e Listed) -> &'e str {
        match self.side {
            Side::Input => &entry.path,
            Side::Output => entry.after_path(),
        }
    }

    /// Recordings below this root that the report does not list, as it would show them, and
    /// where they are. What lies below `other`, where that is a folder within this one,
    /// belongs there.
    pub(super) fn unlisted(&self, listing: &Listing, other: Option<&Root>) -> Vec<(String, &Path)> {
        if self.single {
            return Vec::new();
        }
        // The two recordings of a pair may lie side by side.
        let beside = listing.command == Command::Measure;
        let mut known: HashSet<(&str, bool)> = HashSet::new();
        for entry in &listing.entries {
            if self.side == Side::Input || beside {
                known.insert((&entry.path, entry.escaped));
            }
            if entry.after.is_some() && (self.side == Side::Output || beside) {
                known.insert((entry.after_path(), entry.escaped));
            }
        }
        let unpaired = listing.summary.unpaired.as_ref();
        let unpaired: HashSet<&str> = unpaired
            .map(|unpaired| if self.side == Side::Input { &unpaired.before } else { &unpaired.after })
            .into_iter()
            .flatten()
            .map(String::as_str)
            .collect();
        let within = other.and_then(|other| other.real.strip_prefix(&self.real).ok());
        let within = within.filter(|within| !within.as_os_str().is_empty());
        let ours = |found: &&Found| within.is_none_or(|within| !found.relative.starts_with(within));
        let shown = self.found.recordings.iter().filter(ours).map(|found| (paths::shown(&found.relative), found));
        let unlisted = shown.filter(|((shown, escaped), _)| {
            !known.contains(&(shown.as_str(), *escaped)) && !unpaired.contains(shown.as_str())
        });
        unlisted.map(|((shown, _), found)| (shown, found.path.as_path())).collect()
    }

    /// Whether the report lists a recording at `place` below this root.
    pub(super) fn lists(&self, listing: &Listing, place: &Path) -> bool {
        let Ok(relative) = place.strip_prefix(&self.real) else { return false };
        let (shown, escaped) = paths::shown(relative);
        listing.entries.iter().any(|entry| entry.escaped == escaped && self.shown(entry) == shown)
    }

    /// Folders and files that could not be looked at, but for those the report lists.
    pub(super) fn unreadable(&self) -> impl Iterator<Item = Unreadable> + '_ {
        self.found.unreadable.iter().map(|(path, error)| Unreadable {
            path: paths::shown(path).0,
            side: self.side,
            error: error.clone(),
        })
    }

    /// Every recording below this root.
    pub(super) fn recordings(&self) -> impl Iterator<Item = &Path> {
        self.found.recordings.iter().map(|found| found.path.as_path())
    }
}

/// The two sides.
#[derive(Debug)]
pub(super) struct Roots {
    pub(super) output: Root,
    pub(super) input: Option<Root>,
}

impl Roots {
    /// Output and, if there is one, input.
    pub(super) fn all(&self) -> impl Iterator<Item = &Root> {
        [&self.output].into_iter().chain(&self.input)
    }

    /// Decides where to look.
    pub(super) fn of(job: &RecheckJob, listing: &Listing) -> Result<Self, RecheckError> {
        let listed = listing.entries.len();
        let input = job.input.as_deref().map(|path| Root::open(path, Side::Input, listed)).transpose()?;
        let beside = job.report.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
        let output = Root::open(job.output.as_deref().unwrap_or(beside), Side::Output, listed)?;
        let guessed = job.output.is_none() && listing.command == Command::Measure;
        let there = |entry: &Listed| output.locate(entry).is_some_and(|path| path.symlink_metadata().is_ok());
        let mut pairs = listing.entries.iter().filter(|entry| entry.after.is_some()).peekable();
        if guessed && pairs.peek().is_some() && !pairs.any(there) {
            return Err(RecheckError::WhereIsAfter(job.report.clone()));
        }
        Ok(Roots { output, input })
    }
}
