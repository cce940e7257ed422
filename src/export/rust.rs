//! `rust`: a module with a block function.

use super::head::Head;
use crate::cascade::{CLEAR_BELOW, CLEAR_PERIOD};
use crate::section::Section;

const NOTES: [&str; 3] = [
    "Use: as a module of its own (no dependency, no unsafe). One State a channel: State::new with the channel's first \
     sample, then process over its blocks, of any length and in order. The first sample is taken to have been there \
     for ever, so an offset makes no step. Samples must be finite.",
    "Bits: each operation is rounded once, in the order written; Rust neither contracts nor reorders. The output of one \
     pass is bandproof's own with these sections, bit for bit, for any division into blocks (on 32-bit x86 with SSE2).",
    "Sections: one row each, in the order they run: b0 b1 b2 a0 a1 a2 of H(z) = (b0 + b1 z^-1 + b2 z^-2) / (a0 + a1 z^-1 \
     + a2 z^-2), a0 = 1, in the report's order and with its signs: y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] \
     - a2 y[n-2]. SECTION_COUNT and SECTIONS are section_count and sections of the other forms.",
];

const CODE: &str = "
/// One channel on its way through the cascade.
#[derive(Clone, Debug)]
pub struct State {
    /// s1, s2 of each section, transposed direct form II.
    s: [[f64; 2]; SECTION_COUNT],
    /// Frames so far, modulo {period}.
    frame: u32,
}

impl State {
    /// A channel in the steady state of its first sample.
    pub fn new(first: f64) -> State {
        let mut state = State { s: [[0.0; 2]; SECTION_COUNT], frame: 0 };
        let mut constant = first;
        for (s, [b0, b1, b2, _, a1, a2]) in state.s.iter_mut().zip(SECTIONS) {
            let denominator = sum_of_three(1.0, a1, a2);
            let mut output = 0.0;
            if denominator != 0.0 {
                output = sum_of_three(b0, b1, b2) / denominator * constant;
                *s = [output - b0 * constant, b2 * constant - a2 * output];
            }
            constant = output;
        }
        state
    }

    /// Filters the next frames of a channel: as many as both slices have.
    pub fn process(&mut self, input: &[f64], output: &mut [f64]) {
        for (input, output) in input.iter().zip(output) {
            if self.frame == 0 {
                // Before a state decays to where arithmetic is slow.
                for s in self.s.iter_mut().flatten().filter(|s| s.abs() < {below}) {
                    *s = 0.0;
                }
            }
            let mut sample = *input;
            for ([s1, s2], [b0, b1, b2, _, a1, a2]) in self.s.iter_mut().zip(&SECTIONS) {
                let x = sample;
                let y = b0 * x + *s1;
                *s1 = (b1 * x + *s2) - a1 * y;
                *s2 = b2 * x - a2 * y;
                sample = y;
            }
            *output = sample;
            self.frame = (self.frame + 1) % {period};
        }
    }
}

/// a + b + c as with twice the digits: near z = 1 the three cancel.
fn sum_of_three(a: f64, b: f64, c: f64) -> f64 {
    let (partial, first) = two_sum(a, b);
    let (total, second) = two_sum(partial, c);
    total + (first + second)
}

/// The rounded sum and its rounding error.
fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let b_part = sum - a;
    (sum, (a - (sum - b_part)) + (b - b_part))
}
";

/// The module.
pub(super) fn text(head: &Head<'_>, sections: &[Section]) -> String {
    let mut text = head.comment("// ", &NOTES);
    text.push_str("\n/// Number of second-order sections.\n");
    text.push_str(&format!("pub const SECTION_COUNT: usize = {};\n\n", sections.len()));
    text.push_str("/// b0 b1 b2 a0 a1 a2 of each section.\n#[rustfmt::skip]\n");
    text.push_str("#[allow(clippy::excessive_precision, clippy::unreadable_literal)]\n");
    text.push_str("pub const SECTIONS: [[f64; 6]; SECTION_COUNT] = [\n");
    for section in sections {
        let numbers: Vec<_> =
            [section.b, section.a].as_flattened().iter().map(|number| format!("{number:?}")).collect();
        text.push_str(&format!("    [{}],\n", numbers.join(", ")));
    }
    text.push_str("];\n");
    text + &CODE.replace("{period}", &CLEAR_PERIOD.to_string()).replace("{below}", &format!("{CLEAR_BELOW:?}"))
}
