//! The rules of Data Package 2.0 as far as they concern what is written here.
//!
//! Source: datapackage.org/standard, "Data Package" and "Data Resource", and the profile
//! datapackage.org/profiles/2.0/datapackage.json; from memory. Where version 1
//! (specs.frictionlessdata.io) is stricter, as for names, its rule is held.

use serde_json::{Map, Value};
use std::collections::BTreeSet;

/// Every rule that `descriptor` breaks.
pub fn broken(descriptor: &Value) -> Vec<String> {
    let mut broken = Vec::new();
    let Some(package) = descriptor.as_object() else { return vec!["a descriptor is an object".into()] };
    texts(package, &["$schema", "name", "title", "description", "created"], &mut broken);
    // "$schema": which profile the descriptor is to be held against.
    if package.get("$schema").is_none_or(|url| url != "https://datapackage.org/profiles/2.0/datapackage.json") {
        broken.push("$schema names no profile of version 2.0".into());
    }
    // "name": version 1: lower-case letters, digits, ".", "_", "-".
    if !package.get("name").and_then(Value::as_str).is_some_and(is_name) {
        broken.push(format!("package name {:?}", package.get("name")));
    }
    // "created": RFC 3339.
    let created = package.get("created").and_then(Value::as_str).unwrap_or_default();
    if created.parse::<jiff::Timestamp>().is_err() {
        broken.push(format!("created {created:?} is no time"));
    }
    // "resources": required, at least one.
    let resources = package.get("resources").and_then(Value::as_array).cloned().unwrap_or_default();
    if resources.is_empty() {
        broken.push("no resources".into());
    }
    let mut names = BTreeSet::new();
    for resource in &resources {
        let Some(resource) = resource.as_object() else {
            broken.push("a resource is an object".into());
            continue;
        };
        check_resource(resource, &mut broken);
        if !names.insert(resource.get("name").map(Value::to_string)) {
            broken.push(format!("two resources have the name {:?}", resource.get("name")));
        }
    }
    broken
}

fn check_resource(resource: &Map<String, Value>, broken: &mut Vec<String>) {
    texts(resource, &["name", "path", "title", "format", "mediatype", "encoding", "hash"], broken);
    let text = |key: &str| resource.get(key).and_then(Value::as_str);
    // "name": required; version 1's characters.
    if !text("name").is_some_and(is_name) {
        broken.push(format!("resource name {:?}", text("name")));
    }
    // "path" or "data": one of them, and not both.
    if resource.contains_key("path") == resource.contains_key("data") {
        broken.push("a resource has either path or data".into());
    }
    if let Some(fault) = text("path").and_then(path_fault) {
        broken.push(format!("path {:?}: {fault}", text("path")));
    }
    // "mediatype": the profile's pattern ^(.+)/(.+)$.
    if text("mediatype").is_some_and(|kind| !kind.split_once('/').is_some_and(|(a, b)| !a.is_empty() && !b.is_empty()))
    {
        broken.push(format!("mediatype {:?}", text("mediatype")));
    }
    // "bytes": an integer.
    if resource.get("bytes").is_some_and(|bytes| !bytes.is_u64()) {
        broken.push(format!("bytes {:?}", resource.get("bytes")));
    }
    // "hash": MD5, or the algorithm's name in lower case, a colon, hexadecimal digits.
    let sha256 = |hash: &str| hash.strip_prefix("sha256:").is_some_and(|hex| hex.len() == 64 && is_hexadecimal(hex));
    if !text("hash").is_some_and(sha256) {
        broken.push(format!("hash {:?}", text("hash")));
    }
}

/// What is wrong with a resource's path: it leads to the descriptor's siblings and what
/// lies below them, so it is neither absolute nor goes up, and goes through nothing
/// hidden. The profile's pattern forbids `.`, `/` and `~` at the beginning, `file:`, a
/// backslash, `/../` and `://`, and its `.` (ECMA-262) matches no line end.
pub fn path_fault(path: &str) -> Option<&'static str> {
    let begins = |prefix: &str| path.starts_with(prefix);
    if path.is_empty() {
        Some("empty")
    } else if begins(".") || begins("/") || begins("~") || begins("file:") {
        Some("begins with what it must not")
    } else if path.contains('\\') || path.contains("/../") || path.contains("://") {
        Some("holds what it must not")
    } else if path.contains("/.") {
        Some("hidden")
    } else if path.contains(['\n', '\r', '\u{2028}', '\u{2029}']) {
        Some("more than one line")
    } else {
        None
    }
}

/// The keys that are there are strings, and not empty.
fn texts(object: &Map<String, Value>, keys: &[&str], broken: &mut Vec<String>) {
    for &key in keys {
        if object.get(key).is_some_and(|value| value.as_str().is_none_or(str::is_empty)) {
            broken.push(format!("{key} is {:?}", object.get(key)));
        }
    }
}

fn is_name(name: &str) -> bool {
    !name.is_empty() && name.bytes().all(|byte| matches!(byte, b'a'..=b'z' | b'0'..=b'9' | b'.' | b'_' | b'-'))
}

fn is_hexadecimal(text: &str) -> bool {
    text.bytes().all(|byte| matches!(byte, b'0'..=b'9' | b'a'..=b'f'))
}
