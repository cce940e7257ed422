//! The phase of one pass.

use crate::section::Section;

/// Coefficients that mirror each other up to this part of the largest are equal: sections of a
/// polynomial are rounded to f64, and multiplied out again.
const MIRRORED: f64 = 1e-10;

/// Whether the response to an impulse ends (FIR): no section feeds its output back.
pub fn is_finite(sections: &[Section]) -> bool {
    sections.iter().all(|section| section.a[1] == 0.0 && section.a[2] == 0.0)
}

/// `linear` where an impulse response that ends reads the same from both ends, but for the
/// sign; otherwise `non-linear`.
pub fn of_one_pass(sections: &[Section]) -> &'static str {
    if is_finite(sections) && is_mirrored(&response(sections)) { "linear" } else { "non-linear" }
}

/// The numerators multiplied out.
fn response(sections: &[Section]) -> Vec<f64> {
    sections.iter().fold(vec![1.0], |product, section| {
        let mut next = vec![0.0; product.len() + 2];
        for (i, have) in product.iter().enumerate() {
            for (k, b) in section.b.iter().enumerate() {
                next[i + k] += have * b;
            }
        }
        next
    })
}

fn is_mirrored(response: &[f64]) -> bool {
    let largest = response.iter().fold(0.0_f64, |largest, c| largest.max(c.abs()));
    let counts = |c: &f64| c.abs() > MIRRORED * largest;
    let Some(first) = response.iter().position(counts) else { return true };
    let last = response.iter().rposition(counts).unwrap_or(first);
    let own = &response[first..=last];
    let is_near = |sign: f64| own.iter().zip(own.iter().rev()).all(|(a, b)| (a - sign * b).abs() <= MIRRORED * largest);
    is_near(1.0) || is_near(-1.0)
}

#[cfg(test)]
mod tests {
    use super::of_one_pass;
    use crate::section::Section;

    #[test]
    fn numerators_that_mirror_have_linear_phase() {
        let section = |b: [f64; 3], a1: f64| Section { b, a: [1.0, a1, 0.0] };
        for (sections, phase) in [
            (vec![section([1.0, 2.0, 1.0], 0.0)], "linear"),
            (vec![section([1.0, 0.0, -1.0], 0.0)], "linear"),
            (vec![section([0.0, 1.0, 1.0], 0.0)], "linear"),
            // (1 - 2 / z) (2 - 1 / z) mirrors, neither of the two does.
            (vec![section([1.0, -2.0, 0.0], 0.0), section([2.0, -1.0, 0.0], 0.0)], "linear"),
            (vec![section([1.0, -2.0, 0.0], 0.0)], "non-linear"),
            (vec![section([1.0, 2.0, 1.0], -0.5)], "non-linear"),
        ] {
            assert_eq!(of_one_pass(&sections), phase, "{sections:?}");
        }
    }
}
