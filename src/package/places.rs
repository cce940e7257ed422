//! Where things lie: real places, and paths relative to them with `/`.

pub use crate::files::place::{folder_of, real};
use std::path::{Component, Path, PathBuf};

/// The place of `path` below `folder`, both real; empty where they are the same.
pub fn below(path: &Path, folder: &Path) -> Option<PathBuf> {
    real(path).strip_prefix(real(folder)).ok().map(Path::to_path_buf)
}

/// A relative path with `/` between its components; `None` where one is not UTF-8.
pub fn posix(relative: &Path) -> Option<String> {
    let mut text = String::new();
    for component in relative.components() {
        let Component::Normal(name) = component else { continue };
        if !text.is_empty() {
            text.push('/');
        }
        text.push_str(name.to_str()?);
    }
    Some(text)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn places_are_compared_where_they_really_are() {
        let root = tempfile::tempdir().unwrap();
        let out = root.path().join("out");
        std::fs::create_dir(&out).unwrap();
        assert_eq!(below(&out.join("../out/new/report.json"), &out), Some("new/report.json".into()));
        assert_eq!(below(&out.join("./."), &out), Some(PathBuf::new()));
        assert_eq!(below(&root.path().join("outer"), &out), None, "a longer name is not a place inside");
        assert_eq!(below(&out.join("not-there/../../elsewhere"), &out), None);
        #[cfg(unix)]
        {
            let link = root.path().join("link");
            std::os::unix::fs::symlink(&out, &link).unwrap();
            assert_eq!(below(&link.join("a"), &out), Some("a".into()));
        }
    }

    #[test]
    fn a_bare_name_lies_in_the_current_folder() {
        assert_eq!(folder_of(Path::new("report.json")), Path::new("."));
        assert_eq!(folder_of(Path::new("out/report.json")), Path::new("out"));
    }
}
