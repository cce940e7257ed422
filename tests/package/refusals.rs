//! What can't become a package is refused before anything is written, with a way out.

use super::dataset::{Dataset, listing};
use bandproof::package::Emit::{Bagit, Datapackage};
use bandproof::package::{Emit, PackageError};
use std::fs;
use std::path::Path;

fn sentence(result: Result<(), PackageError>) -> String {
    result.unwrap_err().to_string()
}

/// `check` refuses with these words and leaves the folder as it is.
fn refused(dataset: &Dataset, emit: Emit, words: &[&str]) {
    let before = listing(dataset.root.path());
    let text = sentence(dataset.check(emit));
    for word in words {
        assert!(text.contains(word), "no {word:?} in: {text}");
    }
    assert_eq!(listing(dataset.root.path()), before, "something was written");
}

#[test]
fn a_bag_needs_a_folder_named_data() {
    let dataset = Dataset::new(&["a.wav"]);
    let input = dataset.root.path().join("originals");
    for name in ["Data", "DATA", "data2", "data/..", "out"] {
        let text = sentence(dataset.check_places(Bagit, &input, &dataset.bag().join(name)));
        assert!(text.contains("must be named `data`"), "{name}: {text}");
    }
    for name in ["data/", "./data", "data/.", "nothing/../data", "data//", "data/nothing/..", "data/a/.."] {
        dataset.check_places(Bagit, &input, &dataset.bag().join(name)).unwrap();
    }
}

/// `/proc` takes no new files from anybody.
#[cfg(target_os = "linux")]
#[test]
fn a_bag_is_not_begun_where_its_manifests_can_not_be_written() {
    let mut dataset = Dataset::new(&["a.wav"]);
    let output = Path::new("/proc/data");
    dataset.report = output.join("report.json");
    let text = sentence(dataset.check_places(Bagit, &dataset.root.path().join("originals"), output));
    assert!(text.contains("/proc, can't be written to") && text.contains("manifests"), "{text}");
}

#[test]
fn a_bag_is_never_made_among_the_originals() {
    let dataset = Dataset::new(&["a.wav"]);
    let output = dataset.output();
    let check = |input: &Path| dataset.check_places(Bagit, input, &output);
    assert!(sentence(check(&dataset.bag())).contains("that is the input"));
    assert!(sentence(check(dataset.root.path())).contains("that lies inside the input"));
    let original = dataset.add_other("original.wav", "RIFF");
    assert!(sentence(check(&original)).contains("that is the folder of the input"));
    let elsewhere = dataset.root.path().join("original.wav");
    fs::write(&elsewhere, "RIFF").unwrap();
    check(&elsewhere).unwrap();
}

#[test]
fn a_bag_carries_its_report() {
    let mut dataset = Dataset::new(&["a.wav"]);
    for place in ["bag/report.json", "report.json", "bag/data/../report.json"] {
        dataset.report = dataset.root.path().join(place);
        refused(&dataset, Bagit, &["report.json", "not in the output folder", "--report"]);
    }
    dataset.report = dataset.output().join("reports/report.json");
    dataset.check(Bagit).unwrap();
}

#[test]
fn a_table_can_not_take_the_place_of_a_tag_file() {
    for name in ["bagit.txt", "Manifest-SHA256.txt", "manifest-md5.txt", "fetch.txt", "bag-info.txt"] {
        let mut dataset = Dataset::new(&["a.wav"]);
        dataset.table = Some(dataset.bag().join(name));
        refused(&dataset, Bagit, &[name, "--emit bagit", "the table"]);
    }
}

#[test]
fn manifests_of_another_program_are_not_left_to_become_untrue() {
    for name in ["manifest-md5.txt", "tagmanifest-sha512.txt", "fetch.txt"] {
        let dataset = Dataset::new(&["a.wav"]);
        dataset.add_other(name, "");
        refused(&dataset, Bagit, &[name, "remove it"]);
        dataset.write(Bagit).unwrap_err();
    }
    let dataset = Dataset::new(&["a.wav"]);
    dataset.add_other("manifest-notes.md", "");
    dataset.check(Bagit).unwrap();
}

#[test]
fn temporary_files_of_an_interrupted_run_are_not_packed() {
    let dataset = Dataset::new(&["a.wav"]);
    // A run takes away what a killed one left where it writes; what is there then is being
    // written.
    dataset.add_other("data/.bandproof-x1y2z3.part", "half");
    dataset.check(Bagit).unwrap();
    let message = dataset.write(Bagit).unwrap_err().to_string();
    assert!(message.contains(".bandproof-x1y2z3.part") && message.contains("delete it"), "{message}");
    assert!(dataset.files(Bagit).iter().all(|file| !file.exists()));
    // It does not look into folders in which it has nothing to write.
    let dataset = Dataset::new(&["a.wav"]);
    dataset.add_other("data/deep/.bandproof-x1y2z3.part", "half");
    refused(&dataset, Bagit, &[".bandproof-x1y2z3.part", "delete it"]);
}

#[cfg(unix)]
#[test]
fn links_and_pipes_are_no_payload() {
    let links = Dataset::new(&["a.wav"]);
    std::os::unix::fs::symlink("a.wav", links.output().join("b.wav")).unwrap();
    refused(&links, Bagit, &["b.wav is a link"]);
    links.write(Bagit).unwrap_err();

    let sockets = Dataset::new(&["a.wav"]);
    let _listener = std::os::unix::net::UnixListener::bind(sockets.output().join("s")).unwrap();
    refused(&sockets, Bagit, &["neither a file nor a folder"]);

    let linked = Dataset::new(&["a.wav"]);
    let link = linked.root.path().join("data");
    std::os::unix::fs::symlink(linked.output(), &link).unwrap();
    let text = sentence(linked.check_places(Bagit, &linked.root.path().join("originals"), &link));
    assert!(text.contains("data is a link"), "{text}");
}

#[cfg(unix)]
#[test]
fn names_that_are_not_utf8_are_refused() {
    use std::os::unix::ffi::OsStrExt;
    let odd = Path::new(std::ffi::OsStr::from_bytes(b"d/\xFF.wav"));
    let planned = Dataset::new(&[odd]);
    refused(&planned, Bagit, &["is not UTF-8", "--exclude"]);
    refused(&planned, Datapackage, &["is not UTF-8", "--exclude"]);
    planned.write(Bagit).unwrap_err();
    planned.write(Datapackage).unwrap_err();

    // One that lies there already concerns the bag only, which must list it.
    let mut there = Dataset::new(&["a.wav"]);
    assert!(there.add_output(odd));
    there.items.retain(|item| item.path != odd);
    refused(&there, Bagit, &["is not UTF-8"]);
    there.check(Datapackage).unwrap();
}

#[test]
fn a_descriptor_lists_only_what_lies_below_it() {
    let mut dataset = Dataset::new(&["a.wav"]);
    for place in ["originals/report.json", "bag/data/reports/report.json"] {
        dataset.report = dataset.root.path().join(place);
        refused(&dataset, Datapackage, &["report.json", "below its descriptor", "--report"]);
    }
}

#[test]
fn paths_that_the_standard_forbids_are_refused_by_name() {
    for (path, why) in
        [("x/.hidden/a.wav", "dot"), ("~a.wav", "`~`"), ("a\\b.wav", "backslash"), ("a\nb.wav", "line break")]
    {
        let dataset = Dataset::new(&[path]);
        refused(&dataset, Datapackage, &[path, why, "--exclude"]);
        dataset.write(Datapackage).unwrap_err();
    }
    let mut dataset = Dataset::new(&["a.wav"]);
    dataset.report = dataset.output().join(".report.json");
    refused(&dataset, Datapackage, &[".report.json"]);
}

#[test]
fn report_and_table_can_not_take_the_descriptors_place() {
    let mut dataset = Dataset::new(&["a.wav"]);
    dataset.table = Some(dataset.output().join("Datapackage.json"));
    refused(&dataset, Datapackage, &["Datapackage.json", "the table"]);
    dataset.table = Some(dataset.output().join("tables/datapackage.json"));
    dataset.check(Datapackage).unwrap();
    dataset.report = dataset.output().join("datapackage.json");
    refused(&dataset, Datapackage, &["datapackage.json", "the report"]);
}

#[test]
fn folders_that_are_yet_to_be_made_are_no_hindrance() {
    let mut dataset = Dataset::new(&["a.wav"]);
    let input = dataset.root.path().join("originals");
    let output = dataset.root.path().join("not/yet/there/data");
    dataset.report = output.join("bandproof-report.json");
    dataset.check_places(Bagit, &input, &output).unwrap();
    dataset.check_places(Datapackage, &input, &output).unwrap();
    assert!(!dataset.root.path().join("not").exists());
}
