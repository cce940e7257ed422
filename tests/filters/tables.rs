//! Stages as a user writes them, as tables of what they must do. The figures follow
//! from each family's definition; where one is computed, the line says how.

use crate::support::{Filter, Tol, check_table, filter, notch};
use bandproof::design::{response, sections};
use bandproof::spec::{Family, FilterKind};
use std::f64::consts::PI;

const RATE_HZ: f64 = 48_000.0;

#[test]
fn a_rumble_filter_is_flat_above_and_falls_24_db_an_octave_below() {
    let sections = filter(Family::Butterworth, FilterKind::Highpass, 4, &[40.0], RATE_HZ).sections();
    // 10 log10(1 + (tan(pi 40/48000) / tan(pi f/48000))^8)
    check_table(
        &sections,
        RATE_HZ,
        &[
            (0.0, Tol::GainBelowDb(f64::NEG_INFINITY)),
            (1.0, Tol::GainBelowDb(-128.0)),
            (20.0, Tol::GainDb(-24.0992, 1e-3)),
            (40.0, Tol::GainDb(-3.0103, 1e-4)),
            (80.0, Tol::GainDb(-0.016932, 1e-4)),
            (1_000.0, Tol::GainDb(0.0, 1e-9)),
            (24_000.0, Tol::GainDb(0.0, 1e-12)),
        ],
    );
}

#[test]
fn a_row_of_elliptic_stops_keeps_its_ripple_outside_and_its_depth_inside() {
    for line in 1..=8 {
        let center = 50.0 * f64::from(line);
        let edges = [center - 1.6, center + 1.6];
        let made = Filter {
            ripple_db: Some(0.1),
            stop_db: Some(40.0),
            ..filter(Family::Elliptic, FilterKind::Bandstop, 3, &edges, RATE_HZ)
        };
        // Order 3 with these figures: the stop band begins at 3.52 on the prototype's
        // axis (`prototypes.json`), so it is 28 % of the width.
        let in_ripple = Tol::GainDb(-0.05, 0.05 + 1e-9);
        check_table(
            &made.sections(),
            RATE_HZ,
            &[
                (0.0, Tol::GainDb(0.0, 1e-6)),
                (center - 10.0, in_ripple),
                (edges[0] - 0.3, in_ripple),
                (edges[0], Tol::GainDb(-0.1, 1e-6)),
                (center - 0.4, Tol::GainBelowDb(-40.0)),
                (center, Tol::GainBelowDb(-40.0)),
                (center + 0.4, Tol::GainBelowDb(-40.0)),
                (edges[1], Tol::GainDb(-0.1, 1e-6)),
                (edges[1] + 0.3, in_ripple),
                (center + 10.0, in_ripple),
                (20_000.0, Tol::GainDb(0.0, 1e-6)),
            ],
        );
    }
}

#[test]
fn a_notch_takes_out_its_center_and_leaves_the_rest() {
    let (center, width) = (15_800.0, 15_800.0 / 60.0);
    let sections = sections::build(&[notch(center, width)], RATE_HZ).unwrap();
    check_table(
        &sections,
        RATE_HZ,
        &[
            (0.0, Tol::GainDb(0.0, 1e-12)),
            (6_000.0, Tol::GainDb(0.0, 1e-3)),
            (center, Tol::GainBelowDb(-200.0)),
            (24_000.0, Tol::GainDb(0.0, 1e-12)),
        ],
    );
}

#[test]
fn a_chebyshev2_low_pass_begins_its_stop_band_at_the_edge() {
    let made =
        Filter { stop_db: Some(60.0), ..filter(Family::Chebyshev2, FilterKind::Lowpass, 7, &[3_000.0], RATE_HZ) };
    let sections = made.sections();
    check_table(&sections, RATE_HZ, &[(0.0, Tol::GainDb(0.0, 1e-12)), (3_000.0, Tol::GainDb(-60.0, 1e-9))]);
    let beyond: Vec<(f64, Tol)> =
        (1..=200).map(|i| (3_000.0 + 105.0 * f64::from(i), Tol::GainBelowDb(-60.0 + 1e-9))).collect();
    check_table(&sections, RATE_HZ, &beyond);
}

#[test]
fn a_chebyshev1_band_pass_touches_0_db_once_an_order_and_its_ripple_between() {
    let made = Filter {
        ripple_db: Some(1.0),
        ..filter(Family::Chebyshev1, FilterKind::Bandpass, 5, &[2_000.0, 5_000.0], RATE_HZ)
    };
    let sections = made.sections();
    let gains: Vec<f64> = (0..=3_000).map(|i| response::gain_db(&sections, 2_000.0 + f64::from(i), RATE_HZ)).collect();
    assert!(gains.iter().all(|gain| (-1.0 - 1e-9..=1e-9).contains(gain)));
    let maxima = gains.windows(3).filter(|w| w[1] > w[0] && w[1] >= w[2]).count();
    let minima = gains.windows(3).filter(|w| w[1] < w[0] && w[1] <= w[2]).count();
    assert_eq!((maxima, minima), (5, 4));
    for w in gains.windows(3) {
        if w[1] > w[0] && w[1] >= w[2] {
            assert!(w[1] > -1e-4, "{w:?}");
        }
    }
}

/// Maximally flat: at half the edge the delay of order 8 is that at DC to 1e-6, where
/// the bilinear transform's own stretch, 1 / cos^2(pi f / rate), is taken out.
#[test]
fn a_bessel_low_pass_delays_its_pass_band_evenly() {
    let sections = filter(Family::Bessel, FilterKind::Lowpass, 8, &[400.0], RATE_HZ).sections();
    let delay = |f: f64| response::group_delay_s(&sections, f, RATE_HZ) * (PI * f / RATE_HZ).cos().powi(2);
    // The -3 dB frequency of the filter with unit delay is 3.1796 for order 8
    // (`prototypes.json`): the delay at DC follows from it.
    let edge = 2.0 * RATE_HZ * (PI * 400.0 / RATE_HZ).tan();
    assert!((delay(0.0) * edge / 3.179_617_237_510_65 - 1.0).abs() < 1e-9, "{}", delay(0.0) * edge);
    assert!((delay(200.0) / delay(0.0) - 1.0).abs() < 1e-6, "{} and {} s", delay(200.0), delay(0.0));
}
