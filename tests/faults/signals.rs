//! One polite signal ends a run with a report of what it did; the second ends it at once.

use super::season::{Outputs, Season, Way, is_passing, outputs};
use serde_json::Value;
use std::fs;
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::time::Duration;

fn signal(child: &Child, name: &str) {
    // A run that is over is no longer there.
    _ = Command::new("kill").args([&format!("-{name}"), &child.id().to_string()]).stderr(Stdio::null()).status();
}

/// Recordings that have their names, or 0 before there is a folder.
fn wait_for_outputs(child: &mut Child, out: &Path, count: usize) {
    let there = || {
        let names = walkdir::WalkDir::new(out).into_iter().filter_map(Result::ok);
        names.filter(|file| file.path().extension().is_some_and(|ending| ending == "wav")).count()
    };
    // The journal stands when signals have been listened for a long while.
    while !(out.join(".bandproof-journal").exists() && there() >= count) && child.try_wait().unwrap().is_none() {
        std::thread::sleep(Duration::from_micros(200));
    }
}

/// What an interrupted run left: its report says so and lists what has its name, each
/// entry as in the whole one.
fn assert_cut_short(found: &Outputs, whole: &Outputs, what: &str) {
    let parse = |outputs: &Outputs| serde_json::from_slice::<Value>(&outputs["bandproof-report.json"]).unwrap();
    let (report, all) = (parse(found), parse(whole));
    assert_eq!(report["complete"], false, "{what}");
    assert_eq!(report["designs"], all["designs"], "{what}");
    let entries = report["recordings"].as_array().unwrap();
    let wanted = all["recordings"].as_array().unwrap();
    assert!(entries.len() < wanted.len() && entries.iter().all(|entry| wanted.contains(entry)), "{what}");
    let done = entries.iter().filter(|entry| entry["status"] == "done").map(|entry| entry["path"].as_str().unwrap());
    let mut names: Vec<&str> = done.chain(["bandproof-report.json"]).collect();
    names.sort_unstable();
    assert_eq!(found.keys().map(String::as_str).collect::<Vec<_>>(), names, "{what}");
    let wavs = found.iter().filter(|(name, _)| name.ends_with(".wav"));
    wavs.for_each(|(name, bytes)| assert!(whole.get(name) == Some(bytes), "{what}: {name}"));
}

#[test]
fn an_interrupted_run_drops_what_is_open_and_the_next_does_the_rest() {
    let season = Season::new();
    let out = season.bench.path("out");
    let whole = season.undisturbed(Way::TwoThreads);
    let mut cut_short = 0;
    for count in 0..8 {
        let name = ["INT", "TERM"][count % 2];
        season.clear();
        let mut what = String::new();
        // Twice in a row, the second time into a run that goes on from the first.
        for more in [0, 2] {
            let mut child = season.start(Way::TwoThreads);
            wait_for_outputs(&mut child, &out, count + more);
            signal(&child, name);
            let status = child.wait().unwrap().code();
            what = format!("{what}; SIG{name} after {} outputs", count + more);
            season.assert_inputs_untouched(&what);
            if status == Some(130) {
                cut_short += 1;
                assert_cut_short(&outputs(&out), &whole, &what);
            } else {
                assert_eq!(status, Some(3), "{what}: neither cut short nor at its end");
                season.assert_complete(&whole, &what);
            }
        }
        season.run(Way::TwoThreads, &what);
        season.assert_complete(&whole, &what);
        season.assert_inputs_untouched(&what);
    }
    assert!(cut_short >= 8, "only {cut_short} of 16 signals met a run");
}

#[test]
fn a_signal_before_anything_is_written_leaves_nothing() {
    let season = Season::new();
    for _ in 0..5 {
        season.clear();
        let mut child = season.start(Way::OneThread);
        signal(&child, "INT");
        let status = child.wait().unwrap();
        use std::os::unix::process::ExitStatusExt;
        // On a busy machine the signal may come when outputs are there, or to a run at its end.
        if status.code() == Some(3) || !outputs(&season.bench.path("out")).is_empty() {
            continue;
        }
        // The very first moments are the system's: there the signal ends the program.
        assert!(status.code() == Some(130) || status.signal() == Some(2), "{status:?}");
        assert!(!season.bench.path("out").exists() || status.signal() == Some(2), "an empty folder is left");
        season.assert_inputs_untouched("interrupted at once");
    }
}

#[test]
fn two_signals_leave_no_file_half_written() {
    let season = Season::new();
    let out = season.bench.path("out");
    // Takes minutes, so that a run that ends has been ended: 2 GB of silence in a hole.
    let mut header = fs::read(season.bench.path("in/00.wav")).unwrap();
    header.truncate(44);
    header[4..8].copy_from_slice(&2_000_000_036_u32.to_le_bytes());
    header[40..44].copy_from_slice(&2_000_000_000_u32.to_le_bytes());
    let endless = season.bench.input("endless.wav", &header);
    fs::File::options().write(true).open(&endless).unwrap().set_len(2_000_000_044).unwrap();
    for name in ["INT", "TERM"] {
        season.clear();
        let mut child = season.start(Way::TwoThreads);
        wait_for_outputs(&mut child, &out, 1);
        signal(&child, name);
        signal(&child, name);
        assert_eq!(child.wait().unwrap().code(), Some(130), "SIG{name} twice");
        let left = outputs(&out);
        assert!(
            !left.contains_key("endless.wav") && left.keys().any(|name| name.ends_with(".wav")),
            "{:?}",
            left.keys()
        );
        // The journal may stay: the next run goes on from it.
        let parts = left.keys().filter(|name| is_passing(name) && !name.ends_with("journal"));
        assert_eq!(parts.count(), 0, "SIG{name} twice: {:?}", left.keys());
    }
}
