//! Whole runs that are broken off around a package: at no time does a folder call itself a
//! bag that it is not, and the same command ends in one.

use super::bag_reader::faults;
use crate::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use bandproof::job::{self, FilterJob, Outcome, Progress};
use bandproof::package::Emit;
use std::fs;
use std::sync::atomic::{AtomicU64, Ordering};

/// Interrupted once so many recordings have ended.
struct After(AtomicU64);

impl Progress for After {
    fn planned(&self, _recordings: u64, _bytes: u64) {}

    fn advanced(&self, _bytes: u64) {}

    fn finished(&self, _path: &str, _failed: Option<&str>) {
        self.0.fetch_sub(1, Ordering::SeqCst);
    }

    fn interrupted(&self) -> bool {
        self.0.load(Ordering::SeqCst) == 0
    }
}

fn bench() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    for (seed, name) in ["a.wav", "b.wav", "far/c.wav"].into_iter().enumerate() {
        bench.input(name, &wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.3, seed as u64)));
    }
    bench
}

/// Runs until so many recordings have ended.
fn run(bench: &Bench, emit: Emit, replace: bool, recordings: u64) -> Outcome {
    let job = FilterJob {
        spec: bandproof::spec::load(&bench.path("spec.toml")).unwrap(),
        spec_path: None,
        input: bench.path("in"),
        output: bench.path("bag/data"),
        report: None,
        table: None,
        emit: Some(emit),
        replace,
        include: Vec::new(),
        exclude: Vec::new(),
        jobs: 1,
        dry_run: false,
        scan: false,
    };
    job::run(&job, &After(AtomicU64::new(recordings))).unwrap()
}

const TO_THE_END: u64 = u64::MAX;

/// The package's files that are there.
fn there(bench: &Bench) -> Vec<&'static str> {
    let names = ["bag-info.txt", "bagit.txt", "manifest-sha256.txt", "tagmanifest-sha256.txt", "data/datapackage.json"];
    names.into_iter().filter(|name| bench.path("bag").join(name).exists()).collect()
}

/// The spec is another now, so every output will be.
fn change_spec(bench: &Bench) {
    fs::write(bench.path("spec.toml"), NOTCH_SPEC.replace("width_hz = 8", "width_hz = 12")).unwrap();
}

#[test]
fn a_run_that_goes_on_and_is_broken_off_again_takes_its_package_back_first() {
    for emit in [Emit::Bagit, Emit::Datapackage] {
        let bench = bench();
        assert!(run(&bench, emit, false, TO_THE_END).complete);
        assert!(!there(&bench).is_empty());
        for name in ["d.wav", "e.wav"] {
            bench.input(name, &wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.2, 7)));
        }
        assert!(!run(&bench, emit, false, 1).complete);
        assert_eq!(there(&bench), [""; 0], "{emit:?}: the report is another by now");
        assert!(run(&bench, emit, false, TO_THE_END).complete, "without --replace");
        if emit == Emit::Bagit {
            assert_eq!(faults(&bench.path("bag")), [""; 0]);
        }
    }
}

#[test]
fn a_run_that_replaces_a_bag_and_is_broken_off_leaves_none() {
    let bench = bench();
    assert!(run(&bench, Emit::Bagit, false, TO_THE_END).complete);
    let info = fs::read(bench.path("bag/bag-info.txt")).unwrap();
    change_spec(&bench);
    assert!(!run(&bench, Emit::Bagit, true, 1).complete);
    // It is not this job's bag: what is in the other files stays until it is replaced.
    assert_eq!(there(&bench), ["bag-info.txt", "manifest-sha256.txt", "tagmanifest-sha256.txt"]);
    assert_eq!(fs::read(bench.path("bag/bag-info.txt")).unwrap(), info);
    assert!(run(&bench, Emit::Bagit, true, TO_THE_END).complete);
    assert_eq!(faults(&bench.path("bag")), [""; 0]);
}

/// A refusal is no reason to take anything away.
#[test]
fn a_run_that_is_refused_leaves_the_bag_as_it_was() {
    let bench = bench();
    assert!(run(&bench, Emit::Bagit, false, TO_THE_END).complete);
    change_spec(&bench);
    let before = bench.tree("bag");
    for more in ["", "--replace --exclude *", "--replace --report bag/data/a.wav"] {
        assert_eq!(bench.run(&format!("filter spec.toml in bag/data --emit bagit {more}")).status, 2, "{more}");
        assert_eq!(bench.tree("bag"), before, "{more}");
    }
    let dry = bench.run("filter spec.toml in bag/data --emit bagit --replace --dry-run");
    assert_eq!((dry.status, bench.tree("bag") == before), (0, true), "{}", dry.stderr);
}

/// Killed at any moment between the first name and the last: every set of files that a
/// rename order can leave.
#[test]
fn a_run_that_was_killed_while_it_packed_goes_on_without_replace() {
    let bench = bench();
    assert!(run(&bench, Emit::Bagit, false, TO_THE_END).complete);
    let whole = bench.tree("bag");
    let order: [&str; 4] = ["manifest-sha256.txt", "bag-info.txt", "tagmanifest-sha256.txt", "bagit.txt"];
    for reached in 0..4 {
        for name in &order[reached..] {
            fs::remove_file(bench.path("bag").join(name)).unwrap();
        }
        fs::write(bench.path("bag/.bandproof-Ab12Cd.part"), "half a manifest").unwrap();
        assert!(run(&bench, Emit::Bagit, false, TO_THE_END).complete, "{reached}");
        assert_eq!(faults(&bench.path("bag")), [""; 0], "{reached}");
        let names = |tree: &[(String, Vec<u8>)]| tree.iter().map(|(name, _)| name.clone()).collect::<Vec<_>>();
        assert_eq!(names(&bench.tree("bag")), names(&whole), "{reached}: nothing is left");
    }
}
