//! Reads a bag by RFC 8493 and says what is wrong with it.
//!
//! The RFC's rules are from memory; `check_bag.py` holds a bag against an implementation
//! from elsewhere.

use super::dataset::{listing, sha256};
use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

/// Everything that makes the folder no valid bag; empty for a valid one.
pub fn faults(bag: &Path) -> Vec<String> {
    let mut faults = Vec::new();
    // Section 2.1.1: exactly these two lines.
    let declaration = fs::read_to_string(bag.join("bagit.txt")).unwrap_or_default();
    if declaration != "BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n" {
        faults.push(format!("bagit.txt is {declaration:?}"));
    }
    // Section 3: every payload file is in every payload manifest, and the other way round.
    let payload = manifest(&bag.join("manifest-sha256.txt"), &mut faults);
    for file in listing(&bag.join("data")) {
        let path = format!("data/{}", file.to_str().unwrap_or_default());
        if !payload.contains_key(&path) {
            faults.push(format!("{path:?} is not in the manifest"));
        }
    }
    let tags = manifest(&bag.join("tagmanifest-sha256.txt"), &mut faults);
    for (path, hash) in payload.iter().chain(&tags) {
        match fs::read(bag.join(path)) {
            Ok(bytes) if sha256(&bytes) == *hash => {}
            Ok(_) => faults.push(format!("{path:?} has another hash")),
            Err(error) => faults.push(format!("{path:?}: {error}")),
        }
    }
    // Section 2.2.1: a tag manifest lists no payload and no tag manifest.
    if tags.keys().any(|path| path.starts_with("data/") || path.starts_with("tagmanifest-")) {
        faults.push("the tag manifest lists what it must not".into());
    }
    // Section 2.2.2: octets, a point, files.
    let sizes = payload.keys().filter_map(|path| bag.join(path).metadata().ok()).map(|metadata| metadata.len());
    let oxum = format!("{}.{}", sizes.sum::<u64>(), payload.len());
    if info(bag).get("Payload-Oxum") != Some(&oxum) {
        faults.push(format!("Payload-Oxum should be {oxum}: {:?}", info(bag)));
    }
    faults
}

/// Path to checksum.
pub fn manifest(file: &Path, faults: &mut Vec<String>) -> BTreeMap<String, String> {
    let text = fs::read_to_string(file).unwrap_or_default();
    let mut entries = BTreeMap::new();
    for line in text.split_terminator('\n') {
        let Some((hash, path)) = line.split_once(char::is_whitespace) else {
            faults.push(format!("{} has the line {line:?}", file.display()));
            continue;
        };
        let path = decode(path.strip_prefix(' ').unwrap_or(path));
        if entries.insert(path.clone(), hash.to_owned()).is_some() {
            faults.push(format!("{path:?} is listed twice"));
        }
    }
    entries
}

/// Section 2.1.3 with RFC 3986, section 2.1.
fn decode(path: &str) -> String {
    let mut parts = path.split('%');
    let mut text = parts.next().unwrap_or_default().to_owned();
    for part in parts {
        let (code, rest) = part.split_at(2);
        text.push(char::from(u8::from_str_radix(code, 16).unwrap()));
        text.push_str(rest);
    }
    text
}

/// `bag-info.txt`, section 2.2.2: a line that begins with a space goes on with the
/// value before.
pub fn info(bag: &Path) -> BTreeMap<String, String> {
    let mut entries: Vec<(String, String)> = Vec::new();
    for line in fs::read_to_string(bag.join("bag-info.txt")).unwrap_or_default().lines() {
        match (line.strip_prefix(' '), entries.last_mut()) {
            (Some(more), Some((_, value))) => *value = format!("{value} {more}"),
            _ => {
                let (label, value) = line.split_once(": ").unwrap();
                entries.push((label.into(), value.into()));
            }
        }
    }
    entries.into_iter().collect()
}
