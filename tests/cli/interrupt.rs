//! What an interruption leaves.

use crate::spec;
use bandproof::job::{self, FilterJob, Progress};
use serde_json::Value;
use std::fs;
use std::path::Path;
use std::sync::atomic::{AtomicU64, Ordering};

/// Interrupted once so many recordings have ended.
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

/// Half a second of silence at 48 kHz.
fn silence(path: &Path) {
    let format = hound::WavSpec {
        channels: 1,
        sample_rate: 48_000,
        bits_per_sample: 16,
        sample_format: hound::SampleFormat::Int,
    };
    let mut writer = hound::WavWriter::create(path, format).unwrap();
    (0..24_000).for_each(|_| writer.write_sample(0_i16).unwrap());
    writer.finalize().unwrap();
}

#[test]
fn an_interrupted_run_reports_what_it_did_and_that_it_is_not_all() {
    for (limit, done, complete) in [(0, 0, false), (1, 1, false), (3, 3, true), (9, 3, true)] {
        let folder = tempfile::tempdir().unwrap();
        let (input, output) = (folder.path().join("in"), folder.path().join("out"));
        fs::create_dir(&input).unwrap();
        ["a.wav", "b.wav", "c.wav"].iter().for_each(|name| silence(&input.join(name)));
        let job = FilterJob {
            spec: bandproof::spec::load(Path::new(&spec("fixed-rate.toml"))).unwrap(),
            spec_path: None,
            input,
            output: output.clone(),
            report: None,
            table: None,
            emit: None,
            replace: false,
            include: Vec::new(),
            exclude: Vec::new(),
            jobs: 1,
            dry_run: false,
            scan: false,
        };
        let outcome = job::run(&job, &After { limit, ended: AtomicU64::new(0) }).unwrap();
        assert_eq!((outcome.complete, outcome.summary.done), (complete, done), "after {limit}");
        // Half a second of 16 bits each, and nothing of those that were not begun.
        assert_eq!((outcome.not_begun, outcome.bytes_read), (3 - done, done * 48_000), "after {limit}");
        let report: Value = serde_json::from_slice(&fs::read(outcome.report_path.unwrap()).unwrap()).unwrap();
        assert_eq!(report["complete"], complete, "after {limit}");
        assert_eq!(report["recordings"].as_array().unwrap().len() as u64, done, "after {limit}");
        // The recordings done and the report, and nothing half-written.
        assert_eq!(fs::read_dir(output).unwrap().count() as u64, done + 1, "after {limit}");
    }
}

/// A recording that takes far longer than this test: 2 GB of silence in a file with a
/// hole.
#[cfg(unix)]
fn endless(path: &Path) {
    use std::io::{Seek, SeekFrom, Write};
    const DATA_BYTES: u32 = 2_000_000_000;
    silence(path);
    let mut file = fs::OpenOptions::new().write(true).open(path).unwrap();
    file.seek(SeekFrom::Start(4)).unwrap();
    file.write_all(&(DATA_BYTES + 36).to_le_bytes()).unwrap();
    file.seek(SeekFrom::Start(40)).unwrap();
    file.write_all(&DATA_BYTES.to_le_bytes()).unwrap();
    file.set_len(u64::from(DATA_BYTES) + 44).unwrap();
}

#[cfg(unix)]
#[test]
fn the_second_interrupt_stops_at_once_with_its_own_status() {
    use std::io::{BufRead, BufReader};
    use std::process::{Command, Stdio};
    let folder = tempfile::tempdir().unwrap();
    let (input, output) = (folder.path().join("in"), folder.path().join("out"));
    fs::create_dir(&input).unwrap();
    endless(&input.join("long.wav"));
    let mut child = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args(["filter", &spec("fixed-rate.toml")])
        .args([&input, &output])
        .stdout(Stdio::null())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut complaints = BufReader::new(child.stderr.take().unwrap());
    let interrupt = || Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    // Before anything is in OUT the program may not listen yet.
    while fs::read_dir(&output).map_or(0, Iterator::count) == 0 {
        std::thread::yield_now();
    }
    assert!(interrupt().success());
    let mut line = String::new();
    complaints.read_line(&mut line).unwrap();
    assert!(line.starts_with("bandproof: interrupted"), "{line}");
    assert!(interrupt().success());
    assert_eq!(child.wait().unwrap().code(), Some(130));
    let left: Vec<_> = fs::read_dir(&output).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert!(left.is_empty(), "neither a final name nor anything half-written: {left:?}");
}
