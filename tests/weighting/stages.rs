//! Stages as part of a spec: what a design says of them, and what the report does.

use bandproof::design::{Design, DesignError, design};
use bandproof::report::Methods;
use bandproof::spec::{
    BeyondHalfRate, Curve, EqualizerKind, EqualizerShape, EqualizerStage, OutputSpec, Phase, Row, Spec, Stage,
    WeightingStage, Width,
};

fn spec(stages: Vec<Stage>) -> Spec {
    Spec {
        title: None,
        beyond_half_rate: BeyondHalfRate::Error,
        rate: None,
        output: OutputSpec::default(),
        phase: Phase::Causal,
        auto: None,
        reference_band: None,
        stages,
        bands: Vec::new(),
    }
}

fn curve(curve: Curve) -> Stage {
    Stage::Weighting(WeightingStage { curve })
}

fn equalizer(kind: EqualizerKind, hz: f64, gain_db: f64, shape: EqualizerShape) -> Stage {
    Stage::Equalizer(EqualizerStage { kind, hz, gain_db, shape })
}

fn designed(stages: Vec<Stage>, rate_hz: u32) -> Design {
    design(&spec(stages), rate_hz).unwrap_or_else(|error| panic!("{error}"))
}

fn sentence(stages: Vec<Stage>) -> String {
    Methods::new(&designed(stages, 48_000), Some("none")).unwrap().sentence
}

#[test]
fn a_weighting_says_how_near_it_is_and_what_it_is_not() {
    for (name, phrases) in [
        (Curve::A, ["A of IEC 61672-1:2013, 0 dB at 1000 Hz: within 0.000", "no sound level meter"]),
        (Curve::C, ["C of IEC 61672-1:2013, 0 dB at 1000 Hz: within 0.000", "no sound level meter"]),
        (Curve::K, ["BS.1770, +0.691 dB at 997 Hz: within 0.00", "without gating"]),
        (Curve::Riaa, ["IEC 60098 (3180, 318, and 75 us, without the later 7950 us), 0 dB", "cartridge"]),
    ] {
        let made = designed(vec![curve(name)], 44_100);
        let [nearness, caution] = made.stages[0].remarks.as_slice() else { panic!("{:?}", made.stages[0].remarks) };
        assert!(nearness.contains(phrases[0]) && caution.contains(phrases[1]), "{nearness}. {caution}");
        assert!(nearness.contains("up to 19845 Hz"), "{nearness}");
    }
    let k = designed(vec![curve(Curve::K)], 48_000);
    assert!(k.stages[0].remarks[0].ends_with("the printed coefficients"), "{:?}", k.stages[0].remarks);
    let slow = designed(vec![curve(Curve::A)], 2_000);
    assert!(slow.stages[0].remarks[0].contains("exact at 500 Hz since 1000 Hz is out of reach"), "{slow:?}");
    let slow = designed(vec![curve(Curve::K)], 1_000);
    let [nearness, _] = slow.stages[0].remarks.as_slice() else { panic!("{slow:?}") };
    assert!(nearness.contains("BS.1770, exact at 250 Hz since 997 Hz is out of reach: within"), "{nearness}");
}

/// The figure is that of the finished sections.
#[test]
fn the_deviation_in_the_remark_is_computed() {
    let made = designed(vec![curve(Curve::A)], 48_000);
    let deviation = bandproof::design::weighting::deviation(Curve::A, &made.sections, 48_000.0);
    let remark = &made.stages[0].remarks[0];
    let shown: f64 = remark.split_once("within ").unwrap().1.split_once(" dB").unwrap().0.parse().unwrap();
    assert!(shown >= deviation.largest_db && shown < deviation.largest_db + 1.1e-5, "{remark}: {deviation:?}");
}

#[test]
fn a_rate_that_is_refused_names_stage_curve_and_figures() {
    let error = design(&spec(vec![curve(Curve::A)]), 60_000_000).unwrap_err();
    assert!(matches!(error, DesignError::Weighting { .. }));
    let text = error.to_string();
    assert!(text.starts_with("stage 1 (weighting): curve A is made for sample rates from 100"), "{text}");
    assert!(text.contains("not for 60000000 Hz"), "{text}");
}

#[test]
fn gain_and_shape_of_peaks_and_shelves_are_remarked() {
    let made = designed(
        vec![
            equalizer(EqualizerKind::Peak, 3_000.0, -12.0, EqualizerShape::Q(4.0)),
            equalizer(EqualizerKind::Lowshelf, 200.0, 6.5, EqualizerShape::Slope(0.75)),
            equalizer(EqualizerKind::Highshelf, 8_000.0, -3.0, EqualizerShape::Q(0.7)),
        ],
        48_000,
    );
    let remarks: Vec<_> = made.stages.iter().map(|stage| stage.remarks.concat()).collect();
    assert_eq!(
        remarks,
        [
            "-12 dB at its center, q 4",
            "+6.5 dB below its edge, half of that at it, slope 0.75",
            "-3 dB above its edge, half of that at it, q 0.7",
        ]
    );
    assert_eq!(made.sections.len(), 3);
}

/// As all other figures of a design with two passes.
#[test]
fn a_zero_phase_gain_is_remarked_as_that_of_both_passes() {
    let peak = equalizer(EqualizerKind::Peak, 3_000.0, 6.0, EqualizerShape::Q(2.0));
    let made = design(&Spec { phase: Phase::Zero, ..spec(vec![peak]) }, 48_000).unwrap();
    assert_eq!(made.stages[0].remarks, ["each of the two passes has half the gain, 3 dB", "+6 dB at its center, q 2"]);
}

#[test]
fn a_peak_beyond_half_the_rate_has_a_center_and_a_shelf_an_edge() {
    let peak = equalizer(EqualizerKind::Peak, 24_000.0, 3.0, EqualizerShape::Q(1.0));
    let shelf = equalizer(EqualizerKind::Highshelf, 30_000.0, 3.0, EqualizerShape::Q(1.0));
    let error = design(&spec(vec![peak.clone(), shelf.clone()]), 48_000).unwrap_err().to_string();
    assert!(
        error.contains("stage 1 (peak): its center, 24000 Hz, is not below half the sample rate, 24000 Hz"),
        "{error}"
    );
    assert!(error.contains("stage 2 (highshelf): its edge, 30000 Hz, is not below"), "{error}");
    let leave_out = Spec { beyond_half_rate: BeyondHalfRate::LeaveOut, ..spec(vec![peak, shelf]) };
    let made = design(&leave_out, 48_000).unwrap();
    assert!(made.stages.is_empty() && made.left_out.len() == 2);
}

#[test]
fn the_sentence_tells_each_stage_and_claims_no_prewarping() {
    for (stage, phrase, way) in [
        (curve(Curve::A), "through the frequency weighting A of IEC 61672-1:2013.", "matched z transform"),
        (curve(Curve::K), "through the K weighting of ITU-R BS.1770.", "the coefficients printed in the standard"),
        (curve(Curve::Riaa), "through the playback equalization of IEC 60098 (time", "matched z transform"),
        (
            equalizer(EqualizerKind::Peak, 3_000.0, 6.0, EqualizerShape::Q(4.0)),
            "through a peak of +6 dB at 3000 Hz with a Q of 4.",
            "from the formulas of the W3C note Audio EQ Cookbook",
        ),
        (
            equalizer(EqualizerKind::Lowshelf, 200.0, -6.0, EqualizerShape::Slope(1.0)),
            "through a low shelf of -6 dB with its midpoint at 200 Hz and a slope S of 1.",
            "from the formulas of the W3C note Audio EQ Cookbook",
        ),
    ] {
        let text = sentence(vec![stage]);
        assert!(text.contains(phrase) && text.contains(way), "{text}");
        assert!(!text.contains("prewarp") && !text.contains("prototype"), "{text}");
    }
}

/// Beside a notch the prewarping is the notch's alone: a peak's frequency is no edge.
#[test]
fn a_mixed_cascade_tells_each_way_once() {
    let notch =
        Stage::Notch(bandproof::spec::NotchStage { row: Row { center_hz: 50.0, width: Width::Hz(2.0), harmonics: 1 } });
    let peak = equalizer(EqualizerKind::Peak, 3_000.0, 6.0, EqualizerShape::Q(4.0));
    let text = sentence(vec![notch, peak.clone(), peak, curve(Curve::A)]);
    let way = "was designed from analog prototypes by the bilinear transform with prewarped center and width, has its \
               peaks and shelves from the formulas of the W3C note Audio EQ Cookbook, has its weighting from the poles \
               and zeros of the standard by the matched z transform with a fitted correction, ran";
    assert!(text.contains(way), "{text}");
    assert!(text.contains("a Q of 4, twice in succession; and the frequency weighting A"), "{text}");
}
