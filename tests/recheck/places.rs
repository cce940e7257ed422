//! Where a dataset lies, and names that are hard to write down.

use crate::dataset::{Dataset, REPORT};
use crate::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use std::fs;

fn recording(seed: u64) -> Vec<u8> {
    wav16(8000, 1, &hum_and_noise(8000, 1.5, 0.2, seed))
}

#[test]
fn a_dataset_that_moved_is_found_where_the_options_say() {
    let dataset = Dataset::new();
    fs::create_dir(dataset.path("archive")).unwrap();
    fs::rename(dataset.path("in"), dataset.path("archive/before")).unwrap();
    fs::rename(dataset.path("out"), dataset.path("archive/after")).unwrap();
    fs::rename(dataset.path("archive/after/bandproof-report.json"), dataset.path("report.json")).unwrap();
    let run = |arguments: &str| dataset.bench.run(&format!("recheck {arguments}"));
    let ran = run("report.json --input archive/before --output archive/after --replay");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    // Beside the report there is nothing, and it is said what to do.
    let ran = run("report.json --input archive/before/");
    assert_eq!(ran.status, 1);
    assert!(ran.stdout.contains("None of the outputs is below .: --output says where"), "{}", ran.stdout);
    let ran = run("report.json --output archive/before --input archive/after");
    assert_eq!(ran.status, 1, "the wrong way round: {}", ran.stdout);
}

#[test]
fn a_folder_that_is_not_there_is_refused() {
    let dataset = Dataset::new();
    for (more, part) in [
        ("--input nowhere", "--input nowhere can't be read: "),
        ("--output nowhere", "--output nowhere can't be read: "),
        ("--input in/a.wav", "--input in/a.wav is a file, and the report lists 4 recordings"),
        ("--output out/a.wav", "--output out/a.wav is a file"),
    ] {
        let ran = dataset.recheck(more);
        assert_eq!((ran.status, ran.stdout.as_str()), (2, ""), "{more}");
        assert!(ran.stderr.starts_with(&format!("bandproof: {part}")), "{}", ran.stderr);
    }
    for more in ["--replay", "--remeasure", "--csv x.csv", "--input in --csv x.csv"] {
        assert_eq!(dataset.recheck(more).status, 2, "{more}");
    }
}

#[test]
fn one_recording_may_be_given_by_itself() {
    let bench = Bench::new(NOTCH_SPEC);
    bench.input("one.wav", &recording(1));
    bench.input("other.wav", &recording(2));
    assert_eq!(bench.run("filter spec.toml in/one.wav out --quiet").status, 0);
    let dataset = Dataset { bench };
    assert_eq!(dataset.found("--input in/one.wav --replay"), [""; 0]);
    assert_eq!(dataset.found("--input in/one.wav --output out/one.wav"), [""; 0]);
    assert_eq!(dataset.found("--input in/other.wav"), ["changed input one.wav"]);
    // The folder holds another that the report does not list.
    assert_eq!(dataset.found("--input in"), ["new input other.wav"]);
}

#[test]
fn inputs_within_the_folder_of_outputs_are_not_new_there() {
    let bench = Bench::new(NOTCH_SPEC);
    bench.write("data/raw/a.wav", &recording(1));
    assert_eq!(bench.run("filter spec.toml data/raw data --quiet").status, 0);
    let recheck = |more: &str| bench.run(&format!("recheck data/bandproof-report.json {more}"));
    let ran = recheck("--input data/raw");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    bench.write("data/raw/b.wav", &recording(1));
    let ran = recheck("--input data/raw");
    assert!(ran.stdout.contains("  b.wav (input)") && !ran.stdout.contains("raw/b.wav"), "{}", ran.stdout);
}

#[cfg(unix)]
#[test]
fn names_that_are_not_utf8_are_found_and_not_taken_for_others() {
    use std::ffi::OsStr;
    use std::os::unix::ffi::OsStrExt;
    let name = |bytes: &[u8]| OsStr::from_bytes(bytes).to_owned();
    let bench = Bench::new(NOTCH_SPEC);
    // Shown alike, and two files all the same; and a plain name that looks escaped.
    let names = [name(b"50%\xFF.wav"), name(b"50%25%FF.wav"), name(b"plain%41.wav")];
    for (name, seed) in names.iter().zip(1..) {
        fs::write(bench.path("in").join(name), recording(seed)).unwrap();
    }
    let dataset = Dataset::filtered(bench);
    assert_eq!(dataset.bench.report()["recordings"][0]["path"], dataset.bench.report()["recordings"][1]["path"]);
    assert_eq!(dataset.found("--input in --replay"), [""; 0]);
    for (name, shown) in names.iter().zip(["50%25%FF.wav", "50%25%FF.wav", "plain%41.wav"]) {
        let file = dataset.path("out").join(name);
        let bytes = fs::read(&file).unwrap();
        let mut other = bytes.clone();
        other[100] ^= 4;
        fs::write(&file, other).unwrap();
        assert_eq!(dataset.found("--input in"), [format!("changed output {shown}")]);
        fs::remove_file(&file).unwrap();
        assert_eq!(dataset.found("--input in"), [format!("missing output {shown}")]);
        fs::write(&file, bytes).unwrap();
    }
    fs::rename(dataset.path("out/plain%41.wav"), dataset.path("out/plainA.wav")).unwrap();
    assert_eq!(dataset.found(""), ["missing output plain%41.wav", "new output plainA.wav"]);
}

#[test]
fn odd_names_are_names_all_the_same() {
    let bench = Bench::new(NOTCH_SPEC);
    for name in ["a\"quote\".wav", "new\nline.wav", "..dots...wav", "\u{4f4e}\u{97f3}.wav"] {
        bench.input(name, &recording(1));
    }
    #[cfg(unix)]
    bench.input("back\\slash.wav", &recording(2));
    let dataset = Dataset::filtered(bench);
    assert_eq!(dataset.found("--input in --replay"), [""; 0]);
    fs::remove_file(dataset.path("out/new\nline.wav")).unwrap();
    let ran = dataset.recheck("");
    assert!(ran.stdout.contains("  new\\nline.wav (output)\n"), "{}", ran.stdout);
    assert!(dataset.path(REPORT).exists());
}
