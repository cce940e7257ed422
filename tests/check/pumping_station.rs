//! The pumping station's cascade at 48 kHz against figures made outside the project
//! (tests/reference/check_pumping_station.py: SciPy 1.17.1 from poles and zeros,
//! times from a simulated impulse response and its FFT).

use crate::common::{close, keep, placed, reduce};
use bandproof::design::check::check;
use bandproof::design::settling::settling_frames;
use bandproof::design::{BandDesign, Check};
use bandproof::section::Section;
use bandproof::spec::{Band, Extent, Requirement, Row, Width};
use serde::Deserialize;

const RATE_HZ: f64 = 48_000.0;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Reference {
    sections: Vec<Section>,
    settling_frames_50_db: u64,
    bands: Vec<Line>,
    keep_attenuation_min_db: f64,
    group_delay_3045_hz_s: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Line {
    attenuation_min_db: f64,
    reaches_hz: (f64, f64),
    excepted_hz: Option<(f64, f64)>,
    startup_frames: u64,
}

fn reference() -> Reference {
    serde_json::from_str(include_str!("../reference/check_pumping_station.json")).unwrap()
}

fn designs(sections: &[Section]) -> Vec<BandDesign> {
    let row = Row { center_hz: 50.0, width: Width::Hz(1.0), harmonics: 8 };
    let hum = Band { name: "pump hum".to_owned(), extent: Extent::Row(row), requirement: reduce(30.0) };
    let extent = Extent::Range { from_hz: 90.0, to_hz: 6_000.0 };
    let birds = Band { name: "bird calls".to_owned(), extent, requirement: keep(0.5, &["pump hum"]) };
    let extent = Extent::Range { from_hz: 15_750.0, to_hz: 15_850.0 };
    let residual = Requirement::Residual { residual_dbfs: -90.0 };
    let whine = Band { name: "converter whine".to_owned(), extent, requirement: residual };
    check(&placed(&[hum, birds, whine]), sections, 1, RATE_HZ, 2.0)
}

#[test]
fn the_hum_bands_have_the_attenuation_the_reach_and_the_startup_of_the_reference() {
    let reference = reference();
    let found = designs(&reference.sections);
    for (k, (found, want)) in found.iter().zip(&reference.bands).enumerate() {
        assert_eq!(found.band.name, format!("pump hum x{}", k + 1));
        // The reference is of the exact poles; coefficients near 2 round by 1e-16,
        // which moves a root at 50 Hz by 1e-16/w^2 = 2e-12 of itself.
        close("least attenuation", found.attenuation_min_db, want.attenuation_min_db, 1e-6);
        assert_eq!(found.attenuation_max_db, 180.0);
        let (from_hz, to_hz) = found.reaches_hz.unwrap();
        close("reaches from", from_hz, want.reaches_hz.0, 1e-8);
        close("reaches to", to_hz, want.reaches_hz.1, 1e-8);
        let startup_frames = found.startup_s.unwrap() * RATE_HZ;
        close("startup", startup_frames, want.startup_frames as f64, 0.1);
        close("shortest", found.shortest_s.unwrap(), 12.0, 1e-12);
        assert_eq!((found.check, found.violation, found.group_delay_s), (Some(Check::Guaranteed), None, None));
    }
}

#[test]
fn the_keep_band_holds_outside_what_the_stops_take_out() {
    let reference = reference();
    let found = &designs(&reference.sections)[8];
    let want: Vec<_> = reference.bands.iter().filter_map(|line| line.excepted_hz).collect();
    assert_eq!(found.excepted_hz.len(), want.len());
    for (found, want) in found.excepted_hz.iter().zip(want) {
        close("excepted from", found.0, want.0, 1e-8);
        close("excepted to", found.1, want.1, 1e-8);
    }
    assert_eq!((found.check, found.violation), (Some(Check::Guaranteed), None));
    // Where an exception ends the response is at the limit itself.
    close("largest attenuation", found.attenuation_max_db, 0.5, 1e-9);
    // The reference looks at a grid of 3 mHz; the summit is flat.
    close("least attenuation", found.attenuation_min_db, reference.keep_attenuation_min_db, 1e-7);
    close("group delay", found.group_delay_s.unwrap(), reference.group_delay_3045_hz_s, 1e-15);
    assert_eq!((found.reaches_hz, found.startup_s), (None, None));
}

#[test]
fn without_a_stop_the_residual_band_depends_and_reaches_nowhere() {
    let found = &designs(&reference().sections)[9];
    assert_eq!((found.check, found.reaches_hz, found.violation), (Some(Check::Depends), None, None));
}

#[test]
fn settling_is_that_of_the_simulated_tail() {
    let reference = reference();
    let got = settling_frames(&reference.sections, 50.0) as f64;
    // There the height falls by 0.015 % a frame, and the reference's padded FFT misses
    // a summit by less.
    close("settling", got, reference.settling_frames_50_db as f64, 1.0);
}
