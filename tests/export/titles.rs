//! No title, file name or band name leaves the comment or string it stands in.

use crate::code::has_c_compiler;
use crate::support::{SHORT, written};
use bandproof::export::{Form, Request, export};
use bandproof::spec::SpecFile;
use proptest::prelude::*;
use std::process::Command;

const FORMS: [(Form, &str); 4] = [(Form::C, "// "), (Form::Rust, "// "), (Form::Numpy, "# "), (Form::Equation, "# ")];

fn named(title: &str, band: &str) -> SpecFile {
    let mut spec = written(&format!("{SHORT}\n[[band]]\nname = \"x\"\nfrom_hz = 2000\nto_hz = 3000\n"));
    spec.spec.title = Some(title.to_owned());
    spec.spec.bands[0].name = band.to_owned();
    spec
}

fn text(spec: &SpecFile, file_name: &str, form: Form) -> String {
    export(&Request { spec, file_name, rate_hz: 48_000, form, digits: None, bits: None }).unwrap().text
}

/// What is no comment.
fn code<'a>(text: &'a str, prefix: &str) -> Vec<&'a str> {
    text.lines().filter(|line| !line.starts_with(prefix.trim_end())).collect()
}

/// Characters that end lines, comments or strings somewhere, among plain ones.
fn awkward() -> impl Strategy<Value = String> {
    let hostile = prop::sample::select(vec![
        '"', '\'', '\\', '\n', '\r', '*', '/', '?', '#', '\0', '\u{b}', '\u{c}', '\u{85}', '\u{2028}', '\u{2029}',
        '\u{202e}', '`', '{', '}', ' ', 'n', 'u', '\u{1f}', '\u{feff}',
    ]);
    prop::collection::vec(prop_oneof![3 => hostile, 1 => any::<char>()], 0..200)
        .prop_map(|all| all.into_iter().collect())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(96))]
    #[test]
    fn the_code_is_the_same_whatever_the_names(title in awkward(), band in awkward(), file in awkward()) {
        let plain = named("plain", "plain");
        let odd = named(&title, &band);
        for (form, prefix) in FORMS {
            let (expected, found) = (text(&plain, "plain.toml", form), text(&odd, &file, form));
            prop_assert_eq!(code(&found, prefix), code(&expected, prefix));
            for line in found.lines().filter(|line| line.starts_with(prefix.trim_end())) {
                // What may follow `//` or `#` up to the end of the line, for every compiler's notion of a line.
                let is_plain = line.chars().all(|c| !c.is_control() && !matches!(c, '\u{2028}' | '\u{2029}' | '\u{202e}'));
                prop_assert!(is_plain && !line.ends_with('\\') && !line.ends_with("??/"), "{line:?}");
            }
        }
        for form in [Form::Json, Form::Fixed] {
            let document: serde_json::Value = serde_json::from_str(&text(&odd, &file, form)).unwrap();
            prop_assert_eq!(document["spec"]["title"].as_str(), Some(title.as_str()));
            prop_assert_eq!(document["bands"][0]["name"].as_str(), Some(band.as_str()));
        }
    }
}

#[test]
fn compilers_take_hostile_names_for_comments() {
    let hostile = "end */ int x; /* \"??/ ??/\n#error\r\n\\ \\\\ \u{202e} \u{2028} // \"\"\"";
    let spec = named(hostile, hostile);
    let folder = tempfile::tempdir().unwrap();
    let rust = folder.path().join("cascade.rs");
    std::fs::write(&rust, text(&spec, hostile, Form::Rust)).unwrap();
    let mut rustc = Command::new(std::env::var_os("RUSTC").unwrap_or_else(|| "rustc".into()));
    rustc.current_dir(folder.path()).args(["--edition=2021", "--crate-type=lib", "--emit=metadata", "-Dwarnings"]);
    let output = rustc.arg(&rust).output().unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    if !has_c_compiler() {
        return;
    }
    std::fs::write(folder.path().join("cascade.c"), text(&spec, hostile, Form::C)).unwrap();
    let mut cc = Command::new("cc");
    cc.current_dir(folder.path()).args(["-std=c99", "-Wall", "-Wextra", "-Wpedantic", "-Werror", "-fsyntax-only"]);
    let output = cc.arg("cascade.c").output().unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
}
