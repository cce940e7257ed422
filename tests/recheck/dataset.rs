//! A dataset of a report, and what is asked of it.

use crate::fixtures::{Bench, NOTCH_SPEC, Ran, hum_and_noise, wav, wav16};
use serde_json::Value;
use std::fs;
use std::path::PathBuf;

/// A folder in which `in/` was filtered into `out/`.
pub struct Dataset {
    pub bench: Bench,
}

/// Where the report stands.
pub const REPORT: &str = "out/bandproof-report.json";

/// The recordings of [`Dataset::new`] that are done.
pub const DONE: [&str; 3] = ["a.wav", "station/b.wav", "station/two.WAV"];

impl Dataset {
    /// Three recordings that are done and one that failed.
    pub fn new() -> Self {
        Dataset::filtered(Dataset::unfiltered().bench)
    }

    /// The same recordings before anything is done with them.
    pub fn unfiltered() -> Self {
        let bench = Bench::new(NOTCH_SPEC);
        bench.input("a.wav", &wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.3, 1)));
        bench.input("station/b.wav", &wav16(8000, 1, &hum_and_noise(8000, 2.0, 0.0, 2)));
        bench.input("station/two.WAV", &wav(12_000, 2, 24, &hum_and_noise(12_000, 4.0, 0.2, 3)));
        bench.input("broken.wav", b"RIFF, and then nothing");
        Dataset { bench }
    }

    /// Filters what is in `in/`.
    pub fn filtered(bench: Bench) -> Self {
        let ran = bench.filter("--quiet");
        assert!(bench.path(REPORT).exists(), "{}", ran.stderr);
        Dataset { bench }
    }

    /// `recheck` of the report with more arguments.
    pub fn recheck(&self, more: &str) -> Ran {
        self.bench.run(&format!("recheck {REPORT} {more}"))
    }

    /// Status and document of `recheck --json`.
    pub fn json(&self, more: &str) -> (i32, Value) {
        let ran = self.recheck(&format!("--json {more}"));
        let document = serde_json::from_str(&ran.stdout).unwrap_or_else(|_| panic!("{}{}", ran.stdout, ran.stderr));
        (ran.status, document)
    }

    /// What `recheck` finds: `changed output a.wav`, one a disagreement.
    pub fn found(&self, more: &str) -> Vec<String> {
        let (status, document) = self.json(more);
        let found = told(&document);
        assert_eq!(status, i32::from(!found.is_empty()), "{document}");
        assert_eq!(document["agrees"], found.is_empty());
        found
    }

    /// Changes a file's bytes.
    pub fn harm(&self, relative: &str, change: impl FnOnce(&mut Vec<u8>)) {
        let mut bytes = fs::read(self.bench.path(relative)).unwrap();
        change(&mut bytes);
        fs::write(self.bench.path(relative), bytes).unwrap();
    }

    /// Changes the report as JSON.
    pub fn edit(&self, change: impl FnOnce(&mut Value)) {
        let mut report = self.bench.report();
        change(&mut report);
        fs::write(self.bench.path(REPORT), serde_json::to_vec_pretty(&report).unwrap()).unwrap();
    }

    /// Path of a file of the folder.
    pub fn path(&self, relative: &str) -> PathBuf {
        self.bench.path(relative)
    }
}

/// One line a disagreement: kind, side, path.
pub fn told(document: &Value) -> Vec<String> {
    let word = |value: &Value| value.as_str().unwrap_or("-").to_owned();
    let line = |one: &Value| format!("{} {} {}", word(&one["kind"]), word(&one["side"]), word(&one["path"]));
    document["disagreements"].as_array().unwrap().iter().map(line).collect()
}

/// The entry of a report for a path, to be changed.
pub fn entry_mut<'a>(report: &'a mut Value, path: &str) -> &'a mut Value {
    let entries = report["recordings"].as_array_mut().unwrap();
    entries.iter_mut().find(|entry| entry["path"] == path).unwrap()
}
