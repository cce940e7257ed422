//! Puts a report together as a stream, so that its size does not matter.

use super::layout::{break_line, separate, write_key, write_pretty};
use super::{Head, Recording, Summary};
use serde::Serialize;
use serde_json::Value;
use std::io::{self, Write};

/// Writes a report: `head`, then `recordings`, each a [`Recording`] serialized as
/// JSON, in the order given (which is to be by path, byte by byte), then `summary`.
/// One recording at a time is held in memory. Equal arguments give equal bytes.
///
/// # Errors
/// Those of `out` and of the iterator; [`io::ErrorKind::InvalidData`] for a string
/// that is no recording of this format or a head that holds a number that is not
/// finite.
pub fn write_report(
    out: &mut impl Write,
    head: &Head,
    recordings: impl Iterator<Item = io::Result<String>>,
    summary: &Summary,
) -> io::Result<()> {
    let mut keys = 0;
    out.write_all(b"{")?;
    if let Value::Object(map) = to_value(head)? {
        for (key, value) in &map {
            separate(out, keys, 1)?;
            write_key(out, key)?;
            write_pretty(out, value, 1)?;
            keys += 1;
        }
    }

    separate(out, keys, 1)?;
    write_key(out, "recordings")?;
    out.write_all(b"[")?;
    let mut count = 0;
    for line in recordings {
        separate(out, count, 2)?;
        write_pretty(out, &to_value(&read_recording(&line?, count)?)?, 2)?;
        count += 1;
    }
    if count > 0 {
        break_line(out, 1)?;
    }
    out.write_all(b"]")?;

    separate(out, 1, 1)?;
    write_key(out, "summary")?;
    write_pretty(out, &to_value(summary)?, 1)?;
    out.write_all(b"\n}\n")?;
    out.flush()
}

/// Reading the string as what it has to be keeps damage out of the report and the
/// keys in their order.
fn read_recording(line: &str, count: usize) -> io::Result<Recording> {
    serde_json::from_str(line).map_err(|error| {
        let place = count + 1;
        let message = format!("entry {place} of the list of finished recordings is damaged: {error}");
        io::Error::new(io::ErrorKind::InvalidData, message)
    })
}

fn to_value(part: &impl Serialize) -> io::Result<Value> {
    serde_json::to_value(part).map_err(|error| io::Error::new(io::ErrorKind::InvalidData, error))
}
