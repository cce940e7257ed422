//! The cascade one section at a time: what the kernel must equal, bit for bit.
//!
//! Written for reading, not for speed. Tests and benches hold the kernel against it.

use super::start::steady;
use super::{CLEAR_BELOW, CLEAR_PERIOD};
use crate::section::Section;

/// Filters one whole channel through `sections` in their order.
pub fn filter(sections: &[Section], input: &[f64]) -> Vec<f64> {
    filter_with_states(sections, input).0
}

/// The same, with `s1`, `s2` of each section after the last sample.
pub fn filter_with_states(sections: &[Section], input: &[f64]) -> (Vec<f64>, Vec<[f64; 2]>) {
    let mut samples = input.to_vec();
    let mut constant = input.first().copied().unwrap_or(0.0);
    let mut states = Vec::with_capacity(sections.len());
    for section in sections {
        let start = steady(section, constant);
        constant = start.output;
        states.push(one_section(section, [start.s1, start.s2], &mut samples));
    }
    (samples, states)
}

/// Runs one section from `state` in place and returns its state at the end.
fn one_section(section: &Section, state: [f64; 2], samples: &mut [f64]) -> [f64; 2] {
    let [b0, b1, b2] = section.b;
    let [_, a1, a2] = section.a;
    let [mut s1, mut s2] = state;
    for (frame, sample) in (0_u64..).zip(samples) {
        if frame % CLEAR_PERIOD == 0 {
            [s1, s2] = [s1, s2].map(|s| if s.abs() < CLEAR_BELOW { 0.0 } else { s });
        }
        let x = *sample;
        let y = b0 * x + s1;
        s1 = (b1 * x + s2) - a1 * y;
        s2 = b2 * x - a2 * y;
        *sample = y;
    }
    [s1, s2]
}
