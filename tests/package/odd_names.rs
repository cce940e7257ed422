//! Packages of files with whatever names a disk takes.

use super::bag_reader::{faults, manifest};
use super::dataset::Dataset;
use super::package_rules::{broken, path_fault};
use bandproof::package::Emit::{Bagit, Datapackage};
use proptest::prelude::*;
use std::fs;
use std::path::{Component, Path};

/// Relative paths of one to three names, with all that manifests and descriptors find
/// special.
fn paths() -> impl Strategy<Value = Vec<String>> {
    let name = "[aAb%2505AD\r\n .~#?:\\\\ü日-]{1,5}|[^/\u{0}]{1,4}";
    let path = prop::collection::vec(name, 1..4).prop_map(|names| names.join("/"));
    prop::collection::vec(path, 1..12)
}

fn is_plain(path: &str) -> bool {
    !path.is_empty() && path.split('/').all(|name| !matches!(name, "" | "." | "..")) && {
        Path::new(path).components().all(|part| matches!(part, Component::Normal(_)))
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 32, ..ProptestConfig::default() })]

    #[test]
    fn every_name_in_utf8_goes_into_a_bag(paths in paths(), others in paths()) {
        let mut dataset = Dataset::new(&[""; 0]);
        for path in paths.iter().filter(|path| is_plain(path)) {
            dataset.add_output(path.as_ref());
        }
        // Some that are not of this run.
        let mut expected = dataset.items.len() + 1;
        for path in others.iter().filter(|path| is_plain(path)) {
            if dataset.add_output(path.as_ref()) {
                dataset.items.retain(|item| item.path != Path::new(path));
                expected += 1;
            }
        }
        dataset.check(Bagit).unwrap();
        dataset.write(Bagit).unwrap();
        prop_assert_eq!(faults(&dataset.bag()), [""; 0]);
        prop_assert_eq!(manifest(&dataset.bag().join("manifest-sha256.txt"), &mut Vec::new()).len(), expected);
    }

    #[test]
    fn a_descriptor_takes_exactly_the_paths_that_the_standard_allows(paths in paths()) {
        let mut dataset = Dataset::new(&[""; 0]);
        for path in paths.iter().filter(|path| is_plain(path)) {
            let alone = Dataset::new(&[path]);
            prop_assert_eq!(alone.check(Datapackage).is_ok(), path_fault(path).is_none(), "{:?}", path);
            if path_fault(path).is_none() {
                dataset.add_output(path.as_ref());
            }
        }
        dataset.check(Datapackage).unwrap();
        dataset.write(Datapackage).unwrap();
        let text = fs::read(dataset.output().join("datapackage.json")).unwrap();
        let package: serde_json::Value = serde_json::from_slice(&text).unwrap();
        prop_assert_eq!(broken(&package), [""; 0]);
        let listed: Vec<&str> =
            package["resources"].as_array().unwrap().iter().skip(1).map(|one| one["path"].as_str().unwrap()).collect();
        let wanted: Vec<&str> = dataset.items.iter().map(|item| item.path.to_str().unwrap()).collect();
        prop_assert_eq!(listed, wanted);
    }
}
