//! Numbers for people.

/// `count` and what is counted: `1 recording`, `12 recordings`.
pub fn counted(count: u64, singular: &str) -> String {
    if count == 1 { format!("1 {singular}") } else { format!("{count} {singular}s") }
}

/// Decimal units, three digits: `812 bytes`, `1.24 GB`.
pub fn bytes(count: u64) -> String {
    const UNITS: [&str; 5] = ["kB", "MB", "GB", "TB", "PB"];
    if count < 1000 {
        return counted(count, "byte");
    }
    let mut value = count as f64 / 1e3;
    let mut unit = 0;
    // 999.5 would read as 1000 of the smaller unit.
    while value >= 999.5 && unit + 1 < UNITS.len() {
        value /= 1e3;
        unit += 1;
    }
    format!("{} {}", three_digits(value), UNITS[unit])
}

/// `3 ms` (rounded up), `0.55 s`, `12.4 s`, `3 min 20 s`, `2 h 05 min`.
pub fn seconds(value: f64) -> String {
    if value < 0.0995 {
        return format!("{} ms", (value * 1e3).ceil());
    }
    // 99.95 would read as 100 with one digit too many.
    if value < 99.95 { format!("{} s", three_digits(value)) } else { about(value) }
}

/// A time that is only known roughly: `45 s`, `1 min 10 s`, `2 h 05 min`.
pub fn about(value: f64) -> String {
    let whole = value.round() as u64;
    match whole {
        ..60 => format!("{whole} s"),
        60..3600 => format!("{} min {:02} s", whole / 60, whole % 60),
        _ => format!("{} h {:02} min", whole / 3600, whole % 3600 / 60),
    }
}

fn three_digits(value: f64) -> String {
    match value {
        _ if value < 9.995 => format!("{value:.2}"),
        _ if value < 99.95 => format!("{value:.1}"),
        _ => format!("{value:.0}"),
    }
}

/// Up to `digits` decimals, without trailing zeros: `50`, `49.5`, `15668.333`.
pub fn trimmed(value: f64, digits: usize) -> String {
    let text = format!("{value:.digits$}");
    if !text.contains('.') {
        return text;
    }
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0".to_owned() } else { text.to_owned() }
}

/// As [`trimmed`] with three decimals, with more where fewer than two digits would be left: a
/// ripple of 0.00023 is not none.
pub fn small(value: f64) -> String {
    let size = value.abs();
    let digits = if size > 0.0 && size < 0.01 { (1.0 - libm::log10(size).floor()).min(300.0) as usize } else { 3 };
    trimmed(value, digits.max(3))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_read_well() {
        assert_eq!([counted(1, "file"), counted(0, "file")], ["1 file", "0 files"]);
        for (count, text) in [
            (1, "1 byte"),
            (999, "999 bytes"),
            (1000, "1.00 kB"),
            (9_994, "9.99 kB"),
            (9_996, "10.0 kB"),
            (999_499, "999 kB"),
            (999_500, "1.00 MB"),
            (1_240_000_000, "1.24 GB"),
            (u64::MAX, "18447 PB"),
        ] {
            assert_eq!(bytes(count), text);
        }
        for (value, text) in [
            (0.0021, "3 ms"),
            (0.554, "0.55 s"),
            (12.44, "12.4 s"),
            (99.94, "99.9 s"),
            (99.96, "1 min 40 s"),
            (200.0, "3 min 20 s"),
            (3599.6, "1 h 00 min"),
            (7500.0, "2 h 05 min"),
        ] {
            assert_eq!(seconds(value), text);
        }
        for (value, text) in [(50.0, "50"), (49.5, "49.5"), (-0.0001, "0"), (100.0, "100"), (0.1256, "0.126")] {
            assert_eq!(trimmed(value, 3), text);
        }
        for (value, text) in [
            (0.5, "0.5"),
            (0.012_34, "0.012"),
            (0.002_34, "0.0023"),
            (0.000_234, "0.00023"),
            (4e-9, "0.000000004"),
            (0.0, "0"),
        ] {
            assert_eq!(small(value), text);
        }
        assert_eq!(trimmed(1200.0, 0), "1200");
        assert_eq!([0.4, 59.4, 59.6, 7500.0].map(about), ["0 s", "59 s", "1 min 00 s", "2 h 05 min"]);
    }
}
