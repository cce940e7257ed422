//! What the stops of reduce bands take out of a keep band.

use crate::common::{band, butterworth, checked, close, keep, notch, notch_edge_hz, reduce};
use bandproof::design::{BandDesign, Check};
use bandproof::section::Section;
use bandproof::spec::{Band, Extent, Row, Width};

const RATE_HZ: f64 = 48_000.0;

fn last(bands: &[Band], sections: &[Section]) -> BandDesign {
    checked(bands, sections, RATE_HZ).pop().unwrap()
}

#[test]
fn an_exception_reaches_as_far_as_the_stop_is_deeper_than_the_limit() {
    let sections = [notch(1_000.0, 40.0, RATE_HZ)];
    let bands = [band("hum", 999.0, 1_001.0, reduce(20.0)), band("calls", 500.0, 2_000.0, keep(1.0, &["hum"]))];
    let found = last(&bands, &sections);
    assert_eq!((found.check, found.excepted_hz.len()), (Some(Check::Guaranteed), 1));
    close("from", found.excepted_hz[0].0, notch_edge_hz(1_000.0, 40.0, RATE_HZ, 1.0, -1.0), 1e-6);
    close("to", found.excepted_hz[0].1, notch_edge_hz(1_000.0, 40.0, RATE_HZ, 1.0, 1.0), 1e-6);
    assert!(found.attenuation_max_db <= 1.0 + 1e-9);
}

#[test]
fn a_stop_around_no_named_band_is_a_violation_at_its_deepest_point() {
    let sections = [notch(1_000.0, 40.0, RATE_HZ), notch(1_500.0, 40.0, RATE_HZ)];
    let bands = [band("hum", 999.0, 1_001.0, reduce(20.0)), band("calls", 500.0, 2_000.0, keep(1.0, &["hum"]))];
    let found = last(&bands, &sections);
    assert_eq!(found.check, Some(Check::Impossible));
    let violation = found.violation.unwrap();
    close("at", violation.at_hz, 1_500.0, 1e-6);
    assert_eq!(violation.gain_db, -180.0);
}

#[test]
fn a_named_band_is_taken_out_whole_even_where_the_response_comes_up_inside_it() {
    // Two narrow stops at the ends of a wide band: in the middle nothing is taken out.
    let sections = [notch(1_000.0, 4.0, RATE_HZ), notch(1_200.0, 4.0, RATE_HZ)];
    let bands = [band("hum", 1_000.0, 1_200.0, reduce(20.0)), band("calls", 500.0, 2_000.0, keep(1.0, &["hum"]))];
    let found = last(&bands, &sections);
    assert_eq!((found.check, found.excepted_hz.len()), (Some(Check::Guaranteed), 1));
    close("from", found.excepted_hz[0].0, 1_000.0 - 4.0, 0.1);
    close("to", found.excepted_hz[0].1, 1_200.0 + 4.0, 0.1);
}

#[test]
fn a_band_without_a_stop_takes_out_itself_and_nothing_more() {
    let bands = [band("hum", 999.0, 1_001.0, reduce(20.0)), band("calls", 500.0, 2_000.0, keep(1.0, &["hum"]))];
    assert_eq!(last(&bands, &[]).excepted_hz, [(999.0, 1_001.0)]);
}

#[test]
fn a_row_s_name_stands_for_all_its_lines_and_meeting_exceptions_merge() {
    let row = Row { center_hz: 100.0, width: Width::Hz(1.0), harmonics: 4 };
    let hum = Band { name: "hum".to_owned(), extent: Extent::Row(row), requirement: reduce(10.0) };
    let separate: Vec<_> = (1..=4).map(|k| notch(100.0 * f64::from(k), 5.0, RATE_HZ)).collect();
    let calls = band("calls", 50.0, 350.0, keep(1.0, &["hum"]));
    let found = last(&[hum.clone(), calls.clone()], &separate);
    assert_eq!((found.check, found.excepted_hz.len()), (Some(Check::Guaranteed), 3));
    // So wide that between the lines the response never comes back to -1 dB.
    let wide: Vec<_> = (1..=4).map(|k| notch(100.0 * f64::from(k), 90.0, RATE_HZ)).collect();
    let found = last(&[hum, calls], &wide);
    assert_eq!(found.excepted_hz.len(), 1);
}

#[test]
fn exceptions_are_clipped_to_the_keep_band() {
    let sections = butterworth(4, 100.0, RATE_HZ, true);
    let bands = [band("rumble", 0.0, 60.0, reduce(10.0)), band("calls", 50.0, 2_000.0, keep(1.0, &["rumble"]))];
    let found = last(&bands, &sections);
    assert_eq!(found.excepted_hz.len(), 1);
    assert_eq!(found.excepted_hz[0].0, 50.0);
    // 1/v^8 = 10^0.1 - 1 at 1 dB: see butterworth_db.
    let tangent = libm::tan(std::f64::consts::PI * 100.0 / RATE_HZ) / libm::pow(libm::pow(10.0, 0.1) - 1.0, 0.125);
    close("to", found.excepted_hz[0].1, libm::atan(tangent) * RATE_HZ / std::f64::consts::PI, 1e-6);
    assert_eq!(found.check, Some(Check::Guaranteed));
    // A reduce band elsewhere takes nothing out.
    let bands = [band("rumble", 0.0, 20.0, reduce(10.0)), band("calls", 500.0, 2_000.0, keep(1.0, &["rumble"]))];
    assert_eq!(last(&bands, &sections).excepted_hz, []);
}

#[test]
fn exceptions_that_leave_nothing_make_the_requirement_impossible() {
    let sections = butterworth(4, 100.0, RATE_HZ, true);
    let bands = [band("rumble", 0.0, 60.0, reduce(10.0)), band("calls", 20.0, 80.0, keep(1.0, &["rumble"]))];
    let found = last(&bands, &sections);
    assert_eq!((found.check, found.violation), (Some(Check::Impossible), None));
    assert_eq!(found.excepted_hz, [(20.0, 80.0)]);
}
