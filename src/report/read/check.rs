//! What must hold of an entry beyond the types of its values.

use super::super::{Recording, Status};

/// What types alone don't say of an entry.
pub(super) fn check(recording: &Recording) -> Result<(), String> {
    check_path(&recording.path, "path")?;
    if let Some(hash) = recording.input.as_ref().and_then(|input| input.sha256.as_ref()) {
        check_hash(hash, "input.sha256")?;
    }
    if let Some(output) = &recording.output {
        check_path(&output.path, "output.path")?;
        check_hash(&output.sha256, "output.sha256")?;
    }
    if let Some(pair) = &recording.pair {
        check_path(&pair.path, "pair.path")?;
        if let Some(hash) = &pair.sha256 {
            check_hash(hash, "pair.sha256")?;
        }
        if let Some(hash) = &pair.noise_sha256 {
            check_hash(hash, "pair.noise_sha256")?;
        }
    }
    let path = &recording.path;
    match recording.status {
        Status::Done if recording.input.is_none() => Err(format!("`{path}` is done but has no `input`")),
        Status::Done if recording.error.is_some() => Err(format!("`{path}` is done but has an `error`")),
        Status::Failed if recording.error.is_none() => Err(format!("`{path}` failed but has no `error`")),
        Status::Failed if recording.output.is_some() => Err(format!("`{path}` failed but has an `output`")),
        _ => Ok(()),
    }
}

pub(super) fn check_hash(hash: &str, key: &str) -> Result<(), String> {
    let digits = hash.bytes().all(|byte| matches!(byte, b'0'..=b'9' | b'a'..=b'f'));
    if hash.len() == 64 && digits {
        return Ok(());
    }
    Err(format!("`{key}` is `{}`, expected 64 lower-case hexadecimal digits", hash.escape_debug()))
}

/// A path must stay below its root on every system, whatever that takes for a separator.
fn check_path(path: &str, key: &str) -> Result<(), String> {
    let bad = |why: &str| {
        let path = path.escape_debug();
        Err(format!("`{key}` is `{path}`, {why}; expected a path below the folder, with `/` between its parts"))
    };
    let starts_with_drive = {
        let mut bytes = path.bytes();
        bytes.next().is_some_and(|letter| letter.is_ascii_alphabetic()) && bytes.next() == Some(b':')
    };
    let drive_is_meant = cfg!(windows) || matches!(path.as_bytes().get(2), None | Some(b'/' | b'\\'));
    match path {
        "" => bad("which is empty"),
        _ if path.contains('\0') => bad("which holds a zero byte"),
        _ if path.starts_with(['/', '\\']) => bad("which is absolute"),
        _ if starts_with_drive && drive_is_meant => bad("which names a drive"),
        _ if path.split(['/', '\\']).any(|part| part == "..") => bad("which climbs out of the folder"),
        _ if path.split('/').any(|part| part.is_empty() || part == ".") => bad("which has a part without a name"),
        // Elsewhere it is a letter like any other, if an unusual one.
        _ if cfg!(windows) && path.contains('\\') => bad("which holds a backslash"),
        _ => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::path::{Component, Path};

    proptest! {
        /// Whatever is let through lies below any folder it is joined to, read with either
        /// separator.
        #[test]
        fn a_path_that_passes_stays_below_its_root(path in r"[./\\a:%C]{0,8}") {
            if check_path(&path, "path").is_ok() {
                for read in [path.clone(), path.replace('\\', "/")] {
                    let mut parts = Path::new(&read).components();
                    prop_assert!(parts.all(|part| matches!(part, Component::Normal(_) | Component::CurDir)), "{read}");
                }
            }
        }
    }

    #[test]
    fn ordinary_and_odd_names_pass() {
        for path in ["a.wav", "station-a/0512.wav", "..a/b...wav", "100%.wav", "%2E%2E/a.wav", "a b/c\"d.wav"] {
            assert_eq!(check_path(path, "path"), Ok(()));
        }
    }
}
