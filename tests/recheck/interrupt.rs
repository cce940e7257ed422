//! What an interruption leaves.

use crate::dataset::{Dataset, REPORT, told};
use crate::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use bandproof::job::Progress;
use bandproof::recheck::{self, RecheckJob};
use std::sync::atomic::{AtomicU64, Ordering};

/// Interrupted once so many files have been looked at.
struct After {
    limit: u64,
    ended: AtomicU64,
}

impl Progress for After {
    fn planned(&self, _recordings: u64, _bytes: u64) {}

    fn advanced(&self, _bytes: u64) {}

    fn finished(&self, _path: &str, _failed: Option<&str>) {
        self.ended.fetch_add(1, Ordering::SeqCst);
    }

    fn interrupted(&self) -> bool {
        self.ended.load(Ordering::SeqCst) >= self.limit
    }
}

#[test]
fn an_interrupted_recheck_does_not_say_that_all_agrees() {
    let dataset = Dataset::new();
    let table = dataset.path("figures.csv");
    for (limit, remeasure, finished) in [(0, false, false), (1, false, false), (9, false, true), (3, true, false)] {
        let job = RecheckJob {
            report: dataset.path(REPORT),
            input: Some(dataset.path("in")).filter(|_| remeasure),
            output: None,
            replay: false,
            remeasure,
            noise: None,
            csv: Some(table.clone()).filter(|_| remeasure),
            replace: false,
            jobs: 1,
        };
        let findings = recheck::run(&job, &After { limit, ended: AtomicU64::new(0) }).unwrap();
        assert_eq!((findings.finished, findings.agrees), (finished, finished), "after {limit}");
        assert_eq!(findings.disagreements, [], "what was not looked at is not missing");
        if !remeasure {
            assert_eq!(findings.outputs.unchanged, limit.min(3), "after {limit}");
        }
        assert!(!table.exists(), "a table of a part would pass for the whole");
    }
    let left: Vec<_> = dataset.bench.tree(".").into_iter().filter(|(name, _)| name.ends_with(".part")).collect();
    assert_eq!(left, []);
}

/// Only its hash tells whether a recording that no entry lists is that of the idle device.
#[test]
fn an_interruption_is_heard_while_unlisted_recordings_are_read() {
    let bench = Bench::new(NOTCH_SPEC);
    let sound = wav16(8000, 1, &hum_and_noise(8000, 6.0, 0.3, 1));
    bench.write("set/played.wav", &sound);
    bench.write("set/heard.wav", &sound);
    bench.write("set/idle.wav", &wav16(8000, 1, &hum_and_noise(8000, 10.0, 0.0, 2)));
    let ran = bench
        .run("measure spec.toml set/played.wav set/heard.wav --noise set/idle.wav --report set/report.json --quiet");
    assert!(ran.status <= 1, "{}", ran.stderr);
    for (limit, finished) in [(1, false), (9, true)] {
        let job = RecheckJob {
            report: bench.path("set/report.json"),
            input: None,
            output: None,
            replay: false,
            remeasure: false,
            noise: None,
            csv: None,
            replace: false,
            jobs: 1,
        };
        let findings = recheck::run(&job, &After { limit, ended: AtomicU64::new(0) }).unwrap();
        assert_eq!((findings.finished, findings.outputs.unchanged), (finished, 1), "after {limit}");
        assert_eq!(findings.disagreements, [], "what was not looked at is not new");
    }
}

/// The dataset as a run leaves it that was interrupted before it came to these recordings.
fn interrupted_before(paths: &[&str]) -> Dataset {
    let dataset = Dataset::unfiltered();
    let left: Vec<String> = paths.iter().map(|path| format!(" --exclude {path}")).collect();
    dataset.bench.filter(&format!("--quiet{}", left.concat()));
    dataset.edit(|report| report["complete"] = false.into());
    dataset
}

#[test]
fn what_an_interrupted_run_had_not_begun_is_counted_and_not_called_new() {
    let dataset = interrupted_before(&["a.wav", "broken.wav"]);
    let (status, document) = dataset.json("--input in --replay");
    assert_eq!((status, told(&document)), (1, vec!["incomplete - -".to_owned()]), "{document}");
    let one = &document["disagreements"][0];
    assert_eq!((&one["inputs_not_listed"], &one["outputs_not_listed"]), (&2.into(), &0.into()));
    assert_eq!((&document["report_complete"], &document["agrees"]), (&false.into(), &false.into()));
    let ran = dataset.recheck("--input in");
    let line = "  it is of an interrupted run, and 2 inputs and 0 outputs are not in it yet: run the same";
    assert!(ran.status == 1 && ran.stdout.contains(line), "{}", ran.stdout);
    assert!(!ran.stdout.contains("a.wav"), "{}", ran.stdout);
    // Nobody looked at the inputs.
    let (status, document) = dataset.json("");
    assert_eq!((status, &document["disagreements"][0]["inputs_not_listed"]), (1, &serde_json::Value::Null));
}

#[test]
fn what_an_interrupted_run_had_done_is_checked_all_the_same() {
    let dataset = interrupted_before(&["a.wav"]);
    // An output of a later run that was killed.
    dataset.bench.write("out/a.wav", b"");
    dataset.harm("out/station/b.wav", |bytes| bytes[100] ^= 1);
    std::fs::remove_file(dataset.path("in/station/two.WAV")).unwrap();
    let found = dataset.found("--input in");
    assert_eq!(found, ["incomplete - -", "changed output station/b.wav", "missing input station/two.WAV"]);
    let (_, document) = dataset.json("--input in");
    let one = &document["disagreements"][0];
    assert_eq!((&one["inputs_not_listed"], &one["outputs_not_listed"]), (&1.into(), &1.into()));
}

#[test]
fn running_the_same_command_again_repairs_it() {
    let dataset = interrupted_before(&["a.wav", "station/two.WAV"]);
    assert_eq!(dataset.found("--input in"), ["incomplete - -"]);
    let ran = dataset.bench.filter("--quiet");
    assert_eq!(ran.status, 3, "broken.wav is still broken: {}", ran.stderr);
    assert_eq!(dataset.found("--input in --replay"), [""; 0]);
}
