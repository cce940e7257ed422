//! Where a prototype has a given attenuation, and edges placed so that it has it at stated
//! frequencies.
//!
//! A band transform (see [`super::transform`]) puts the prototype's frequency w at W with
//!
//! ```text
//! low-pass  w = W / We     band-pass  w = |W^2 - W0^2| / (B W)
//! high-pass w = We / W     band-stop  w = B W / |W^2 - W0^2|
//! ```
//!
//! so edges that are to be at w in place of 1 are those of an edge We / w, of a width B / w
//! around the same W0, and so on: both edges of a band stay exact, whatever w is.

use super::prototype::{self, power_ratio_minus_one};
use super::transform::{Edges, prewarp, unwarp};
use crate::spec::{Family, FilterKind};

/// Halvings of a bracket before two neighboring f64 are left of it.
const HALVINGS: usize = 200;

/// The prototype's frequency, rad/s, at which the attenuation first is `attenuation_db`
/// (positive), on the way from its pass band to its first zero. `stop_db` is Chebyshev II's
/// own, above `attenuation_db`. For Chebyshev I and elliptic `attenuation_db` counts as their
/// ripple. `None` for an order the family has not, and for figures out of these ranges.
pub fn frequency_at(family: Family, order: u32, attenuation_db: f64, stop_db: f64) -> Option<f64> {
    if order == 0 || order > family.highest_order() || attenuation_db.is_nan() || attenuation_db <= 0.0 {
        return None;
    }
    let (n, ratio) = (f64::from(order), power_ratio_minus_one(attenuation_db));
    match family {
        Family::Butterworth => Some(libm::pow(ratio, 0.5 / n)),
        Family::Chebyshev1 | Family::Elliptic => Some(1.0),
        Family::Chebyshev2 => {
            let selectivity = libm::sqrt(power_ratio_minus_one(stop_db) / ratio);
            (selectivity >= 1.0).then(|| 1.0 / libm::cosh(libm::acosh(selectivity) / n))
        }
        Family::Bessel => {
            let bessel = prototype::approximate(family, order, None, None).ok()?;
            first_reaching(&bessel, attenuation_db)
        }
    }
}

/// The prototype's frequency, rad/s, at which its attenuation first is `attenuation_db` or
/// more, above its ripple and at most its stop attenuation: to the last bits.
pub fn first_reaching(prototype: &prototype::Prototype<f64>, attenuation_db: f64) -> Option<f64> {
    let reached = |w: f64| prototype.attenuation_db(w) >= attenuation_db;
    let first_zero = prototype.zeros_rad.iter().copied().reduce(f64::min);
    let (mut low, mut high) = (0.0, first_zero.unwrap_or(1.0));
    // 2^128: 770 dB at the lowest order.
    for _ in 0..128 {
        if reached(high) {
            break;
        }
        (low, high) = (high, 2.0 * high);
    }
    for _ in 0..HALVINGS {
        let middle = 0.5 * (low + high);
        if middle == low || middle == high {
            break;
        }
        if reached(middle) { high = middle } else { low = middle }
    }
    reached(high).then_some(high)
}

/// The frequencies, Hz, at which the prototype's frequency is `frequency_rad` where it is 1
/// at `edges_hz`: one, or two rising ones; `None` for the wrong number of edges.
pub fn images_hz(kind: FilterKind, edges_hz: &[f64], frequency_rad: f64, rate_hz: f64) -> Option<Vec<f64>> {
    let images_hz = match (kind, edges_hz) {
        (FilterKind::Lowpass | FilterKind::Highpass, &[edge_hz]) => {
            let edge = prewarp(edge_hz, rate_hz);
            let upward = kind == FilterKind::Lowpass;
            vec![unwarp(if upward { edge * frequency_rad } else { edge / frequency_rad }, rate_hz)]
        }
        (FilterKind::Bandpass | FilterKind::Bandstop, &[low_hz, high_hz]) => {
            let Edges::Two { center_square, width } = Edges::two(low_hz, high_hz, rate_hz) else { return None };
            let outward = kind == FilterKind::Bandpass;
            let half = 0.5 * if outward { width * frequency_rad } else { width / frequency_rad };
            let high = half + libm::hypot(half, libm::sqrt(center_square));
            vec![unwarp(center_square / high, rate_hz), unwarp(high, rate_hz)]
        }
        _ => return None,
    };
    // Nothing moves: not even by the rounding of the way there and back.
    Some(if frequency_rad == 1.0 { edges_hz.to_vec() } else { images_hz })
}

#[cfg(test)]
mod tests {
    use super::*;

    const FAMILIES: [Family; 5] =
        [Family::Butterworth, Family::Chebyshev1, Family::Chebyshev2, Family::Elliptic, Family::Bessel];

    /// The closed forms against the poles and zeros: a sum of up to 20 logarithms, each off
    /// by a few parts in 10^16, and more of it the nearer the first zero lies.
    #[test]
    fn the_attenuation_is_that_of_the_poles_and_zeros() {
        for family in FAMILIES {
            for order in 1..=family.highest_order() {
                for (ripple_db, stop_db) in [(0.01, 20.0), (0.5, 60.0), (1.505_149_978_319_906, 20.0), (3.0, 100.0)] {
                    let prototype = prototype::approximate(family, order, Some(ripple_db), Some(stop_db)).unwrap();
                    let w = frequency_at(family, order, ripple_db, stop_db).unwrap();
                    let stop = first_reaching(&prototype, stop_db).unwrap();
                    let first_zero = prototype.zeros_rad.iter().copied().fold(10.0 * stop, f64::min);
                    for (at, want_db) in [(w, ripple_db), (stop, stop_db)] {
                        let got_db = prototype.attenuation_db(at);
                        let within_db = 1e-11 + 1e-14 / (first_zero / at - 1.0);
                        assert!((got_db - want_db).abs() < within_db, "{family:?} {order}: {got_db} dB for {want_db}");
                    }
                    if family == Family::Chebyshev2 {
                        assert!((stop - 1.0).abs() < 1e-10, "{order}: the stop band begins at {stop}");
                    }
                }
            }
        }
    }

    #[test]
    fn images_of_images_are_the_edges_again() {
        for (kind, edges_hz) in [
            (FilterKind::Lowpass, vec![23_000.0]),
            (FilterKind::Highpass, vec![20.0]),
            (FilterKind::Bandpass, vec![49.9, 50.1]),
            (FilterKind::Bandstop, vec![900.0, 20_000.0]),
        ] {
            for frequency_rad in [0.1, 0.97, 1.0, 3.0] {
                let there = images_hz(kind, &edges_hz, frequency_rad, 48_000.0).unwrap();
                let back = images_hz(kind, &there, 1.0 / frequency_rad, 48_000.0).unwrap();
                for (back_hz, edge_hz) in back.iter().zip(&edges_hz) {
                    assert!((back_hz / edge_hz - 1.0).abs() < 1e-14, "{kind:?} {frequency_rad}: {back:?}");
                }
            }
            assert_eq!(images_hz(kind, &[], 1.0, 48_000.0), None);
        }
    }

    #[test]
    fn figures_out_of_range_have_no_frequency() {
        assert_eq!(frequency_at(Family::Butterworth, 0, 3.0, 60.0), None);
        assert_eq!(frequency_at(Family::Elliptic, 15, 3.0, 60.0), None);
        assert_eq!(frequency_at(Family::Bessel, 3, 0.0, 60.0), None);
        assert_eq!(frequency_at(Family::Chebyshev2, 3, 60.0, 20.0), None);
    }
}
