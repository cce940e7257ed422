//! A Data Package descriptor beside the report.
//!
//! Follows version 2.0 of the Data Package standard (datapackage.org/standard, profile
//! `https://datapackage.org/profiles/2.0/datapackage.json`). What it adds to version 1 is
//! not used but for `$schema`, and what version 1 forbids is not written but for two dots
//! in a row within a name, so that readers of either can take it.

use super::names::{ResourceNames, objection, package_name};
use super::new_file::{Complete, NewFile, Purpose};
use super::payload::still_there;
use super::places::{below, folder_of, posix, real};
use super::{Contents, Item, PackageError};
use crate::files::digest::{self, Digest};
use serde::Serialize;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// The descriptor's name, fixed by the standard.
const DESCRIPTOR: &str = "datapackage.json";
const PROFILE: &str = "https://datapackage.org/profiles/2.0/datapackage.json";

/// The descriptor.
pub fn files(contents: &Contents<'_>) -> Vec<PathBuf> {
    vec![folder_of(contents.report).join(DESCRIPTOR)]
}

/// See [`super::check`].
pub fn check(contents: &Contents<'_>, paths: &mut dyn Iterator<Item = &Path>) -> Result<(), PackageError> {
    let listed = Listed::new(contents)?;
    for (file, what) in [(Some(contents.report), "the report"), (contents.table, "the table")] {
        // Case does not tell files apart everywhere.
        let is_descriptor = |file: &Path| {
            file.file_name().is_some_and(|name| name.eq_ignore_ascii_case(DESCRIPTOR))
                && real(folder_of(file)) == real(folder_of(contents.report))
        };
        if let Some(file) = file.filter(|file| is_descriptor(file)) {
            return Err(PackageError::NameTaken { path: file.into(), form: "datapackage", what });
        }
    }
    for path in paths {
        listed.output_path(path)?;
    }
    Ok(())
}

/// Where the files of the package lie below the descriptor's folder.
struct Listed {
    /// The output folder; empty where the descriptor lies in it.
    output: PathBuf,
    report: String,
    /// Only where it lies below the descriptor's folder: nothing else can be listed.
    table: Option<String>,
}

impl Listed {
    fn new(contents: &Contents<'_>) -> Result<Self, PackageError> {
        let folder = folder_of(contents.report);
        let Some(output) = below(contents.output, folder) else {
            return Err(PackageError::ReportNotAbove {
                report: contents.report.into(),
                output: contents.output.into(),
            });
        };
        let report = listable(Path::new(contents.report.file_name().unwrap_or_default()))?;
        let table = contents.table.and_then(|table| below(table, folder));
        Ok(Listed { output, report, table: table.as_deref().map(listable).transpose()? })
    }

    fn output_path(&self, relative: &Path) -> Result<String, PackageError> {
        listable(&self.output.join(relative))
    }
}

/// `path` as a descriptor holds it.
fn listable(path: &Path) -> Result<String, PackageError> {
    let refuse = |why| PackageError::NotListable { path: path.into(), why };
    let text = posix(path).ok_or_else(|| refuse("its name is not UTF-8, and JSON can't hold it"))?;
    objection(&text).map_or(Ok(text), |why| Err(refuse(why)))
}

/// One resource.
#[derive(Serialize)]
struct Resource<'a> {
    name: String,
    path: &'a str,
    #[serde(skip_serializing_if = "Option::is_none")]
    title: Option<&'a str>,
    format: &'a str,
    mediatype: &'a str,
    #[serde(skip_serializing_if = "Option::is_none")]
    encoding: Option<&'a str>,
    bytes: u64,
    hash: String,
}

/// What kind of file a resource is.
struct Kind {
    title: Option<&'static str>,
    format: &'static str,
    /// `audio/wav` is common practice and not registered; the other two are.
    mediatype: &'static str,
    encoding: Option<&'static str>,
}

const RECORDING: Kind = Kind { title: None, format: "wav", mediatype: "audio/wav", encoding: None };
const REPORT: Kind = Kind {
    title: Some("Report: what was done to each recording, figures and verdicts"),
    format: "json",
    mediatype: "application/json",
    encoding: Some("utf-8"),
};
const TABLE: Kind = Kind {
    title: Some("The report's figures as a table"),
    format: "csv",
    mediatype: "text/csv",
    encoding: Some("utf-8"),
};

impl Kind {
    fn resource<'a>(&self, name: String, path: &'a str, digest: &Digest) -> Resource<'a> {
        Resource {
            name,
            path,
            title: self.title,
            format: self.format,
            mediatype: self.mediatype,
            encoding: self.encoding,
            bytes: digest.bytes,
            hash: format!("sha256:{}", digest.sha256),
        }
    }
}

/// Renders the descriptor.
pub fn render(
    contents: &Contents<'_>,
    items: &mut dyn Iterator<Item = io::Result<Item>>,
    purpose: Purpose<'_>,
) -> Result<Vec<Complete>, PackageError> {
    let listed = Listed::new(contents)?;
    let mut names = ResourceNames::default();
    let mut file = NewFile::begin(&folder_of(contents.report).join(DESCRIPTOR), purpose)?;
    file.write(|out| write_head(out, contents))?;
    let read =
        |path: &Path| digest::of_file(path).map_err(|cause| PackageError::Unreadable { path: path.into(), cause });
    let report = REPORT.resource(names.assign(&listed.report), &listed.report, &read(contents.report)?);
    file.write(|out| write_resource(out, &report))?;
    if let (Some(place), Some(path)) = (contents.table, &listed.table) {
        let table = TABLE.resource(names.assign(path), path, &read(place)?);
        file.write(|out| write_next(out, &table))?;
    }
    for item in items {
        let item = item.map_err(PackageError::Items)?;
        if purpose.outputs_must_be_there() {
            still_there(contents.output, &item)?;
        }
        let path = listed.output_path(&item.path)?;
        let digest = Digest { sha256: item.sha256, bytes: item.bytes };
        let recording = RECORDING.resource(names.assign(&path), &path, &digest);
        file.write(|out| write_next(out, &recording))?;
    }
    file.write(|out| out.write_all(b"\n  ]\n}\n"))?;
    Ok(vec![file.complete()?])
}

/// All that stands before the first resource.
fn write_head(out: &mut dyn Write, contents: &Contents<'_>) -> io::Result<()> {
    out.write_all(b"{")?;
    let title = contents.title.filter(|title| !title.trim().is_empty());
    let folder = real(contents.output);
    let named_after = title.or_else(|| folder.file_name()?.to_str()).unwrap_or("recordings");
    let name = package_name(named_after);
    let description = format!(
        "Recordings filtered and measured by {} {}; the report says what was done to each and holds the figures",
        env!("CARGO_PKG_NAME"),
        env!("CARGO_PKG_VERSION")
    );
    let entries = [
        ("$schema", Some(PROFILE)),
        ("name", Some(&name)),
        ("title", title),
        ("description", Some(&description)),
        ("created", Some(contents.started)),
    ];
    for (key, value) in entries {
        if let Some(value) = value {
            write!(out, "\n  \"{key}\": ")?;
            serde_json::to_writer(&mut *out, value)?;
            out.write_all(b",")?;
        }
    }
    out.write_all(b"\n  \"resources\": [")
}

/// A resource on a line of its own, after another.
fn write_next(out: &mut dyn Write, resource: &Resource<'_>) -> io::Result<()> {
    out.write_all(b",")?;
    write_resource(out, resource)
}

fn write_resource(out: &mut dyn Write, resource: &Resource<'_>) -> io::Result<()> {
    out.write_all(b"\n    ")?;
    Ok(serde_json::to_writer(out, resource)?)
}
