//! A response as a table: RFC 4180 CSV like that of `super::table`, one row a frequency,
//! designs one after another.
//!
//! # Columns
//! | column | holds | empty |
//! |---|---|---|
//! | `rate_hz` | sample rate | never |
//! | `frequency_hz` | frequency, in full | never |
//! | `gain_db` | net gain before any output gain, to 1e-6; -180 stands for all below it | never |
//! | `phase_deg` | phase, continuous but for half a turn upward at each zero on the unit circle, to 1e-6; 0 for forward and backward | at such a zero |
//! | `group_delay_s` | group delay, to 1e-9; 0 for forward and backward | never |
//! | `limit_low_db` | lowest gain that the bands allow | no band does |
//! | `limit_high_db` | highest gain that the bands allow | no band does |
//! | `bands` | names of the bands here, joined by `; `, but for keep bands where they are excepted | there is none |
//!
//! At an edge of a band there are two rows, the first with the limits below it, the second
//! with those above.

use crate::design::Design;
use crate::design::curve::{Row, curve};
use crate::files::temporary;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Names of the columns.
const COLUMNS: [&str; 8] =
    ["rate_hz", "frequency_hz", "gain_db", "phase_deg", "group_delay_s", "limit_low_db", "limit_high_db", "bands"];

/// Why there is no table.
#[derive(Debug, thiserror::Error)]
pub enum CurveError {
    /// Something has that name.
    #[error("{0} exists already: choose another place for the table, or move that away")]
    Exists(PathBuf),
    /// Writing failed; nothing is left of it.
    #[error("{path}: the table can't be written: {cause}")]
    Write {
        /// The table.
        path: PathBuf,
        /// What the system says.
        cause: io::Error,
    },
}

/// Whether nothing has the name of a new table.
///
/// # Errors
/// [`CurveError::Exists`].
pub fn check(path: &Path) -> Result<(), CurveError> {
    if path.symlink_metadata().is_ok() { Err(CurveError::Exists(path.into())) } else { Ok(()) }
}

/// Writes the responses of `designs` to a new file, which appears complete.
///
/// # Errors
/// See [`CurveError`].
pub fn save_curves(path: &Path, designs: &[Design]) -> Result<(), CurveError> {
    check(path)?;
    let save = || -> io::Result<()> {
        let mut text = Vec::new();
        write_curves(&mut text, designs)?;
        let mut file = temporary::beside(path)?;
        file.write_all(&text)?;
        file.as_file().sync_all()?;
        temporary::settle(file, path, false)
    };
    save().map_err(|cause| match cause.kind() {
        io::ErrorKind::AlreadyExists => CurveError::Exists(path.into()),
        _ => CurveError::Write { path: path.into(), cause },
    })
}

/// Writes the responses of `designs`.
///
/// # Errors
/// Those of `out`.
pub fn write_curves(out: impl Write, designs: &[Design]) -> io::Result<()> {
    let mut table = csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).from_writer(out);
    table.write_record(COLUMNS)?;
    for design in designs {
        for row in curve(design) {
            table.write_record(cells(design.rate_hz, &row))?;
        }
    }
    table.flush()
}

fn cells(rate_hz: u32, row: &Row<'_>) -> [String; 8] {
    let limit = |limit: Option<f64>| limit.map_or(String::new(), |db| db.to_string());
    [
        rate_hz.to_string(),
        row.frequency_hz.to_string(),
        rounded(row.gain_db, 6),
        row.phase_deg.map_or(String::new(), |deg| rounded(deg, 6)),
        rounded(row.group_delay_s, 9),
        limit(row.limit_low_db),
        limit(row.limit_high_db),
        row.bands.join("; "),
    ]
}

/// With so many decimals, and no minus before nothing.
fn rounded(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(size) if size.bytes().all(|byte| matches!(byte, b'0' | b'.')) => size.to_owned(),
        _ => text,
    }
}
