//! Files changed, missing and new, before and after.

use crate::dataset::{DONE, Dataset, entry_mut, told};
use crate::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav16};
use std::fs;

#[test]
fn a_dataset_that_nobody_touched_agrees() {
    let dataset = Dataset::new();
    for more in ["", "--input in", "--input in --replay", "--jobs 1"] {
        assert_eq!(dataset.found(more), [""; 0], "{more}");
    }
    let (_, document) = dataset.json("--input in --replay");
    let counts = |side: &str, key: &str| document[side][key].as_u64().unwrap();
    assert_eq!((counts("recordings", "done"), counts("recordings", "failed")), (3, 1));
    assert_eq!((counts("outputs", "unchanged"), counts("inputs", "unchanged")), (3, 3));
    // The one that failed was never read to its end.
    assert_eq!((counts("inputs", "without_hash"), counts("replay", "same")), (1, 4));
    let bytes = |folder: &str| DONE.iter().map(|path| dataset.path(folder).join(path).metadata().unwrap().len()).sum();
    let bytes: (u64, u64) = (bytes("out"), bytes("in"));
    assert_eq!((counts("outputs", "bytes_read"), counts("inputs", "bytes_read")), bytes);
}

#[test]
fn one_flipped_bit_anywhere_in_any_file_is_found() {
    let dataset = Dataset::new();
    for folder in ["out", "in"] {
        let side = if folder == "out" { "output" } else { "input" };
        for path in DONE {
            let file = format!("{folder}/{path}");
            let length = fs::read(dataset.path(&file)).unwrap().len();
            // The container, the samples and the last byte.
            for (offset, bit) in [(0, 0), (20, 3), (44, 7), (length / 2, 0), (length - 1, 7)] {
                dataset.harm(&file, |bytes| bytes[offset] ^= 1 << bit);
                assert_eq!(dataset.found("--input in"), [format!("changed {side} {path}")], "byte {offset}");
                dataset.harm(&file, |bytes| bytes[offset] ^= 1 << bit);
            }
        }
    }
    assert_eq!(dataset.found("--input in"), [""; 0]);
}

#[test]
fn a_file_of_another_length_is_not_read_to_be_found_changed() {
    let dataset = Dataset::new();
    dataset.harm("out/a.wav", |bytes| _ = bytes.pop());
    dataset.harm("out/station/b.wav", |bytes| bytes.push(0));
    let (status, document) = dataset.json("");
    assert_eq!(status, 1);
    assert_eq!(told(&document), ["changed output a.wav", "changed output station/b.wav"]);
    let one = &document["disagreements"][0];
    let length = fs::read(dataset.path("out/a.wav")).unwrap().len() as u64;
    assert_eq!((one["bytes_then"].as_u64(), one["bytes_now"].as_u64()), (Some(length + 1), Some(length)));
    assert!(one["sha256_now"].is_null() && one["sha256_then"].is_string(), "{one}");
    let read = dataset.path("out/station/two.WAV").metadata().unwrap().len();
    assert_eq!(document["outputs"]["bytes_read"], read);
}

#[test]
fn missing_and_new_files_are_named() {
    let dataset = Dataset::new();
    fs::remove_file(dataset.path("out/a.wav")).unwrap();
    fs::rename(dataset.path("in/station/b.wav"), dataset.path("in/station/moved.bwf")).unwrap();
    dataset.bench.write("out/deep/down/extra.WAVE", b"whatever");
    // No recordings: other files, companions, and links, which are not followed.
    dataset.bench.write("out/notes.txt", b"");
    dataset.bench.write("out/._a.wav", b"");
    #[cfg(unix)]
    std::os::unix::fs::symlink(dataset.path("out/station"), dataset.path("out/link.wav")).unwrap();
    assert_eq!(
        dataset.found("--input in"),
        [
            "missing output a.wav",
            "new output deep/down/extra.WAVE",
            "missing input station/b.wav",
            "new input station/moved.bwf",
        ]
    );
    // A whole folder that is gone, and a file where it was.
    fs::remove_dir_all(dataset.path("out/station")).unwrap();
    fs::write(dataset.path("out/station"), b"").unwrap();
    let found = dataset.found("");
    assert!(found.contains(&"missing output station/b.wav".to_owned()), "{found:?}");
}

#[test]
fn an_output_of_a_recording_that_failed_is_new() {
    let dataset = Dataset::new();
    dataset.bench.write("out/broken.wav", b"RIFF, and then nothing");
    assert_eq!(dataset.found("--input in"), ["new output broken.wav"]);
    // Its input is known all the same, and missed.
    fs::remove_file(dataset.path("out/broken.wav")).unwrap();
    fs::remove_file(dataset.path("in/broken.wav")).unwrap();
    assert_eq!(dataset.found("--input in"), ["missing input broken.wav"]);
}

#[test]
fn an_input_that_failed_after_it_was_read_is_checked_by_its_hash() {
    let loud = "[output]\nencoding = \"pcm16\"\ngain_db = 20\n".to_owned() + NOTCH_SPEC;
    let bench = Bench::new(&loud);
    bench.input("loud.wav", &wav16(8000, 1, &hum_and_noise(8000, 2.0, 0.9, 1)));
    bench.input("soft.wav", &wav16(8000, 1, &hum_and_noise(8000, 2.0, 0.0, 1)));
    let dataset = Dataset::filtered(bench);
    let report = dataset.bench.report();
    assert_eq!((&report["summary"]["failed"], &report["summary"]["done"]), (&1.into(), &1.into()));
    assert_eq!(dataset.found("--input in --replay"), [""; 0]);
    dataset.harm("in/loud.wav", |bytes| bytes[1000] ^= 1);
    assert_eq!(dataset.found("--input in --replay"), ["changed input loud.wav"], "and it still overloads");
}

#[test]
fn a_hash_or_a_length_changed_in_the_report_is_found() {
    let other = "0123456789abcdef".repeat(4);
    for path in DONE {
        let dataset = Dataset::new();
        dataset.edit(|report| entry_mut(report, path)["output"]["sha256"] = other.clone().into());
        assert_eq!(dataset.found("--input in"), [format!("changed output {path}")]);
        dataset.edit(|report| entry_mut(report, path)["input"]["bytes"] = 1.into());
        assert_eq!(dataset.found("--input in"), [format!("changed input {path}"), format!("changed output {path}")]);
    }
}

#[test]
fn an_entry_taken_out_of_the_report_is_found_twice() {
    let dataset = Dataset::new();
    dataset.edit(|report| _ = report["recordings"].as_array_mut().unwrap().remove(0));
    assert_eq!(dataset.found("--input in"), ["report - -", "report - -", "new input a.wav", "new output a.wav"]);
}

#[cfg(unix)]
#[test]
fn what_can_not_be_read_is_told_apart_from_what_is_missing() {
    let dataset = Dataset::new();
    fs::remove_file(dataset.path("out/a.wav")).unwrap();
    fs::create_dir(dataset.path("out/a.wav")).unwrap();
    let ran = dataset.recheck("");
    assert_eq!(ran.status, 3, "{}", ran.stdout);
    assert!(ran.stderr.contains("a.wav: it is no file"), "{}", ran.stderr);
    let (status, document) = dataset.json("");
    assert_eq!((status, &document["agrees"]), (3, &false.into()));
    assert_eq!(document["unreadable"][0]["path"], "a.wav");
    assert_eq!(document["outputs"]["unreadable"], 1);
    // It outweighs a disagreement, and both are told.
    dataset.harm("out/station/b.wav", |bytes| bytes[60] ^= 1);
    let (status, document) = dataset.json("");
    assert_eq!((status, told(&document)), (3, vec!["changed output station/b.wav".to_owned()]));
    // A pipe would wait for ever for somebody to write into it.
    fs::remove_dir(dataset.path("out/a.wav")).unwrap();
    let made = std::process::Command::new("mkfifo").arg(dataset.path("out/a.wav")).status().unwrap();
    assert!(made.success());
    assert_eq!(dataset.recheck("").status, 3);
}

#[test]
fn a_recheck_writes_nothing() {
    let dataset = Dataset::new();
    let before = (dataset.bench.tree("out"), dataset.bench.tree("in"));
    for more in ["", "--input in", "--input in --replay --remeasure"] {
        assert_eq!(dataset.recheck(more).status, 0);
    }
    assert_eq!((dataset.bench.tree("out"), dataset.bench.tree("in")), before);
}
