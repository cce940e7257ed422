//! `json`: sections as in a report.

use super::head::Head;
use super::{ExportError, document};
use crate::cascade::start_states;
use crate::section::Section;
use serde_json::{Value, json};

const COEFFICIENTS: &str = "H(z) = (b[0] + b[1] z^-1 + b[2] z^-2) / (a[0] + a[1] z^-1 + a[2] z^-2) for each section, \
                            in the order they run, the output of one the input of the next; order and signs are the \
                            report's: y[n] = b[0] x[n] + b[1] x[n-1] + b[2] x[n-2] - a[1] y[n-1] - a[2] y[n-2]";

const STATE: &str = "steady state of each section under a constant input of 1, in transposed direct form II: y = b[0] x \
                     + s1, then s1 = b[1] x + s2 - a[1] y, then s2 = b[2] x - a[2] y; times the first sample it starts \
                     a recording without a step";

/// The document.
pub(super) fn text(head: &Head<'_>, sections: &[Section]) -> Result<String, ExportError> {
    let mut map = document::head(head)?;
    map.insert("coefficients".to_owned(), json!(COEFFICIENTS));
    let sections_value = serde_json::to_value(sections).map_err(|error| ExportError::Json(error.to_string()))?;
    map.insert("sections".to_owned(), sections_value);
    map.insert("state_note".to_owned(), json!(STATE));
    let state: Vec<Value> = start_states(sections, 1.0).into_iter().map(|state| json!(state)).collect();
    map.insert("state".to_owned(), Value::Array(state));
    document::text(map)
}
