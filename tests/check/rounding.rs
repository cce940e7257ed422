//! What rounding costs, by the laws of small errors.

use bandproof::design::rounding::{Rounded, largest};
use bandproof::section::Section;
use core::f64::consts::LN_10;

/// 1 dB is so many nepers.
const NEPERS: f64 = LN_10 / 20.0;

/// Errors of factors add up: so many copies have so many times the error, at the same place.
#[test]
fn copies_of_a_section_have_as_many_times_its_error() {
    // A resonance at a tenth of the rate, above 0 dB everywhere on the circle: nothing counts as deep.
    let section = Section { b: [4.0, 0.0, 0.0], a: [1.0, -1.56, 0.93] };
    let dropped = Section { b: [1e-16, 0.0, 0.0], a: [0.0, 5e-17, -3e-17] };
    let one = Rounded { section, dropped: Some(dropped) };
    let single = largest(&[one], 1);
    assert!(single.db > 1e-16);
    for copies in [2, 7, 600] {
        let all = largest(&vec![one; copies], 1);
        // Each copy adds a rounding of its own.
        let tolerance = copies as f64 * f64::EPSILON;
        assert!((all.db / (copies as f64 * single.db) - 1.0).abs() <= tolerance, "{copies}: {all:?}, {single:?}");
        assert!((all.angle - single.angle).abs() < 1e-6);
    }
}

/// Below -80 dB of the net response an error is a part of that level: with two passes of -60 dB
/// each it is as far below as one pass of -100 dB.
#[test]
fn how_deep_an_error_counts_is_a_matter_of_the_net_response() {
    let error_db = |gain: f64, passes| {
        let section = Section { b: [gain, 0.0, 0.0], a: [1.0, 0.0, 0.0] };
        let dropped = Section { b: [1e-12 * gain, 0.0, 0.0], a: [0.0; 3] };
        largest(&[Rounded { section, dropped: Some(dropped) }], passes).db
    };
    // 1e-12 nepers, and the part of them that counts: one pass at -80 and at -40 dB.
    for (gain, passes, part) in [(1e-3, 1, 1.0), (1e-5, 1, 0.1), (1e-1, 2, 1.0), (1e-3, 2, 0.1)] {
        let (found, expected) = (error_db(gain, passes), part * 1e-12 / NEPERS);
        assert!((found / expected - 1.0).abs() < 1e-12, "{gain}, {passes} passes: {found} dB, expected {expected}");
    }
}
