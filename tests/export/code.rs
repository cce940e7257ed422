//! `c` and `rust`, compiled and run against the program's own filter.

use crate::support::{IDENTITY, SHORT, designed, exported, filtered, noise, specs, written};
use bandproof::export::{Form, rounding};
use bandproof::section::Section;
use bandproof::spec::SpecFile;
use std::io::Write as _;
use std::path::Path;
use std::process::{Command, Stdio};

/// Reads samples from stdin, writes the filtered ones to stdout, in blocks whose lengths
/// repeat 1, 7, 1000, 0, 64.
const C_DRIVER: &str = r#"
#include <stdio.h>
#include "cascade.c"
static double samples[1000];
int main(void)
{
    static const size_t blocks[5] = {1, 7, 1000, 0, 64};
    struct cascade_state state;
    int started = 0, turn = 0;
    for (;;) {
        const size_t wanted = blocks[turn++ % 5];
        const size_t frames = fread(samples, sizeof samples[0], wanted, stdin);
        if (frames > 0 && !started) {
            cascade_init(&state, samples[0]);
            started = 1;
        }
        if (started) cascade_process(&state, samples, samples, frames);
        fwrite(samples, sizeof samples[0], frames, stdout);
        if (frames < wanted) return 0;
    }
}
"#;

const RUST_DRIVER: &str = r#"
#![deny(warnings, unsafe_code)]
mod cascade;
use std::io::{Read, Write};
fn main() {
    assert!(cascade::SECTIONS.len() == cascade::SECTION_COUNT);
    let mut bytes = Vec::new();
    std::io::stdin().read_to_end(&mut bytes).unwrap();
    let samples: Vec<f64> = bytes.chunks_exact(8).map(|b| f64::from_le_bytes(b.try_into().unwrap())).collect();
    let mut state = cascade::State::new(samples[0]);
    let mut rest = &samples[..];
    for block in [1, 7, 1000, 0, 64].into_iter().cycle() {
        if rest.is_empty() { break; }
        let (now, later) = rest.split_at(block.min(rest.len()));
        let mut out = vec![0.0; now.len()];
        state.process(now, &mut out);
        for sample in out { std::io::stdout().write_all(&sample.to_le_bytes()).unwrap(); }
        rest = later;
    }
}
"#;

/// Noise on an offset, then digital silence in which states decay below what is kept of them.
fn signal() -> Vec<f64> {
    let mut signal: Vec<f64> = noise(5, 6_000).iter().map(|sample| 0.4 + 0.5 * sample).collect();
    signal.extend([0.0; 60_000]);
    signal.extend([-0.0, -0.0, 1e-300, -1.0]);
    signal.extend(noise(6, 2_000));
    signal
}

/// What is compiled: text by form, with the sections that it must equal.
fn cases(form: Form) -> Vec<(String, String, Vec<Section>)> {
    let mut cases = Vec::new();
    let mut add = |name: &str, spec: &SpecFile, rate_hz, digits| {
        let full = designed(spec, rate_hz).sections;
        let sections = full.iter().map(|section| rounding::to_digits(section, digits)).collect();
        let asked = (digits < rounding::MOST_DIGITS).then_some(digits);
        let text = exported(spec, rate_hz, form, asked, None).unwrap().text;
        cases.push((format!("{name} at {rate_hz} Hz with {digits} digits"), text, sections));
    };
    let (_, reed_bed, _) = specs().remove(0);
    add("reed-bed", &reed_bed, 48_000, 17);
    add("short", &written(SHORT), 48_000, 17);
    add("short", &written(SHORT), 48_000, 4);
    add("identity", &written(IDENTITY), 48_000, 17);
    cases
}

fn run(program: &Path, input: &[f64]) -> Vec<f64> {
    let mut child = Command::new(program).stdin(Stdio::piped()).stdout(Stdio::piped()).spawn().unwrap();
    let mut stdin = child.stdin.take().unwrap();
    let bytes: Vec<u8> = input.iter().flat_map(|sample| sample.to_le_bytes()).collect();
    let writer = std::thread::spawn(move || stdin.write_all(&bytes).unwrap());
    let output = child.wait_with_output().unwrap();
    writer.join().unwrap();
    assert!(output.status.success());
    output.stdout.as_chunks::<8>().0.iter().map(|bytes| f64::from_le_bytes(*bytes)).collect()
}

#[track_caller]
fn compiled(command: &mut Command) {
    let output = command.output().unwrap();
    assert!(output.status.success(), "{command:?}\n{}", String::from_utf8_lossy(&output.stderr));
}

#[track_caller]
fn assert_same_bits(name: &str, found: &[f64], expected: &[f64]) {
    assert_eq!(found.len(), expected.len(), "{name}");
    let differs = found.iter().zip(expected).position(|(found, expected)| found.to_bits() != expected.to_bits());
    assert_eq!(differs, None, "{name}: the first frame that differs");
}

/// Whether there is a C compiler; says so where there is none.
#[allow(clippy::print_stdout)]
pub fn has_c_compiler() -> bool {
    let found = Command::new("cc").arg("--version").output().is_ok();
    if !found {
        println!("skipped: there is no C compiler named cc, and the C form can't be tried");
    }
    found
}

#[test]
fn the_c_form_gives_the_programs_own_samples_bit_for_bit() {
    if !has_c_compiler() {
        return;
    }
    let input = signal();
    for (name, text, sections) in cases(Form::C) {
        let expected = filtered(&sections, &input);
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(folder.path().join("cascade.c"), &text).unwrap();
        std::fs::write(folder.path().join("driver.c"), C_DRIVER).unwrap();
        for level in ["-O2", "-O3"] {
            let mut cc = Command::new("cc");
            cc.current_dir(folder.path()).args(["-std=c99", level, "-ffp-contract=off"]);
            cc.args(["-Wall", "-Wextra", "-Wpedantic", "-Werror", "driver.c", "-o", "driver"]);
            compiled(&mut cc);
            assert_same_bits(&format!("{name}, {level}"), &run(&folder.path().join("driver"), &input), &expected);
        }
    }
}

#[test]
fn the_rust_form_gives_the_programs_own_samples_bit_for_bit() {
    let input = signal();
    for (name, text, sections) in cases(Form::Rust) {
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(folder.path().join("cascade.rs"), &text).unwrap();
        std::fs::write(folder.path().join("driver.rs"), RUST_DRIVER).unwrap();
        let mut rustc = Command::new(std::env::var_os("RUSTC").unwrap_or_else(|| "rustc".into()));
        compiled(rustc.current_dir(folder.path()).args(["--edition=2021", "-O", "driver.rs", "-o", "driver"]));
        assert_same_bits(&name, &run(&folder.path().join("driver"), &input), &filtered(&sections, &input));
    }
}

#[test]
fn the_signal_takes_states_below_what_is_kept_of_them() {
    // Or the tests above would not see whether the forms clear them.
    let sections = designed(&written(SHORT), 48_000).sections;
    let (_, states) = bandproof::cascade::plain::filter_with_states(&sections, &signal()[..66_000]);
    assert!(states.iter().flatten().all(|s| *s == 0.0), "{states:?}");
}
