//! Lines of a bag's manifests (RFC 8493, sections 2.1.3 and 2.2.1).

use crate::files::digest::Digest;
use std::io::{self, Write};

/// Writes `checksum  path` and a line feed.
pub fn write_line(out: &mut dyn Write, digest: &Digest, path: &str) -> io::Result<()> {
    writeln!(out, "{}  {}", digest.sha256, encode(path))
}

/// A path as a manifest holds it: line feed, carriage return and `%` percent-encoded,
/// and only those (section 2.1.3).
fn encode(path: &str) -> String {
    let mut text = String::with_capacity(path.len());
    for character in path.chars() {
        match character {
            '\n' => text.push_str("%0A"),
            '\r' => text.push_str("%0D"),
            '%' => text.push_str("%25"),
            other => text.push(other),
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    /// RFC 8493, section 2.1.3.
    #[test]
    fn only_line_breaks_and_percent_signs_are_encoded() {
        assert_eq!(encode("data/a b\t#?&ü\\.wav"), "data/a b\t#?&ü\\.wav");
        assert_eq!(encode("data/50%\r\n.wav"), "data/50%25%0D%0A.wav");
        assert_eq!(encode("data/%0A.wav"), "data/%250A.wav");
    }

    /// Undoes `encode` without knowing how it works: RFC 3986, section 2.1, for the
    /// three characters RFC 8493 names.
    fn decode(text: &str) -> String {
        text.replace("%0D", "\r").replace("%0A", "\n").replace("%25", "%")
    }

    proptest::proptest! {
        #[test]
        fn every_path_comes_back(path in "([%\r\nADad025 ü日/]|.){0,40}") {
            let text = encode(&path);
            proptest::prop_assert!(!text.contains(['\r', '\n']));
            proptest::prop_assert_eq!(decode(&text), path);
        }
    }
}
