//! Reports of `measure`: pairs that something else filtered.

use crate::dataset::told;
use crate::fixtures::{Bench, NOTCH_SPEC, Noise, Ran, hum_and_noise, wav16};
use serde_json::{Value, json};
use std::fs;

/// Folders `before` and `after` of pairs, `after` made by `filter`, and more on both sides.
fn pairs() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    for (name, seed) in [("a.wav", 1), ("b/c.wav", 2)] {
        let recording = wav16(8000, 1, &hum_and_noise(8000, 6.0, 0.3, seed));
        bench.write(&format!("before/{name}"), &recording);
    }
    assert!(bench.run("filter spec.toml before after --report filter.json --quiet").status <= 1);
    bench.write("before/lost.wav", b"");
    bench.write("after/stray.wav", b"");
    bench
}

fn recheck(bench: &Bench, more: &str) -> (i32, Value) {
    let ran = bench.run(&format!("recheck bandproof-report.json --json {more}"));
    (ran.status, serde_json::from_str(&ran.stdout).unwrap_or_else(|_| panic!("{}{}", ran.stdout, ran.stderr)))
}

fn measured(bench: &Bench, more: &str) -> Ran {
    let ran = bench.run(&format!("measure spec.toml {more} --quiet"));
    assert!(ran.status <= 1, "{}", ran.stderr);
    ran
}

#[test]
fn pairs_agree_in_files_and_figures() {
    let bench = pairs();
    for options in ["", "--delay 0", "--max-delay 0.5"] {
        measured(&bench, &format!("before after --replace {options}"));
        let (status, document) = recheck(&bench, "--input before --output after --remeasure");
        assert_eq!((status, told(&document)), (0, vec![]), "{options}: {document}");
        assert_eq!(document["command"], "measure");
        assert_eq!(document["remeasure"], json!({"same": 2, "different": 0, "not_done": 0}));
        assert_eq!((&document["inputs"]["unchanged"], &document["outputs"]["unchanged"]), (&json!(2), &json!(2)));
    }
}

#[test]
fn where_the_recordings_after_lie_must_be_said_unless_it_is_plain() {
    let bench = pairs();
    measured(&bench, "before after");
    let ran = bench.run("recheck bandproof-report.json --input before");
    assert_eq!((ran.status, ran.stdout.as_str()), (2, ""));
    assert!(ran.stderr.contains("give --output with the folder that was AFTER"), "{}", ran.stderr);
    fs::rename(bench.path("bandproof-report.json"), bench.path("after/report.json")).unwrap();
    let ran = bench.run("recheck after/report.json --input before");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let ran = bench.run("recheck after/report.json --input before --replay");
    assert_eq!(ran.status, 2);
    assert!(ran.stderr.contains("nothing was filtered"), "{}", ran.stderr);
}

#[test]
fn what_was_done_to_a_pair_is_found() {
    let bench = pairs();
    measured(&bench, "before after");
    let flip = |file: &str| {
        let mut bytes = fs::read(bench.path(file)).unwrap();
        bytes[50_001] ^= 0x10;
        fs::write(bench.path(file), bytes).unwrap();
    };
    flip("after/a.wav");
    fs::remove_file(bench.path("before/b/c.wav")).unwrap();
    bench.write("after/b/d.wav", b"");
    let (status, document) = recheck(&bench, "--input before --output after");
    let found = ["changed output a.wav", "missing input b/c.wav", "new output b/d.wav"];
    assert_eq!((status, told(&document)), (1, found.map(str::to_owned).to_vec()));
    let report: Value = bench.report_at("bandproof-report.json");
    let mut edited = report.clone();
    edited["recordings"][0]["pair"]["delay_frames"] = 7.5.into();
    edited["recordings"][0]["pair"]["inverted"] = true.into();
    fs::write(bench.path("bandproof-report.json"), serde_json::to_vec(&edited).unwrap()).unwrap();
    flip("after/a.wav");
    let (_, document) = recheck(&bench, "--input before --output after --remeasure");
    let about = |one: &&Value| one["path"] == "a.wav";
    let told: Vec<_> = document["disagreements"].as_array().unwrap().iter().filter(about).collect();
    assert_eq!(told.len(), 2, "{document}");
    assert_eq!((&told[0]["figure"], &told[0]["then"]), (&json!("delay_frames"), &json!(7.5)));
    assert_eq!(told[1]["what"], "inverted then, not inverted now");
    assert_eq!(document["remeasure"], json!({"same": 0, "different": 1, "not_done": 1}));
}

#[test]
fn whatever_a_report_says_of_a_pair_is_held_against_it() {
    let bench = pairs();
    measured(&bench, "before after");
    let report: Value = bench.report_at("bandproof-report.json");
    for (pointer, value, found) in [
        ("/pair/clock_error_ppm", json!(0.5), "clock_error_ppm"),
        ("/pair/frames", json!(7), "the recording after"),
        ("/pair/encoding", json!("pcm24"), "the recording after"),
        ("/pair/full_scale_runs", json!(7), "the recording after"),
        ("/input/full_scale_runs", json!(7), "the recording before"),
        ("/input/seconds", json!(60.0), "the recording before"),
        ("/chunks/0/id", json!("fact"), "the recording before"),
        ("/spectrum/segments", json!(700), "spectra"),
        ("/spectrum/skipped_s", json!(0.0), "spectra"),
    ] {
        let mut edited = report.clone();
        let place = edited["recordings"][0].pointer_mut(pointer).unwrap();
        assert_ne!(*place, value, "{pointer}");
        *place = value;
        fs::write(bench.path("bandproof-report.json"), serde_json::to_vec(&edited).unwrap()).unwrap();
        let (status, document) = recheck(&bench, "--input before --output after --remeasure");
        let all = document["disagreements"].as_array().unwrap();
        let says =
            |one: &Value| ["figure", "what"].iter().any(|key| one[*key].as_str().is_some_and(|s| s.contains(found)));
        assert!(status == 1 && all.len() == 1 && all[0]["path"] == "a.wav" && says(&all[0]), "{pointer}: {document}");
    }
}

/// On either side: what `measure` could not look into, `recheck` need not.
#[cfg(unix)]
#[test]
fn folders_that_stayed_closed_are_no_news() {
    use std::os::unix::fs::{MetadataExt, PermissionsExt};
    use std::os::unix::process::CommandExt;
    let bench = pairs();
    let mode = |path: &str, mode: u32| {
        fs::set_permissions(bench.path(path), fs::Permissions::from_mode(mode)).unwrap();
    };
    let program = assert_cmd::cargo::cargo_bin!("bandproof");
    // Permissions do not bind root: a copy of the binary runs as nobody. Not `fs::copy`, see
    // the same in `run`.
    let copied = std::process::Command::new("cp").arg(program).arg(bench.path("program")).status();
    assert!(copied.unwrap().success());
    mode("", 0o777);
    let run = |arguments: &str| {
        let mut command = std::process::Command::new(bench.path("program"));
        if fs::metadata(bench.path("program")).unwrap().uid() == 0 {
            command.uid(65_534).gid(65_534);
        }
        let output = command.args(arguments.split(' ')).current_dir(bench.path("")).output().unwrap();
        (output.status.code().unwrap(), String::from_utf8(output.stdout).unwrap())
    };
    for closed in ["before/closed", "after/closed"] {
        fs::create_dir(bench.path(closed)).unwrap();
        mode(closed, 0o000);
    }
    let (status, told) = run("measure spec.toml before after --quiet");
    assert_eq!(status, 3, "{told}");
    let report = bench.report_at("bandproof-report.json");
    assert_eq!((&report["summary"]["done"], &report["summary"]["failed"]), (&json!(2), &json!(2)));
    let (status, told) = run("recheck bandproof-report.json --input before --output after");
    assert_eq!(status, 0, "{told}");
    // One that the report does not know is.
    fs::create_dir(bench.path("after/shut")).unwrap();
    mode("after/shut", 0o000);
    let (status, told) = run("recheck bandproof-report.json --input before --output after");
    assert!(status == 3 && told.contains("shut"), "{status}: {told}");
    for closed in ["before/closed", "after/closed", "after/shut"] {
        mode(closed, 0o700);
    }
}

#[test]
fn two_recordings_beside_each_other_and_the_idle_device() {
    let bench = pairs();
    fs::copy(bench.path("before/a.wav"), bench.path("played.wav")).unwrap();
    fs::copy(bench.path("after/a.wav"), bench.path("heard.wav")).unwrap();
    let mut noise = Noise(9);
    let idle: Vec<f64> = (0..80_000).map(|_| 0.0002 * noise.next()).collect();
    bench.write("idle.wav", &wav16(8000, 1, &idle));
    fs::create_dir(bench.path("other")).unwrap();
    fs::rename(bench.path("before"), bench.path("other/before")).unwrap();
    fs::rename(bench.path("after"), bench.path("other/after")).unwrap();
    fs::create_dir(bench.path("set")).unwrap();
    for name in ["played.wav", "heard.wav", "idle.wav"] {
        fs::rename(bench.path(name), bench.path("set").join(name)).unwrap();
    }
    measured(&bench, "set/played.wav set/heard.wav --noise set/idle.wav --report set/report.json");
    let run = |more: &str| bench.run(&format!("recheck set/report.json {more}"));
    for more in [
        "",
        "--input set",
        "--input set/played.wav --output set/heard.wav",
        "--input set --remeasure --noise set/idle.wav",
    ] {
        let ran = run(more);
        assert_eq!(ran.status, 0, "{more}: {}{}", ran.stdout, ran.stderr);
    }
    for (more, part) in [
        ("--input set --remeasure", "give it with --noise"),
        ("--input set --remeasure --noise set/heard.wav", "give that one"),
        ("--input set --remeasure --noise nowhere.wav", "can't be opened"),
    ] {
        let ran = run(more);
        assert_eq!(ran.status, 2, "{more}");
        assert!(ran.stderr.contains(part), "{}", ran.stderr);
    }
}
