//! Files that change, vanish, or become something else while a run goes on.

use super::fixtures::{Bench, NOTCH_SPEC, entry, hum_and_noise, wav16};
use bandproof::job::{self, FilterJob, JobError, Outcome, Progress};
use std::fs::{self, File};
use std::path::Path;
use std::process::Command;
use std::sync::atomic::{AtomicBool, Ordering};

/// When something happens to the files of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum When {
    /// Headers have been read and everything is decided.
    Planned,
    /// The first block of the first recording has gone through.
    InWork,
    /// The first recording has its name.
    OneDone,
}

/// Lets it happen once.
struct Happens<'a> {
    when: When,
    what: &'a (dyn Fn() + Sync),
    done: AtomicBool,
}

impl<'a> Happens<'a> {
    fn new(when: When, what: &'a (dyn Fn() + Sync)) -> Self {
        Happens { when, what, done: AtomicBool::new(false) }
    }

    fn now(&self, when: When) {
        if self.when == when && !self.done.swap(true, Ordering::SeqCst) {
            (self.what)();
        }
    }
}

impl Progress for Happens<'_> {
    fn planned(&self, _recordings: u64, _bytes: u64) {
        self.now(When::Planned);
    }

    fn advanced(&self, _bytes: u64) {
        self.now(When::InWork);
    }

    fn finished(&self, _path: &str, _failed: Option<&str>) {
        self.now(When::OneDone);
    }
}

/// `a/victim.wav` is the longest and so the first in work; two others are well.
fn bench() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    for (seed, (name, seconds)) in [("a/victim.wav", 60.0), ("b/good.wav", 6.0), ("good.wav", 5.0)].iter().enumerate() {
        bench.input(name, &wav16(8000, 1, &hum_and_noise(8000, *seconds, 0.3, seed as u64)));
    }
    bench
}

fn run(bench: &Bench, replace: bool, progress: &dyn Progress) -> Result<Outcome, JobError> {
    let job = FilterJob {
        spec: bandproof::spec::load(&bench.path("spec.toml")).unwrap(),
        spec_path: None,
        input: bench.path("in"),
        output: bench.path("out"),
        report: None,
        table: None,
        emit: None,
        replace,
        include: Vec::new(),
        exclude: Vec::new(),
        jobs: 1,
        dry_run: false,
        scan: false,
    };
    job::run(&job, progress)
}

fn pipe(path: &Path) {
    assert!(Command::new("mkfifo").arg(path).status().unwrap().success());
}

#[test]
fn a_recording_that_changes_under_a_run_fails_alone() {
    type Change = fn(&Path);
    let gone: Change = |path| fs::remove_file(path).unwrap();
    let is_pipe: Change = |path| {
        fs::remove_file(path).unwrap();
        pipe(path);
    };
    let is_folder: Change = |path| {
        fs::remove_file(path).unwrap();
        fs::create_dir(path).unwrap();
    };
    let is_device: Change = |path| {
        fs::remove_file(path).unwrap();
        std::os::unix::fs::symlink("/dev/zero", path).unwrap();
    };
    let is_loop: Change = |path| {
        fs::remove_file(path).unwrap();
        std::os::unix::fs::symlink("victim.wav", path).unwrap();
    };
    let is_other: Change = |path| fs::write(path, wav16(16_000, 1, &[0.1; 4000])).unwrap();
    let is_text: Change = |path| fs::write(path, b"a text, not a recording").unwrap();
    let is_empty: Change = |path| fs::write(path, b"").unwrap();
    let shrinks: Change = |path| File::options().write(true).open(path).unwrap().set_len(400_000).unwrap();
    let grows: Change = |path| File::options().write(true).open(path).unwrap().set_len(2_000_000).unwrap();
    let folder_gone: Change = |path| fs::remove_dir_all(path.parent().unwrap()).unwrap();
    let table: [(&str, When, Change, &str); 14] = [
        ("is removed", When::Planned, gone, "can't be opened: No such file"),
        ("becomes a pipe", When::Planned, is_pipe, "it is a pipe, expected a regular file"),
        ("becomes a folder", When::Planned, is_folder, "it is a folder, expected a regular file"),
        ("becomes a device", When::Planned, is_device, "it is a device, expected a regular file"),
        ("becomes a link to itself", When::Planned, is_loop, "can't be opened: Too many levels of symbolic links"),
        ("becomes another recording", When::Planned, is_other, "it changed while this run was going on"),
        ("becomes a text", When::Planned, is_text, "expected `RIFF`"),
        ("becomes empty", When::Planned, is_empty, "empty: the file has 0 bytes"),
        ("shrinks", When::Planned, shrinks, "it changed while this run was going on"),
        ("is gone with its folder", When::Planned, folder_gone, "can't be opened: No such file"),
        ("shrinks in work", When::InWork, shrinks, "expected 960044 bytes in all, found 400000"),
        ("is emptied in work", When::InWork, is_empty, "expected 960044 bytes in all, found 0"),
        ("grows in work", When::InWork, grows, "expected 960044 bytes in all, found 2000000"),
        ("becomes a text in work", When::InWork, is_text, "expected 960044 bytes in all, found 23"),
    ];
    for (what, when, change, words) in table {
        let bench = bench();
        let victim = bench.path("in/a/victim.wav");
        let good = bench.tree("in/b");
        let outcome = run(&bench, false, &Happens::new(when, &|| change(&victim))).unwrap();
        assert_eq!((outcome.summary.done, outcome.summary.failed, outcome.complete), (2, 1, true), "{what}");
        let report = bench.report();
        let error = entry(&report, "a/victim.wav")["error"].as_str().unwrap().to_owned();
        assert!(error.contains(words), "{what}: {error}");
        assert!(!error.contains("defect"), "{what}: {error}");
        let names: Vec<String> = bench.tree("out").into_iter().map(|(name, _)| name).collect();
        assert_eq!(names, ["b/good.wav", "bandproof-report.json", "good.wav"], "{what}");
        assert!(bench.tree("in/b") == good, "{what}: another input was touched");
    }
}

/// The system keeps an open file until it is closed, whatever becomes of its name.
#[test]
fn a_recording_removed_in_work_is_done_all_the_same() {
    let whole = bench();
    run(&whole, false, &Happens::new(When::Planned, &|| ())).unwrap();
    let bench = bench();
    let victim = bench.path("in/a/victim.wav");
    let outcome = run(&bench, false, &Happens::new(When::InWork, &|| fs::remove_file(&victim).unwrap())).unwrap();
    assert_eq!((outcome.summary.done, outcome.summary.failed), (3, 0));
    assert!(bench.tree("out/a") == whole.tree("out/a"));
}

#[test]
fn an_output_folder_that_vanishes_is_said_and_costs_no_input() {
    for when in [When::Planned, When::InWork, When::OneDone] {
        let bench = bench();
        let before = bench.tree("in");
        let out = bench.path("out");
        fs::create_dir(&out).unwrap();
        let result = run(&bench, false, &Happens::new(when, &|| _ = fs::remove_dir_all(&out)));
        assert!(bench.tree("in") == before, "{when:?}");
        if when == When::Planned {
            // Nothing had been begun: as good as a folder that was not there.
            assert!(result.is_ok_and(|outcome| outcome.summary.done == 3) || !bench.path("out").exists());
            continue;
        }
        let error = result.unwrap_err();
        assert!(!error.is_refusal(), "{when:?}: {error}");
        assert!(error.to_string().contains("out/bandproof-report.json could not be written"), "{when:?}: {error}");
        // What was done after that is there whole, or not there.
        let left = bench.tree("out");
        assert!(left.iter().all(|(name, _)| name.ends_with(".wav")), "{when:?}: {:?}", left.len());
    }
}

#[test]
fn what_comes_between_a_plan_and_its_output_is_not_overwritten() {
    let bench = bench();
    let target = bench.path("out/a/victim.wav");
    let come = || {
        fs::create_dir_all(target.parent().unwrap()).unwrap();
        fs::write(&target, b"somebody else's").unwrap();
    };
    let outcome = run(&bench, false, &Happens::new(When::InWork, &come)).unwrap();
    assert_eq!((outcome.summary.done, outcome.summary.failed), (2, 1));
    assert_eq!(fs::read(&target).unwrap(), b"somebody else's");
    let report = bench.report();
    let error = entry(&report, "a/victim.wav")["error"].as_str().unwrap();
    assert!(error.contains("can't be written") && error.contains("File exists"), "{error}");
    assert_eq!(entry(&report, "a/victim.wav")["output"], serde_json::Value::Null);
}

/// What the plan can't know is seen when an output gets its name: even `--replace` keeps
/// the earlier of two outputs.
#[test]
fn a_link_that_makes_two_outputs_one_while_a_run_goes_on_costs_the_second() {
    let bench = bench();
    bench.input("b/victim.wav", &wav16(8000, 1, &hum_and_noise(8000, 10.0, 0.3, 9)));
    let link = || {
        // `a/victim.wav` has its name, `b/victim.wav` comes next.
        std::os::unix::fs::symlink("a", bench.path("out/b")).unwrap();
    };
    let whole = run(&bench, true, &Happens::new(When::OneDone, &link)).unwrap();
    assert_eq!((whole.summary.done, whole.summary.failed), (3, 1));
    let report = bench.report();
    let error = entry(&report, "b/victim.wav")["error"].as_str().unwrap();
    assert!(error.contains("another output of this run"), "{error}");
    let first = &entry(&report, "a/victim.wav")["output"];
    assert_eq!(first["bytes"], fs::read(bench.path("out/a/victim.wav")).unwrap().len());
}

/// `--scan` reads under the same conditions.
#[test]
fn a_pipe_under_a_recordings_name_is_no_recording_and_holds_nothing() {
    let bench = bench();
    pipe(&bench.path("in/pipe.wav"));
    for more in ["--dry-run --scan", ""] {
        let ran = bench.filter(more);
        assert_eq!(ran.status, 0, "{more}: {}", ran.stderr);
    }
    assert_eq!(bench.report()["summary"]["skipped"]["other_files"], 1);
    // As the whole input.
    let ran = bench.run("filter spec.toml in/pipe.wav other");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(ran.stderr.contains("no recordings"), "{}", ran.stderr);
}
