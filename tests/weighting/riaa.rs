//! Playback of records after IEC 60098.

use crate::support::{RATES_HZ, made, rows};
use bandproof::design::weighting;
use bandproof::spec::Curve;

/// 10 log10 |H|^2 of the three time constants, 0 dB at 1 kHz.
fn formula_db(hz: f64) -> f64 {
    let raw_db = |hz: f64| {
        let part = |microseconds: f64| 1.0 + (2.0 * std::f64::consts::PI * hz * microseconds * 1e-6).powi(2);
        10.0 * (part(318.0) / (part(3180.0) * part(75.0))).log10()
    };
    raw_db(hz) - raw_db(1_000.0)
}

/// Three decimals.
#[test]
fn the_table_holds_at_every_usual_rate() {
    let table = rows(include_str!("../reference/riaa.csv"));
    assert_eq!(table.len(), 38);
    for rate_hz in RATES_HZ {
        let made = made(Curve::Riaa, rate_hz);
        for row in table.iter().filter(|row| row[0] <= made.top_hz()) {
            let gain_db = made.gain_db(row[0]);
            assert!((gain_db - row[1]).abs() < 1e-3 + 5e-4, "{rate_hz} Hz: {gain_db} dB for {row:?}");
        }
    }
}

/// Measured: 0.0008 dB; asked for are 0.01 dB from 32 kHz on.
#[test]
fn designs_follow_the_formula_up_to_0_45_of_every_usual_rate_in_two_sections() {
    for rate_hz in RATES_HZ {
        let made = made(Curve::Riaa, rate_hz);
        let worst_db = made.worst_db(made.top_hz(), formula_db);
        assert!(worst_db < 1e-3, "{rate_hz} Hz is off by {worst_db} dB");
        assert_eq!(made.sections.len(), 2);
        assert!(made.gain_db(1_000.0).abs() < 1e-13);
    }
}

/// 20 Hz: 19.274 dB, with the amendment 16.261 dB.
#[test]
fn the_amendment_of_1976_is_not_part_of_it() {
    let made = made(Curve::Riaa, 48_000.0);
    let table = rows(include_str!("../reference/riaa.csv"));
    let low = table.iter().find(|row| row[0] == 20.0).unwrap();
    assert!((made.gain_db(20.0) - low[1]).abs() < 0.01 && (made.gain_db(20.0) - low[2]).abs() > 3.0);
    assert!(weighting::remarks(Curve::Riaa, &made.sections, 48_000.0)[0].contains("without the later 7950 us"));
}
