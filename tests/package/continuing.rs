//! A run that goes on where another ended knows that run's package as its own, takes it
//! back while it is not true, and leaves alone what may be somebody else's.

use super::bag_reader::faults;
use super::dataset::{Dataset, listing};
use bandproof::package::Emit::{self, Bagit, Datapackage};
use proptest::prelude::*;
use std::fs;
use std::path::{Path, PathBuf};

const FORMS: [Emit; 2] = [Datapackage, Bagit];

/// With a table, a file that no run made, and names that manifests encode.
fn dataset() -> Dataset {
    let mut dataset = Dataset::new(&["station-a/0512.wav", "station-a.wav", "station-a-2/50%.wav", "z.wav"]);
    dataset.table = Some(dataset.add_other("data/figures.csv", "a,b\r\n"));
    dataset.add_other("data/notes/readme.txt", "field notes");
    dataset
}

fn packed(emit: Emit) -> Dataset {
    let dataset = dataset();
    dataset.write(emit).unwrap();
    dataset
}

/// The files of the package that are there.
fn there(dataset: &Dataset, emit: Emit) -> Vec<PathBuf> {
    dataset.files(emit).into_iter().filter(|file| file.exists()).collect()
}

fn damage(place: &Path) {
    let mut bytes = fs::read(place).unwrap();
    *bytes.last_mut().unwrap() ^= 1;
    fs::write(place, bytes).unwrap();
}

#[test]
fn a_finished_package_is_known_again() {
    for emit in FORMS {
        assert!(packed(emit).is_as_written(emit), "{emit:?}");
    }
}

#[test]
fn where_there_is_no_package_there_is_nothing_foreign() {
    for emit in FORMS {
        let dataset = dataset();
        assert!(dataset.is_as_written(emit));
        // Not even a report is needed to know that.
        fs::remove_file(&dataset.report).unwrap();
        assert!(dataset.is_as_written(emit));
    }
}

/// Every stop between two renames, and every other way in which some files are missing.
#[test]
fn a_package_that_was_broken_off_is_known_by_the_files_it_has() {
    for missing in 0..16_usize {
        let dataset = packed(Bagit);
        let files = dataset.files(Bagit);
        for (at, file) in files.iter().enumerate() {
            if missing & (1 << at) != 0 {
                fs::remove_file(file).unwrap();
            }
        }
        assert!(dataset.is_as_written(Bagit), "{missing:04b}");
    }
}

#[test]
fn one_byte_more_less_or_other_in_any_file_is_somebody_elses() {
    let edits: [fn(&mut Vec<u8>); 5] = [
        |bytes| bytes.push(b'\n'),
        |bytes| _ = bytes.pop(),
        |bytes| bytes.clear(),
        |bytes| bytes[0] ^= 1,
        |bytes| *bytes.last_mut().unwrap() ^= 1,
    ];
    for emit in FORMS {
        let dataset = packed(emit);
        for file in dataset.files(emit) {
            let whole = fs::read(&file).unwrap();
            for (at, edit) in edits.iter().enumerate() {
                let mut bytes = whole.clone();
                edit(&mut bytes);
                fs::write(&file, &bytes).unwrap();
                assert!(!dataset.is_as_written(emit), "{} after edit {at}", file.display());
            }
            fs::write(&file, &whole).unwrap();
        }
        assert!(dataset.is_as_written(emit));
    }
}

#[test]
fn a_package_of_another_job_is_not_this_ones() {
    let changes: [fn(&mut Dataset); 6] = [
        |dataset| dataset.title = Some("Harbor hydrophones"),
        |dataset| dataset.started = "2031-05-03T06:10:00Z",
        |dataset| dataset.table = None,
        |dataset| _ = dataset.items.pop(),
        |dataset| dataset.items[0].sha256 = "0".repeat(64),
        |dataset| fs::write(&dataset.report, "another report").unwrap(),
    ];
    for emit in FORMS {
        for (at, change) in changes.iter().enumerate() {
            let mut dataset = packed(emit);
            change(&mut dataset);
            // A bag lists whatever lies in the payload, called a table or not, hash for hash.
            let same = emit == Bagit && (at == 2 || at == 3);
            assert_eq!(dataset.is_as_written(emit), same, "{emit:?}, change {at}");
        }
    }
}

/// Such outputs are made again; that is no reason to refuse the package around them.
#[test]
fn an_output_that_is_gone_or_damaged_leaves_the_package_ours() {
    for emit in FORMS {
        let dataset = packed(emit);
        damage(&dataset.output().join("station-a.wav"));
        fs::write(dataset.output().join("z.wav"), "of another length").unwrap();
        fs::remove_dir_all(dataset.output().join("station-a-2")).unwrap();
        fs::remove_file(dataset.output().join("station-a/0512.wav")).unwrap();
        assert!(dataset.is_as_written(emit), "{emit:?}");
    }
}

#[test]
fn a_file_that_came_into_the_payload_since_is_not_of_the_bag() {
    let dataset = packed(Bagit);
    let new = dataset.add_other("data/new", "");
    assert!(!dataset.is_as_written(Bagit));
    fs::remove_file(new).unwrap();
    damage(&dataset.output().join("notes/readme.txt"));
    assert!(!dataset.is_as_written(Bagit));
}

/// They go before the run that finds them writes anything.
#[test]
fn what_a_killed_run_left_half_written_is_no_part_of_the_bag() {
    let dataset = packed(Bagit);
    for name in ["station-a/.bandproof-Ab12Cd.part", ".bandproof-Ab12Cd.part", ".bandproof-journal"] {
        dataset.add_other(&format!("data/{name}"), "half");
    }
    assert!(dataset.is_as_written(Bagit));
}

#[test]
fn without_its_report_or_table_a_package_is_not_known() {
    for emit in FORMS {
        let dataset = packed(emit);
        let report = fs::read(&dataset.report).unwrap();
        fs::remove_file(&dataset.report).unwrap();
        assert!(!dataset.is_as_written(emit));
        fs::write(&dataset.report, report).unwrap();
        assert!(dataset.is_as_written(emit));
        fs::remove_file(dataset.table.as_ref().unwrap()).unwrap();
        assert!(!dataset.is_as_written(emit));
    }
}

#[cfg(unix)]
#[test]
fn a_link_in_the_place_of_a_file_is_somebody_elses() {
    for emit in FORMS {
        let dataset = packed(emit);
        let file = dataset.files(emit).remove(0);
        let elsewhere = dataset.root.path().join("elsewhere");
        fs::rename(&file, &elsewhere).unwrap();
        std::os::unix::fs::symlink(&elsewhere, &file).unwrap();
        assert!(!dataset.is_as_written(emit), "{emit:?}");
    }
}

#[test]
fn a_list_of_outputs_that_breaks_off_is_an_error_and_no_answer() {
    for emit in FORMS {
        let dataset = packed(emit);
        let error = dataset.is_as_written_of(emit, &mut [Err(std::io::Error::other("disk fell out"))].into_iter());
        assert!(error.unwrap_err().to_string().contains("disk fell out"));
    }
}

#[test]
fn what_is_ours_is_taken_back_whole_and_made_anew() {
    for emit in FORMS {
        let mut dataset = packed(emit);
        let before = listing(dataset.root.path());
        dataset.take_back(emit, true).unwrap();
        assert_eq!(there(&dataset, emit), [""; 0].map(PathBuf::from));
        let others = before.len() - dataset.files(emit).len();
        assert_eq!(listing(dataset.root.path()).len(), others, "nothing else went");
        // Nothing stands in the way of the next run, however this one ends.
        dataset.add_output("later.wav".as_ref());
        assert!(dataset.is_as_written(emit));
        dataset.write(emit).unwrap();
        assert!(dataset.is_as_written(emit));
        if emit == Bagit {
            assert_eq!(faults(&dataset.bag()), [""; 0]);
        }
    }
}

#[test]
fn taking_back_what_is_not_there_is_no_fault() {
    for emit in FORMS {
        let mut dataset = dataset();
        for replace in [false, true] {
            dataset.replace = replace;
            dataset.take_back(emit, true).unwrap();
            dataset.take_back(emit, false).unwrap();
        }
    }
}

/// The folder must not go on calling itself a bag while its payload is replaced.
#[test]
fn of_a_foreign_bag_only_the_declaration_goes_and_only_with_leave() {
    let mut dataset = packed(Bagit);
    let manual = "Contact-Name: the keeper of the reed bed\n";
    fs::write(dataset.bag().join("bag-info.txt"), manual).unwrap();
    let before = there(&dataset, Bagit);
    assert!(!dataset.is_as_written(Bagit));
    dataset.take_back(Bagit, false).unwrap();
    assert_eq!(there(&dataset, Bagit), before, "without leave everything stays");
    dataset.replace = true;
    dataset.take_back(Bagit, false).unwrap();
    assert_eq!(there(&dataset, Bagit), before[..3]);
    assert!(!dataset.bag().join("bagit.txt").exists());
    assert_eq!(fs::read_to_string(dataset.bag().join("bag-info.txt")).unwrap(), manual);
}

#[test]
fn a_foreign_descriptor_stays_until_it_is_replaced() {
    let mut dataset = packed(Datapackage);
    dataset.replace = true;
    let file = dataset.files(Datapackage).remove(0);
    fs::write(&file, "{}").unwrap();
    dataset.take_back(Datapackage, false).unwrap();
    assert_eq!(fs::read_to_string(&file).unwrap(), "{}");
}

#[test]
fn a_bag_with_manifests_of_another_program_keeps_its_declaration() {
    let mut dataset = packed(Bagit);
    dataset.replace = true;
    dataset.add_other("manifest-md5.txt", "");
    dataset.take_back(Bagit, false).unwrap_err();
    dataset.write(Bagit).unwrap_err();
    assert_eq!(there(&dataset, Bagit).len(), 4);
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, ..ProptestConfig::default() })]

    /// Whatever the names, what was written is known, with any of its outputs gone.
    #[test]
    fn what_was_written_is_known_whatever_the_names(
        paths in prop::collection::btree_set("[ab%2 .#-]{1,3}(/[ab%2 -]{1,3})?\\.wav", 1..12),
        gone in any::<u16>(),
    ) {
        let mut dataset = Dataset::new(&[""; 0]);
        for path in paths.iter().filter(|path| !path.starts_with('.')) {
            dataset.add_output(path.as_ref());
        }
        for emit in FORMS {
            dataset.write(emit).unwrap();
            // The descriptor lies in the payload.
            if emit == Datapackage {
                prop_assert!(dataset.is_as_written(emit));
            }
        }
        for (at, item) in dataset.items.iter().enumerate() {
            if gone & (1 << at) != 0 {
                fs::remove_file(dataset.output().join(&item.path)).unwrap();
            }
        }
        for emit in FORMS {
            prop_assert!(dataset.is_as_written(emit), "{:?}", emit);
        }
    }
}
