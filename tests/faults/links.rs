//! Links, which are not followed into loops, and never written through.

use super::fixtures::{Bench, NOTCH_SPEC, entry, hum_and_noise, wav16};
use std::fs;
use std::os::unix::fs::symlink;

fn bench() -> Bench {
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("a/one.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 1)));
    bench.input("b/one.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 2)));
    bench.input("b/two.wav", &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, 3)));
    bench
}

#[test]
fn link_loops_are_counted_and_not_followed() {
    let bench = bench();
    let links = [
        ("..", "in/a/up"),
        (".", "in/here"),
        ("x.wav", "in/x.wav"),
        ("one.wav", "in/a/again.wav"),
        ("gone", "in/b/gone.wav"),
    ];
    links.iter().for_each(|(to, at)| symlink(to, bench.path(at)).unwrap());
    symlink(bench.path("in"), bench.path("in/b/root")).unwrap();
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let report = bench.report();
    assert_eq!((&report["summary"]["done"], &report["summary"]["skipped"]["other_files"]), (&3.into(), &6.into()));
}

#[test]
fn an_input_that_is_a_link_to_a_folder_is_that_folder() {
    let bench = bench();
    symlink("in", bench.path("season")).unwrap();
    assert_eq!(bench.filter("").status, 0);
    let ran = bench.run("filter spec.toml season linked");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let wavs =
        |folder: &str| bench.tree(folder).into_iter().filter(|(name, _)| name.ends_with(".wav")).collect::<Vec<_>>();
    assert!(wavs("linked") == wavs("out") && wavs("out").len() == 3);
    // A link to itself is nowhere.
    symlink("loop", bench.path("loop")).unwrap();
    let ran = bench.run("filter spec.toml loop other");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(ran.stderr.contains("loop can't be read"), "{}", ran.stderr);
    assert!(!bench.path("other").exists());
}

#[test]
fn nothing_is_written_through_a_link_that_leads_out_of_the_output_folder() {
    for more in ["", "--replace"] {
        let bench = bench();
        bench.write("precious/one.wav", b"somebody else's");
        fs::create_dir(bench.path("out")).unwrap();
        symlink("../precious", bench.path("out/b")).unwrap();
        let ran = bench.filter(more);
        assert_eq!(ran.status, 2, "{more}: {}", ran.stderr);
        let words = ["out/b leads out of the output folder", "precious", "remove the link"];
        words.iter().for_each(|word| assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr));
        assert_eq!(bench.tree("precious"), [("one.wav".to_owned(), b"somebody else's".to_vec())]);
        assert_eq!(fs::read_dir(bench.path("out")).unwrap().count(), 1, "{more}: something was written");
        // The folder itself may be a link: that is the place that was named.
        fs::remove_file(bench.path("out/b")).unwrap();
        fs::rename(bench.path("out"), bench.path("disk")).unwrap();
        symlink("disk", bench.path("out")).unwrap();
        assert_eq!(bench.filter(more).status, 0);
        assert_eq!(bench.tree("disk").len(), 4);
    }
}

#[test]
fn two_names_that_a_link_makes_one_file_keep_the_first() {
    let bench = bench();
    fs::create_dir_all(bench.path("out/a")).unwrap();
    symlink("a", bench.path("out/b")).unwrap();
    let whole = Bench::new(NOTCH_SPEC);
    bench.tree("in").into_iter().for_each(|(name, bytes)| _ = whole.input(&name, &bytes));
    assert_eq!(whole.filter("").status, 0);
    // And again: the first is kept, the second still not written.
    for more in ["", "", "--replace"] {
        let ran = bench.filter(more);
        assert_eq!(ran.status, 3, "{more}: {}", ran.stderr);
        let report = bench.report();
        let error = entry(&report, "b/one.wav")["error"].as_str().unwrap();
        assert!(error.contains("the same file as that of a/one.wav"), "{error}");
        assert_eq!((&report["summary"]["done"], &report["summary"]["failed"]), (&2.into(), &1.into()), "{more}");
        assert!(bench.tree("out/a")[0] == whole.tree("out/a")[0], "{more}: the first was overwritten");
        assert!(bench.tree("out/a")[1].1 == whole.tree("out/b")[1].1, "{more}");
        let planned = bench.filter(&format!("--dry-run {more}"));
        let unwrapped = planned.stdout.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(unwrapped.contains("the same file as that of a/one.wav"), "{more}: {unwrapped}");
    }
}

/// The journal's name is the run's own, whatever has it.
#[test]
fn a_journal_that_is_a_link_or_a_pipe_is_replaced_and_not_written_through() {
    let bench = bench();
    bench.write("precious", b"somebody else's");
    for make in ["ln -s ../precious", "mkfifo"] {
        fs::create_dir_all(bench.path("out")).unwrap();
        let made = format!("{make} out/.bandproof-journal");
        assert!(
            std::process::Command::new("sh")
                .args(["-c", &made])
                .current_dir(bench.path(""))
                .status()
                .unwrap()
                .success()
        );
        let ran = bench.filter("");
        assert_eq!(ran.status, 0, "{make}: {}", ran.stderr);
        assert_eq!(fs::read(bench.path("precious")).unwrap(), b"somebody else's");
        assert!(bench.path("out/.bandproof-journal").symlink_metadata().is_err(), "{make}");
        fs::remove_dir_all(bench.path("out")).unwrap();
    }
    // A folder can't be replaced.
    fs::create_dir_all(bench.path("out/.bandproof-journal")).unwrap();
    let ran = bench.filter("");
    assert_eq!(ran.status, 2, "{}", ran.stderr);
    assert!(ran.stderr.contains("can't be written"), "{}", ran.stderr);
    assert!(bench.tree("out").is_empty());
}

/// A rename takes the place of a link, not of what it leads to.
#[test]
fn a_link_under_an_outputs_name_is_replaced_and_not_written_through() {
    let bench = bench();
    bench.write("precious.wav", b"somebody else's");
    fs::create_dir_all(bench.path("out/a")).unwrap();
    symlink("../../precious.wav", bench.path("out/a/one.wav")).unwrap();
    assert_eq!(bench.filter("").status, 2);
    assert_eq!(bench.filter("--replace").status, 0);
    assert_eq!(fs::read(bench.path("precious.wav")).unwrap(), b"somebody else's");
    assert!(!bench.path("out/a/one.wav").is_symlink());
}
