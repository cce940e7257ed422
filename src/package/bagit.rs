//! A bag around the output folder: RFC 8493, "The BagIt File Packaging Format (V1.0)".
//!
//! The folder above the output folder becomes the bag, the output folder, which must be
//! named `data`, its payload. A bag is valid only if its manifest lists every file of
//! the payload: also those which lay there before this run are hashed and listed.
//! `bagit.txt` makes a folder a bag, so it is the last file to be written.

use super::bag_info::BagInfo;
use super::manifest;
use super::new_file::{Complete, NewFile, Purpose};
use super::payload::{Payload, files_below};
use super::places::{below, folder_of, posix, real};
use super::{Contents, Item, PackageError};
use crate::files::digest;
use std::borrow::Cow;
use std::collections::HashSet;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};

/// Section 2.1.2.
const PAYLOAD: &str = "data";
/// Section 2.1.1: the declaration.
const DECLARATION: (&str, &str) = ("bagit.txt", "BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n");
/// Section 2.1.3.
const MANIFEST: &str = "manifest-sha256.txt";
/// Section 2.2.2.
const INFO: &str = "bag-info.txt";
/// Section 2.2.1.
const TAG_MANIFEST: &str = "tagmanifest-sha256.txt";
/// In the order in which they get their names, the declaration last.
const TAG_FILES: [&str; 4] = [MANIFEST, INFO, TAG_MANIFEST, DECLARATION.0];

/// The tag files.
pub fn files(contents: &Contents<'_>) -> Vec<PathBuf> {
    let bag = bag_folder(contents.output).unwrap_or(Cow::Borrowed(folder_of(contents.output)));
    TAG_FILES.iter().map(|name| bag.join(name)).collect()
}

/// The folder above `output`, if `output` is named `data`. Where the path as given does
/// not end in a name (`.`, `data/..`), the real one decides.
fn bag_folder(output: &Path) -> Option<Cow<'_, Path>> {
    match output.file_name() {
        Some(name) => (name == PAYLOAD).then(|| Cow::Borrowed(folder_of(output))),
        None => {
            let real = real(output);
            (real.file_name()? == PAYLOAD).then(|| Cow::Owned(folder_of(&real).into()))
        }
    }
}

/// See [`super::check`].
pub fn check(contents: &Contents<'_>, paths: &mut dyn Iterator<Item = &Path>) -> Result<(), PackageError> {
    let output = contents.output;
    let bag = bag_folder(output).ok_or_else(|| PackageError::NotNamedData(output.into()))?;
    if output.symlink_metadata().is_ok_and(|metadata| metadata.is_symlink()) {
        return Err(PackageError::NotAFile { path: output.into(), what: "a link" });
    }
    not_among_originals(&bag, contents.input)?;
    report_in_payload(contents)?;
    table_has_its_own_name(contents, &bag)?;
    // Before it writes there, a run removes what a killed one left half-written.
    let documents = [Some(contents.report), contents.table].into_iter().flatten();
    let mut cleaned: HashSet<PathBuf> = documents.map(folder_of).chain([output]).map(Path::to_path_buf).collect();
    for path in paths {
        posix(path).ok_or_else(|| PackageError::NotUtf8(path.into()))?;
        cleaned.insert(folder_of(&output.join(path)).to_path_buf());
    }
    if output.exists() {
        files_below(output).try_for_each(|found| match found {
            Err(PackageError::Leftover(path)) if cleaned.contains(folder_of(&path)) => Ok(()),
            found => found.map(drop),
        })?;
    }
    if bag.is_dir() {
        no_other_manifests(&bag)?;
        // Without a name: nothing is left whatever happens.
        tempfile::tempfile_in(&bag).map_err(|cause| PackageError::BagNotWritable { path: bag.to_path_buf(), cause })?;
    }
    Ok(())
}

fn not_among_originals(bag: &Path, input: &Path) -> Result<(), PackageError> {
    let (real_bag, real_input) = (real(bag), real(input));
    let relation = if real_bag == real_input {
        "is"
    } else if real_bag.starts_with(&real_input) {
        "lies inside"
    } else if real_input.is_file() && real_input.parent() == Some(&real_bag) {
        "is the folder of"
    } else {
        return Ok(());
    };
    Err(PackageError::AmongOriginals { bag: bag.into(), input: input.into(), relation })
}

fn report_in_payload(contents: &Contents<'_>) -> Result<(), PackageError> {
    let Contents { report, output, .. } = *contents;
    let outside = || PackageError::ReportNotInPayload { report: report.into(), output: output.into() };
    let inside = below(report, output).ok_or_else(outside)?;
    posix(&inside).map(drop).ok_or_else(|| PackageError::NotUtf8(report.into()))
}

/// A table in the bag but outside the payload is a tag file, and must be none of ours.
fn table_has_its_own_name(contents: &Contents<'_>, bag: &Path) -> Result<(), PackageError> {
    let Some(table) = contents.table else { return Ok(()) };
    let Some(place) = below(table, bag) else { return Ok(()) };
    let Some(name) = posix(&place) else { return Err(PackageError::NotUtf8(table.into())) };
    // Case does not tell files apart everywhere.
    let lower = name.to_ascii_lowercase();
    if TAG_FILES.contains(&lower.as_str()) || is_manifest(&lower) {
        return Err(PackageError::NameTaken { path: table.into(), form: "bagit", what: "the table" });
    }
    Ok(())
}

/// Every manifest of a bag must list every file of its payload (section 3), so another
/// one that stays there would make the bag invalid; `fetch.txt` (section 2.2.3) speaks
/// of payload that is elsewhere.
fn no_other_manifests(bag: &Path) -> Result<(), PackageError> {
    let unreadable = |cause| PackageError::Unreadable { path: bag.into(), cause };
    let mut others = Vec::new();
    for entry in fs::read_dir(bag).map_err(unreadable)? {
        let name = entry.map_err(unreadable)?.file_name();
        if name.to_str().is_some_and(|name| is_manifest(name) && !TAG_FILES.contains(&name)) {
            others.push(name);
        }
    }
    others.sort();
    others.first().map_or(Ok(()), |name| Err(PackageError::OtherManifest(bag.join(name))))
}

fn is_manifest(name: &str) -> bool {
    let begins = name.starts_with("manifest-") || name.starts_with("tagmanifest-");
    name == "fetch.txt" || (begins && name.ends_with(".txt"))
}

/// The declaration, where it may be replaced.
pub fn declaration_to_replace(contents: &Contents<'_>) -> Result<Vec<PathBuf>, PackageError> {
    let bag = bag_folder(contents.output).ok_or_else(|| PackageError::NotNamedData(contents.output.into()))?;
    if bag.is_dir() {
        no_other_manifests(&bag)?;
    }
    Ok(vec![bag.join(DECLARATION.0)])
}

/// Renders the tag files, in the order in which they are to get their names.
pub fn render(
    contents: &Contents<'_>,
    items: &mut dyn Iterator<Item = io::Result<Item>>,
    purpose: Purpose<'_>,
) -> Result<Vec<Complete>, PackageError> {
    let output = contents.output;
    let bag = bag_folder(output).ok_or_else(|| PackageError::NotNamedData(output.into()))?;
    no_other_manifests(&bag)?;
    let (mut payload_bytes, mut payload_files) = (0, 0);
    let mut file = NewFile::begin(&bag.join(MANIFEST), purpose)?;
    Payload::new(output, items, purpose).each(|found| {
        payload_bytes += found.digest.bytes;
        payload_files += 1;
        file.write(|out| manifest::write_line(out, &found.digest, &format!("{PAYLOAD}/{}", found.path)))
    })?;
    let manifest = file.complete()?;
    let Contents { title, started, .. } = *contents;
    let info = BagInfo { title, started, payload_bytes, payload_files }.text();
    let info = whole(&bag.join(INFO), &info, purpose)?;
    let declaration = whole(&bag.join(DECLARATION.0), DECLARATION.1, purpose)?;

    let mut listed = vec![
        (INFO.to_owned(), info.digest.clone()),
        (DECLARATION.0.to_owned(), declaration.digest.clone()),
        (MANIFEST.to_owned(), manifest.digest.clone()),
    ];
    listed.extend(tag_table(contents, &bag)?);
    listed.sort_by(|(left, _), (right, _)| left.cmp(right));
    let mut file = NewFile::begin(&bag.join(TAG_MANIFEST), purpose)?;
    for (path, digest) in &listed {
        file.write(|out| manifest::write_line(out, digest, path))?;
    }
    let tag_manifest = file.complete()?;
    Ok(vec![manifest, info, tag_manifest, declaration])
}

/// The table, where it lies in the bag and not in the payload: a tag file of the user's
/// choice (section 2.2.4).
fn tag_table(contents: &Contents<'_>, bag: &Path) -> Result<Option<(String, digest::Digest)>, PackageError> {
    let Some(table) = contents.table else { return Ok(None) };
    if below(table, contents.output).is_some() {
        return Ok(None);
    }
    let Some(place) = below(table, bag) else { return Ok(None) };
    let name = posix(&place).ok_or_else(|| PackageError::NotUtf8(table.into()))?;
    let digest = digest::of_file(table).map_err(|cause| PackageError::Unreadable { path: table.into(), cause })?;
    Ok(Some((name, digest)))
}

fn whole(target: &Path, text: &str, purpose: Purpose<'_>) -> Result<Complete, PackageError> {
    let mut file = NewFile::begin(target, purpose)?;
    file.write(|out| out.write_all(text.as_bytes()))?;
    file.complete()
}
