//! Damaged specs are refused or read, and nothing else happens.

use bandproof::spec::{self, SpecError, SpecSyntax};

use super::designs::{DESIGNS_JSON, DESIGNS_TOML};
use super::examples::{REED_BED_JSON, REED_BED_TOML};

/// A xorshift generator (G. Marsaglia, J. Stat. Software 8(14), 2003): the same cases on
/// every run.
struct Random(u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0
    }

    fn below(&mut self, end: usize) -> usize {
        (self.next() % end as u64) as usize
    }
}

/// Values to put in place of others; half of them fit some key.
const VALUES: &[&str] = &[
    "0",
    "-1",
    "1",
    "2.5",
    "4",
    "14",
    "49.5",
    "51",
    "100",
    "440.25",
    "15800",
    "9999",
    "0.6",
    "-20",
    "1e999",
    "99999999999999999999",
    "5e-324",
    "1.7e308",
    "\"\"",
    "\"50 Hz\"",
    "\"notch\"",
    "\"elliptic\"",
    "\"bessel\"",
    "\"lowpass\"",
    "\"same\"",
    "\"pump hum x3\"",
    "\"pump hum\"",
    "[40, 60]",
    "[60, 40]",
    "[0, 1, 0.50]",
    "[[0.5, 0.7], [0.5, -0.70]]",
    "[[-3, 4]]",
    "[\"pump hum\"]",
    "[]",
    "[[[[]]]]",
    "true",
    "{}",
];

/// Pieces that break a text, or its meaning.
const PIECES: &[&str] = &[
    "nan",
    "-inf",
    "null",
    "[",
    "]",
    "{",
    "}",
    "\"",
    "'",
    "=",
    ":",
    ",",
    "\n",
    "\u{0}",
    "\u{feff}",
    "é",
    "\\u0000",
    "1979-05-27",
    "[[band]]",
    "[[stage]]",
    "[stage]",
    "center_hz",
    "[[[[[[[[",
    "{\"a\":",
];

fn mutate(bytes: &mut Vec<u8>, random: &mut Random) {
    let at = random.below(bytes.len() + 1);
    let end = (at + random.below(12)).min(bytes.len());
    match random.below(16) {
        0 => drop(bytes.drain(at..end)),
        1 => {
            let piece = PIECES[random.below(PIECES.len())];
            drop(bytes.splice(at..end, piece.bytes()));
        }
        2 => {
            if let Some(byte) = bytes.get_mut(at) {
                *byte = random.next() as u8;
            }
        }
        3 => bytes.truncate(at),
        4 | 5 => {
            // A line less, or twice.
            let is_break = |byte: &u8| *byte == b'\n';
            let from = bytes[..at].iter().rposition(is_break).map_or(0, |offset| offset + 1);
            let to = bytes[from..].iter().position(is_break).map_or(bytes.len(), |offset| from + offset + 1);
            let twice = if random.below(2) == 0 { bytes[from..to].repeat(2) } else { Vec::new() };
            drop(bytes.splice(from..to, twice));
        }
        6 => {
            // Another letter: a key or word misspelled.
            if let Some(offset) = bytes[at..].iter().position(u8::is_ascii_lowercase) {
                bytes[at + offset] = b'a' + random.below(26) as u8;
            }
        }
        _ => {
            // Another value.
            if let Some(offset) = bytes[at..].iter().position(|byte| matches!(byte, b'=' | b':')) {
                let from = at + offset + 1;
                let length = bytes[from..].iter().position(|byte| matches!(byte, b'\n' | b',' | b'}')).unwrap_or(0);
                let value = VALUES[random.below(VALUES.len())];
                drop(bytes.splice(from..from + length, value.bytes()));
            }
        }
    }
}

#[test]
fn twenty_thousand_damaged_specs_are_refused_in_words_or_read_into_valid_specs() {
    let mut random = Random(0x9e37_79b9_7f4a_7c15);
    let (mut read, mut invalid, mut unreadable) = (0, 0, 0);
    for case in 0..20_000 {
        let (example, syntax) = match case % 4 {
            0 => (REED_BED_TOML, SpecSyntax::Toml),
            1 => (REED_BED_JSON, SpecSyntax::Json),
            2 => (DESIGNS_TOML, SpecSyntax::Toml),
            _ => (DESIGNS_JSON, SpecSyntax::Json),
        };
        let mut bytes = example.as_bytes().to_vec();
        for _ in 0..=random.below(3) {
            mutate(&mut bytes, &mut random);
        }
        match spec::parse(&bytes, syntax, "spec") {
            Ok(spec) => {
                read += 1;
                // Whatever is accepted is accepted again, and written the same: a coefficient
                // loses the zeros at its end.
                let json = serde_json::to_vec(&spec).unwrap();
                let again = spec::parse(&json, SpecSyntax::Json, "spec").unwrap();
                assert_eq!(serde_json::to_vec(&again).unwrap(), json, "case {case}");
            }
            Err(error) => {
                let text = error.to_string();
                match error {
                    SpecError::Invalid { problems, .. } => {
                        invalid += 1;
                        assert!(!problems.is_empty(), "case {case}");
                        assert_eq!(text.lines().count(), problems.len(), "case {case}: one line a problem: {text}");
                    }
                    SpecError::Syntax { .. } | SpecError::NotUtf8 { .. } => unreadable += 1,
                    other => panic!("case {case}: {other:?}"),
                }
                assert!(!text.chars().any(|c| c.is_control() && c != '\n'), "case {case}: {text:?}");
            }
        }
    }
    // The mutator reaches every outcome, each by the hundreds.
    assert!(read > 500 && invalid > 500 && unreadable > 500, "{read} read, {invalid} invalid, {unreadable} unreadable");
}
