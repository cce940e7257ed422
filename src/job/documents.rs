//! What a run leaves behind besides recordings: the report and, if asked for, the table.

use super::journal::Journal;
use super::{JobError, Progress};
use crate::files::temporary;
use crate::report::{Head, Recording, Summary, TableWriter, write_report};
use std::fs::File;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};
use tempfile::NamedTempFile;

const BUFFER_BYTES: usize = 1 << 18;

/// Report and table under their temporary names, made first so that a bad place costs no
/// work.
pub struct Documents {
    report: Document,
    table: Option<Document>,
}

/// One of them.
pub struct Document {
    /// `the report` or `the table`.
    what: &'static str,
    file: NamedTempFile,
    target: PathBuf,
}

impl Documents {
    /// Makes the temporary files beside their targets.
    ///
    /// # Errors
    /// A place that can't be written to.
    pub fn begin(report: &Path, table: Option<&Path>, progress: &dyn Progress) -> Result<Self, JobError> {
        let documents = Documents {
            report: Document::begin("the report", report)?,
            table: table.map(|table| Document::begin("the table", table)).transpose()?,
        };
        for document in documents.table.iter().chain([&documents.report]) {
            progress.temporary(document.file.path());
        }
        Ok(documents)
    }

    /// Writes both from the journal and gives them their names; `replace` says in whose
    /// place a file may come.
    ///
    /// # Errors
    /// [`JobError::Record`].
    pub fn finish(
        self,
        replace: &dyn Fn(&Path) -> bool,
        head: &Head,
        journal: &Journal,
        summary: &Summary,
    ) -> Result<(), JobError> {
        if let Some(table) = self.table {
            let replace = replace(&table.target);
            table.finish(replace, |out| write_table(out, journal))?;
        }
        let replace = replace(&self.report.target);
        self.report.finish(replace, |out| write_report(out, head, journal.sorted(), summary))
    }
}

fn write_table(out: &mut impl Write, journal: &Journal) -> io::Result<()> {
    let mut table = TableWriter::new(out)?;
    for line in journal.sorted() {
        let recording: Recording = serde_json::from_str(&line?)?;
        table.add(&recording)?;
    }
    table.finish().map(drop)
}

impl Document {
    /// Makes the temporary file beside `target`; `what` is what messages call it.
    ///
    /// # Errors
    /// A place that can't be written to.
    pub fn begin(what: &'static str, target: &Path) -> Result<Self, JobError> {
        let not_writable = |cause| JobError::NotWritable { what, path: target.into(), cause };
        let file = temporary::beside(target).map_err(not_writable)?;
        Ok(Document { what, file, target: target.into() })
    }

    /// The temporary file.
    pub fn temporary(&self) -> &Path {
        self.file.path()
    }

    /// Lets `write` fill the file and gives it its name.
    ///
    /// # Errors
    /// [`JobError::Record`].
    pub fn finish(
        self,
        replace: bool,
        write: impl FnOnce(&mut BufWriter<&File>) -> io::Result<()>,
    ) -> Result<(), JobError> {
        let Document { what, file, target } = self;
        write_whole(file, &target, replace, write).map_err(|cause| JobError::Record { what, path: target, cause })
    }
}

fn write_whole(
    file: NamedTempFile,
    target: &Path,
    replace: bool,
    write: impl FnOnce(&mut BufWriter<&File>) -> io::Result<()>,
) -> io::Result<()> {
    // The file itself: errors of the temporary file name it, which would mean nothing.
    let mut out = BufWriter::with_capacity(BUFFER_BYTES, file.as_file());
    write(&mut out)?;
    out.into_inner().map_err(io::IntoInnerError::into_error)?.sync_all()?;
    temporary::settle(file, target, replace)
}
