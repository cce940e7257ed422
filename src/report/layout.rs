//! JSON that people and line-by-line comparison can read: one section, one band,
//! one chunk a line.

use serde_json::Value;
use std::io::{self, Write};

/// Writes `value` with two spaces a level, `depth` levels in, without a line break
/// at its end.
///
/// An object stays on one line if its values are numbers, strings, lists of those,
/// or objects of those: a section, a band's figures. So does a list of numbers.
/// Every other list or object has each of its elements on a line of its own.
///
/// # Errors
/// Those of `out`.
pub fn write_pretty(out: &mut impl Write, value: &Value, depth: usize) -> io::Result<()> {
    match value {
        Value::Object(map) if !fits_one_line(value) => {
            out.write_all(b"{")?;
            for (count, (key, child)) in map.iter().enumerate() {
                separate(out, count, depth + 1)?;
                write_key(out, key)?;
                write_pretty(out, child, depth + 1)?;
            }
            break_line(out, depth)?;
            out.write_all(b"}")
        }
        Value::Array(items) if !fits_one_line(value) => {
            out.write_all(b"[")?;
            for (count, child) in items.iter().enumerate() {
                separate(out, count, depth + 1)?;
                write_pretty(out, child, depth + 1)?;
            }
            break_line(out, depth)?;
            out.write_all(b"]")
        }
        other => write_line(out, other),
    }
}

/// `"key": `.
pub(super) fn write_key(out: &mut impl Write, key: &str) -> io::Result<()> {
    serde_json::to_writer(&mut *out, key)?;
    out.write_all(b": ")
}

/// Ends the element before, if there is one, and starts a line `depth` levels in.
pub(super) fn separate(out: &mut impl Write, count: usize, depth: usize) -> io::Result<()> {
    if count > 0 {
        out.write_all(b",")?;
    }
    break_line(out, depth)
}

/// Starts a line `depth` levels in.
pub(super) fn break_line(out: &mut impl Write, depth: usize) -> io::Result<()> {
    out.write_all(b"\n")?;
    (0..depth).try_for_each(|_| out.write_all(b"  "))
}

fn write_comma(out: &mut impl Write, count: usize) -> io::Result<()> {
    if count > 0 { out.write_all(b", ") } else { Ok(()) }
}

fn write_line(out: &mut impl Write, value: &Value) -> io::Result<()> {
    match value {
        Value::Array(items) => {
            out.write_all(b"[")?;
            for (count, child) in items.iter().enumerate() {
                write_comma(out, count)?;
                write_line(out, child)?;
            }
            out.write_all(b"]")
        }
        Value::Object(map) => {
            out.write_all(b"{")?;
            for (count, (key, child)) in map.iter().enumerate() {
                write_comma(out, count)?;
                write_key(out, key)?;
                write_line(out, child)?;
            }
            out.write_all(b"}")
        }
        scalar => Ok(serde_json::to_writer(out, scalar)?),
    }
}

fn fits_one_line(value: &Value) -> bool {
    match value {
        // Notes and the like are sentences: one a line.
        Value::Array(items) => items.iter().all(|item| is_scalar(item) && !item.is_string()),
        Value::Object(map) => map.values().all(|child| match child {
            Value::Array(items) => items.iter().all(is_scalar),
            Value::Object(inner) => inner.values().all(is_scalar),
            _ => true,
        }),
        _ => true,
    }
}

fn is_scalar(value: &Value) -> bool {
    !value.is_array() && !value.is_object()
}
