//! `bandproof schema`.

use assert_cmd::Command;
use serde_json::Value;
use std::process::Stdio;

fn schema(arguments: &[&str]) -> Command {
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
    command.arg("schema").args(arguments);
    command
}

#[test]
fn the_schemas_are_those_of_the_library() {
    for (name, expected) in [("spec", bandproof::spec::schema()), ("report", bandproof::report::schema())] {
        let output = schema(&[name]).output().unwrap();
        assert_eq!(output.status.code(), Some(0));
        assert_eq!(String::from_utf8(output.stderr).unwrap(), "");
        let text = String::from_utf8(output.stdout).unwrap();
        assert_eq!(serde_json::from_str::<Value>(&text).unwrap(), expected, "{name}");
        // One key a line, and the last line ended.
        assert!(text.starts_with("{\n  \"$schema\": ") && text.ends_with("\n}\n"), "{name}");
        assert!(text.bytes().all(|byte| byte == b'\n' || (b' '..=b'~').contains(&byte)), "{name}");
        // The same bytes every time.
        assert_eq!(schema(&[name]).output().unwrap().stdout, text.into_bytes(), "{name}");
    }
}

#[test]
fn without_a_file_that_has_a_schema_it_says_which_have() {
    for arguments in [&[][..], &["recording"][..], &["spec", "report"][..]] {
        let output = schema(arguments).output().unwrap();
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(output.stdout.is_empty(), "{arguments:?}");
        assert!(!output.stderr.is_empty(), "{arguments:?}");
    }
    let said = String::from_utf8(schema(&["recording"]).output().unwrap().stderr).unwrap();
    assert!(said.contains("spec") && said.contains("report"), "{said}");
}

#[test]
fn a_closed_pipe_ends_it_quietly() {
    let mut child = std::process::Command::new(assert_cmd::cargo::cargo_bin!("bandproof"))
        .args(["schema", "report"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let ended = child.wait_with_output().unwrap();
    assert_eq!(ended.status.code(), Some(0));
    assert_eq!(String::from_utf8(ended.stderr).unwrap(), "");
}
