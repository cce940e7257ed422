//! What rounding coefficients to f64 does to a response.
//!
//! The filter that a stage asks for has coefficients of more digits than f64 holds. How
//! far the response of the finished sections is from that filter's follows from what
//! rounding dropped, to first order, and that is all there is: errors are a small part
//! of each polynomial.
//!
//! ```text
//! d ln|H| = sum Re(dB / B) - sum Re(dA / A)
//! ```

use super::double::Double;
use super::response::{self, Point, Polynomial};
use super::roots;
use crate::section::Section;
use core::f64::consts::{LN_10, PI};

/// A finished section and what rounding dropped of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rounded {
    /// The section as it runs.
    pub section: Section,
    /// Exact coefficients less those of the section; `None` where they are not known, as
    /// for sections that a user gave.
    pub dropped: Option<Section>,
}

impl Rounded {
    /// A section, and the exact coefficients b and a that it was rounded from.
    pub fn of([b, a]: [[Double; 3]; 2], section: Section) -> Rounded {
        let dropped = |exact: [Double; 3], rounded: [f64; 3]| [0, 1, 2].map(|k| (exact[k] - rounded[k]).hi);
        Rounded { section, dropped: Some(Section { b: dropped(b, section.b), a: dropped(a, section.a) }) }
    }

    /// A section of which nothing more exact is known.
    pub fn unknown(section: Section) -> Rounded {
        Rounded { section, dropped: None }
    }
}

/// The largest error of a response.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Largest {
    /// Its size, dB.
    pub db: f64,
    /// Where, radians a frame, 0 to pi.
    pub angle: f64,
}

/// Where the net response is lower than this, dB, its error is taken as a part of this level:
/// what moves a zero is an error of its own size there, not an infinite one.
pub const DEEPEST_DB: f64 = -80.0;

/// Around a pole, in parts of its distance from the unit circle.
const AROUND_POLES: [f64; 9] = [-4.0, -1.5, -0.7, -0.3, 0.0, 0.3, 0.7, 1.5, 4.0];

/// Both sides of a zero on the unit circle, in parts of its distance from the nearest pole.
const AROUND_ZEROS: [f64; 9] = [0.3, 0.15, 0.07, 0.03, 0.01, 3e-3, 1e-3, 1e-4, 1e-6];

/// The largest error of one of `passes` over all sections; 0 dB at angle 0 for no sections.
/// One pass is down to [`DEEPEST_DB`] over `passes` where the net response is to
/// [`DEEPEST_DB`].
///
/// Where it is not known what was dropped, the largest that rounding to the nearest can
/// drop is added up, which is more than what it does.
pub fn largest(sections: &[Rounded], passes: u32) -> Largest {
    let plain: Vec<Section> = sections.iter().map(|one| one.section).collect();
    let deepest_db = DEEPEST_DB / f64::from(passes);
    // Each angle's weights are let go at once: those of all would grow with the square of the
    // sections.
    let errors = angles(&plain).into_iter().filter_map(|angle| {
        let weights = weights(&plain, angle, deepest_db)?;
        Some(Largest { db: error_db(sections, &weights), angle })
    });
    largest_of(errors)
}

/// The first of the largest.
fn largest_of(errors: impl Iterator<Item = Largest>) -> Largest {
    errors.fold(Largest { db: 0.0, angle: 0.0 }, |largest, one| if one.db > largest.db { one } else { largest })
}

/// Of each section what a small change of the coefficients b and a adds to ln |H| at `angle`;
/// errors below `deepest_db` are taken as parts of that level. `None` at a zero met exactly,
/// which has neighbors that have them.
fn weights(sections: &[Section], angle: f64, deepest_db: f64) -> Option<Vec<[[f64; 3]; 2]>> {
    let point = Point::from_half_angle(libm::sin(angle / 2.0), libm::cos(angle / 2.0));
    let below_db = (response::gain_db_at(sections, &point) - deepest_db).min(0.0);
    let counted = libm::exp10(below_db / 20.0);
    let of = |section: &Section| {
        [section.b, section.a].map(|p| Polynomial::new(p).log_weights(&point).map(|weight| weight * counted))
    };
    let weights: Vec<[[f64; 3]; 2]> = sections.iter().map(of).collect();
    weights.as_flattened().as_flattened().iter().all(|weight| weight.is_finite()).then_some(weights)
}

/// The error of the product of all sections, dB, where it hangs on them by `weights`.
fn error_db(sections: &[Rounded], weights: &[[[f64; 3]; 2]]) -> f64 {
    let (mut known, mut at_most) = (0.0, 0.0);
    for (one, [b, a]) in sections.iter().zip(weights) {
        match one.dropped {
            Some(dropped) => known += dot(a, dropped.a) - dot(b, dropped.b),
            None => at_most += bound(one.section, b, a),
        }
    }
    20.0 / LN_10 * (f64::abs(known) + at_most)
}

/// How a response hangs on each coefficient, at the frequencies that matter; for roundings of
/// the same few sections.
pub(super) struct Sensitivity {
    /// Angle, and the weights there.
    points: Vec<(f64, Vec<[[f64; 3]; 2]>)>,
}

impl Sensitivity {
    /// Errors below `deepest_db` are taken as parts of that level.
    pub(super) fn new(sections: &[Section], deepest_db: f64) -> Sensitivity {
        let at = |angle: f64| weights(sections, angle, deepest_db).map(|weights| (angle, weights));
        Sensitivity { points: angles(sections).into_iter().filter_map(at).collect() }
    }

    /// [`largest`] of the same sections, or of some that differ from them by rounding only.
    pub(super) fn largest(&self, sections: &[Rounded]) -> Largest {
        largest_of(
            self.points.iter().map(|(angle, weights)| Largest { db: error_db(sections, weights), angle: *angle }),
        )
    }
}

fn dot(weights: &[f64; 3], change: [f64; 3]) -> f64 {
    weights[0] * change[0] + weights[1] * change[1] + weights[2] * change[2]
}

/// The largest that half a unit in the last place of each coefficient changes ln |H|.
fn bound(section: Section, b_weights: &[f64; 3], a_weights: &[f64; 3]) -> f64 {
    let sum = |weights: &[f64; 3], p: [f64; 3]| dot(&weights.map(f64::abs), p.map(half_unit));
    let [b0, b1, b2] = section.b;
    let [_, a1, a2] = section.a;
    // Zeros at z = 1, at z = -1 and at the origin stay there.
    let stays = |ratio: f64| [0.0, 1.0, 2.0].contains(&ratio.abs());
    let numerator = if stays(b1 / b0) && stays(b2 / b0) { half_unit(b0) / b0.abs() } else { sum(b_weights, section.b) };
    numerator + sum(a_weights, [0.0, a1, a2])
}

/// Half the distance to the next f64; 0 for 0, which is never rounded.
fn half_unit(value: f64) -> f64 {
    if value == 0.0 { 0.0 } else { 0.5 * (value.abs().next_up() - value.abs()) }
}

/// Where errors can be largest: around poles and zeros, between them and at both ends.
fn angles(sections: &[Section]) -> Vec<f64> {
    let poles: Vec<roots::Landmark> = roots::poles(sections).collect();
    let mut angles = vec![0.0, PI];
    for pole in &poles {
        angles.extend(AROUND_POLES.map(|part| pole.angle + part * pole.depth));
    }
    for angle in roots::zeros_on_circle(sections) {
        let distance = |pole: &roots::Landmark| libm::hypot(pole.angle - angle, pole.depth);
        let nearest = poles.iter().map(distance).fold(PI, f64::min);
        angles.extend(AROUND_ZEROS.iter().flat_map(|part| [angle - part * nearest, angle + part * nearest]));
    }
    angles.retain(|angle| (0.0..=PI).contains(angle));
    angles
}
