//! Temporary files that a killed run left, wherever it writes.

use super::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use std::fs;

#[test]
fn temporary_files_of_a_killed_run_are_gone_after_the_next() {
    let places = ["bag/data", "bag/data/a", "bag", "reports", "tables"];
    for (emit, untouched) in
        [("--emit bagit", vec!["reports", "tables"]), ("--report reports/r.json --csv tables/t.csv", vec!["bag"])]
    {
        let bench = Bench::new(NOTCH_SPEC);
        bench.input("a/one.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 1)));
        for folder in places {
            bench.write(&format!("{folder}/.bandproof-Ab3dEf.part"), b"half");
        }
        // Names that are not quite ours are the user's.
        bench.write("bag/data/a/.bandproof-notes.txt", b"mine");
        let ran = bench.run(&format!("filter spec.toml in bag/data {emit}"));
        assert_eq!(ran.status, 0, "{emit}: {}", ran.stderr);
        let there = |folder: &&str| bench.path(folder).join(".bandproof-Ab3dEf.part").exists();
        let left: Vec<&str> = places.into_iter().filter(there).collect();
        assert_eq!(left, untouched, "{emit}");
        assert_eq!(fs::read(bench.path("bag/data/a/.bandproof-notes.txt")).unwrap(), b"mine");
    }
}
