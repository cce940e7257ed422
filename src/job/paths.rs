//! Paths as the report and messages show them, and folders made on the way.

use std::path::{Component, Path, PathBuf};
use std::{fs, io};

/// Makes a folder and those above it, and says which of them are new, the lowest first.
///
/// # Errors
/// What the system says; folders made before it said so are taken away again.
pub fn make_folder(folder: &Path) -> io::Result<Vec<PathBuf>> {
    let above = folder.ancestors().filter(|one| !one.as_os_str().is_empty());
    let missing: Vec<PathBuf> =
        above.take_while(|one| one.symlink_metadata().is_err()).map(Path::to_path_buf).collect();
    fs::create_dir_all(folder).inspect_err(|_| unmake(&missing))?;
    Ok(missing)
}

/// Takes folders away again as far as they are empty.
pub fn unmake(folders: &[PathBuf]) {
    for folder in folders {
        // A folder that is not empty is another's by now and stays.
        _ = fs::remove_dir(folder);
    }
}

/// The note of a recording whose path is escaped.
pub const ESCAPED_NOTE: &str = "the file's name is not UTF-8; it is shown percent-escaped";

/// A relative path with `/` between its components. Names that are not UTF-8 are
/// percent-escaped (every byte outside UTF-8 and every `%` of that name); the second
/// value says whether any was.
pub fn shown(relative: &Path) -> (String, bool) {
    let mut text = String::new();
    let mut escaped = false;
    for component in relative.components() {
        let Component::Normal(name) = component else { continue };
        if !text.is_empty() {
            text.push('/');
        }
        match name.to_str() {
            Some(name) => text.push_str(name),
            None => {
                escaped = true;
                escape_into(&mut text, name.as_encoded_bytes());
            }
        }
    }
    (text, escaped)
}

fn escape_into(text: &mut String, name: &[u8]) {
    for chunk in name.utf8_chunks() {
        for character in chunk.valid().chars() {
            match character {
                '%' => text.push_str("%25"),
                other => text.push(other),
            }
        }
        for byte in chunk.invalid() {
            text.push_str(&format!("%{byte:02X}"));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn components_are_joined_by_slashes() {
        assert_eq!(shown(Path::new("station-a/0512.wav")), ("station-a/0512.wav".into(), false));
        assert_eq!(shown(Path::new("100%.wav")), ("100%.wav".into(), false));
    }

    #[cfg(unix)]
    #[test]
    fn names_that_are_not_utf8_are_escaped_reversibly() {
        use std::os::unix::ffi::OsStrExt;
        let name = std::ffi::OsStr::from_bytes(b"d\xFFr/50%\xE9.wav");
        assert_eq!(shown(Path::new(name)), ("d%FFr/50%25%E9.wav".into(), true));
    }
}
