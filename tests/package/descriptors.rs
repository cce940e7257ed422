//! Data Package descriptors: they keep the standard's rules and tell the truth.

use super::dataset::{Dataset, STARTED, sha256};
use super::package_rules::broken;
use bandproof::package::Emit::Datapackage;
use serde_json::{Value, json};
use std::fs;
use std::path::Path;

fn dataset() -> Dataset {
    Dataset::new(&["station-a/0512.wav", "Station-A/0512.WAV", "50% #1?.wav", "früh.bwf"])
}

fn descriptor(folder: &Path) -> Value {
    serde_json::from_slice(&fs::read(folder.join("datapackage.json")).unwrap()).unwrap()
}

/// Every resource is on the disk with that length and hash; gives back the paths.
fn true_paths(folder: &Path) -> Vec<String> {
    let descriptor = descriptor(folder);
    let resources = descriptor["resources"].as_array().unwrap();
    let checked = resources.iter().map(|resource| {
        let path = resource["path"].as_str().unwrap();
        let bytes = fs::read(folder.join(path)).unwrap();
        assert_eq!(resource["bytes"], bytes.len() as u64, "{path}");
        assert_eq!(resource["hash"], format!("sha256:{}", sha256(&bytes)), "{path}");
        path.to_owned()
    });
    checked.collect()
}

#[test]
fn a_descriptor_beside_the_report_lists_every_output() {
    let dataset = dataset();
    dataset.check(Datapackage).unwrap();
    assert_eq!(dataset.files(Datapackage), [dataset.output().join("datapackage.json")]);
    dataset.write(Datapackage).unwrap();
    let package = descriptor(&dataset.output());
    assert_eq!(broken(&package), [""; 0]);
    assert_eq!(
        true_paths(&dataset.output()),
        ["bandproof-report.json", "50% #1?.wav", "Station-A/0512.WAV", "früh.bwf", "station-a/0512.wav"]
    );
    assert_eq!(package["title"], "Reed-bed recorders");
    assert_eq!(package["name"], "reed-bed-recorders");
    assert_eq!(package["created"], STARTED);
}

#[test]
fn each_kind_of_file_says_what_it_is() {
    let mut dataset = dataset();
    dataset.table = Some(dataset.add_other("data/tables/figures.csv", "a,b\n"));
    dataset.write(Datapackage).unwrap();
    let package = descriptor(&dataset.output());
    assert_eq!(broken(&package), [""; 0]);
    let kinds = package["resources"].as_array().unwrap().iter().map(|resource| {
        let text = |key: &str| resource[key].as_str().unwrap().to_owned();
        (text("path"), text("format"), text("mediatype"))
    });
    let kinds: Vec<_> = kinds.take(3).collect();
    let kind = |path: &str, format: &str, media: &str| (path.to_owned(), format.to_owned(), media.to_owned());
    assert_eq!(kinds[0], kind("bandproof-report.json", "json", "application/json"));
    assert_eq!(kinds[1], kind("tables/figures.csv", "csv", "text/csv"));
    assert_eq!(kinds[2], kind("50% #1?.wav", "wav", "audio/wav"));
}

#[test]
fn from_a_folder_above_paths_lead_down_to_the_outputs() {
    let mut dataset = dataset();
    dataset.report = dataset.root.path().join("report.json");
    fs::write(&dataset.report, "{}").unwrap();
    dataset.check(Datapackage).unwrap();
    dataset.write(Datapackage).unwrap();
    assert_eq!(broken(&descriptor(dataset.root.path())), [""; 0]);
    let paths = true_paths(dataset.root.path());
    assert_eq!(paths[0], "report.json");
    assert_eq!(paths[4], "bag/data/station-a/0512.wav");
}

#[test]
fn a_table_elsewhere_is_left_out() {
    let mut dataset = dataset();
    dataset.table = Some(dataset.add_other("figures.csv", "a,b\n"));
    dataset.check(Datapackage).unwrap();
    dataset.write(Datapackage).unwrap();
    assert!(!true_paths(&dataset.output()).iter().any(|path| path.contains("figures")));
}

#[test]
fn without_a_title_the_package_is_named_after_its_folder() {
    let mut dataset = dataset();
    for title in [None, Some(" ")] {
        dataset.title = title;
        dataset.replace = true;
        dataset.write(Datapackage).unwrap();
        let package = descriptor(&dataset.output());
        assert_eq!(broken(&package), [""; 0]);
        assert_eq!((&package["name"], package.get("title")), (&json!("data"), None));
    }
}

#[test]
fn a_run_of_which_nothing_came_still_has_its_report_as_a_resource() {
    let dataset = Dataset::new(&[""; 0]);
    dataset.write(Datapackage).unwrap();
    assert_eq!(broken(&descriptor(&dataset.output())), [""; 0]);
    assert_eq!(true_paths(&dataset.output()), ["bandproof-report.json"]);
}

#[test]
fn the_same_run_gives_the_same_bytes() {
    let bytes = || {
        let dataset = dataset();
        dataset.write(Datapackage).unwrap();
        fs::read(dataset.output().join("datapackage.json")).unwrap()
    };
    assert_eq!(bytes(), bytes());
}

#[test]
fn an_earlier_descriptor_is_replaced_only_where_that_is_allowed() {
    let mut dataset = dataset();
    dataset.write(Datapackage).unwrap();
    let refused = dataset.write(Datapackage).unwrap_err().to_string();
    assert!(refused.contains("datapackage.json can't be written"), "{refused}");
    dataset.add_output("later.wav".as_ref());
    dataset.replace = true;
    dataset.write(Datapackage).unwrap();
    assert!(true_paths(&dataset.output()).contains(&"later.wav".into()));
}

#[test]
fn an_output_that_is_gone_makes_no_package() {
    let dataset = dataset();
    fs::remove_file(dataset.output().join("früh.bwf")).unwrap();
    let error = dataset.write(Datapackage).unwrap_err().to_string();
    assert!(error.contains("früh.bwf is gone"), "{error}");
    assert!(!dataset.output().join("datapackage.json").exists());
}

#[test]
fn the_rules_catch_what_is_wrong() {
    let dataset = dataset();
    dataset.write(Datapackage).unwrap();
    let good = descriptor(&dataset.output());
    for (pointer, bad) in [
        ("/$schema", json!("https://datapackage.org")),
        ("/name", json!("Reed bed")),
        ("/created", json!("2031-05-02")),
        ("/resources", json!([])),
        ("/resources/1/name", json!("A.wav")),
        ("/resources/1/name", good["resources"][0]["name"].clone()),
        ("/resources/1/path", json!("../a.wav")),
        ("/resources/1/path", json!("/a.wav")),
        ("/resources/1/path", json!("a/.b/c.wav")),
        ("/resources/1/path", json!("~a.wav")),
        ("/resources/1/bytes", json!(1.5)),
        ("/resources/1/bytes", json!(-1)),
        ("/resources/1/hash", json!("sha256:123")),
        ("/resources/1/mediatype", json!("wav")),
    ] {
        let mut wrong = good.clone();
        *wrong.pointer_mut(pointer).unwrap() = bad.clone();
        assert_eq!(broken(&wrong).len(), 1, "{pointer} {bad}: {:?}", broken(&wrong));
    }
}
