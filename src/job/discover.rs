//! Which files below the input are recordings.

use super::{JobError, paths};
use globset::{GlobBuilder, GlobSet, GlobSetBuilder};
use std::ffi::OsStr;
use std::path::{Path, PathBuf};
use walkdir::WalkDir;

/// Endings of a recording's name, in any case.
const ENDINGS: [&str; 3] = ["wav", "wave", "bwf"];

/// One recording to be processed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Found {
    /// Where it is.
    pub path: PathBuf,
    /// Relative to the input root.
    pub relative: PathBuf,
    /// Length in bytes when it was found.
    pub bytes: u64,
}

/// What lies below the input.
#[derive(Debug, Default)]
pub struct Discovered {
    /// Recordings, sorted by relative path.
    pub recordings: Vec<Found>,
    /// Folders and files that could not be looked at: relative path and why.
    pub unreadable: Vec<(PathBuf, String)>,
    /// `._*` files, which exFAT cards carry beside each recording.
    pub dot_underscore: u64,
    /// Files that are no recordings, links included.
    pub other_files: u64,
    /// Links among [`Self::other_files`]: links are not followed.
    pub links: u64,
    /// Recordings that `--include` or `--exclude` left out.
    pub filtered_out: u64,
}

/// Finds the recordings below `input`, or takes `input` itself if it is a file.
pub fn discover(input: &Path, include: &[String], exclude: &[String]) -> Result<Discovered, JobError> {
    let metadata = std::fs::metadata(input).map_err(|cause| JobError::Input { path: input.into(), cause })?;
    let patterns = Patterns { include: pattern_set(include)?, exclude: pattern_set(exclude)? };
    let mut discovered = Discovered::default();
    if metadata.is_file() {
        let relative = PathBuf::from(input.file_name().unwrap_or_default());
        discovered.recordings.push(Found { path: input.into(), relative, bytes: metadata.len() });
        return Ok(discovered);
    }
    for entry in WalkDir::new(input).follow_links(false) {
        match entry {
            Ok(entry) if entry.file_type().is_dir() => {}
            Ok(entry) => discovered.sort_in(input, &entry, &patterns),
            // Nothing at all can be found then.
            Err(error) if error.depth() == 0 => {
                return Err(JobError::Input { path: input.into(), cause: error.into() });
            }
            Err(error) => {
                let path = error.path().unwrap_or(input);
                let relative = path.strip_prefix(input).unwrap_or(path).to_path_buf();
                let cause = error.io_error().map_or_else(|| error.to_string(), ToString::to_string);
                let why = format!("can't be looked into: {cause}; nothing below it was done: see to its permissions");
                discovered.unreadable.push((relative, why));
            }
        }
    }
    discovered.recordings.sort_by_cached_key(|found| paths::shown(&found.relative));
    Ok(discovered)
}

impl Discovered {
    fn sort_in(&mut self, root: &Path, entry: &walkdir::DirEntry, patterns: &Patterns) {
        let name = entry.file_name();
        if name.as_encoded_bytes().starts_with(b"._") {
            self.dot_underscore += 1;
        } else if entry.file_type().is_symlink() {
            self.links += 1;
            self.other_files += 1;
        } else if !entry.file_type().is_file() || !is_recording_name(name) {
            self.other_files += 1;
        } else {
            let relative = entry.path().strip_prefix(root).unwrap_or(entry.path()).to_path_buf();
            if !patterns.take(&relative) {
                self.filtered_out += 1;
                return;
            }
            match entry.metadata() {
                Ok(metadata) => {
                    self.recordings.push(Found { path: entry.path().into(), relative, bytes: metadata.len() })
                }
                Err(error) => self.unreadable.push((relative, format!("can't be looked at: {error}"))),
            }
        }
    }
}

fn is_recording_name(name: &OsStr) -> bool {
    Path::new(name).extension().is_some_and(|found| ENDINGS.iter().any(|ending| found.eq_ignore_ascii_case(ending)))
}

/// `--include` and `--exclude`.
struct Patterns {
    include: Option<PatternSet>,
    exclude: Option<PatternSet>,
}

impl Patterns {
    fn take(&self, relative: &Path) -> bool {
        self.include.as_ref().is_none_or(|set| set.matches(relative))
            && !self.exclude.as_ref().is_some_and(|set| set.matches(relative))
    }
}

/// A pattern with a `/` speaks of the relative path, one without of the file's name.
struct PatternSet {
    paths: GlobSet,
    names: GlobSet,
}

impl PatternSet {
    fn matches(&self, relative: &Path) -> bool {
        self.paths.is_match(relative) || relative.file_name().is_some_and(|name| self.names.is_match(name))
    }
}

fn pattern_set(patterns: &[String]) -> Result<Option<PatternSet>, JobError> {
    if patterns.is_empty() {
        return Ok(None);
    }
    let bad = |error: &globset::Error| JobError::Pattern {
        pattern: error.glob().unwrap_or_default().into(),
        why: error.kind().to_string(),
    };
    let (mut paths, mut names) = (GlobSetBuilder::new(), GlobSetBuilder::new());
    for pattern in patterns {
        let glob = GlobBuilder::new(pattern).literal_separator(true).build().map_err(|error| bad(&error))?;
        if pattern.contains('/') {
            paths.add(glob)
        } else {
            names.add(glob)
        };
    }
    let build = |builder: GlobSetBuilder| builder.build().map_err(|error| bad(&error));
    Ok(Some(PatternSet { paths: build(paths)?, names: build(names)? }))
}
