//! What a Data Package may call things: resource names and paths.
//!
//! Data Package 2.0 (datapackage.org/standard), the sections on resources' `name` and
//! `path`; stated here from memory.

use crate::files::digest::hexadecimal;
use sha2::{Digest as _, Sha256};
use std::collections::HashSet;

/// Gives each resource of one package a name of its own.
///
/// A name is the path in lower case with `/` as `_` and whatever else is not among
/// `a-z 0-9 . - _` as `-`: that is what version 2 recommends and version 1 requires. The
/// first path that maps to a name gets it; each later one gets a part of its own SHA-256
/// appended, so that its name does not depend on how many came before.
#[derive(Debug, Default)]
pub struct ResourceNames {
    /// Eight bytes of the SHA-256 of each name in use. Two names that shared them would
    /// cost one a suffix, never its uniqueness.
    used: HashSet<[u8; 8]>,
}

impl ResourceNames {
    /// The name of the resource at `path`, and from now on taken.
    pub fn assign(&mut self, path: &str) -> String {
        let plain = legal(path);
        if self.take(&plain) {
            return plain;
        }
        let hash = hexadecimal(&Sha256::digest(path));
        let mut round = 0_u64;
        loop {
            let suffix = match round {
                0 => hash.get(..8).unwrap_or_default().to_owned(),
                1 => hash.clone(),
                // Only where a path was made to collide.
                _ => format!("{hash}-{round}"),
            };
            let name = format!("{plain}-{suffix}");
            if self.take(&name) {
                return name;
            }
            round += 1;
        }
    }

    fn take(&mut self, name: &str) -> bool {
        let hash: [u8; 32] = Sha256::digest(name).into();
        let [a, b, c, d, e, f, g, h, ..] = hash;
        self.used.insert([a, b, c, d, e, f, g, h])
    }
}

/// `text` as far as a name may hold it; `-` where nothing of it is left.
pub fn legal(text: &str) -> String {
    let map = |character: char| match character {
        'a'..='z' | '0'..='9' | '.' | '-' | '_' => character,
        'A'..='Z' => character.to_ascii_lowercase(),
        '/' => '_',
        _ => '-',
    };
    let name: String = text.chars().map(map).collect();
    if name.is_empty() { "-".to_owned() } else { name }
}

/// A package's name made of its title: what may not stand in a name parts words, and
/// words are joined by `-`.
pub fn package_name(title: &str) -> String {
    let lower = title.to_lowercase();
    let words = lower.split(|character: char| !(character.is_ascii_alphanumeric() || "._-".contains(character)));
    let words: Vec<&str> = words.filter(|word| !word.is_empty()).collect();
    if words.is_empty() { "recordings".to_owned() } else { words.join("-") }
}

/// What keeps a resource from having this `path`, if anything does; a phrase for after a
/// colon. `path` is relative, with `/` between its components.
///
/// A `path` is a POSIX path, not a URL: `%`, `#`, `?` and spaces stand for themselves and
/// are not escaped.
pub fn objection(path: &str) -> Option<&'static str> {
    if path.is_empty() {
        return Some("it is the descriptor's own folder");
    }
    if path.split('/').any(|name| name.starts_with('.')) {
        return Some("the standard allows no name that begins with a dot");
    }
    if path.split('/').any(str::is_empty) {
        return Some("the standard allows no absolute path");
    }
    if path.starts_with('~') {
        return Some("the standard allows no path that begins with `~`");
    }
    if path.starts_with("file:") {
        return Some("the standard would read it as a URL");
    }
    if path.contains('\\') {
        return Some("the standard allows no backslash in a path");
    }
    // What ends a line ends the match of the profile's pattern.
    if path.contains(['\n', '\r', '\u{2028}', '\u{2029}']) {
        return Some("the standard allows no line break in a path");
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_path_keeps_what_a_name_may_hold() {
        assert_eq!(legal("station-a/SM4_0512.WAV"), "station-a_sm4_0512.wav");
        assert_eq!(legal("Rohrdommel früh (1).wav"), "rohrdommel-fr-h--1-.wav");
        assert_eq!(legal(""), "-");
    }

    #[test]
    fn a_package_is_named_by_the_words_of_its_title() {
        assert_eq!(package_name("Reed-bed: recorders / 2031"), "reed-bed-recorders-2031");
        assert_eq!(package_name("沼"), "recordings");
    }

    #[test]
    fn the_first_of_two_paths_keeps_the_plain_name() {
        let mut names = ResourceNames::default();
        assert_eq!(names.assign("a/B.wav"), "a_b.wav");
        let second = names.assign("a_b.wav");
        assert!(second.starts_with("a_b.wav-") && second.len() == "a_b.wav-".len() + 8, "{second}");
        assert_eq!(ResourceNames { used: names.used.clone() }.assign("A/b.wav").len(), second.len());
    }

    #[test]
    fn a_suffix_does_not_depend_on_what_came_between() {
        let (mut few, mut many) = (ResourceNames::default(), ResourceNames::default());
        few.assign("b.wav");
        for path in ["b.wav", "B.wav", "x.wav", "ü.wav"] {
            many.assign(path);
        }
        assert_eq!(few.assign("b.WAV"), many.assign("b.WAV"));
    }

    #[test]
    fn a_path_made_to_collide_still_gets_a_name_of_its_own() {
        let mut names = ResourceNames::default();
        names.assign("a.wav");
        let suffix = hexadecimal(&Sha256::digest("A.wav"));
        names.assign(&format!("a.wav-{}", &suffix[..8]));
        names.assign(&format!("a.wav-{suffix}"));
        assert_eq!(names.assign("A.wav"), format!("a.wav-{suffix}-2"));
    }

    #[test]
    fn what_the_standard_forbids_is_named() {
        for (path, word) in [
            ("", "own folder"),
            (".hidden/a.wav", "dot"),
            ("a/.b.wav", "dot"),
            ("../a.wav", "dot"),
            ("/a.wav", "absolute"),
            ("~a.wav", "`~`"),
            ("file:a.wav", "URL"),
            ("a\\b.wav", "backslash"),
            ("a\nb.wav", "line break"),
        ] {
            assert!(objection(path).is_some_and(|why| why.contains(word)), "{path:?}: {:?}", objection(path));
        }
    }

    #[test]
    fn what_is_special_in_a_url_only_is_allowed() {
        for path in ["50%.wav", "a#1.wav", "a?.wav", "a b.wav", "a..b.wav", "c:x.wav", "früh/ä.wav", "a/~b.wav"] {
            assert_eq!(objection(path), None, "{path}");
        }
    }

    proptest::proptest! {
        #[test]
        fn names_are_legal_and_unique_whatever_the_paths(
            paths in proptest::collection::btree_set("[abAB._/ -]{0,4}|.{0,8}", 0..200)
        ) {
            let mut names = ResourceNames::default();
            let mut seen = HashSet::new();
            for path in &paths {
                let name = names.assign(path);
                let legal = |byte: u8| matches!(byte, b'a'..=b'z' | b'0'..=b'9' | b'.' | b'-' | b'_');
                proptest::prop_assert!(!name.is_empty() && name.bytes().all(legal), "{path:?}: {name:?}");
                proptest::prop_assert!(seen.insert(name.clone()), "{path:?}: {name} twice");
            }
        }
    }
}
