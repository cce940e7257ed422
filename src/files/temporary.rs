//! Files that appear under their names complete.

use std::fs;
use std::io;
use std::path::Path;
use tempfile::{Builder, NamedTempFile};

/// Beginning and end of this program's temporary names.
const PREFIX: &str = ".bandproof-";
const SUFFIX: &str = ".part";

/// Name of the journal inside an output folder; it is removed when the report is complete.
pub const JOURNAL_NAME: &str = ".bandproof-journal";

/// A temporary file beside `target`, so that the rename can't cross file systems. It has
/// the permissions of any new file.
///
/// # Errors
/// What the system says, without the temporary name, which would mean nothing to a user.
pub fn beside(target: &Path) -> io::Result<NamedTempFile> {
    let mut builder = builder();
    #[cfg(unix)]
    {
        // tempfile's own default is for its owner only.
        use std::os::unix::fs::PermissionsExt;
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    begin(&builder, target)
}

/// The same for a file that gets the permissions of another in the end: until then it is
/// for its owner only.
///
/// # Errors
/// As [`beside`].
pub fn private_beside(target: &Path) -> io::Result<NamedTempFile> {
    begin(&builder(), target)
}

fn builder() -> Builder<'static, 'static> {
    let mut builder = Builder::new();
    builder.prefix(PREFIX).suffix(SUFFIX);
    builder
}

fn begin(builder: &Builder<'_, '_>, target: &Path) -> io::Result<NamedTempFile> {
    let file = builder.tempfile_in(super::place::folder_of(target)).map_err(without_name)?;
    // Held until the file has its name: another run takes away only what nobody holds. A
    // file system without locks has none to respect.
    _ = file.as_file().try_lock();
    Ok(file)
}

/// Gives a finished file its name, in the place of another only where `replace` says so.
///
/// # Errors
/// What the system says; the temporary file is gone then.
pub fn settle(file: NamedTempFile, target: &Path, replace: bool) -> io::Result<()> {
    let settled = if replace { file.persist(target) } else { file.persist_noclobber(target) };
    settled.map(drop).map_err(|error| error.error)
}

/// Whether a name is one of those a run gives its own files at the top of an output folder
/// (the journal), which are gone when the run has ended.
pub fn is_run_name(name: &[u8]) -> bool {
    name == JOURNAL_NAME.as_bytes()
}

/// Whether a name is one that this program gives files while they are written.
pub fn is_temporary_name(name: &[u8]) -> bool {
    let middle = name.strip_prefix(PREFIX.as_bytes()).and_then(|rest| rest.strip_suffix(SUFFIX.as_bytes()));
    // Letters and digits, as many as tempfile makes unless told otherwise.
    middle.is_some_and(|middle| middle.len() == 6 && middle.iter().all(u8::is_ascii_alphanumeric))
}

/// What is wrong with the place of a temporary file, without that file's name.
fn without_name(error: io::Error) -> io::Error {
    match error.kind() {
        io::ErrorKind::NotFound => io::Error::new(io::ErrorKind::NotFound, "no such folder"),
        kind if kind.to_string() == io::ErrorKind::Other.to_string() => error,
        kind => kind.into(),
    }
}
