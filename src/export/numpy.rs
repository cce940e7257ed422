//! `numpy`: a Python file with the array that SciPy's `sosfilt` takes.

use super::head::Head;
use crate::cascade::start_states;
use crate::section::Section;

const NOTES: [&str; 2] = [
    "Use: start every channel x (an array) in the steady state of its first sample, so that an offset makes no step: \
     y, _ = scipy.signal.sosfilt(sections, x, zi=state * x[0]). `state` is what scipy.signal.sosfilt_zi(sections) \
     returns, computed without its rounding errors.",
    "Sections: one row each, in the order they run: b0 b1 b2 a0 a1 a2 of H(z) = (b0 + b1 z^-1 + b2 z^-2) / (a0 + a1 z^-1 \
     + a2 z^-2), in the report's order and with its signs, which are those of sosfilt.",
];

const IDENTITY: &str = "\
# There is no section. The row below passes every sample: sosfilt takes no empty array.
";

/// The file.
pub(super) fn text(head: &Head<'_>, sections: &[Section]) -> String {
    let [one_pass, order] = NOTES;
    let use_note = if head.passes == 2 {
        format!(
            "{one_pass} Both passes over an array x, continued as bandproof does it: scipy.signal.sosfiltfilt(sections, x, \
             padtype=\"odd\", padlen=min({}, len(x) - 1)). The result differs from bandproof's own by rounding alone.",
            head.ring_frames
        )
    } else {
        format!("{one_pass} The result differs from bandproof's own by rounding alone.")
    };
    let mut text = head.comment("# ", &[&use_note, order]);
    text.push_str(&format!("\nimport numpy as np\n\nsection_count = {}\n\n", sections.len()));
    let pass = [Section { b: [1.0, 0.0, 0.0], a: [1.0, 0.0, 0.0] }];
    let rows = if sections.is_empty() {
        text.push_str(IDENTITY);
        &pass
    } else {
        sections
    };
    text.push_str("sections = np.array([\n");
    for section in rows {
        text.push_str(&row([section.b, section.a].as_flattened()));
    }
    text.push_str("], dtype=np.float64)\n\n");
    text.push_str("# s1 s2 of each section, transposed direct form II, under a constant input of 1.\n");
    text.push_str("state = np.array([\n");
    for state in start_states(rows, 1.0) {
        text.push_str(&row(&state));
    }
    text.push_str("], dtype=np.float64)\n");
    text
}

fn row(numbers: &[f64]) -> String {
    let numbers: Vec<_> = numbers.iter().map(|number| format!("{number:?}")).collect();
    format!("    [{}],\n", numbers.join(", "))
}
