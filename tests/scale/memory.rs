//! Peak memory by the number of recordings.

use super::{Bench, tiny_recordings};
use assert_cmd::cargo::CommandCargoExt;
use std::fs;
use std::io::Read;
use std::process::{Command, Stdio};

/// Twenty bands, so that an entry is long.
const SPEC: &str = r#"
[[stage]]
kind = "notch"
center_hz = 50
width_hz = 8
harmonics = 20

[[band]]
name = "hum"
center_hz = 50
span_hz = 4
harmonics = 20
reduce_db = 3

[[band]]
name = "voice"
from_hz = 2200
to_hz = 3000
keep_db = 0.5
"#;

/// What one more recording may take, bytes.
///
/// The plan keeps three paths and a path as reported, the journal another, all of 20 to
/// 50 bytes here, with some 300 bytes of lengths and places: well below 1 KB. Twice that
/// leaves room for what the allocator keeps for itself. The text of an entry is
/// several times longer.
const MORE_BYTES: u64 = 2048;

/// Peak resident memory of a run in bytes, and the length of its report.
fn peak(bench: &Bench) -> (u64, u64) {
    let mut child = Command::cargo_bin("bandproof")
        .unwrap()
        .args(["filter", "spec.toml", "in", "out", "--json", "--jobs", "1"])
        .current_dir(bench.path(""))
        .stdout(Stdio::piped())
        .spawn()
        .unwrap();
    // The report comes when everything is done, and does not fit into the pipe: after the
    // first byte the program waits, with all its peaks behind it.
    let mut stdout = child.stdout.take().unwrap();
    stdout.read_exact(&mut [0]).unwrap();
    let status = fs::read_to_string(format!("/proc/{}/status", child.id())).unwrap();
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:")).unwrap();
    let kib: u64 = line.trim().strip_suffix("kB").unwrap().trim().parse().unwrap();
    let mut rest = Vec::new();
    stdout.read_to_end(&mut rest).unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(0));
    assert!(rest.len() > 1 << 20, "a report that fits into a pipe proves nothing");
    (kib * 1024, rest.len() as u64)
}

#[test]
fn memory_grows_by_far_less_than_an_entry_with_each_recording() {
    let (few, many) = (1000, 4000);
    let (small, small_report) = peak(&tiny_recordings(SPEC, few).0);
    let (large, large_report) = peak(&tiny_recordings(SPEC, many).0);
    let more = (many - few) as u64;
    let entry = (large_report - small_report) / more;
    assert!(entry > 3 * MORE_BYTES, "an entry of {entry} bytes is too short to tell");
    let grown = large.saturating_sub(small) / more;
    assert!(grown < MORE_BYTES, "{grown} bytes a recording: {small} bytes for {few}, {large} for {many}");
}
