//! Where a section's poles and zeros lie, as landmarks for searches along the
//! frequency axis.
//!
//! Nothing here enters a figure: a landmark only says where a response can turn and
//! how sharply, so its last digits do not matter.

use crate::section::Section;
use core::f64::consts::PI;

/// A pole or zero seen from the unit circle.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Landmark {
    /// Angle, 0 to pi radians a frame; of a conjugate pair the upper one.
    pub angle: f64,
    /// 1 - |root|: positive inside the unit circle, negative outside.
    pub depth: f64,
}

/// Landmarks of p0 + p1 z^-1 + p2 z^-2, one for a conjugate pair, two for a pair of
/// real roots. Roots at the origin and at infinity bend nothing and are left out.
pub fn landmarks(p: [f64; 3]) -> Vec<Landmark> {
    let [p0, p1, p2] = p;
    if p0 == 0.0 {
        return if p1 == 0.0 { Vec::new() } else { real(-p2 / p1).into_iter().collect() };
    }
    let (sum, product) = (-p1 / p0, p2 / p0);
    let discriminant = sum * sum - 4.0 * product;
    if discriminant < 0.0 {
        let radius = product.sqrt();
        let angle = libm::atan2((-discriminant).sqrt(), sum);
        return vec![Landmark { angle, depth: (1.0 - product) / (1.0 + radius) }];
    }
    // The root of larger magnitude without cancellation, the other from the product.
    let larger = 0.5 * (sum + libm::copysign(discriminant.sqrt(), sum));
    let smaller = if larger == 0.0 { 0.0 } else { product / larger };
    [larger, smaller].into_iter().filter_map(real).collect()
}

fn real(root: f64) -> Option<Landmark> {
    (root != 0.0).then(|| Landmark { angle: if root > 0.0 { 0.0 } else { PI }, depth: 1.0 - root.abs() })
}

/// Poles of all sections.
pub fn poles(sections: &[Section]) -> impl Iterator<Item = Landmark> {
    sections.iter().flat_map(|section| landmarks(section.a))
}

/// Zeros of all sections.
pub fn zeros(sections: &[Section]) -> impl Iterator<Item = Landmark> {
    sections.iter().flat_map(|section| landmarks(section.b))
}

/// Angles (0 to pi) of the zeros that lie exactly on the unit circle by their
/// coefficients: `b[0]` = `b[2]` with a pair of roots that is not real.
///
/// 4 sin^2(w/2) = 2 + `b[1]/b[0]` and 4 cos^2(w/2) = 2 - `b[1]/b[0]`, of which the smaller
/// is free of rounding but for its quotient: the angle is good to its last digits.
pub fn zeros_on_circle(sections: &[Section]) -> impl Iterator<Item = f64> {
    sections.iter().filter_map(|section| {
        let [b0, b1, b2] = section.b;
        if b0 != b2 || b0 == 0.0 || b1.abs() > 2.0 * b0.abs() {
            return None;
        }
        let (sin_squared, cos_squared) = ((2.0 * b0 + b1) / (4.0 * b0), (2.0 * b0 - b1) / (4.0 * b0));
        Some(if sin_squared < cos_squared {
            2.0 * libm::asin(sin_squared.sqrt())
        } else {
            PI - 2.0 * libm::asin(cos_squared.sqrt())
        })
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_pair_has_one_landmark_and_real_roots_have_two() {
        // Roots 0.9 e^(+-j pi/3); 0.5 and -0.25; one at 0.75.
        let pair = landmarks([2.0, -1.8, 1.62]);
        assert_eq!(pair.len(), 1);
        assert!((pair[0].angle - PI / 3.0).abs() < 1e-15 && (pair[0].depth - 0.1).abs() < 1e-15);
        let real = landmarks([1.0, -0.25, -0.125]);
        assert_eq!(real, [Landmark { angle: 0.0, depth: 0.5 }, Landmark { angle: PI, depth: 0.75 }]);
        assert_eq!(landmarks([1.0, -0.75, 0.0]), [Landmark { angle: 0.0, depth: 0.25 }]);
    }

    #[test]
    fn roots_at_the_origin_and_at_infinity_are_no_landmarks() {
        assert!(landmarks([1.0, 0.0, 0.0]).is_empty());
        assert!(landmarks([0.0, 0.0, 1.0]).is_empty());
        assert_eq!(landmarks([0.0, 1.0, -0.5]), [Landmark { angle: 0.0, depth: 0.5 }]);
    }
}
