//! Finding and reading the file itself.

use std::path::Path;

use bandproof::spec::{self, SpecError, SpecSyntax};

const TINY: &str = "[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9\n";

fn in_folder(name: &str, bytes: &[u8]) -> (tempfile::TempDir, std::path::PathBuf) {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join(name);
    std::fs::write(&path, bytes).unwrap();
    (folder, path)
}

#[test]
fn a_file_is_read_with_the_hash_of_its_bytes() {
    let (_folder, path) = in_folder("spec.toml", TINY.as_bytes());
    let file = spec::load(&path).unwrap();
    assert_eq!(file.spec, crate::read(TINY));
    // `printf "[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9\n" | sha256sum` (coreutils)
    assert_eq!(file.file_sha256, "a4c0804a834dff2bc8f63e43a842055fca8d2d490722ce19d3e7e1bfaa53702b");
}

#[test]
fn the_extension_decides_in_any_case() {
    let (_folder, path) = in_folder("SPEC.TOML", TINY.as_bytes());
    assert!(spec::load(&path).is_ok());
    let json = br#"{"band": [{"name": "a", "from_hz": 5, "to_hz": 9}]}"#;
    let (_folder, path) = in_folder("spec.Json", json);
    assert_eq!(spec::load(&path).unwrap().spec, crate::read(TINY));
}

#[test]
fn no_such_file() {
    let error = spec::load(Path::new("nowhere/spec.toml")).unwrap_err();
    assert!(matches!(error, SpecError::NotFound { .. }));
    assert_eq!(error.to_string(), "nowhere/spec.toml: no such spec file; check the path");
}

#[test]
fn a_name_that_says_neither_notation() {
    for name in ["spec.yaml", "spec", "toml", ".toml", "recording.wav"] {
        let error = spec::load(Path::new(name)).unwrap_err();
        assert!(matches!(error, SpecError::Extension { .. }), "{name}: {error}");
    }
    assert_eq!(
        spec::load(Path::new("spec.yaml")).unwrap_err().to_string(),
        "spec.yaml: the name must end in .toml or .json, which says how the spec is written; rename the file"
    );
}

#[test]
fn a_folder_can_not_be_read() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("spec.toml");
    std::fs::create_dir(&path).unwrap();
    let error = spec::load(&path).unwrap_err();
    assert!(matches!(error, SpecError::Unreadable { .. }), "{error}");
}

#[test]
fn a_megabyte_is_the_limit() {
    let mut text = TINY.to_owned();
    text.push_str(&"#".repeat((1 << 20) - TINY.len()));
    let (_folder, path) = in_folder("spec.toml", text.as_bytes());
    assert!(spec::load(&path).is_ok());
    text.push('#');
    let (_folder, path) = in_folder("spec.toml", text.as_bytes());
    assert!(matches!(spec::load(&path), Err(SpecError::TooLarge { limit_bytes: 1_048_576, .. })));
}

#[test]
fn bytes_that_are_not_utf8() {
    let error = spec::parse(b"# \xc3\xa9\n# K\xf6nig\n", SpecSyntax::Toml, "spec.toml").unwrap_err();
    assert!(matches!(error, SpecError::NotUtf8 { offset: 8, line: 2, .. }));
    assert_eq!(error.to_string(), "spec.toml:2: not UTF-8 at byte 8; save the file as UTF-8 text");
}

#[test]
fn a_byte_order_mark_and_windows_line_ends_are_no_matter() {
    let text = format!("\u{feff}{}", TINY.replace('\n', "\r\n"));
    assert_eq!(crate::read(&text), crate::read(TINY));
    let json = "\u{feff}{\"band\": [{\"name\": \"a\", \"from_hz\": 5, \"to_hz\": 9}]}";
    assert_eq!(spec::parse(json.as_bytes(), SpecSyntax::Json, "spec.json").unwrap(), crate::read(TINY));
}
