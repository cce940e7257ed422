//! Peaks, shelves and standard curves.

use bandproof::spec::*;

use crate::{read, refused};

/// The one stage of a spec.
fn stage(keys: &str) -> Stage {
    read(&format!("[[stage]]\n{keys}")).stages.remove(0)
}

/// What is said of a stage whose keys begin in line 2.
fn said(keys: &str) -> String {
    refused(&format!("[[stage]]\n{keys}"))
}

#[test]
fn peaks_and_shelves_are_read() {
    let equalizer = |kind, hz, gain_db, shape| Stage::Equalizer(EqualizerStage { kind, hz, gain_db, shape });
    assert_eq!(
        stage("kind = 'peak'\ncenter_hz = 1000\ngain_db = 6\nq = 2"),
        equalizer(EqualizerKind::Peak, 1000.0, 6.0, EqualizerShape::Q(2.0))
    );
    assert_eq!(
        stage("kind = 'lowshelf'\nedge_hz = 200\ngain_db = -9.5\nslope = 1"),
        equalizer(EqualizerKind::Lowshelf, 200.0, -9.5, EqualizerShape::Slope(1.0))
    );
    assert_eq!(
        stage("kind = 'highshelf'\nedge_hz = 8e3\ngain_db = -60\nq = 0.707"),
        equalizer(EqualizerKind::Highshelf, 8000.0, -60.0, EqualizerShape::Q(0.707))
    );
    for curve in Curve::ALL {
        let read = stage(&format!("kind = 'weighting'\ncurve = '{}'", curve.name()));
        assert_eq!(read, Stage::Weighting(WeightingStage { curve: *curve }));
    }
    let names: Vec<_> = Curve::ALL.iter().map(|curve| curve.name()).collect();
    assert_eq!(names, ["A", "C", "K", "riaa"]);
}

#[test]
fn they_are_written_as_they_are_read() {
    let written = |keys: &str| serde_json::to_value(stage(keys)).unwrap().to_string();
    assert_eq!(
        written("kind = 'peak'\ncenter_hz = 1000\ngain_db = 6\nq = 2"),
        r#"{"kind":"peak","center_hz":1000.0,"q":2.0,"gain_db":6.0}"#
    );
    assert_eq!(
        written("kind = 'lowshelf'\nedge_hz = 200\ngain_db = -9.5\nslope = 1"),
        r#"{"kind":"lowshelf","edge_hz":200.0,"gain_db":-9.5,"slope":1.0}"#
    );
    assert_eq!(written("kind = 'weighting'\ncurve = 'riaa'"), r#"{"kind":"weighting","curve":"riaa"}"#);
}

#[test]
fn what_each_needs() {
    assert_eq!(
        said("kind = 'peak'"),
        "spec.toml:1:1: the peak stage has no center_hz; add the frequency of its center in hertz\n\
         spec.toml:1:1: the peak stage has no gain_db; \
         add its gain in decibels, above 0 to raise and below 0 to lower\n\
         spec.toml:1:1: the peak stage has no q; add q: center over the width at half its decibels"
    );
    assert_eq!(
        said("kind = 'highshelf'\ngain_db = 3"),
        "spec.toml:1:1: the highshelf stage has no edge_hz; add the frequency of its edge in hertz\n\
         spec.toml:1:1: the highshelf stage has neither q nor slope; \
         add slope (1 is the steepest without a bump), or q"
    );
    assert_eq!(
        said("kind = 'weighting'"),
        "spec.toml:1:1: the weighting stage has no curve; choose one of A, C, K, riaa"
    );
}

#[test]
fn a_gain_of_nothing_and_two_shapes() {
    assert_eq!(
        said("kind = 'peak'\ncenter_hz = 1000\ngain_db = -0.0\nq = 2"),
        "spec.toml:4:11: gain_db = 0 leaves the peak stage without effect; remove the stage, or give another gain"
    );
    assert_eq!(
        said("kind = 'lowshelf'\nedge_hz = 1000\ngain_db = 3\nq = 2\nslope = 1"),
        "spec.toml:6:1: the lowshelf stage has both q and slope, which say the same; keep one of them"
    );
}

#[test]
fn keys_of_other_kinds() {
    assert_eq!(
        said("kind = 'peak'\nedge_hz = 1000\ngain_db = 3\nslope = 1"),
        "spec.toml:3:1: edge_hz in the peak stage: a peak lies around a center; write center_hz instead\n\
         spec.toml:5:1: slope in the peak stage: the width of a peak is given by q; \
         write q instead, center over width"
    );
    assert_eq!(
        said("kind = 'lowshelf'\nfamily = 'bessel'\norder = 2\ncenter_hz = 1000\ngain_db = 3\nslope = 1"),
        "spec.toml:3:1: family in the lowshelf stage: peaks and shelves are always one second-order section; \
         remove it\n\
         spec.toml:4:1: order in the lowshelf stage: peaks and shelves are always one second-order section; \
         remove it\n\
         spec.toml:5:1: center_hz in the lowshelf stage: a shelf has one edge; write edge_hz instead"
    );
    assert_eq!(
        said("kind = 'peak'\ncenter_hz = 1000\nq = 3\ngain_db = 3\ngain = 1"),
        "spec.toml:6:1: gain in the peak stage: the gain of a peak or shelf is in decibels; write gain_db instead"
    );
    assert_eq!(
        said("kind = 'highshelf'\nedge_hz = 1000\nslope = 1\ngain = 6"),
        "spec.toml:5:1: gain in the highshelf stage: the gain of a peak or shelf is in decibels; write gain_db instead"
    );
    assert_eq!(
        said("kind = 'weighting'\ncurve = 'A'\ngain_db = 3"),
        "spec.toml:4:1: gain_db in the weighting stage: it belongs to peak, lowshelf, highshelf; \
         remove it, or choose one of these kinds"
    );
}

#[test]
fn words_near_a_kind_or_a_curve() {
    for (written, meant) in [
        ("peaking", "peak"),
        ("bell", "peak"),
        ("low-shelf", "lowshelf"),
        ("High shelf", "highshelf"),
        ("treble", "highshelf"),
        ("A-weighting", "weighting"),
        ("analogue", "analog"),
        ("transfer_function", "digital"),
    ] {
        let said = said(&format!("kind = '{written}'"));
        assert!(said.contains(&format!("did you mean \"{meant}\"?")), "{written}: {said}");
    }
    for (written, meant) in [("a", "A"), ("k", "K"), ("RIAA", "riaa"), ("K-weighting", "K"), ("dBC", "C")] {
        let said = said(&format!("kind = 'weighting'\ncurve = '{written}'"));
        assert_eq!(
            said,
            format!("spec.toml:3:9: curve can't be \"{written}\"; did you mean \"{meant}\"? (one of A, C, K, riaa)")
        );
    }
    assert_eq!(
        said("kind = 'weighting'\ncurve = 'B'"),
        "spec.toml:3:9: curve can't be \"B\"; choose one of A, C, K, riaa"
    );
}
