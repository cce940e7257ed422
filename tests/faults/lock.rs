//! Two runs into one folder at once.

use super::season::{Season, Way, outputs};
use std::process::Stdio;
use std::time::Duration;

#[test]
fn a_second_run_into_the_same_folder_is_refused_and_the_first_unharmed() {
    let season = Season::new();
    let out = season.bench.path("out");
    let whole = season.undisturbed(Way::TwoThreads);
    season.clear();
    let mut first = season.start(Way::TwoThreads);
    while !out.join(".bandproof-journal").exists() && first.try_wait().unwrap().is_none() {
        std::thread::sleep(Duration::from_micros(200));
    }
    let mut refused = 0;
    loop {
        // `--replace` is no reason to let it in.
        let mut second = season.command(Way::OneThread);
        let output = second.arg("--replace").stdout(Stdio::null()).output().unwrap();
        if first.try_wait().unwrap().is_some() {
            // The second may have come after the first.
            break;
        }
        let complaints = String::from_utf8(output.stderr).unwrap();
        assert_eq!(output.status.code(), Some(2), "{complaints}");
        assert!(complaints.contains("another run") && complaints.contains("out"), "{complaints}");
        season.assert_no_wrong_file(&whole, "while the first runs");
        refused += 1;
    }
    assert_eq!(first.wait().unwrap().code(), Some(3));
    assert!(refused > 0, "no second run met the first");
    let found = outputs(&out);
    assert_eq!(found.keys().collect::<Vec<_>>(), whole.keys().collect::<Vec<_>>());
    season.assert_complete(&whole, "both are over");
}

/// A killed run holds nothing: locks end with the process.
#[test]
fn the_lock_of_a_killed_run_is_gone_with_it() {
    let season = Season::new();
    let out = season.bench.path("out");
    let mut first = season.start(Way::TwoThreads);
    while !out.join(".bandproof-journal").exists() && first.try_wait().unwrap().is_none() {
        std::thread::sleep(Duration::from_micros(200));
    }
    first.kill().unwrap();
    first.wait().unwrap();
    season.run(Way::TwoThreads, "after a killed one");
}
