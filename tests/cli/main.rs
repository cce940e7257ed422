//! The program from outside: what it takes, prints and returns.
#![allow(clippy::unwrap_used, clippy::panic)] // also in functions that are no #[test]

mod design;
mod filter;
mod interrupt;
mod response_table;
mod words;

use assert_cmd::Command;

/// The program, without what the environment says about colors.
fn bandproof() -> Command {
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
    command.env_remove("NO_COLOR").env_remove("CLICOLOR_FORCE").current_dir(env!("CARGO_MANIFEST_DIR"));
    command
}

/// Path of a spec among the test's own.
fn spec(name: &str) -> String {
    format!("tests/cli/specs/{name}")
}

/// Standard output of a finished command as text.
fn stdout(command: &mut Command) -> String {
    String::from_utf8(command.output().unwrap().stdout).unwrap()
}

/// Standard error of a finished command as text.
fn stderr(command: &mut Command) -> String {
    String::from_utf8(command.output().unwrap().stderr).unwrap()
}
