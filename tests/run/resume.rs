//! The same command again: what is done stays, what is not is done, and nobody can tell
//! from the result.

use super::fixtures::{Bench, NOTCH_SPEC, entry, hum_and_noise, wav16};
use serde_json::Value;
use sha2::{Digest as _, Sha256};
use std::fs;
use std::time::SystemTime;

pub const NAMES: [&str; 4] = ["a.wav", "b.wav", "far/c.wav", "far/d.wav"];

/// Four recordings and one that fails.
pub fn bench() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    for (seed, name) in NAMES.iter().enumerate() {
        bench.input(name, &wav16(8000, 1, &hum_and_noise(8000, 3.0 + seed as f64, 0.3, seed as u64)));
    }
    bench.input("far/empty.wav", b"");
    bench
}

/// A report as everything but `run` of it.
pub fn lasting(bench: &Bench) -> String {
    let text = fs::read_to_string(bench.path("out/bandproof-report.json")).unwrap();
    let run = text.lines().find(|line| line.starts_with("  \"run\": ")).unwrap().to_owned();
    text.replace(&run, "")
}

/// Which recordings a dry run would filter.
fn to_do(bench: &Bench, more: &str) -> Vec<String> {
    let ran = bench.filter(&format!("--dry-run --json {more}"));
    let plan: Value = serde_json::from_str(&ran.stdout).unwrap_or_else(|_| panic!("{}", ran.stderr));
    let open =
        plan["recordings"].as_array().unwrap().iter().filter(|one| one["kept"] == false && one["fails"] == false);
    open.map(|one| one["path"].as_str().unwrap().to_owned()).collect()
}

#[test]
fn a_finished_run_again_filters_nothing_and_says_the_same() {
    let bench = bench();
    assert_eq!(to_do(&bench, ""), NAMES);
    let first = bench.filter("--csv table.csv");
    assert_eq!(first.status, 3, "{}", first.stderr);
    let (report, tree) = (lasting(&bench), bench.tree("out"));
    assert_eq!(to_do(&bench, "--csv table.csv"), [""; 0]);
    for more in ["--csv table.csv", "--csv table.csv --jobs 1", "--csv table.csv --replace"] {
        let again = bench.filter(more);
        assert_eq!(again.status, 3, "{}", again.stderr);
        let sentence =
            "4 of 5 recordings filtered and measured, 4 by an earlier run (input and output unchanged), 1 failed:";
        assert!(again.stdout.replace('\n', " ").starts_with(sentence), "{}", again.stdout);
        assert_eq!(lasting(&bench), report);
        let names = |tree: &[(String, Vec<u8>)]| tree.iter().map(|(name, _)| name.clone()).collect::<Vec<_>>();
        assert_eq!(names(&bench.tree("out")), names(&tree));
    }
}

/// Without a recording that fails, which is tried again, a finished run leaves nothing to do.
#[test]
fn a_finished_run_is_left_as_it_is_to_the_last_byte() {
    for more in ["", "--csv table.csv", "--emit datapackage", "--emit bagit --csv out/data/table.csv"] {
        let bench = bench();
        fs::remove_file(bench.path("in/far/empty.wav")).unwrap();
        let run = || bench.run(&format!("filter spec.toml in out/data {more}"));
        assert_eq!(run().status, 0, "{more}");
        let tree = bench.tree("");
        let leftovers = [".bandproof-Ab12Cd.part", "far/.bandproof-Ab12Cd.part"];
        leftovers.iter().for_each(|name| drop(bench.write(&format!("out/data/{name}"), b"{}")));
        let again = run();
        assert_eq!(again.status, 0, "{more}: {}", again.stderr);
        assert!(again.stdout.replace('\n', " ").contains("nothing left to do, found in"), "{}", again.stdout);
        assert_eq!(bench.tree(""), tree, "{more}");
    }
}

#[test]
fn a_package_is_made_anew_when_something_was_left_to_do() {
    for (emit, files) in [("datapackage", &["datapackage.json"][..]), ("bagit", &["../bagit.txt", "../bag-info.txt"])] {
        let bench = bench();
        fs::remove_file(bench.path("in/far/empty.wav")).unwrap();
        let run = || bench.run(&format!("filter spec.toml in out/data --emit {emit}"));
        assert_eq!(run().status, 0, "{emit}");
        let report = bench.report_at("out/data/bandproof-report.json");
        fs::remove_file(bench.path("out/data/b.wav")).unwrap();
        bench.write("out/data/far/.bandproof-Ab12Cd.part", b"half a recording");
        let again = run();
        assert_eq!(again.status, 0, "{emit}: {}", again.stderr);
        assert!(again.stdout.contains("3 by an earlier run"), "{}", again.stdout);
        let now = bench.report_at("out/data/bandproof-report.json");
        assert_eq!(now["recordings"], report["recordings"], "{emit}");
        // And its own is known again.
        let third = run();
        let told = third.stdout.replace('\n', " ");
        assert!(told.contains("nothing left to do"), "{emit}: {}{}", third.stdout, third.stderr);
        // One that somebody edited is not.
        for file in files {
            let path = bench.path("out/data").join(file);
            let text = fs::read_to_string(&path).unwrap();
            fs::write(&path, format!("{text} ")).unwrap();
            let tree = bench.tree("");
            let refused = run();
            assert_eq!(refused.status, 2, "{emit}, {file}");
            assert!(refused.stderr.contains("exists already"), "{}", refused.stderr);
            assert_eq!(bench.tree(""), tree, "{emit}, {file}");
            fs::write(&path, text).unwrap();
        }
    }
}

#[test]
fn a_package_that_would_not_be_made_anew_is_not_made_untrue() {
    for emit in ["datapackage", "bagit"] {
        let bench = bench();
        fs::remove_file(bench.path("in/far/empty.wav")).unwrap();
        assert_eq!(bench.run(&format!("filter spec.toml in out/data --emit {emit}")).status, 0);
        // Nothing to do: nothing is written.
        assert_eq!(bench.run("filter spec.toml in out/data").status, 0);
        fs::remove_file(bench.path("out/data/b.wav")).unwrap();
        let tree = bench.tree("");
        let refused = bench.run("filter spec.toml in out/data");
        assert_eq!(refused.status, 2, "{emit}");
        assert!(refused.stderr.contains("belongs to a package that lists"), "{}", refused.stderr);
        assert_eq!(bench.tree(""), tree, "{emit}");
        assert_eq!(bench.run(&format!("filter spec.toml in out/data --emit {emit}")).status, 0);
    }
}

#[test]
fn what_was_done_is_not_touched() {
    let bench = bench();
    bench.filter("");
    let files = NAMES.map(|name| bench.path(&format!("out/{name}")));
    // The input's time stands on each output; another one shows whether it is written again.
    let then = SystemTime::UNIX_EPOCH + std::time::Duration::from_secs(1_000_000_000);
    for file in &files {
        fs::File::options().write(true).open(file).unwrap().set_modified(then).unwrap();
    }
    bench.filter("");
    assert!(files.iter().all(|file| file.metadata().unwrap().modified().unwrap() == then));
}

#[test]
fn only_what_changed_is_done_again() {
    let bench = bench();
    bench.filter("");
    // An output that is gone, an input with other samples, one that is new, one that failed
    // and is whole now.
    fs::remove_file(bench.path("out/b.wav")).unwrap();
    bench.input("far/c.wav", &wav16(8000, 1, &hum_and_noise(8000, 4.0, 0.1, 9)));
    bench.input("new.wav", &wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.1, 10)));
    bench.input("far/empty.wav", &wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.1, 11)));
    let changed = ["b.wav", "far/c.wav", "far/empty.wav", "new.wav"];
    assert_eq!(to_do(&bench, ""), changed);
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    assert!(ran.stdout.contains("2 by an earlier run"), "{}", ran.stdout);
    let resumed = (lasting(&bench), bench.tree("out").len());
    fs::remove_dir_all(bench.path("out")).unwrap();
    bench.filter("");
    assert_eq!((lasting(&bench), bench.tree("out").len()), resumed);
}

#[test]
fn a_recording_that_failed_may_be_taken_away() {
    let bench = bench();
    assert_eq!(bench.filter("").status, 3);
    fs::remove_file(bench.path("in/far/empty.wav")).unwrap();
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    assert!(ran.stdout.starts_with("4 of 4 recordings filtered and measured, 4 by an earlier run"), "{}", ran.stdout);
    assert_eq!(bench.report()["summary"]["failed"], 0);
}

#[test]
fn an_older_output_of_a_recording_that_fails_now_is_left_and_named() {
    let bench = bench();
    bench.filter("");
    bench.input("b.wav", b"RIFF");
    let output = fs::read(bench.path("out/b.wav")).unwrap();
    assert_eq!(bench.filter("").status, 3);
    let report = bench.report();
    let notes = entry(&report, "b.wav")["notes"].to_string();
    assert!(notes.contains("was there before this run and was left alone"), "{notes}");
    assert_eq!(entry(&report, "far/empty.wav")["notes"].to_string(), "[]");
    assert_eq!(fs::read(bench.path("out/b.wav")).unwrap(), output);
    // It is this job's all the same, until it is replaced.
    let again = bench.filter("");
    assert_eq!(again.status, 3, "{}", again.stderr);
    assert_eq!(fs::read(bench.path("out/b.wav")).unwrap(), output);
    bench.input("b.wav", &wav16(8000, 1, &hum_and_noise(8000, 4.0, 0.1, 9)));
    assert_eq!(bench.filter("").status, 3);
    let resumed = (lasting(&bench), bench.tree("out").len());
    assert_ne!(fs::read(bench.path("out/b.wav")).unwrap(), output);
    fs::remove_dir_all(bench.path("out")).unwrap();
    bench.filter("");
    assert_eq!((lasting(&bench), bench.tree("out").len()), resumed);
}

/// The entry comes before the name: a run can be killed in between.
#[test]
fn an_output_that_a_killed_run_was_about_to_replace_is_replaced() {
    let bench = bench();
    bench.filter("");
    let older = bench.tree("out");
    bench.input("b.wav", &wav16(8000, 1, &hum_and_noise(8000, 4.0, 0.1, 9)));
    bench.filter("");
    let whole = (lasting(&bench), bench.tree("out").len());
    let sha256 = bench.report()["spec"]["file_sha256"].as_str().unwrap().to_owned();
    fs::write(bench.path("out/.bandproof-journal"), journal(&bench, &sha256)).unwrap();
    for (name, bytes) in &older {
        fs::write(bench.path("out").join(name), bytes).unwrap();
    }
    assert_eq!(to_do(&bench, ""), ["b.wav"]);
    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    assert_eq!((lasting(&bench), bench.tree("out").len()), whole);
}

#[test]
fn an_output_that_somebody_changed_is_not_written_over_unasked() {
    let bench = bench();
    bench.filter("");
    let whole = lasting(&bench);
    let mut bytes = fs::read(bench.path("out/b.wav")).unwrap();
    // One bit of one sample: the length stays.
    *bytes.last_mut().unwrap() ^= 1;
    bench.write("out/b.wav", &bytes);
    let tree = bench.tree("out");
    let refused = bench.filter("");
    assert_eq!(refused.status, 2, "{}", refused.stdout);
    assert!(refused.stderr.contains("b.wav exists already (it is not, or can't be seen to be, what an earlier run"));
    assert_eq!(bench.tree("out"), tree);
    assert_eq!(bench.filter("--replace").status, 3);
    assert_eq!(lasting(&bench), whole);
    assert_ne!(bench.tree("out"), tree);
}

#[test]
fn a_report_of_another_job_counts_for_nothing() {
    let bench = bench();
    bench.filter("");
    let report = fs::read_to_string(bench.path("out/bandproof-report.json")).unwrap();
    let version = format!("\"tool_version\": \"{}\"", env!("CARGO_PKG_VERSION"));
    let met = "\"verdict\": \"met\"";
    let edits = [
        ("version", report.replace(&version, "\"tool_version\": \"0.0.9\""), "version 0.0.9 of this program"),
        ("a verdict", report.replacen(met, "\"verdict\": \"missed\"", 1), "summary is not what"),
        ("a path", report.replace("\"a.wav\"", "\"aa.wav\""), "1 recording, the first aa.wav"),
        ("no report", report.replace("\"report\": \"bandproof\"", "\"report\": \"other\""), "give --replace"),
    ];
    for (what, edited, told) in edits {
        assert_ne!(edited, report, "{what}");
        bench.write("out/bandproof-report.json", edited.as_bytes());
        let refused = bench.filter("");
        assert_eq!(refused.status, 2, "{what}: {}", refused.stdout);
        assert!(refused.stderr.contains(told), "{what}: {}", refused.stderr);
        assert_eq!(fs::read_to_string(bench.path("out/bandproof-report.json")).unwrap(), edited, "{what}");
    }
    bench.write("out/bandproof-report.json", report.as_bytes());
    bench.write("spec.toml", NOTCH_SPEC.replace("reduce_db = 3", "reduce_db = 4").as_bytes());
    let refused = bench.filter("");
    assert_eq!(refused.status, 2);
    assert!(refused.stderr.contains("bandproof-report.json is a report made with another spec"), "{}", refused.stderr);
    // With leave to replace, everything is done again.
    let ran = bench.filter("--replace");
    assert!(ran.stdout.starts_with("4 of 5 recordings filtered and measured, 1 failed"), "{}", ran.stdout);
}

#[test]
fn fewer_recordings_than_the_report_lists_are_another_job() {
    let bench = bench();
    bench.filter("");
    let tree = bench.tree("out");
    let refused = bench.filter("--include far/*");
    assert_eq!(refused.status, 2);
    assert!(refused.stderr.contains("(2 recordings, the first a.wav)"), "{}", refused.stderr);
    assert_eq!(bench.tree("out"), tree);
    // With leave to replace the report, what is done is done.
    let ran = bench.filter("--include far/* --replace");
    assert!(ran.stdout.starts_with("2 of 3 recordings filtered and measured, 2 by an earlier run"), "{}", ran.stdout);
    bench.filter("--replace");
    // Its own report has its own place, and outputs are not its own there.
    let refused = bench.filter("--include far/* --report far.json");
    assert_eq!(refused.status, 2);
    assert!(refused.stderr.contains("far/c.wav exists already"), "{}", refused.stderr);
}

#[test]
fn a_table_that_was_edited_is_not_written_over_unasked() {
    let bench = bench();
    bench.filter("--csv table.csv");
    let table = fs::read_to_string(bench.path("table.csv")).unwrap();
    let edited = table.replacen("a.wav", "A.wav", 1);
    for (what, text) in [("edited", edited.as_str()), ("cut", &table[..100]), ("longer", &format!("{table}x\r\n"))] {
        bench.write("table.csv", text.as_bytes());
        let refused = bench.filter("--csv table.csv");
        assert_eq!(refused.status, 2, "{what}");
        assert!(refused.stderr.contains("table.csv exists already"), "{what}: {}", refused.stderr);
        assert_eq!(fs::read_to_string(bench.path("table.csv")).unwrap(), text);
    }
    bench.write("table.csv", table.as_bytes());
    assert_eq!(bench.filter("--csv table.csv").status, 3);
}

#[cfg(unix)]
#[test]
fn names_that_are_not_utf8_are_found_again() {
    use std::ffi::OsStr;
    use std::os::unix::ffi::OsStrExt;
    let bench = Bench::new(NOTCH_SPEC);
    let sound = wav16(8000, 1, &hum_and_noise(8000, 3.0, 0.3, 1));
    // Escaped, the first reads like the second.
    for name in [&b"d\xFF.wav"[..], b"d%FF.wav"] {
        fs::write(bench.path("in").join(OsStr::from_bytes(name)), &sound).unwrap();
    }
    bench.filter("");
    let report = lasting(&bench);
    let again = bench.filter("");
    assert!(again.stdout.contains("2 by an earlier run"), "{}", again.stdout);
    assert_eq!(lasting(&bench), report);
}

#[test]
fn leftovers_of_a_killed_run_go_and_nothing_else_does() {
    let bench = bench();
    let stray = bench.write("out/far/.bandproof-Ab12Cd.part", b"half a recording");
    bench.write("out/.bandproof-journal", b"{}\n");
    let other = bench.write("out/far/.bandproof-notes", b"mine");
    bench.filter("--dry-run");
    assert!(stray.exists());
    assert_eq!(bench.filter("").status, 3);
    assert!(!stray.exists() && other.exists() && !bench.path("out/.bandproof-journal").exists());
}

#[cfg(unix)]
#[test]
fn two_runs_into_one_folder_do_not_meet() {
    let bench = bench();
    fs::create_dir(bench.path("out")).unwrap();
    let held = fs::File::open(bench.path("out")).unwrap();
    held.try_lock().unwrap();
    let refused = bench.filter("");
    assert_eq!(refused.status, 2);
    assert!(refused.stderr.contains("another run is writing into out"), "{}", refused.stderr);
    assert!(bench.tree("out").is_empty());
    // To look does no harm.
    assert_eq!(bench.filter("--dry-run").status, 3);
    drop(held);
    assert_eq!(bench.filter("").status, 3);
}

/// The first line of a journal of this job, and an entry a line.
pub fn journal(bench: &Bench, spec_sha256: &str) -> String {
    let (version, report) = (env!("CARGO_PKG_VERSION"), bench.report());
    let normalized: String =
        Sha256::digest(report["spec"]["normalized"].to_string()).iter().map(|byte| format!("{byte:02x}")).collect();
    let mut text = format!(
        "{{\"format\":1,\"tool_version\":\"{version}\",\"spec_sha256\":\"{spec_sha256}\",\
         \"normalized_sha256\":\"{normalized}\"}}\n"
    );
    for recording in report["recordings"].as_array().unwrap() {
        text.push_str(&serde_json::to_string(recording).unwrap());
        text.push('\n');
    }
    text
}

#[test]
fn a_journal_counts_as_far_as_it_is_whole() {
    let bench = bench();
    bench.filter("");
    let whole = lasting(&bench);
    let spec_sha256 = bench.report()["spec"]["file_sha256"].as_str().unwrap().to_owned();
    let text = journal(&bench, &spec_sha256);
    let lines: Vec<&str> = text.lines().collect();
    let outputs = NAMES.map(|name| fs::read(bench.path(&format!("out/{name}"))).unwrap());
    let garbled = text.replacen("\"a.wav\"", "\"a.w\u{fffd}", 1);
    let other_spec = journal(&bench, &"0".repeat(64));
    // Stages found for other sample rates.
    let other_cascade = text.replacen("\"normalized_sha256\":\"", "\"normalized_sha256\":\"0", 1);
    let failed = format!("{text}{}\n", lines[1].replacen("\"done\"", "\"failed\"", 1));
    // What is in the journal, and which recordings it has done.
    let cases: [(&str, &str, &[&str]); 7] = [
        ("whole", &text, &NAMES),
        ("cut in its last line", &text[..text.len() - 5], &NAMES),
        ("cut in a recording", &text[..lines[0].len() + lines[1].len() + 40], &NAMES[..1]),
        ("damaged in the middle", &garbled, &NAMES[1..]),
        ("of another spec", &other_spec, &[]),
        ("of another cascade", &other_cascade, &[]),
        ("with a later failure that left the output", &failed, &NAMES),
    ];
    for (what, text, done) in cases {
        fs::remove_dir_all(bench.path("out")).unwrap();
        bench.write("out/.bandproof-journal", text.as_bytes());
        for (name, bytes) in NAMES.iter().zip(&outputs).filter(|(name, _)| done.contains(name)) {
            bench.write(&format!("out/{name}"), bytes);
        }
        let open: Vec<&str> = NAMES.into_iter().filter(|name| !done.contains(name)).collect();
        assert_eq!(to_do(&bench, ""), open, "{what}");
        let ran = bench.filter("");
        assert_eq!(ran.status, 3, "{what}: {}", ran.stderr);
        assert_eq!(lasting(&bench), whole, "{what}");
        assert!(!bench.path("out/.bandproof-journal").exists(), "{what}");
    }
}

#[test]
fn an_output_without_an_entry_is_somebody_elses() {
    let bench = bench();
    bench.filter("");
    let report = bench.report();
    assert_eq!(entry(&report, "b.wav")["status"], "done");
    fs::remove_file(bench.path("out/bandproof-report.json")).unwrap();
    let tree = bench.tree("out");
    let refused = bench.filter("");
    assert_eq!(refused.status, 2);
    assert!(refused.stderr.contains("a.wav exists already and so do 3 other files to be written: give --replace"));
    assert_eq!(bench.tree("out"), tree);
}
