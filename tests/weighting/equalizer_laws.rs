//! Laws of peaks and shelves, which hold for the coefficients as they stand.

use crate::support::unavoidable_db;
use bandproof::design::roots::{poles, zeros};
use bandproof::design::{equalizer, response};
use bandproof::section::Section;
use bandproof::spec::{EqualizerKind, EqualizerShape, EqualizerStage};
use proptest::prelude::*;

const RATE_HZ: f64 = 48_000.0;

/// Numerator: three coefficients off by up to three half units each, the outer two of the size of
/// the first or less. Denominator: the two are chosen among neighbors, up to three and five half
/// units off.
fn within_db(sections: &[Section], hz: f64) -> f64 {
    sections.iter().map(|section| 8.0 * unavoidable_db(section, hz, RATE_HZ)).sum()
}

fn made(stage: EqualizerStage) -> Section {
    equalizer::section(&stage, RATE_HZ).unwrap()
}

fn gain_db(sections: &[Section], hz: f64) -> f64 {
    response::gain_db(sections, hz, RATE_HZ)
}

fn frequencies() -> impl Strategy<Value = f64> {
    prop_oneof![48.0..2_000.0, 2_000.0..23_952.0, Just(12_000.0), 23_000.0..23_952.0]
}

fn gains() -> impl Strategy<Value = f64> {
    (0.01..=60.0, any::<bool>()).prop_map(|(db, cut): (f64, bool)| if cut { -db } else { db })
}

/// What a spec may have.
fn qs() -> impl Strategy<Value = f64> {
    (-2.0..=3.0).prop_map(|exponent: f64| 10f64.powf(exponent))
}

fn shelf_shapes() -> impl Strategy<Value = EqualizerShape> {
    prop_oneof![(0.01..10.0).prop_map(EqualizerShape::Q), (0.001..=1.0).prop_map(EqualizerShape::Slope)]
}

fn any_stage() -> impl Strategy<Value = EqualizerStage> {
    let kinds = prop::sample::select(vec![EqualizerKind::Peak, EqualizerKind::Lowshelf, EqualizerKind::Highshelf]);
    (kinds, frequencies(), gains(), shelf_shapes(), qs()).prop_map(|(kind, hz, gain_db, shape, q)| {
        let shape = if kind == EqualizerKind::Peak { EqualizerShape::Q(q) } else { shape };
        EqualizerStage { kind, hz, gain_db, shape }
    })
}

proptest! {
    #[test]
    fn a_peak_has_its_gain_at_its_center_and_none_at_the_ends(hz in frequencies(), db in gains(), q in qs()) {
        let section = made(EqualizerStage { kind: EqualizerKind::Peak, hz, gain_db: db, shape: EqualizerShape::Q(q) });
        prop_assert!((gain_db(&[section], hz) - db).abs() < within_db(&[section], hz));
        for end_hz in [0.0, RATE_HZ / 2.0] {
            // The coefficients add up to the same on both sides, so here rounding costs nothing
            // as long as all of them have the denominator's last place, 2^-53.
            let exact = section.a[2] >= 0.5 && section.b[0] < 2.0 && section.b[2].abs() <= 1.0;
            let within_db = if exact { 1e-13 } else { within_db(&[section], end_hz) };
            prop_assert!(gain_db(&[section], end_hz).abs() < within_db, "{} dB", gain_db(&[section], end_hz));
        }
        for beside_hz in [hz * 0.98, (hz * 1.02).min(RATE_HZ / 2.0)] {
            prop_assert!(gain_db(&[section], beside_hz).abs() < db.abs());
        }
    }

    #[test]
    fn a_shelf_has_half_of_its_gain_at_its_edge_all_at_one_end_and_none_at_the_other(
        low in any::<bool>(), hz in frequencies(), db in gains(), shape in shelf_shapes(),
    ) {
        let kind = if low { EqualizerKind::Lowshelf } else { EqualizerKind::Highshelf };
        let section = made(EqualizerStage { kind, hz, gain_db: db, shape });
        let (lifted_hz, other_hz) = if low { (0.0, RATE_HZ / 2.0) } else { (RATE_HZ / 2.0, 0.0) };
        for (at_hz, wanted_db) in [(hz, db / 2.0), (lifted_hz, db), (other_hz, 0.0)] {
            let got_db = gain_db(&[section], at_hz);
            prop_assert!((got_db - wanted_db).abs() < within_db(&[section], at_hz), "{got_db} for {wanted_db}");
        }
    }

    #[test]
    fn a_cut_takes_back_what_the_boost_gave(stage in any_stage(), part in 0.001..0.999) {
        let both = [made(stage), made(EqualizerStage { gain_db: -stage.gain_db, ..stage })];
        let hz = part * RATE_HZ / 2.0;
        prop_assert!(gain_db(&both, hz).abs() < within_db(&both, hz), "{} dB at {hz} Hz", gain_db(&both, hz));
        // In phase as well; 8.7 dB are 1.
        prop_assert!((response::at(&both, hz, RATE_HZ) - 1.0).norm() < within_db(&both, hz));
    }

    /// z for -z: exactly the same figures, so high ones are as good as low ones.
    #[test]
    fn high_ones_are_the_mirror_image_of_low_ones(stage in any_stage()) {
        let kind = match stage.kind {
            EqualizerKind::Peak => EqualizerKind::Peak,
            EqualizerKind::Lowshelf => EqualizerKind::Highshelf,
            EqualizerKind::Highshelf => EqualizerKind::Lowshelf,
        };
        // In steps of 2^-10 Hz, so that differences are exact, and off the middle, which is its
        // own image.
        let steps = (stage.hz * 1_024.0).round();
        let hz = (if steps == RATE_HZ * 256.0 { steps + 1.0 } else { steps }) / 1_024.0;
        let (stage, mirrored_hz) = (EqualizerStage { hz, ..stage }, RATE_HZ / 2.0 - hz);
        let (one, other) = (made(stage), made(EqualizerStage { kind, hz: mirrored_hz, ..stage }));
        prop_assert_eq!(one.b, [other.b[0], -other.b[1], other.b[2]]);
        prop_assert_eq!(one.a, [other.a[0], -other.a[1], other.a[2]]);
    }

    #[test]
    fn poles_and_zeros_are_inside_the_unit_circle(stage in any_stage()) {
        let section = made(stage);
        prop_assert!(poles(&[section]).chain(zeros(&[section])).all(|root| root.depth > 0.0), "{section:?}");
    }
}

/// The note's meaning of the steepest slope: S = 1 is the steepest without overshoot, and a q of
/// 1/sqrt 2 is the same.
#[test]
fn slope_1_is_a_q_of_the_root_of_one_half_and_does_not_overshoot() {
    for kind in [EqualizerKind::Lowshelf, EqualizerKind::Highshelf] {
        let stage = EqualizerStage { kind, hz: 700.0, gain_db: 12.0, shape: EqualizerShape::Slope(1.0) };
        let (slope, q) =
            (made(stage), made(EqualizerStage { shape: EqualizerShape::Q(std::f64::consts::FRAC_1_SQRT_2), ..stage }));
        for (one, other) in slope.b.iter().chain(&slope.a).zip(q.b.iter().chain(&q.a)) {
            assert!((one - other).abs() < 1e-15);
        }
        for i in 0..=2_400 {
            let db = gain_db(&[slope], 10.0 * f64::from(i));
            assert!((-1e-9..=12.0 + 1e-9).contains(&db), "{kind:?}: {db} dB");
        }
        let steep = made(EqualizerStage { shape: EqualizerShape::Q(1.0), ..stage });
        assert!((0..=2_400).any(|i| gain_db(&[steep], 10.0 * f64::from(i)) > 12.05));
    }
}

/// As low as 1 - 1/359 of its first coefficient's terms would cancel.
#[test]
fn a_flat_shelf_of_a_large_gain_keeps_its_digits() {
    for hz in [200.0, 15_199.664_983_492_67] {
        let (boost_db, shape) = (51.110_820_123_506_01, EqualizerShape::Slope(0.001));
        let section = made(EqualizerStage { kind: EqualizerKind::Lowshelf, hz, gain_db: boost_db, shape });
        assert!(gain_db(&[section], RATE_HZ / 2.0).abs() < within_db(&[section], RATE_HZ / 2.0), "{section:?}");
        assert!((gain_db(&[section], 0.0) - boost_db).abs() < within_db(&[section], 0.0), "{section:?}");
    }
}

#[test]
fn frequencies_outside_0_to_half_the_rate_have_no_section() {
    for hz in [0.0, -1.0, 24_000.0, 30_000.0, f64::NAN, f64::INFINITY] {
        let stage = EqualizerStage { kind: EqualizerKind::Peak, hz, gain_db: 3.0, shape: EqualizerShape::Q(1.0) };
        assert!(equalizer::section(&stage, RATE_HZ).is_none(), "{hz} Hz");
    }
}
