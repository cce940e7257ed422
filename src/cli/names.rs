//! Names of bands: the lines of a row are told in one breath.

/// Base name and line of `pump hum x3`; no line for other names.
fn parted(name: &str) -> (&str, Option<u32>) {
    match name.rsplit_once(" x") {
        Some((base, line)) if line.bytes().all(|byte| byte.is_ascii_digit()) => match line.parse() {
            Ok(line) => (base, Some(line)),
            Err(_) => (name, None),
        },
        _ => (name, None),
    }
}

/// Whether `next` is the line after `name` in the same row.
pub fn follows(name: &str, next: &str) -> bool {
    match (parted(name), parted(next)) {
        ((base, Some(line)), (next_base, Some(next_line))) => base == next_base && next_line == line.saturating_add(1),
        _ => false,
    }
}

/// `pump hum x1 to x8`, or the one name.
pub fn span(first: &str, last: &str) -> String {
    match parted(last) {
        (_, Some(line)) if first != last => format!("{first} to x{line}"),
        _ => first.to_owned(),
    }
}

/// Splits `items` where the next one's band is not the line after in the same row
/// or `same` says that the two can't be told together.
pub fn rows<T>(items: &[T], name: impl Fn(&T) -> &str, same: impl Fn(&T, &T) -> bool) -> Vec<&[T]> {
    items.chunk_by(|one, next| follows(name(one), name(next)) && same(one, next)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_of_a_row_are_told_together() {
        let names = ["hum x1", "hum x2", "hum x4", "whine", "whine x1", "a x9", "b x10"];
        let told: Vec<_> =
            rows(&names, |name| name, |_, _| true).iter().map(|row| span(row[0], row[row.len() - 1])).collect();
        assert_eq!(told, ["hum x1 to x2", "hum x4", "whine", "whine x1", "a x9", "b x10"]);
        let apart = rows(&names[..2], |name| name, |_, _| false);
        assert_eq!(apart.len(), 2);
    }

    #[test]
    fn other_names_have_no_line() {
        for name in ["hum", "hum x", "hum xy", "hum x99999999999", " x"] {
            assert_eq!(parted(name).1, None, "{name}");
        }
    }
}
