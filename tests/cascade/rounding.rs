//! How far rounding may carry two correct ways of running a cascade apart.

use bandproof::cascade::plain;
use bandproof::section::Section;

/// Unit roundoff of f64: half the distance from 1 to the next number.
const UNIT: f64 = f64::EPSILON / 2.0;

/// How rounding errors of successive frames add up.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Errors {
    /// Like independent random numbers, as under a signal that moves: powers add.
    /// The figure is 8 standard deviations of the sum.
    Independent,
    /// All the same way, as they can under a constant: magnitudes add. Certain in any case.
    Alike,
}

/// How far rounding can carry the output of `sections` from the exact one.
///
/// Each of a section's nine operations errs by at most [`UNIT`] times its result. All
/// errors enter where the output is formed, so they reach that section's own output
/// through 1/A(z), and the end through the sections after it: the sum runs over that
/// path's impulse response. An error uniform within its bound has a third of the
/// bound's square as power.
pub fn bound(sections: &[Section], input: &[f64], errors: Errors) -> f64 {
    bound_before(sections, &[], input, errors)
}

/// How far rounding can carry the output of `sections` run forward and backward from the
/// exact one, errors independent; `forward` is what the second pass runs over. The second
/// pass passes on the power of the first one's errors as it would in the other direction.
pub fn bound_both_ways(sections: &[Section], input: &[f64], forward: &[f64]) -> f64 {
    let first = bound_before(sections, sections, input, Errors::Independent);
    libm::hypot(first, bound(sections, forward, Errors::Independent))
}

/// [`bound`] of what `sections` do where `after` comes after them.
fn bound_before(sections: &[Section], after: &[Section], input: &[f64], errors: Errors) -> f64 {
    let mut samples = input.to_vec();
    let mut total = 0.0;
    for (index, section) in sections.iter().enumerate() {
        let output = plain::filter(std::slice::from_ref(section), &samples);
        let feedback = Section { b: [1.0, 0.0, 0.0], a: section.a };
        let rest = sections[index + 1..].iter().chain(after).copied();
        let path: Vec<Section> = [feedback].into_iter().chain(rest).collect();
        let response = plain::filter(&path, &impulse(input.len().max(2)));
        let results = (2..samples.len()).map(|n| results(section, &samples[n - 2..=n], &output[n - 2..=n]));
        total += match errors {
            Errors::Independent => {
                let power = results.map(|r| r.iter().map(|r| r * r).sum::<f64>()).sum::<f64>() / samples.len() as f64;
                power / 3.0 * response.iter().map(|h| h * h).sum::<f64>()
            }
            Errors::Alike => {
                let largest = results.map(|r| r.iter().map(|r| r.abs()).sum()).fold(0.0, f64::max);
                largest * response.iter().map(|h| h.abs()).sum::<f64>()
            }
        };
        samples = output;
    }
    UNIT * if errors == Errors::Independent { 8.0 * total.sqrt() } else { total }
}

/// The results of the nine operations of one frame, from its input and output and
/// those of the two frames before it.
fn results(section: &Section, x: &[f64], y: &[f64]) -> [f64; 9] {
    let [b0, b1, b2] = section.b;
    let [_, a1, a2] = section.a;
    let s2 = b2 * x[1] - a2 * y[1];
    [
        b0 * x[2],
        y[2],
        b1 * x[2],
        b1 * x[2] + s2,
        a1 * y[2],
        b1 * x[2] + s2 - a1 * y[2],
        b2 * x[2],
        a2 * y[2],
        b2 * x[2] - a2 * y[2],
    ]
}

/// Zero, then an impulse of 1 at frame 1, then zeros: frame 0 belongs to the start state.
pub fn impulse(frames: usize) -> Vec<f64> {
    let mut impulse = vec![0.0; frames];
    impulse[1] = 1.0;
    impulse
}
