//! `fixed`: integers of a given word length, with the scaling of each section.

use super::head::Head;
use super::integers::Integers;
use super::precision::{Precision, Rounded};
use super::{ExportError, document};
use serde_json::{Value, json};

/// What two passes make of all that.
const BOTH_WAYS: &str = "Both passes: the second takes the words that the first made as they are, from the last one to \
    the first, and nothing overflows in it either; its output times 2^(2 output_shift) is the filtered signal. \
    error_bound_steps is that of one pass, noise_dbfs that of both.";

/// What a word is and how a section is computed, for `bits`.
fn arithmetic(bits: u32) -> Vec<String> {
    vec![
        format!(
            "Coefficients, samples and state are words of {bits} bits in two's complement; full scale is 2^{}.",
            bits - 1
        ),
        "For each section, in the order they run, the output of one the input of the next: \
         m = b[0] x[n] + b[1] x[n-1] + b[2] x[n-2], d = a[1] y[n-1] + a[2] y[n-2], \
         f = error_feedback[0] e[n-1] + error_feedback[1] e[n-2], v = down(m, q_bits.b - q_bits.a) - d - f; then \
         y[n] = down(v, q_bits.a) and e[n] = v - y[n] 2^q_bits.a. Order and signs are the report's; a[0] stands for 1."
            .to_owned(),
        format!(
            "down(v, n) = (v + 2^(n-1)) >> n for n > 0, rounding halves up (>> is floor division), v for n = 0, and \
             v << -n for n < 0. {} bits are enough for m, d and v; what wraps around on the way to v comes right again.",
            2 * bits
        ),
        "q_bits.b counts section_shift in: the output of a section is 2^-section_shift of what its H(z) makes. \
         The output of the last times 2^output_shift is the filtered signal."
            .to_owned(),
        "The state x[n-1], x[n-2], y[n-1], y[n-2], e[n-1], e[n-2] of every section starts with zeros. From there no \
         input within full scale overflows in any section: bound by the L1 norm of the impulse response, rounding counted in."
            .to_owned(),
        "error_bound_steps: the most by which rounding moves the output, in steps of its words. noise_dbfs: level of that \
         in the filtered signal if errors are white, relative to a full-scale sine, not to sound pressure."
            .to_owned(),
    ]
}

/// The document.
pub(super) fn text(head: &Head<'_>, rounded: &Rounded) -> Result<String, ExportError> {
    let (Precision::Bits { bits, .. }, Some((words, scaling))) = (head.precision, &rounded.words) else {
        return Err(ExportError::Json("there are no integers".to_owned()));
    };
    let mut map = document::head(head)?;
    let mut arithmetic = arithmetic(bits);
    if head.passes > 1 {
        arithmetic.push(BOTH_WAYS.to_owned());
    }
    map.insert("arithmetic".to_owned(), json!(arithmetic));
    map.insert("output_shift".to_owned(), json!(scaling.output_shift));
    map.insert("error_bound_steps".to_owned(), json!(libm::ceil(scaling.error_bound_steps * 1e3) / 1e3));
    let noise_dbfs = scaling.noise_dbfs.map(|dbfs| libm::round(dbfs * 1e3) / 1e3);
    map.insert("noise_dbfs".to_owned(), json!(noise_dbfs));
    let sections: Vec<Value> =
        words.iter().zip(&scaling.section_shifts).map(|(words, shift)| section(words, *shift)).collect();
    map.insert("sections".to_owned(), Value::Array(sections));
    document::text(map)
}

fn section(words: &Integers, section_shift: i32) -> Value {
    json!({
        "b": words.b,
        "a": words.a,
        "error_feedback": words.error_feedback,
        "q_bits": {"b": words.b_q_bits + section_shift, "a": words.a_q_bits},
        "section_shift": section_shift,
    })
}
