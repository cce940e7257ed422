//! An entry is on disk as soon as its recording is done.

use super::fixtures::NOTCH_SPEC;
use super::tiny_recordings;
use assert_cmd::cargo::CommandCargoExt;
use bandproof::report::{Recording, Status};
use std::collections::HashSet;
use std::fs;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::Duration;

/// Length of the whole lines of a journal: the last may still be being written.
fn whole(text: &[u8]) -> usize {
    text.iter().rposition(|&byte| byte == b'\n').map_or(0, |last| last + 1)
}

fn outputs(folder: &Path) -> Vec<String> {
    // What a run writes changes its name while this looks: entries that are gone are no matter.
    let files = walkdir::WalkDir::new(folder).into_iter().filter_map(Result::ok);
    let below = files.filter_map(|entry| Some(entry.path().strip_prefix(folder).ok()?.to_str()?.to_owned()));
    below.filter(|path| path.ends_with(".wav")).collect()
}

#[test]
fn the_journal_has_the_entry_of_every_output_and_only_grows() {
    let (bench, paths) = tiny_recordings(NOTCH_SPEC, 2000);
    let out = bench.path("out");
    let journal = out.join(".bandproof-journal");
    let mut child = Command::cargo_bin("bandproof")
        .unwrap()
        .args(["filter", "spec.toml", "in", "out", "--quiet", "--jobs", "2"])
        .current_dir(bench.path(""))
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    let (mut before, mut done, mut seen_half_way) = (Vec::new(), HashSet::new(), 0);
    while child.try_wait().unwrap().is_none() {
        std::thread::sleep(Duration::from_millis(5));
        // Outputs first: whatever has its name by then must have its entry.
        let named = if out.is_dir() { outputs(&out) } else { Vec::new() };
        let Ok(mut now) = fs::read(&journal) else { continue };
        now.truncate(whole(&now));
        assert!(now.starts_with(&before), "what was in the journal is gone from it");
        // The first line says whose it is.
        let fresh = now[before.len()..].split(|&byte| byte == b'\n').skip(usize::from(before.is_empty()));
        for line in fresh.filter(|line| !line.is_empty()) {
            let entry: Recording = serde_json::from_slice(line).unwrap();
            assert_eq!(entry.status, Status::Done);
            assert!(done.insert(entry.path.clone()), "{} twice", entry.path);
        }
        let missing = named.iter().find(|path| !done.contains(*path));
        assert_eq!(missing, None, "an output without an entry");
        seen_half_way += u32::from(!done.is_empty() && done.len() < paths.len());
        before = now;
    }
    assert_eq!(child.wait().unwrap().code(), Some(0));
    assert!(seen_half_way > 0, "the run was over before anyone looked");
    assert!(!journal.exists());
    assert_eq!(outputs(&out).len(), paths.len());
}
