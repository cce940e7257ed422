//! The head of the forms that are JSON documents.

use super::ExportError;
use super::head::{Head, margin_db};
use super::precision::{Holding, Precision};
use crate::report::{DesignBand, write_pretty};
use serde_json::{Map, Value, json};

/// Keys of a band of a report's design that say nothing of rounded sections alone.
const LEFT_OUT_OF_BANDS: [&str; 4] = ["group_delay_s", "startup_s", "shortest_s", "violation"];

/// The head as an object; the form's own keys come behind it.
pub(super) fn head(head: &Head<'_>) -> Result<Map<String, Value>, ExportError> {
    let mut map = Map::new();
    let mut put = |key: &str, value: Value| map.insert(key.to_owned(), value);
    put("export", json!("bandproof"));
    put("form", json!(head.form.name()));
    put("tool_version", json!(env!("CARGO_PKG_VERSION")));
    put("spec", json!({"title": head.title, "file": head.file_name, "file_sha256": head.file_sha256}));
    put("rate_hz", json!(head.rate_hz));
    put("passes", json!(head.passes));
    put("passes_note", json!(head.passes_text()));
    put("not_included", json!(head.not_in_it()));
    match head.precision {
        Precision::Full { fewest } => {
            put("digits", Value::Null);
            put("fewest_digits", json!(fewest));
        }
        Precision::FewestDigits { digits } => {
            put("digits", json!(digits));
            put("fewest_digits", json!(digits));
        }
        Precision::Digits { digits, holding } => {
            put("digits", json!(digits));
            put("fewest_digits", json!(holding.map(Holding::fewest)));
        }
        Precision::Bits { bits, fewest, .. } => {
            put("bits", json!(bits));
            put("fewest_bits", json!(fewest));
        }
    }
    put("precision_note", json!(head.precision_text()));
    let left_out: Vec<_> = head.left_out.iter().map(|one| json!({"what": one.what, "reason": one.reason})).collect();
    put("left_out", json!(left_out));
    put("bands", json!(head.bands.iter().map(band).collect::<Result<Vec<_>, _>>()?));
    put("section_count", json!(head.section_count));
    Ok(map)
}

fn band(design: &crate::design::BandDesign) -> Result<Value, ExportError> {
    let entry = DesignBand::new(design).map_err(|error| ExportError::Json(error.to_string()))?;
    let mut value = serde_json::to_value(entry).map_err(|error| ExportError::Json(error.to_string()))?;
    if let Some(map) = value.as_object_mut() {
        map.retain(|key, _| !LEFT_OUT_OF_BANDS.contains(&key.as_str()));
        let margin_db = margin_db(design).map(|db| libm::round(db * 1e3) / 1e3);
        map.insert("holds_by_db".to_owned(), json!(margin_db));
    }
    Ok(value)
}

/// `map` as text, with a line break at its end.
pub(super) fn text(map: Map<String, Value>) -> Result<String, ExportError> {
    let mut bytes = Vec::new();
    write_pretty(&mut bytes, &Value::Object(map), 0).map_err(|error| ExportError::Json(error.to_string()))?;
    bytes.push(b'\n');
    String::from_utf8(bytes).map_err(|error| ExportError::Json(error.to_string()))
}
