//! Recordings whose outputs would be one file.
//!
//! Two inputs on a disk that tells upper from lower case may have names that the output's
//! disk takes for one; a link inside OUT may lead two folders to one place. Either way the
//! second output would take the place of the first, so it is not written: in the order of
//! paths the first recording is done, each later one fails and names the first.
//!
//! Folders that differ by case alone are no collision as long as their files have
//! different names: such a disk finds both in the one folder, whether it was there before
//! or not.

use super::plan::Planned;
use crate::files::place::{Identity, Places, folder_of};
use crate::files::temporary;
use std::collections::{HashMap, HashSet};
use std::ffi::OsString;
use std::hash::{BuildHasher, RandomState};
use std::io;
use std::path::{Path, PathBuf};

/// Fails recordings whose outputs a link inside OUT leads to the place of an earlier one.
pub(super) fn through_links(recordings: &mut [Planned]) {
    let mut places = Places::default();
    // Only folders that lie in one place can bring their files together.
    let mut folders: HashMap<PathBuf, &Path> = HashMap::new();
    let shared = recordings.iter().any(|planned| {
        let folder = folder_of(&planned.target);
        let place = places.of_folder(folder);
        match folders.get(place) {
            Some(&first) => first != folder,
            None => folders.insert(place.to_path_buf(), folder).is_some(),
        }
    });
    if !shared {
        return;
    }
    fail_later(
        recordings,
        |planned| places.of(&planned.target).into_os_string(),
        |first| {
            format!(
                "its output would be the same file as that of {first}, because a link inside the output folder leads \
                 to another of its folders: remove the link, or choose another output folder"
            )
        },
    );
}

/// Fails recordings whose outputs differ by case alone from an earlier one, where the
/// output's disk does not tell them apart. `case_insensitive` is asked only if there are
/// such names, and given the first two of them.
pub(super) fn by_case(recordings: &mut [Planned], case_insensitive: impl FnOnce(&Path, &Path) -> bool) {
    let mut places = Places::default();
    let mut folded = |planned: &Planned| fold(&places.of(&planned.target));
    // Names are looked at closely only where two of them hash alike: the names of a
    // hundred thousand recordings are long.
    let hashes = RandomState::new();
    let mut seen = HashSet::new();
    if recordings.iter().all(|planned| seen.insert(hashes.hash_one(folded(planned)))) {
        return;
    }
    drop(seen);
    let mut first_with = HashMap::new();
    let pair = recordings.iter().filter(|planned| planned.collides.is_none()).find_map(|planned| {
        let target = planned.target.as_path();
        first_with.insert(folded(planned), target).map(|earlier| (earlier, target))
    });
    if pair.is_some_and(|(one, other)| case_insensitive(one, other)) {
        fail_later(recordings, folded, |first| {
            format!(
                "its output and that of {first} would be one file, because the disk of the output folder does not tell \
                 upper from lower case: rename one of the two, or choose an output folder on another disk"
            )
        });
    }
}

/// Whether the disk that `folder` lies on takes names that differ by case alone for one.
///
/// # Errors
/// No file can be made in the folder.
pub(super) fn case_insensitive(folder: &Path) -> io::Result<bool> {
    let file = temporary::beside(&folder.join("case"))?;
    let name = file.path().file_name().map(|name| name.to_string_lossy().to_uppercase()).unwrap_or_default();
    let here = Identity::of(file.path());
    Ok(here.is_some() && Identity::of(&folder.join(name)) == here)
}

fn fail_later(
    recordings: &mut [Planned],
    mut key: impl FnMut(&Planned) -> OsString,
    sentence: impl Fn(&str) -> String,
) {
    let mut first_with: HashMap<OsString, usize> = HashMap::new();
    for index in 0..recordings.len() {
        // It is not written anyway, and has its reason.
        if recordings[index].collides.is_some() {
            continue;
        }
        let key = key(&recordings[index]);
        let first = *first_with.entry(key).or_insert(index);
        if first != index {
            let why = sentence(&recordings[first].shown);
            recordings[index].collides = Some(why);
        }
    }
}

/// The path with every letter as its lower case. Letters whose upper or lower case is more
/// than one character stay: most disks tell those apart.
fn fold(path: &Path) -> OsString {
    let Some(text) = path.to_str() else { return path.into() };
    let one = |character: char, case: &mut dyn Iterator<Item = char>| match (case.next(), case.next()) {
        (Some(other), None) => other,
        _ => character,
    };
    // By way of upper case: some letters have two lower cases.
    let upper = text.chars().map(|character| one(character, &mut character.to_uppercase()));
    upper.map(|character| one(character, &mut character.to_lowercase())).collect::<String>().into()
}

#[cfg(test)]
mod tests {
    use super::super::discover::Found;
    use super::super::earlier::Standing;
    use super::*;
    use std::path::PathBuf;

    fn planned(output: &Path, names: &[&str]) -> Vec<Planned> {
        let one = |name: &&str| Planned {
            found: Found { path: PathBuf::from("in").join(name), relative: name.into(), bytes: 44 },
            shown: (*name).to_owned(),
            escaped: false,
            target: output.join(name),
            header: Err("never read".to_owned()),
            collides: None,
            standing: Standing::Open,
            outdated: None,
        };
        names.iter().map(one).collect()
    }

    fn failed<'a>(recordings: &'a [Planned], names: &[&'a str]) -> Vec<(&'a str, &'a str)> {
        let first = |why: &str| names.iter().copied().find(|name| why.contains(*name));
        let one = |planned: &'a Planned| Some((planned.shown.as_str(), first(planned.collides.as_ref()?)?));
        recordings.iter().filter_map(one).collect()
    }

    #[test]
    fn names_that_differ_by_case_alone_fail_but_the_first_where_the_disk_takes_them_for_one() {
        let folder = tempfile::tempdir().unwrap();
        let names = ["A/x.WAV", "B.wav", "a/X.wav", "a/x.wav", "a/y.wav", "b.wav", "\u{c9}.wav", "\u{e9}.wav"];
        let mut recordings = planned(folder.path(), &names);
        by_case(&mut recordings, |_, _| false);
        assert!(failed(&recordings, &names).is_empty());
        by_case(&mut recordings, |_, _| true);
        let expected = [("a/X.wav", names[0]), ("a/x.wav", names[0]), ("b.wav", names[1]), ("\u{e9}.wav", names[6])];
        assert_eq!(failed(&recordings, &names), expected);
    }

    #[test]
    fn the_disk_is_not_asked_about_names_that_differ_otherwise() {
        let folder = tempfile::tempdir().unwrap();
        // The sharp s has no upper case of one letter.
        let mut recordings = planned(folder.path(), &["A/1.wav", "a/2.wav", "stra\u{df}e.wav", "strasse.wav"]);
        let mut asked = false;
        by_case(&mut recordings, |_, _| {
            asked = true;
            true
        });
        assert!(!asked);
    }

    /// Linux keeps names apart on the disks that tests run on; where another system does
    /// not, this test says so.
    #[test]
    fn the_probe_says_what_the_disk_does_and_leaves_nothing() {
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(folder.path().join("case"), b"x").unwrap();
        let one = folder.path().join("CASE").exists();
        assert_eq!(case_insensitive(folder.path()).unwrap(), one);
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);
    }

    #[cfg(unix)]
    #[test]
    fn folders_that_a_link_leads_to_one_place_keep_the_first_of_each_name() {
        let folder = tempfile::tempdir().unwrap();
        std::fs::create_dir(folder.path().join("a")).unwrap();
        std::os::unix::fs::symlink("a", folder.path().join("b")).unwrap();
        let names = ["a/1.wav", "a/2.wav", "b/1.wav", "b/3.wav", "c/1.wav"];
        let mut recordings = planned(folder.path(), &names);
        through_links(&mut recordings);
        assert_eq!(failed(&recordings, &names), [("b/1.wav", "a/1.wav")]);
        // A disk that does not tell case apart has nothing to add.
        let before = recordings[2].collides.clone();
        by_case(&mut recordings, |_, _| true);
        assert_eq!(failed(&recordings, &names).len(), 1);
        assert_eq!(recordings[2].collides, before);
    }
}
