//! A folder as a run leaves it.

use bandproof::package::{self, Contents, Emit, Item, PackageError};
use sha2::{Digest as _, Sha256};
use std::cell::RefCell;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

pub const STARTED: &str = "2031-05-02T06:10:00Z";

/// `originals/` and `bag/data/`, the latter with outputs and a report.
pub struct Dataset {
    pub root: TempDir,
    /// Sorted by path, as a report lists them.
    pub items: Vec<Item>,
    pub report: PathBuf,
    pub table: Option<PathBuf>,
    pub title: Option<&'static str>,
    pub started: &'static str,
    pub replace: bool,
}

impl Dataset {
    /// With one output at each path and a report.
    pub fn new<P: AsRef<Path>>(outputs: &[P]) -> Self {
        let root = tempfile::tempdir().unwrap();
        let output = root.path().join("bag/data");
        fs::create_dir_all(&output).unwrap();
        fs::create_dir(root.path().join("originals")).unwrap();
        let mut dataset = Dataset {
            root,
            items: Vec::new(),
            report: output.join("bandproof-report.json"),
            table: None,
            title: Some("Reed-bed recorders"),
            started: STARTED,
            replace: false,
        };
        fs::write(&dataset.report, "{\"report\": \"bandproof\"}\n").unwrap();
        for path in outputs {
            dataset.add_output(path.as_ref());
        }
        dataset
    }

    /// Adds an output with content of its own, if the disk takes the name, and lists it.
    pub fn add_output(&mut self, path: &Path) -> bool {
        let content = path.as_os_str().as_encoded_bytes().repeat(3);
        let made = try_put(&self.output().join(path), &content);
        if made {
            let item = Item { path: path.into(), sha256: sha256(&content), bytes: content.len() as u64 };
            self.items.push(item);
            self.items.sort_by_key(|item| item.path.as_os_str().as_encoded_bytes().to_vec());
        }
        made
    }

    /// Adds a file that no run made; `path` is relative to the bag.
    pub fn add_other(&self, path: &str, content: &str) -> PathBuf {
        let place = self.bag().join(path);
        assert!(try_put(&place, content.as_bytes()), "{path}");
        place
    }

    pub fn bag(&self) -> PathBuf {
        self.root.path().join("bag")
    }

    pub fn output(&self) -> PathBuf {
        self.root.path().join("bag/data")
    }

    pub fn check(&self, emit: Emit) -> Result<(), PackageError> {
        self.check_places(emit, &self.root.path().join("originals"), &self.output())
    }

    /// As `check`, with other folders.
    pub fn check_places(&self, emit: Emit, input: &Path, output: &Path) -> Result<(), PackageError> {
        let mut paths = self.items.iter().map(|item| item.path.as_path());
        package::check(emit, &self.contents(input, output), &mut paths)
    }

    pub fn write(&self, emit: Emit) -> Result<(), PackageError> {
        let temporaries = RefCell::new(Vec::new());
        let (input, output) = (self.root.path().join("originals"), self.output());
        let mut items = self.items.iter().cloned().map(Ok);
        let heard = |path: &Path| {
            assert!(path.exists(), "heard of too early");
            temporaries.borrow_mut().push(path.to_path_buf());
        };
        let result = package::write(emit, &self.contents(&input, &output), &mut items, &heard);
        for path in temporaries.into_inner() {
            assert!(!path.exists(), "{} was left", path.display());
        }
        result
    }

    /// Whether the package that is there was made of this dataset.
    pub fn is_as_written(&self, emit: Emit) -> bool {
        let before = listing(self.root.path());
        let answer = self.is_as_written_of(emit, &mut self.items.iter().cloned().map(Ok)).unwrap();
        assert_eq!(listing(self.root.path()), before, "looking changes nothing");
        answer
    }

    /// The same, of other outputs.
    pub fn is_as_written_of(
        &self,
        emit: Emit,
        items: &mut dyn Iterator<Item = io::Result<Item>>,
    ) -> Result<bool, PackageError> {
        let (input, output) = (self.root.path().join("originals"), self.output());
        package::is_as_written(emit, &self.contents(&input, &output), items)
    }

    pub fn take_back(&self, emit: Emit, is_as_written: bool) -> Result<(), PackageError> {
        package::take_back(emit, &self.contents(&self.root.path().join("originals"), &self.output()), is_as_written)
    }

    pub fn files(&self, emit: Emit) -> Vec<PathBuf> {
        package::files(emit, &self.contents(self.root.path(), &self.output()))
    }

    fn contents<'a>(&'a self, input: &'a Path, output: &'a Path) -> Contents<'a> {
        Contents {
            input,
            output,
            report: &self.report,
            table: self.table.as_deref(),
            title: self.title,
            started: self.started,
            replace: self.replace,
        }
    }
}

/// Every file and link below `folder`, relative to it and sorted.
pub fn listing(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    let mut open = vec![folder.to_path_buf()];
    while let Some(next) = open.pop() {
        for entry in fs::read_dir(&next).unwrap() {
            let entry = entry.unwrap();
            if entry.file_type().unwrap().is_dir() {
                open.push(entry.path());
            } else {
                found.push(entry.path().strip_prefix(folder).unwrap().to_path_buf());
            }
        }
    }
    found.sort();
    found
}

pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

fn try_put(place: &Path, content: &[u8]) -> bool {
    !place.exists() && fs::create_dir_all(place.parent().unwrap()).is_ok() && fs::write(place, content).is_ok()
}
