//! What a report of thousands of recordings says.

use super::fixtures::NOTCH_SPEC;
use super::tiny_recordings;
use bandproof::report::{Recording, Status, read_report};
use std::collections::HashMap;
use std::fs::File;
use std::io::BufReader;

#[test]
fn three_thousand_recordings_have_one_entry_each_in_the_order_of_their_paths() {
    let (bench, paths) = tiny_recordings(NOTCH_SPEC, 3000);
    bench.input("card-3/broken.wav", b"RIFF");
    let ran = bench.filter("--quiet --jobs 2");
    assert_eq!(ran.status, 3, "{}", ran.stderr);

    let file = BufReader::new(File::open(bench.path("out/bandproof-report.json")).unwrap());
    let mut entries: Vec<Recording> = Vec::new();
    let (head, summary) = read_report(file, &mut |recording| {
        entries.push(recording);
        Ok(())
    })
    .unwrap();
    assert!(head.complete);
    assert_eq!((summary.recordings, summary.done, summary.failed), (3001, 3000, 1));

    let mut expected = paths;
    expected.push("card-3/broken.wav".into());
    expected.sort();
    let found: Vec<&str> = entries.iter().map(|entry| entry.path.as_str()).collect();
    assert_eq!(found, expected);

    // Each entry is of its own recording: seven contents, seven pairs of hashes.
    let mut outputs: HashMap<String, String> = HashMap::new();
    for entry in entries.iter().filter(|entry| entry.path != "card-3/broken.wav") {
        let (input, output) = (entry.input.as_ref().unwrap(), entry.output.as_ref().unwrap());
        assert_eq!((entry.status, &output.path), (Status::Done, &entry.path));
        let of_input = outputs.entry(input.sha256.clone().unwrap()).or_insert_with(|| output.sha256.clone());
        assert_eq!(*of_input, output.sha256, "{}", entry.path);
    }
    assert_eq!(outputs.len(), 7);
}
