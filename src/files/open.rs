//! Opening what is to be read.

use std::fs::File;
use std::io;
use std::path::Path;

/// Opens a regular file for reading.
///
/// Never waits: a pipe that lies where a recording lay a moment ago would otherwise hold
/// the run until something writes into it, and opening a device can have effects of its own.
///
/// # Errors
/// What the system says; [`io::ErrorKind::InvalidInput`] for anything that is no regular
/// file, with what it is.
pub fn regular(path: &Path) -> io::Result<File> {
    // Looked at before, because opening a device may do something; looked at again after,
    // because it may have changed in between.
    refuse_other(&path.metadata()?.file_type())?;
    let file = without_waiting(path)?;
    refuse_other(&file.metadata()?.file_type())?;
    Ok(file)
}

#[cfg(unix)]
fn without_waiting(path: &Path) -> io::Result<File> {
    use std::os::unix::fs::OpenOptionsExt;
    File::options().read(true).custom_flags(libc::O_NONBLOCK).open(path)
}

#[cfg(not(unix))]
fn without_waiting(path: &Path) -> io::Result<File> {
    File::open(path)
}

fn refuse_other(kind: &std::fs::FileType) -> io::Result<()> {
    if kind.is_file() {
        return Ok(());
    }
    let message = format!("it is {}, expected a regular file", other(kind));
    Err(io::Error::new(io::ErrorKind::InvalidInput, message))
}

/// What a file is that is no regular one.
fn other(kind: &std::fs::FileType) -> &'static str {
    #[cfg(unix)]
    {
        use std::os::unix::fs::FileTypeExt;
        if kind.is_fifo() {
            return "a pipe";
        }
        if kind.is_socket() {
            return "a socket";
        }
        if kind.is_char_device() || kind.is_block_device() {
            return "a device";
        }
    }
    if kind.is_dir() { "a folder" } else { "neither file nor folder" }
}

#[cfg(all(test, unix))]
mod tests {
    use super::*;
    use std::os::unix::fs::symlink;

    #[test]
    fn what_is_no_regular_file_is_named_and_nothing_waits_for_it() {
        let folder = tempfile::tempdir().unwrap();
        let pipe = folder.path().join("pipe.wav");
        assert!(std::process::Command::new("mkfifo").arg(&pipe).status().unwrap().success());
        let link = folder.path().join("link.wav");
        symlink(&pipe, &link).unwrap();
        let _socket = std::os::unix::net::UnixListener::bind(folder.path().join("socket.wav")).unwrap();
        let table = [
            (pipe.as_path(), "a pipe"),
            (&link, "a pipe"),
            (&folder.path().join("socket.wav"), "a socket"),
            (folder.path(), "a folder"),
            (Path::new("/dev/null"), "a device"),
        ];
        for (path, what) in table {
            let error = regular(path).unwrap_err();
            assert_eq!(error.to_string(), format!("it is {what}, expected a regular file"), "{}", path.display());
        }
    }

    #[test]
    fn a_pipe_that_takes_the_place_of_a_file_is_opened_without_waiting() {
        let folder = tempfile::tempdir().unwrap();
        let pipe = folder.path().join("pipe.wav");
        assert!(std::process::Command::new("mkfifo").arg(&pipe).status().unwrap().success());
        let file = without_waiting(&pipe).unwrap();
        assert!(refuse_other(&file.metadata().unwrap().file_type()).is_err());
    }
}
