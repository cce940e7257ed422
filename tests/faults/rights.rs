//! Files and folders that may not be read or written.
//!
//! Rights bind no superuser: where tests run as one, the binary runs as another user.

use super::fixtures::{Bench, NOTCH_SPEC, Ran, entry, hum_and_noise, wav16};
use std::fs;
use std::os::unix::fs::PermissionsExt;
use std::os::unix::process::CommandExt;
use std::path::{Path, PathBuf};
use std::process::Command;

/// A user of no rights, by custom.
const NOBODY: u32 = 65_534;

struct Bound {
    bench: Bench,
    program: PathBuf,
    /// Whether another user has to stand in.
    superuser: bool,
}

impl Bound {
    fn new() -> Self {
        let bench = Bench::new(NOTCH_SPEC);
        for (seed, name) in ["a/one.wav", "b/two.wav", "three.wav"].into_iter().enumerate() {
            bench.input(name, &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, seed as u64)));
        }
        let superuser = fs::metadata("/proc/self").map_or(0, |own| std::os::unix::fs::MetadataExt::uid(&own)) == 0;
        // Where the program was built another user may not look.
        let program = bench.path("program");
        fs::copy(assert_cmd::cargo::cargo_bin!("bandproof"), &program).unwrap();
        fs::create_dir(bench.path("out")).unwrap();
        let bound = Bound { bench, program, superuser };
        bound.allow("", 0o755);
        bound.allow("out", 0o777);
        bound
    }

    fn allow(&self, relative: &str, mode: u32) {
        fs::set_permissions(self.bench.path(relative), fs::Permissions::from_mode(mode)).unwrap();
    }

    fn run(&self, arguments: &str) -> Ran {
        let mut command = Command::new(&self.program);
        command.args(arguments.split_whitespace()).current_dir(self.bench.path(""));
        if self.superuser {
            command.uid(NOBODY).gid(NOBODY);
        }
        let output = command.output().unwrap();
        Ran {
            status: output.status.code().unwrap_or(-1),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }
}

impl Drop for Bound {
    /// Else the folder could not be removed by a user with no more rights than these.
    fn drop(&mut self) {
        for entry in ["in", "in/a", "in/b", "in/a/one.wav", "out", "out/a"] {
            _ = fs::set_permissions(self.bench.path(entry), fs::Permissions::from_mode(0o755));
        }
    }
}

fn names(root: &Path) -> Vec<String> {
    let files = walkdir::WalkDir::new(root).sort_by_file_name().into_iter().map(Result::unwrap);
    let files = files.filter(|entry| entry.file_type().is_file());
    files.map(|entry| entry.path().strip_prefix(root).unwrap().display().to_string()).collect()
}

#[test]
fn a_recording_that_may_not_be_read_fails_alone() {
    let bound = Bound::new();
    bound.allow("in/a/one.wav", 0o000);
    let ran = bound.run("filter spec.toml in out");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    assert!(ran.stderr.contains("a/one.wav: can't be opened: Permission denied"), "{}", ran.stderr);
    assert_eq!(names(&bound.bench.path("out")), ["b/two.wav", "bandproof-report.json", "three.wav"]);
    // Once it may be read, the same command does it.
    bound.allow("in/a/one.wav", 0o644);
    let ran = bound.run("filter spec.toml in out");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    assert_eq!(bound.bench.report()["summary"]["done"], 3);
}

#[test]
fn a_folder_that_may_not_be_looked_into_is_an_entry_of_the_report() {
    let bound = Bound::new();
    bound.allow("in/a", 0o000);
    let ran = bound.run("filter spec.toml in out");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    let report = bound.bench.report();
    let error = entry(&report, "a")["error"].as_str().unwrap();
    let words = ["can't be looked into", "Permission denied", "nothing below it was done"];
    words.iter().for_each(|word| assert!(error.contains(word), "{word}: {error}"));
    assert_eq!((&report["summary"]["done"], &report["summary"]["failed"]), (&2.into(), &1.into()));
}

#[test]
fn an_input_that_may_not_be_looked_into_is_refused() {
    let bound = Bound::new();
    bound.allow("in", 0o000);
    let ran = bound.run("filter spec.toml in out");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(
        ran.stderr.contains("the input in can't be read: ") && ran.stderr.contains("Permission denied"),
        "{}",
        ran.stderr
    );
    assert!(names(&bound.bench.path("out")).is_empty());
}

#[test]
fn an_output_folder_that_may_not_be_written_is_refused_before_any_work() {
    let bound = Bound::new();
    bound.allow("out", 0o555);
    // The folder itself, and one that would have to be made in it.
    for (out, what) in [("out", "the report out/"), ("out/deeper/out", "the output folder out/deeper/out")] {
        let ran = bound.run(&format!("filter spec.toml in {out}"));
        assert_eq!(ran.status, 2, "{}", ran.stderr);
        assert!(ran.stderr.contains(what) && ran.stderr.to_lowercase().contains("permission denied"), "{}", ran.stderr);
        assert_eq!(ran.stderr.lines().count(), 1, "{}", ran.stderr);
        assert!(fs::read_dir(bound.bench.path("out")).unwrap().next().is_none());
    }
}

#[test]
fn a_folder_inside_the_output_that_may_not_be_written_costs_its_recordings_alone() {
    let bound = Bound::new();
    fs::create_dir(bound.bench.path("out/a")).unwrap();
    bound.allow("out/a", 0o555);
    let ran = bound.run("filter spec.toml in out");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    assert!(ran.stderr.contains("a/one.wav: its output can't be written: permission denied"), "{}", ran.stderr);
    assert_eq!(names(&bound.bench.path("out")), ["b/two.wav", "bandproof-report.json", "three.wav"]);
}
