//! Bags: valid, complete, written in an order that can be interrupted.

use super::bag_reader::{faults, info, manifest};
use super::dataset::{Dataset, STARTED, listing};
use bandproof::package::Emit::Bagit;
use std::fs;

const TAG_FILES: [&str; 4] = ["bag-info.txt", "bagit.txt", "manifest-sha256.txt", "tagmanifest-sha256.txt"];

fn dataset() -> Dataset {
    Dataset::new(&["station-a/0512.wav", "station-a/0612.wav", "station-a.wav", "station-a-2/50%.wav", "z.wav"])
}

#[test]
fn a_finished_run_becomes_a_valid_bag() {
    let dataset = dataset();
    dataset.check(Bagit).unwrap();
    dataset.write(Bagit).unwrap();
    assert_eq!(faults(&dataset.bag()), [""; 0]);
    let info = info(&dataset.bag());
    assert_eq!(info["Bagging-Date"], STARTED[..10]);
    assert_eq!(info["External-Description"], "Reed-bed recorders");
    assert_eq!(info["Bag-Software-Agent"], format!("bandproof {}", env!("CARGO_PKG_VERSION")));
}

#[test]
fn exactly_the_files_that_were_announced_are_added() {
    let dataset = dataset();
    let before = listing(&dataset.bag());
    dataset.write(Bagit).unwrap();
    let mut announced = dataset.files(Bagit);
    announced.sort();
    assert_eq!(announced, TAG_FILES.map(|name| dataset.bag().join(name)));
    let added: Vec<_> = listing(&dataset.bag()).into_iter().filter(|path| !before.contains(path)).collect();
    assert_eq!(added, TAG_FILES.map(std::path::PathBuf::from));
}

#[test]
fn what_lay_in_the_folder_before_is_listed_too() {
    let dataset = dataset();
    dataset.add_other("data/notes/readme.txt", "field notes");
    dataset.add_other("data/.DS_Store", "hidden");
    dataset.add_other("data/empty", "");
    fs::create_dir(dataset.output().join("no-files-in-here")).unwrap();
    dataset.write(Bagit).unwrap();
    assert_eq!(faults(&dataset.bag()), [""; 0]);
    let listed = manifest(&dataset.bag().join("manifest-sha256.txt"), &mut Vec::new());
    assert_eq!(listed.len(), dataset.items.len() + 1 + 3);
}

#[test]
fn hashes_of_outputs_are_those_of_the_run() {
    let mut dataset = dataset();
    dataset.add_other("data/station-a/0513.wav", "of an earlier run");
    for item in &mut dataset.items {
        item.sha256 = "0".repeat(64);
    }
    dataset.write(Bagit).unwrap();
    let listed = manifest(&dataset.bag().join("manifest-sha256.txt"), &mut Vec::new());
    let from_run: Vec<_> = listed.iter().filter(|(_, hash)| hash.bytes().all(|digit| digit == b'0')).collect();
    assert_eq!(from_run.len(), dataset.items.len(), "{listed:?}");
    assert_eq!(faults(&dataset.bag()).len(), dataset.items.len(), "a hash that is not true is seen");
}

#[test]
fn manifests_are_sorted_by_path_byte_by_byte() {
    let dataset = dataset();
    dataset.write(Bagit).unwrap();
    for name in ["manifest-sha256.txt", "tagmanifest-sha256.txt"] {
        let text = fs::read_to_string(dataset.bag().join(name)).unwrap();
        let paths: Vec<&str> = text.lines().map(|line| &line[66..]).collect();
        assert!(paths.len() > 2 && paths.is_sorted(), "{paths:?}");
    }
}

#[test]
fn the_order_of_outputs_does_not_matter_for_the_bag() {
    let mut dataset = dataset();
    dataset.items.reverse();
    dataset.write(Bagit).unwrap();
    assert_eq!(faults(&dataset.bag()), [""; 0]);
}

#[test]
fn the_same_run_gives_the_same_bytes() {
    let (one, two) = (dataset(), dataset());
    one.write(Bagit).unwrap();
    two.write(Bagit).unwrap();
    for name in TAG_FILES {
        assert_eq!(fs::read(one.bag().join(name)).unwrap(), fs::read(two.bag().join(name)).unwrap(), "{name}");
    }
}

#[test]
fn the_test_sees_a_changed_byte_a_new_file_and_a_missing_one() {
    let dataset = dataset();
    dataset.write(Bagit).unwrap();
    let place = dataset.output().join("z.wav");
    let mut bytes = fs::read(&place).unwrap();
    bytes[0] ^= 1;
    fs::write(&place, &bytes).unwrap();
    assert_eq!(faults(&dataset.bag()), ["\"data/z.wav\" has another hash"]);
    bytes[0] ^= 1;
    fs::write(&place, &bytes).unwrap();
    let new = dataset.add_other("data/new", "");
    assert_eq!(faults(&dataset.bag()), ["\"data/new\" is not in the manifest"]);
    fs::remove_file(new).unwrap();
    assert_eq!(faults(&dataset.bag()), [""; 0]);
    fs::remove_file(place).unwrap();
    assert_eq!(faults(&dataset.bag()).len(), 2, "missing, and the sum is wrong");
}

#[test]
fn the_runs_journal_is_no_payload() {
    let dataset = dataset();
    let journal = dataset.add_other("data/.bandproof-journal", "entries");
    dataset.check(Bagit).unwrap();
    dataset.write(Bagit).unwrap();
    fs::remove_file(journal).unwrap();
    assert_eq!(faults(&dataset.bag()), [""; 0]);
}

#[test]
fn a_table_in_the_payload_is_payload_and_one_beside_it_a_tag_file() {
    let mut inside = dataset();
    inside.table = Some(inside.add_other("data/figures.csv", "a,b\n"));
    inside.write(Bagit).unwrap();
    assert_eq!(faults(&inside.bag()), [""; 0]);
    let tags = |dataset: &Dataset| manifest(&dataset.bag().join("tagmanifest-sha256.txt"), &mut Vec::new());
    assert_eq!(tags(&inside).len(), 3);

    let mut beside = dataset();
    beside.table = Some(beside.add_other("tables/figures.csv", "a,b\n"));
    beside.check(Bagit).unwrap();
    beside.write(Bagit).unwrap();
    assert_eq!(faults(&beside.bag()), [""; 0]);
    assert!(tags(&beside).contains_key("tables/figures.csv"), "{:?}", tags(&beside));

    let mut elsewhere = dataset();
    let far = elsewhere.root.path().join("figures.csv");
    fs::write(&far, "a,b\n").unwrap();
    elsewhere.table = Some(far);
    elsewhere.write(Bagit).unwrap();
    assert_eq!(faults(&elsewhere.bag()), [""; 0]);
    assert_eq!(tags(&elsewhere).len(), 3);
}

#[test]
fn an_earlier_bag_is_replaced_only_where_that_is_allowed() {
    let mut dataset = dataset();
    dataset.write(Bagit).unwrap();
    let old = fs::read(dataset.bag().join("manifest-sha256.txt")).unwrap();
    dataset.add_output("later.wav".as_ref());
    let refused = dataset.write(Bagit).unwrap_err().to_string();
    assert!(refused.contains("manifest-sha256.txt can't be written"), "{refused}");
    assert_eq!(fs::read(dataset.bag().join("manifest-sha256.txt")).unwrap(), old);
    dataset.replace = true;
    dataset.check(Bagit).unwrap();
    dataset.write(Bagit).unwrap();
    assert_eq!(faults(&dataset.bag()), [""; 0]);
}

#[test]
fn a_folder_is_declared_a_bag_last_of_all() {
    let mut dataset = dataset();
    dataset.write(Bagit).unwrap();
    dataset.replace = true;
    // A folder that holds something can't be replaced by a file.
    fs::remove_file(dataset.bag().join("tagmanifest-sha256.txt")).unwrap();
    dataset.add_other("tagmanifest-sha256.txt/in-the-way", "");
    dataset.write(Bagit).unwrap_err();
    let left = listing(&dataset.bag());
    assert!(!left.contains(&"bagit.txt".into()), "still declared a bag: {left:?}");
    assert!(!left.iter().any(|path| path.to_string_lossy().contains(".bandproof")), "{left:?}");
}

#[test]
fn an_output_that_is_gone_or_cut_short_makes_no_bag() {
    let mut dataset = dataset();
    dataset.write(Bagit).unwrap();
    dataset.replace = true;
    fs::write(dataset.output().join("z.wav"), "short").unwrap();
    let cut = dataset.write(Bagit).unwrap_err().to_string();
    assert!(cut.contains("z.wav is 5 bytes long, where 15 were written"), "{cut}");
    assert!(!dataset.bag().join("bagit.txt").exists(), "an untrue declaration was left");
    for gone in ["z.wav", "station-a/0512.wav"] {
        fs::remove_file(dataset.output().join(gone)).unwrap();
    }
    let gone = dataset.write(Bagit).unwrap_err().to_string();
    assert!(gone.contains("0512.wav is gone"), "{gone}");
}

#[test]
fn a_list_of_outputs_that_breaks_off_makes_no_bag() {
    let dataset = dataset();
    let output = dataset.output();
    let contents = bandproof::package::Contents {
        input: dataset.root.path(),
        output: &output,
        report: &dataset.report,
        table: None,
        title: None,
        started: STARTED,
        replace: false,
    };
    let mut items = dataset.items.iter().take(2).cloned().map(Ok).chain([Err(std::io::Error::other("disk fell out"))]);
    let error = bandproof::package::write(Bagit, &contents, &mut items, &|_| ()).unwrap_err().to_string();
    assert!(error.contains("disk fell out"), "{error}");
    assert!(dataset.files(Bagit).iter().all(|file| !file.exists()));
}

#[test]
fn long_titles_are_folded_and_read_the_same() {
    const TITLE: &str = "Reed-bed recorders beside the pumping station, after the second season of floods, with the \
                         hum of all three pumps taken out: stations a to d";
    let mut dataset = dataset();
    dataset.title = Some(TITLE);
    dataset.write(Bagit).unwrap();
    assert_eq!(info(&dataset.bag())["External-Description"], TITLE);
    let text = fs::read_to_string(dataset.bag().join("bag-info.txt")).unwrap();
    assert!(text.lines().all(|line| line.chars().count() <= 79), "{text}");
}
