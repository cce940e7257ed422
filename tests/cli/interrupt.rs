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
    for (limit, done, complete) in [(1, 1, false), (2, 2, false), (3, 3, true), (9, 3, true)] {
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
        // Half a second of 16 bits each, and nothing of those that were not done.
        assert_eq!((outcome.not_done, outcome.bytes_read), (3 - done, done * 48_000), "after {limit}");
        let report: Value = serde_json::from_slice(&fs::read(outcome.report_path.unwrap()).unwrap()).unwrap();
        assert_eq!(report["complete"], complete, "after {limit}");
        assert_eq!(report["recordings"].as_array().unwrap().len() as u64, done, "after {limit}");
        // The recordings done and the report, and nothing half-written.
        assert_eq!(fs::read_dir(output).unwrap().count() as u64, done + 1, "after {limit}");
    }
}

/// Planning takes the ten seconds that the design of so many lines takes, and none of its
/// steps listens.
#[cfg(unix)]
#[test]
fn the_second_interrupt_stops_at_once_with_its_own_status() {
    use std::io::{BufRead, BufReader};
    use std::process::{Command, Stdio};
    let folder = tempfile::tempdir().unwrap();
    let (input, output) = (folder.path().join("in"), folder.path().join("out"));
    fs::create_dir(&input).unwrap();
    silence(&input.join("a.wav"));
    let spec = folder.path().join("lines.toml");
    let lines = "[[stage]]\nkind = \"bandstop\"\nfamily = \"elliptic\"\norder = 6\ncenter_hz = 45\nwidth_hz = 2\n\
                 harmonics = 500\nripple_db = 0.1\nstop_db = 40\n";
    fs::write(&spec, lines).unwrap();
    let mut child = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
        .arg("filter")
        .args([&spec, &input, &output])
        .stdout(Stdio::null())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut complaints = BufReader::new(child.stderr.take().unwrap());
    let interrupt = || Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    is_busy(child.id());
    assert!(interrupt().success());
    let mut line = String::new();
    complaints.read_line(&mut line).unwrap();
    assert!(line.starts_with("bandproof: interrupted: what is in work is dropped"), "{line}");
    assert!(interrupt().success());
    assert_eq!(child.wait().unwrap().code(), Some(130));
    line.clear();
    complaints.read_line(&mut line).unwrap();
    assert_eq!(line, "", "the first one was still waited for");
    assert!(!output.exists());
}

/// Waits until the program has been busy for half a second of its own time.
#[cfg(unix)]
fn is_busy(process: u32) {
    loop {
        // User time in hundredths of a second is the 14th field; the second, in brackets,
        // is the program's name.
        let stat = fs::read_to_string(format!("/proc/{process}/stat")).unwrap();
        let (_, fields) = stat.rsplit_once(')').unwrap();
        if fields.split_whitespace().nth(11).unwrap().parse::<u64>().unwrap() >= 50 {
            return;
        }
        std::thread::sleep(std::time::Duration::from_millis(5));
    }
}
