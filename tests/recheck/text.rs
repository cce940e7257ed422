//! What a recheck prints.

use crate::dataset::Dataset;
use std::fs;

/// A dataset with a disagreement of every kind that needs no measuring.
fn harmed() -> Dataset {
    let dataset = Dataset::new();
    dataset.harm("out/a.wav", |bytes| bytes[100] ^= 1);
    dataset.harm("in/station/b.wav", |bytes| bytes[1001] ^= 0x20);
    dataset.harm("out/station/b.wav", |bytes| bytes.truncate(1000));
    fs::remove_file(dataset.path("out/station/two.WAV")).unwrap();
    dataset.bench.write("out/extra.wav", b"");
    dataset.edit(|report| report["summary"]["failed"] = 2.into());
    dataset
}

#[test]
fn every_disagreement_is_named_under_its_heading() {
    let ran = harmed().recheck("--input in --replay");
    assert_eq!(ran.status, 1, "{}", ran.stderr);
    for part in [
        "out/bandproof-report.json lists 4 recordings: 3 done, 1 failed. ",
        "outputs          0        2        1    1             0           0\n",
        "inputs           2        1        0    0             1           0\n",
        "Filtered again     3          1         0\n",
        "The report itself\n  summary.failed is 2, and the report's entries come to 1",
        "Changed\n  a.wav (output): the same length, other bytes: SHA-256 ",
        "\n  station/b.wav (input): the same length, other bytes: SHA-256 ",
        "\n  station/b.wav (output): 32044 bytes then, 1000 bytes now\n",
        "Missing\n  station/two.WAV (output)\n",
        "New: recordings that the report does not list\n  extra.wav (output)\n",
        "Filtered again, with another result\n  station/b.wav: other bytes come out: SHA-256 ",
        "Result: does not agree (7 disagreements)\n",
    ] {
        assert!(ran.stdout.contains(part), "{part} is missing:\n{}", ran.stdout);
    }
    assert!(ran.stdout.lines().all(|line| line.chars().count() <= 100), "{}", ran.stdout);
    assert_eq!(ran.stderr, "");
}

#[test]
fn any_number_of_threads_prints_the_same() {
    let dataset = harmed();
    for more in ["", "--json"] {
        let one = dataset.recheck(&format!("--input in --replay --remeasure --jobs 1 {more}"));
        for jobs in [2, 5] {
            let others = dataset.recheck(&format!("--input in --replay --remeasure --jobs {jobs} {more}"));
            assert_eq!((one.status, &one.stdout), (others.status, &others.stdout));
        }
    }
}

#[test]
fn quiet_leaves_the_status_alone() {
    let dataset = harmed();
    let ran = dataset.recheck("--quiet");
    assert_eq!((ran.status, ran.stdout.as_str(), ran.stderr.as_str()), (1, "", ""));
}

#[cfg(unix)]
#[test]
fn a_closed_pipe_ends_quietly() {
    use std::process::{Command, Stdio};
    let dataset = harmed();
    for more in [&["--json"][..], &[]] {
        let mut child = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
            .args(["recheck", dataset.path("out/bandproof-report.json").to_str().unwrap()])
            .args(more)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        drop(child.stdout.take());
        let ended = child.wait_with_output().unwrap();
        assert_eq!((ended.status.code(), ended.stderr.as_slice()), (Some(1), &b""[..]));
    }
}
