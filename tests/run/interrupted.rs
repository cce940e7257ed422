//! Runs that are interrupted, or meddled with while they go on, and what the next one makes of it.

use super::fixtures::{Bench, entry, hum_and_noise, wav16};
use super::resume::{NAMES, bench, journal, lasting};
use bandproof::job::{self, FilterJob, JobError, Progress};
use std::fs;
use std::path::Path;
use std::sync::atomic::{AtomicU64, Ordering};
use std::time::SystemTime;

/// Interrupted once so many bytes went through.
struct After {
    limit: u64,
    bytes: AtomicU64,
}

impl Progress for After {
    fn planned(&self, _recordings: u64, _bytes: u64) {}

    fn advanced(&self, bytes: u64) {
        self.bytes.fetch_add(bytes, Ordering::SeqCst);
    }

    fn finished(&self, _path: &str, _failed: Option<&str>) {}

    fn interrupted(&self) -> bool {
        self.bytes.load(Ordering::SeqCst) >= self.limit
    }
}

fn library_job(bench: &Bench) -> FilterJob {
    FilterJob {
        spec: bandproof::spec::load(Path::new(&bench.path("spec.toml"))).unwrap(),
        spec_path: None,
        input: bench.path("in"),
        output: bench.path("out"),
        report: None,
        table: None,
        emit: None,
        replace: false,
        include: Vec::new(),
        exclude: Vec::new(),
        jobs: 1,
        dry_run: false,
        scan: false,
    }
}

#[test]
fn an_open_recording_is_dropped_and_the_next_run_does_it() {
    let bench = bench();
    bench.filter("");
    let (report, tree) = (lasting(&bench), bench.tree("in"));
    fs::remove_dir_all(bench.path("out")).unwrap();
    // Largest first: d, c, b, a, of 96 000 to 48 000 bytes; each is a block or two long.
    for (limit, done) in [(1, 0), (96_001, 1), (176_001, 2), (240_001, 3)] {
        let after = After { limit, bytes: AtomicU64::new(0) };
        let outcome = job::run(&library_job(&bench), &after).unwrap();
        assert_eq!((outcome.complete, outcome.summary.done + outcome.summary.failed), (false, done), "{limit}");
        assert_eq!(outcome.not_done, 5 - done, "{limit}");
        let left = bench.report();
        assert_eq!(left["complete"], false, "{limit}");
        let listed = left["recordings"].as_array().unwrap().iter().map(|one| one["path"].as_str().unwrap());
        let outputs: Vec<String> = bench.tree("out").into_iter().map(|(name, _)| name).collect();
        let expected: Vec<&str> = listed.chain(["bandproof-report.json"]).collect();
        let mut sorted = expected.clone();
        sorted.sort_unstable();
        assert_eq!(outputs, sorted, "{limit}: nothing half-written, no journal");
        let rest = bench.filter("");
        assert_eq!(rest.status, 3, "{}", rest.stderr);
        assert_eq!(lasting(&bench), report, "{limit}");
        fs::remove_dir_all(bench.path("out")).unwrap();
    }
    assert_eq!(bench.tree("in"), tree);
}

/// Does something when the first bytes went through.
struct Meddler<'a>(&'a (dyn Fn() + Sync), std::sync::Once);

impl Progress for Meddler<'_> {
    fn planned(&self, _recordings: u64, _bytes: u64) {
        self.1.call_once(self.0);
    }

    fn advanced(&self, _bytes: u64) {}

    fn finished(&self, _path: &str, _failed: Option<&str>) {}
}

#[test]
fn an_output_that_somebody_wrote_while_a_run_goes_on_is_not_written_over() {
    let bench = bench();
    bench.filter("");
    bench.input("b.wav", &wav16(8000, 1, &hum_and_noise(8000, 4.0, 0.1, 9)));
    let write = || drop(bench.write("out/b.wav", b"mine"));
    let outcome = job::run(&library_job(&bench), &Meddler(&write, std::sync::Once::new())).unwrap();
    assert_eq!((outcome.summary.done, outcome.summary.failed), (3, 2));
    assert_eq!(fs::read(bench.path("out/b.wav")).unwrap(), b"mine");
    let report = bench.report();
    let error = entry(&report, "b.wav")["error"].to_string();
    assert!(error.contains("has come about while this run went on"), "{error}");
}

#[test]
fn a_recording_that_was_written_to_while_it_was_read_is_not_done() {
    let bench = bench();
    let touch = || {
        let then = SystemTime::now() + std::time::Duration::from_secs(7);
        fs::File::options().write(true).open(bench.path("in/b.wav")).unwrap().set_modified(then).unwrap();
    };
    // Between its opening and its end: with one thread the largest come first.
    struct Late<'a>(&'a (dyn Fn() + Sync), AtomicU64);
    impl Progress for Late<'_> {
        fn planned(&self, _recordings: u64, _bytes: u64) {}
        fn advanced(&self, bytes: u64) {
            // `far/d.wav` and `far/c.wav` have 96 000 and 80 000 bytes of samples.
            let before = self.1.fetch_add(bytes, Ordering::SeqCst);
            if before <= 176_000 && before + bytes > 176_000 {
                (self.0)();
            }
        }
        fn finished(&self, _path: &str, _failed: Option<&str>) {}
    }
    job::run(&library_job(&bench), &Late(&touch, AtomicU64::new(0))).unwrap();
    let report = bench.report();
    assert!(entry(&report, "b.wav")["error"].to_string().contains("changed"), "{}", entry(&report, "b.wav")["error"]);
    assert!(!bench.path("out/b.wav").exists());
    assert_eq!(report["summary"]["done"], 3);
}

#[test]
fn another_dataset_with_the_same_names_is_not_written_over() {
    let bench = bench();
    bench.filter("");
    let tree = bench.tree("out");
    for (seed, name) in NAMES.iter().enumerate() {
        bench.input(name, &wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.1, 50 + seed as u64)));
    }
    let refused = bench.filter("");
    assert_eq!(refused.status, 2, "{}", refused.stdout);
    assert!(refused.stderr.contains("made from other recordings of the same names"), "{}", refused.stderr);
    assert_eq!(bench.tree("out"), tree);
    assert_eq!(bench.filter("--replace").status, 3);
}

#[test]
fn a_journal_over_more_recordings_is_not_thrown_away() {
    let bench = bench();
    bench.filter("");
    let sha256 = bench.report()["spec"]["file_sha256"].as_str().unwrap().to_owned();
    let text = journal(&bench, &sha256);
    fs::remove_file(bench.path("out/bandproof-report.json")).unwrap();
    bench.write("out/.bandproof-journal", text.as_bytes());
    let tree = bench.tree("out");
    let refused = bench.filter("--include far/*");
    assert_eq!(refused.status, 2);
    assert!(refused.stderr.contains("broken off and did also a.wav"), "{}", refused.stderr);
    assert_eq!(bench.tree("out"), tree);
    assert!(bench.filter("").stdout.contains("4 by an earlier run"));
}

#[test]
fn an_interrupt_before_the_first_recording_leaves_nothing() {
    let bench = bench();
    let asked = After { limit: 0, bytes: AtomicU64::new(0) };
    assert!(matches!(job::run(&library_job(&bench), &asked), Err(JobError::Interrupted(_))));
    assert!(!bench.path("out").exists());
}

#[test]
fn looking_at_what_was_done_can_be_interrupted() {
    let bench = bench();
    bench.filter("");
    let tree = bench.tree("out");
    let after = After { limit: 1, bytes: AtomicU64::new(0) };
    assert!(matches!(job::run(&library_job(&bench), &after), Err(JobError::Interrupted(_))));
    assert_eq!(bench.tree("out"), tree);
}
