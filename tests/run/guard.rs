//! Nothing of a user's is overwritten or mixed with outputs.

use super::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use std::fs;

fn bench() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("a/one.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 1)));
    bench
}

#[test]
fn nothing_is_written_among_the_originals() {
    let bench = bench();
    for (out, word) in [("in", "same"), ("in/out", "inside"), ("in/../in/./deeper/out", "inside")] {
        let ran = bench.run(&format!("filter spec.toml in {out} --replace"));
        assert_eq!(ran.status, 2, "{out}");
        assert!(ran.stderr.contains(word), "{}", ran.stderr);
    }
    assert_eq!(bench.tree("in").len(), 1);
}

#[test]
fn a_folder_that_would_place_outputs_over_the_inputs_is_refused() {
    let bench = bench();
    // in/ holds in/a/one.wav: writing `in/`'s tree into its parent under the name in/.
    fs::create_dir_all(bench.path("in/in")).unwrap();
    fs::rename(bench.path("in/a"), bench.path("in/in/a")).unwrap();
    let before = bench.tree("in");
    let ran = bench.run("filter spec.toml in . --replace");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert_eq!(bench.tree("in"), before);
    let single = bench.run("filter spec.toml in/in/a/one.wav in/in/a --replace");
    assert_eq!(single.status, 2);
    assert!(single.stderr.contains("same file"), "{}", single.stderr);
}

#[cfg(unix)]
#[test]
fn links_into_the_input_are_seen_through() {
    let bench = bench();
    std::os::unix::fs::symlink(bench.path("in"), bench.path("alias")).unwrap();
    assert_eq!(bench.run("filter spec.toml in alias/out").status, 2);
    fs::create_dir_all(bench.path("out/a")).unwrap();
    fs::hard_link(bench.path("in/a/one.wav"), bench.path("out/a/one.wav")).unwrap();
    let ran = bench.filter("--replace");
    assert_eq!(ran.status, 2);
    assert!(ran.stderr.contains("same file"), "{}", ran.stderr);
}

#[test]
fn existing_files_are_kept_without_replace_and_overwritten_with_it() {
    let bench = bench();
    assert_eq!(bench.filter("").status, 0);
    let first = bench.tree("out");
    fs::write(bench.path("out/a/one.wav"), b"stale").unwrap();
    let other = bench.tree("out");
    let again = bench.filter("");
    assert_eq!(again.status, 2);
    assert!(again.stderr.contains("--replace") && again.stderr.contains("one.wav"), "{}", again.stderr);
    assert_eq!(bench.tree("out"), other);
    assert_eq!(bench.filter("--replace").status, 0);
    assert_eq!(fs::read(bench.path("out/a/one.wav")).unwrap(), first[0].1);
    // A report from elsewhere is a file too.
    fs::write(bench.path("report.json"), b"keep me").unwrap();
    fs::remove_dir_all(bench.path("out")).unwrap();
    assert_eq!(bench.filter("--report report.json").status, 2);
    assert_eq!(fs::read(bench.path("report.json")).unwrap(), b"keep me");
}

#[test]
fn the_report_never_replaces_an_input_or_the_spec() {
    let bench = bench();
    for report in ["in/a/one.wav", "spec.toml", "out/a/one.wav", "in/new.json"] {
        let ran = bench.filter(&format!("--replace --report {report}"));
        assert_eq!(ran.status, 2, "{report}: {}", ran.stderr);
    }
    assert_eq!(fs::read_to_string(bench.path("spec.toml")).unwrap(), NOTCH_SPEC);
}

#[test]
fn an_impossible_spec_writes_nothing() {
    let bench = Bench::new(&NOTCH_SPEC.replace(
        "reduce_db = 3",
        "reduce_db = 3\n\n[[stage]]\nkind = \"lowpass\"\nfamily = \"butterworth\"\norder = 2\nedge_hz = 1500",
    ));
    bench.input("a.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 1)));
    let ran = bench.filter("");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(
        ran.stderr.contains("voice") && ran.stderr.contains("2000") && ran.stderr.contains("8000 Hz"),
        "{}",
        ran.stderr
    );
    assert!(!bench.path("out").exists());
}

#[test]
fn a_dry_run_writes_nothing_and_a_scan_finds_what_would_fail() {
    let bench = bench();
    let mut floats = vec![0.1f32; 9000];
    floats[4321] = f32::NAN;
    bench.input("bad.wav", &super::fixtures::wav_float(8000, 1, &floats));
    let dry = bench.filter("--dry-run");
    assert_eq!(dry.status, 0, "{}", dry.stderr);
    assert!(dry.stdout.contains("one.wav"), "{}", dry.stdout);
    let scanned = bench.filter("--dry-run --scan");
    assert_eq!(scanned.status, 3, "{}", scanned.stdout);
    assert!(scanned.stdout.contains("4321"), "{}", scanned.stdout);
    assert!(!bench.path("out").exists());
}

#[test]
fn no_temporary_files_or_journal_are_left() {
    let bench = bench();
    bench.input("bad.wav", b"RIFFxxxxWAVE");
    bench.filter("");
    let names: Vec<String> = bench.tree("out").into_iter().map(|(name, _)| name).collect();
    assert_eq!(names, ["a/one.wav", "bandproof-report.json"]);
}

#[test]
fn a_report_that_can_not_be_made_leaves_no_folder_behind() {
    let bench = bench();
    let ran = bench.run("filter spec.toml in new/out --report missing/report.json");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(ran.stderr.contains("missing/report.json") && ran.stderr.contains("choose a place"), "{}", ran.stderr);
    assert!(!ran.stderr.contains(".part"), "names a file that the user never sees: {}", ran.stderr);
    assert!(!bench.path("new").exists() && !bench.path("missing").exists());
}

#[test]
fn a_folder_where_a_file_should_go_is_refused() {
    let bench = bench();
    fs::create_dir_all(bench.path("out/a/one.wav")).unwrap();
    for more in ["", "--replace", "--report out", "--report out --replace"] {
        let ran = bench.filter(more);
        assert_eq!(ran.status, 2, "{more}: {}", ran.stderr);
        assert!(ran.stderr.contains("no regular file"), "{more}: {}", ran.stderr);
    }
    assert!(bench.tree("out").is_empty());
}

#[cfg(unix)]
#[test]
fn a_device_or_a_pipe_is_never_replaced_by_a_file() {
    use std::os::unix::fs::FileTypeExt;
    let bench = bench();
    let pipe = bench.path("pipe");
    assert!(std::process::Command::new("mkfifo").arg(&pipe).status().unwrap().success());
    std::os::unix::fs::symlink(&pipe, bench.path("alias")).unwrap();
    for more in ["--report pipe", "--report pipe --replace", "--report alias --replace"] {
        let ran = bench.filter(more);
        assert_eq!(ran.status, 2, "{more}: {}", ran.stderr);
        assert!(ran.stderr.contains("no regular file"), "{more}: {}", ran.stderr);
    }
    assert!(pipe.symlink_metadata().unwrap().file_type().is_fifo());
    assert!(bench.path("alias").symlink_metadata().unwrap().is_symlink());
    assert!(!bench.path("out").exists());
}

#[test]
fn the_files_that_would_be_overwritten_are_counted_in_plain_words() {
    let bench = bench();
    fs::write(bench.path("report.json"), b"keep me").unwrap();
    let one = bench.filter("--report report.json");
    assert!(one.stderr.contains("report.json exists already (report.json is no whole report"), "{}", one.stderr);
    fs::create_dir_all(bench.path("out/a")).unwrap();
    fs::write(bench.path("out/a/one.wav"), b"keep me").unwrap();
    let two = bench.filter("--report report.json");
    assert!(two.stderr.contains("one.wav exists already and so does one other file"), "{}", two.stderr);
}
