//! `equation`: difference equations, one line a section.

use super::head::Head;
use crate::section::Section;

const NOTES: [&str; 2] = [
    "Sections: one line each, in the order they run; the input of the first is x, the output of the last is y. On each \
     line first the terms b0, b1, b2 of the section's H(z) = (b0 + b1 z^-1 + b2 z^-2) / (1 + a1 z^-1 + a2 z^-2), in the \
     report's order and with its signs, then -a1 and -a2: the terms of the section's own output stand with the sign \
     of the equation, which is not that of the report. A term that is not there is zero; a factor of 1 and zeros at \
     the end of a factor are not written.",
    "Start: as if the first sample had been there for ever, x[-1] = x[-2] = x[0], and every section's earlier outputs \
     were its earlier input times its H(1). Then an offset makes no step.",
];

/// The text.
pub(super) fn text(head: &Head<'_>, sections: &[Section]) -> String {
    let count = format!("section_count = {}", sections.len());
    let mut text = head.comment("# ", &NOTES);
    text.push_str(&format!("# {count}\n\n"));
    if sections.is_empty() {
        text.push_str("y[n] = x[n]\n");
    }
    // y1, y2, ... and y for the last.
    let signal = |number: usize| match number {
        0 => "x".to_owned(),
        last if last == sections.len() => "y".to_owned(),
        number => format!("y{number}"),
    };
    for (before, section) in sections.iter().enumerate() {
        text.push_str(&line(&signal(before), &signal(before + 1), section));
    }
    text
}

fn line(input: &str, output: &str, section: &Section) -> String {
    let ([b0, b1, b2], [_, a1, a2]) = (section.b, section.a);
    let terms = [(b0, input, 0), (b1, input, 1), (b2, input, 2), (-a1, output, 1), (-a2, output, 2)];
    let mut line = format!("{output}[n] =");
    let mut is_first = true;
    for (coefficient, signal, delay) in terms.into_iter().filter(|term| term.0 != 0.0) {
        let sign = match (is_first, coefficient < 0.0) {
            (true, false) => " ",
            (true, true) => " -",
            (false, false) => " + ",
            (false, true) => " - ",
        };
        let at = if delay == 0 { "n".to_owned() } else { format!("n-{delay}") };
        line.push_str(&format!("{sign}{}{signal}[{at}]", factor(coefficient.abs())));
        is_first = false;
    }
    if is_first { format!("{output}[n] = 0\n") } else { line + "\n" }
}

/// The shortest decimal of a magnitude and a `*`, `0.996*`, `6.7e-11*`; nothing for 1.
fn factor(magnitude: f64) -> String {
    if magnitude == 1.0 {
        String::new()
    } else if (1e-5..1e17).contains(&magnitude) {
        format!("{magnitude}*")
    } else {
        format!("{magnitude:e}*")
    }
}
