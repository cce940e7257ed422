//! Why a package can't be made.

use std::io;
use std::path::PathBuf;

/// Why a package can't be made.
#[derive(Debug, thiserror::Error)]
pub enum PackageError {
    /// The descriptor beside the report could not reach the outputs.
    #[error(
        "the report {report} is neither in the output folder {output} nor in a folder above it, and a Data Package \
         lists only what lies below its descriptor, which stands beside the report: choose another --report"
    )]
    ReportNotAbove {
        /// The report as given.
        report: PathBuf,
        /// The output folder as given.
        output: PathBuf,
    },
    /// A path that a descriptor must not hold.
    #[error("{path} can't be listed in a Data Package: {why}; give it another name, or leave it out with --exclude")]
    NotListable {
        /// Relative to the descriptor's folder.
        path: PathBuf,
        /// What is wrong with it, after a colon.
        why: &'static str,
    },
    /// Report or table would stand where the package puts a file of its own.
    #[error("{path} is the name of a file that --emit {form} writes itself: choose another for {what}")]
    NameTaken {
        /// As given.
        path: PathBuf,
        /// `datapackage` or `bagit`.
        form: &'static str,
        /// `the report` or `the table`.
        what: &'static str,
    },
    /// OUT is not called `data`.
    #[error(
        "the output folder {0} can't become the payload of a bag: --emit bagit makes the folder above OUT the bag, \
         and OUT must be named `data`, in lower case; give for example {example}",
        example = .0.join("data").display()
    )]
    NotNamedData(PathBuf),
    /// OUT or something in it is a link, a pipe, a device.
    #[error(
        "{path} is {what}, and a bag holds folders and regular files only: put the file or folder itself there, or move \
         it out of the output folder"
    )]
    NotAFile {
        /// Where.
        path: PathBuf,
        /// `a link` or `neither a file nor a folder`.
        what: &'static str,
    },
    /// Tag files would land among the originals.
    #[error(
        "the bag would be {bag}, the folder above OUT, and that {relation} the input {input}: a bag's files must never mix with \
         the originals; choose an OUT elsewhere"
    )]
    AmongOriginals {
        /// The folder above OUT.
        bag: PathBuf,
        /// The input as given.
        input: PathBuf,
        /// `is`, `lies inside` or `is the folder of`.
        relation: &'static str,
    },
    /// The report is not payload.
    #[error(
        "the report {report} is not in the output folder {output}, and a bag carries it as part of its payload: leave out \
         --report, or choose a place in OUT"
    )]
    ReportNotInPayload {
        /// As given.
        report: PathBuf,
        /// As given.
        output: PathBuf,
    },
    /// A manifest that this program does not write, so that it can't be kept true.
    #[error(
        "{0} belongs to a bag that something else made; it would not list this run's outputs, and the bag would be invalid: \
         remove it if it is no longer wanted, or choose an OUT elsewhere"
    )]
    OtherManifest(PathBuf),
    /// A temporary file of a run that was broken off, or of one that is still going on.
    #[error(
        "{0} was left behind by an interrupted run and would become part of the bag: delete it (unless another run is \
         writing to this folder now)"
    )]
    Leftover(PathBuf),
    /// Names in manifests are UTF-8.
    #[error(
        "the name of {0} is not UTF-8, and the manifest of a bag can't hold it: rename it, or leave it out with --exclude"
    )]
    NotUtf8(PathBuf),
    /// A file or folder can't be read or looked into.
    #[error("{path} can't be read: {cause}; see to its permissions")]
    Unreadable {
        /// Where.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// The bag's own files can't be written where they belong.
    #[error("the folder above OUT, {path}, can't be written to: {cause}; --emit bagit puts the bag's manifests there")]
    BagNotWritable {
        /// The folder above OUT.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// An output is not as the run left it.
    #[error(
        "the output {path} {what}, so something else has touched it since this run wrote it; run again \
         with --replace when nothing else writes to this folder"
    )]
    Changed {
        /// Where.
        path: PathBuf,
        /// `is gone` or what it is now.
        what: String,
    },
    /// What the run keeps on its outputs can't be read again.
    #[error("the list of finished outputs can't be read: {0}; see to the output folder and run again with --replace")]
    Items(io::Error),
    /// A file of the package can't be written.
    #[error("{path} can't be written: {cause}; see to that place and run again with --replace")]
    Write {
        /// Where.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
}
