//! `equation`, read back.

use crate::support::{SHORT, designed, exported, reference, specs, text, written};
use bandproof::design::check::{Check, check};
use bandproof::design::placement;
use bandproof::export::{Form, precision};
use bandproof::section::Section;

/// The equations of `text` as sections: its lines that are no comment.
fn read(text: &str) -> Vec<Section> {
    let lines: Vec<&str> = text.lines().filter(|line| !line.is_empty() && !line.starts_with('#')).collect();
    let count = lines.len();
    lines.iter().enumerate().map(|(index, line)| read_line(line, index, count)).collect()
}

fn read_line(line: &str, index: usize, count: usize) -> Section {
    let name = |number: usize| match number {
        0 => "x".to_owned(),
        last if last == count => "y".to_owned(),
        number => format!("y{number}"),
    };
    let (input, output) = (name(index), name(index + 1));
    let (left, right) = line.split_once(" = ").unwrap();
    assert_eq!(left, format!("{output}[n]"));
    let mut section = Section { b: [0.0; 3], a: [1.0, 0.0, 0.0] };
    let (mut sign, mut places) = (1.0, Vec::new());
    for part in right.split(' ') {
        match part {
            "+" => sign = 1.0,
            "-" => sign = -1.0,
            term => {
                // A term without a factor has the factor 1, and no term is written with it.
                let (number, signal) = term.split_once('*').unwrap_or(("1", term));
                assert_ne!(term.split_once('*').map(|(number, _)| number), Some("1"), "{line}");
                let value: f64 = sign * number.parse::<f64>().unwrap();
                let (signal, delay) = signal.strip_suffix(']').unwrap().split_once('[').unwrap();
                let delay: usize = delay.strip_prefix('n').unwrap().trim_start_matches('-').parse().unwrap_or(0);
                if signal == input {
                    section.b[delay] = value;
                    places.push(delay);
                } else {
                    assert_eq!(signal, output);
                    section.a[delay] = -value;
                    places.push(2 + delay);
                }
            }
        }
    }
    assert!(places.is_sorted() && places.len() <= 5, "terms in the report's order: {line}");
    section
}

#[test]
fn the_equations_read_back_as_the_rounded_sections_and_hold_every_requirement() {
    for (name, spec, rates_hz) in specs() {
        for rate_hz in rates_hz {
            let sections = read(&text(&spec, rate_hz, Form::Equation));
            let reference = reference(&spec, rate_hz);
            let digits = precision::fewest_digits(&reference).unwrap();
            assert_eq!(sections, precision::with_digits(&reference, digits), "{name} at {rate_hz} Hz");
            let placed = placement::place(&spec.spec, rate_hz).unwrap();
            let full = designed(&spec, rate_hz);
            let rounded = check(&placed, &sections, 1, f64::from(rate_hz), 0.0);
            for (full, rounded) in full.bands.iter().zip(&rounded) {
                assert_eq!(full.check, rounded.check, "{name} at {rate_hz} Hz, {}", full.band.name);
                assert_ne!(rounded.check, Some(Check::Impossible));
            }
        }
    }
}

#[test]
fn no_more_digits_are_printed_than_are_said() {
    let (_, spec, _) = specs().remove(0);
    for digits in [9, 12] {
        let text = exported(&spec, 48_000, Form::Equation, Some(digits), None).unwrap().text;
        let equations = text.lines().filter(|line| line.starts_with('y'));
        for (number, _) in equations.flat_map(|line| line.split(' ')).filter_map(|term| term.split_once('*')) {
            let mantissa = number.split('e').next().unwrap().trim_start_matches(['0', '.', '-']);
            let count = mantissa.chars().filter(char::is_ascii_digit).count();
            assert!(count <= digits as usize, "{number}");
        }
    }
}

#[test]
fn a_notch_reads_like_this() {
    let spec = written("[[stage]]\nkind = \"notch\"\ncenter_hz = 997\nwidth_hz = 20\n");
    let notch = exported(&spec, 48_000, Form::Equation, Some(4), None).unwrap().text;
    assert_eq!(
        notch.lines().last(),
        Some("y[n] = 0.9987*x[n] - 1.98*x[n-1] + 0.9987*x[n-2] + 1.98*y[n-1] - 0.9974*y[n-2]"),
        "{notch}"
    );
    let spec = written("[[stage]]\nkind = \"digital\"\nnumerator = [1, -1.999, 1]\ndenominator = [1, 0, 0.5]\n");
    let given = text(&spec, 48_000, Form::Equation);
    assert_eq!(given.lines().last(), Some("y[n] = x[n] - 1.999*x[n-1] + x[n-2] - 0.5*y[n-2]"), "{given}");
}

#[test]
fn without_a_requirement_every_digit_is_there() {
    let spec = written(SHORT);
    assert_eq!(read(&text(&spec, 48_000, Form::Equation)), designed(&spec, 48_000).sections);
}
