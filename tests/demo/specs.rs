//! Every spec that comes with the project loads.

use crate::folder;
use bandproof::spec::{self, Requirement, SpecFile};
use std::{error::Error, fs, path::PathBuf};

/// All files of `filter-specs`, each as it loads.
fn specs() -> Result<Vec<(PathBuf, SpecFile)>, Box<dyn Error>> {
    let entries: Vec<_> = fs::read_dir(folder("filter-specs"))?.collect::<Result<_, _>>()?;
    let mut paths: Vec<_> = entries.iter().map(fs::DirEntry::path).collect();
    paths.sort();
    paths.into_iter().map(|path| Ok((path.clone(), spec::load(&path)?))).collect()
}

#[test]
fn every_spec_loads_and_has_a_title_requirements_and_stages_or_asks_for_them() {
    let specs = specs().unwrap();
    assert!(specs.len() >= 5);
    for (path, SpecFile { spec, .. }) in specs {
        assert!(spec.title.is_some(), "{}", path.display());
        assert!(spec.stages.is_empty() == spec.auto.is_some(), "{}", path.display());
        assert!(spec.bands.iter().any(|b| b.requirement != Requirement::Observe), "{}", path.display());
    }
}

#[test]
fn the_two_notations_of_one_spec_mean_the_same() {
    let load = |name: &str| spec::load(&folder("filter-specs").join(name)).unwrap();
    let (toml, json) = (load("converter-whine.toml"), load("converter-whine.json"));
    assert_eq!(toml.spec, json.spec);
    assert_ne!(toml.file_sha256, json.file_sha256);
}

#[test]
fn every_toml_spec_explains_its_choices() {
    for (path, _) in specs().unwrap() {
        if path.extension().is_some_and(|e| e == "toml") {
            let text = fs::read_to_string(&path).unwrap();
            let entries = text.matches("[[").count();
            let comments = text.lines().filter(|l| l.trim_start().starts_with('#')).count();
            assert!(comments >= entries, "{}: {comments} comment lines on {entries} entries", path.display());
        }
    }
}
