//! Inputs filtered a second time.

use crate::dataset::{DONE, Dataset, entry_mut, told};
use crate::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav_float, wav16};
use std::fs;

#[test]
fn a_flipped_bit_of_an_input_gives_other_outputs() {
    let dataset = Dataset::new();
    for path in DONE {
        let file = format!("in/{path}");
        // The top bit of a sample in the middle.
        let middle = (fs::read(dataset.path(&file)).unwrap().len() / 2) | 1;
        dataset.harm(&file, |bytes| bytes[middle] ^= 0x20);
        let (status, document) = dataset.json("--input in --replay");
        assert_eq!((status, told(&document)), (1, vec![format!("changed input {path}"), format!("replay - {path}")]));
        let replay = &document["disagreements"][1];
        let output = entry_mut(&mut dataset.bench.report(), path)["output"]["sha256"].clone();
        assert_eq!(replay["sha256_then"], output);
        assert!(replay["sha256_now"].is_string() && replay["sha256_now"] != output, "{replay}");
        assert_eq!((&document["replay"]["same"], &document["replay"]["different"]), (&3.into(), &1.into()));
        dataset.harm(&file, |bytes| bytes[middle] ^= 0x20);
    }
}

#[test]
fn a_recording_that_fails_now_or_failed_then_is_told() {
    let dataset = Dataset::new();
    let good = fs::read(dataset.path("in/a.wav")).unwrap();
    dataset.bench.input("broken.wav", &good);
    dataset.bench.input("a.wav", b"RIFF, and then nothing");
    let (status, document) = dataset.json("--input in --replay");
    assert_eq!(status, 1);
    assert_eq!(told(&document), ["changed input a.wav", "replay - a.wav", "replay - broken.wav"]);
    let (fails, works) = (&document["disagreements"][1], &document["disagreements"][2]);
    assert!(fails["error_then"].is_null() && fails["error_now"].is_string(), "{fails}");
    assert!(works["error_then"].is_string() && works["error_now"].is_null(), "{works}");
    // Gone altogether, there is nothing to filter.
    fs::remove_file(dataset.path("in/a.wav")).unwrap();
    let (_, document) = dataset.json("--input in --replay");
    assert_eq!(document["replay"]["not_done"], 1);
}

#[test]
fn outputs_of_every_kind_come_out_again() {
    let loud = hum_and_noise(8000, 2.0, 0.9, 5);
    for (output, gain) in [
        ("encoding = \"same\"\noverload = \"scale\"", 12),
        ("encoding = \"pcm16\"\noverload = \"clip\"", 12),
        ("encoding = \"float32\"", 3),
        ("encoding = \"pcm24\"\ndither = \"none\"\noverload = \"scale\"", 0),
    ] {
        let bench = Bench::new(&format!("[output]\n{output}\ngain_db = {gain}\n{NOTCH_SPEC}"));
        bench.input("int.wav", &wav16(8000, 1, &loud));
        bench.input("float.wav", &wav_float(8000, 1, &loud.iter().map(|&s| s as f32).collect::<Vec<_>>()));
        let dataset = Dataset::filtered(bench);
        assert_eq!(dataset.bench.report()["summary"]["done"], 2);
        assert_eq!(dataset.found("--input in --replay"), [""; 0], "{output}");
    }
}

#[test]
fn figures_of_an_output_that_were_changed_are_found() {
    let dataset = Dataset::new();
    dataset.edit(|report| {
        let output = &mut entry_mut(report, "a.wav")["output"];
        output["peak_dbfs"] = (-90.0).into();
        output["clipped_samples"] = 3.into();
        output["gain_db"] = 1.0.into();
    });
    assert_eq!(dataset.found("--input in"), [""; 0], "only filtering shows it");
    let (_, document) = dataset.json("--input in --replay");
    let figures: Vec<_> = document["disagreements"].as_array().unwrap().iter().map(|one| &one["figure"]).collect();
    assert_eq!(figures, ["peak_dbfs", "clipped_samples", "gain_db"]);
}

#[test]
fn sections_that_were_changed_are_found_to_the_last_bit() {
    let dataset = Dataset::new();
    dataset.edit(|report| {
        let coefficient = &mut report["designs"][0]["sections"][0]["a"][1];
        *coefficient = f64::from_bits(coefficient.as_f64().unwrap().to_bits() ^ 1).into();
    });
    assert_eq!(dataset.found("--input in"), [""; 0]);
    let (status, document) = dataset.json("--input in --replay");
    assert_eq!((status, told(&document)), (1, vec!["design - -".to_owned()]));
    let one = &document["disagreements"][0];
    assert_eq!(one["rate_hz"], 8000);
    assert!(one["what"].as_str().unwrap().starts_with("a[1] of section 1 of 1 is -1.9"), "{one}");
    // A design that is missing, and a spec that comes to another.
    dataset.edit(|report| _ = report["designs"].as_array_mut().unwrap().remove(0));
    assert_eq!(told(&dataset.json("--input in --replay").1), ["design - -"]);
    let dataset = Dataset::new();
    dataset.edit(|report| report["spec"]["normalized"]["stage"][0]["width_hz"] = 9.into());
    let found = told(&dataset.json("--input in --replay").1);
    let replays = DONE.map(|path| format!("replay - {path}"));
    assert_eq!(found, [["design - -".to_owned(), "design - -".to_owned()].as_slice(), &replays].concat());
}
