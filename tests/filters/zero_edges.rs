//! Forward and backward: the stated edges are those of both passes together.

use crate::support::{Filter, notch, unavoidable_db};
use bandproof::design::recipe::{Recipe, recipe};
use bandproof::design::{DesignError, PlacedStage, response, sections};
use bandproof::section::Section;
use bandproof::spec::{
    Curve, EqualizerKind, EqualizerShape, EqualizerStage, Family, FilterKind, Phase, Stage, WeightingStage,
};
use std::f64::consts::PI;

const HALF_POWER_DB: f64 = 3.010_299_956_639_812;
const RATES: [f64; 5] = [8_000.0, 44_100.0, 48_000.0, 192_000.0, 384_000.0];

fn one_pass(placed: &PlacedStage, rate_hz: f64) -> (Recipe, Vec<Section>) {
    let recipe = recipe(placed, Phase::Zero, rate_hz).unwrap();
    let sections = sections::build_stage(placed, &recipe, rate_hz).unwrap();
    (recipe, sections)
}

/// What rounding the zeros of a pair at W may cost in gain for the sake of their place:
/// 2^-54 / (4 W^2 / (1 + W^2)), and the same from the other end.
fn zeros_db(sections: &[Section]) -> f64 {
    let relative = sections.iter().map(|section| {
        let [b0, b1, _] = section.b.map(f64::abs);
        if b1 == 0.0 || b1 >= 2.0 * b0 { 0.0 } else { 2f64.powi(-54) / (2.0 - b1 / b0) }
    });
    20.0 / std::f64::consts::LN_10 * relative.sum::<f64>()
}

/// 1e-9 dB, and what coefficients in f64 can't avoid, in two passes.
#[test]
fn two_passes_have_the_stated_figure_at_the_stated_edges() {
    let mut seen = 0;
    for family in [Family::Butterworth, Family::Bessel, Family::Chebyshev1, Family::Chebyshev2, Family::Elliptic] {
        let (ripple_db, stop_db, edge_db) = match family {
            Family::Butterworth | Family::Bessel => (None, None, HALF_POWER_DB),
            Family::Chebyshev1 => (Some(0.5), None, 0.5),
            Family::Chebyshev2 => (None, Some(50.0), 50.0),
            Family::Elliptic => (Some(0.2), Some(60.0), 0.2),
        };
        for rate_hz in RATES {
            for (kind, edges) in [
                (FilterKind::Lowpass, vec![0.002]),
                (FilterKind::Lowpass, vec![0.47]),
                (FilterKind::Highpass, vec![0.001]),
                (FilterKind::Highpass, vec![0.3]),
                (FilterKind::Bandpass, vec![0.1, 0.11]),
                (FilterKind::Bandpass, vec![0.002, 0.4]),
                (FilterKind::Bandstop, vec![0.2, 0.25]),
                (FilterKind::Bandstop, vec![0.01, 0.0101]),
            ] {
                for order in [1, 2, 3, 5, 8, 12] {
                    let edges_hz: Vec<f64> = edges.iter().map(|edge| edge * rate_hz).collect();
                    let filter = Filter { family, kind, order, ripple_db, stop_db, edges_hz, rate_hz };
                    let (recipe, sections) = one_pass(&filter.placed(), rate_hz);
                    assert_eq!(recipe.order(), Some(order), "the order is that of one pass");
                    for &edge_hz in &filter.edges_hz {
                        let net_db = 2.0 * response::gain_db(&sections, edge_hz, rate_hz);
                        let within = 1e-9 + 2.0 * (unavoidable_db(&filter, &sections, edge_hz) + zeros_db(&sections));
                        assert!(
                            (net_db + edge_db).abs() < within,
                            "{filter:?}: {net_db} dB at {edge_hz} Hz, {within:e}"
                        );
                        seen += 1;
                    }
                }
            }
        }
    }
    assert_eq!(seen, 5 * 5 * 12 * 6);
}

/// Of a Butterworth pass in closed form: v^(2n) = sqrt 2 - 1 where it is down by half of half
/// power, v the ratio of tangents.
#[test]
fn a_butterworth_pass_has_its_edge_where_the_closed_form_puts_it() {
    for (order, edge_hz, rate_hz) in [(1, 40.0, 48_000.0), (4, 1_000.0, 8_000.0), (20, 20_000.0, 44_100.0)] {
        let filter = crate::support::filter(Family::Butterworth, FilterKind::Lowpass, order, &[edge_hz], rate_hz);
        let Recipe::Filter(recipe) = one_pass(&filter.placed(), rate_hz).0 else { panic!("a prototype") };
        let v = (2f64.sqrt() - 1.0).powf(0.5 / f64::from(order));
        let want_hz = ((PI * edge_hz / rate_hz).tan() / v).atan() / PI * rate_hz;
        assert!((recipe.edges_hz[0] / want_hz - 1.0).abs() < 1e-14, "{recipe:?}, {want_hz} Hz");
    }
}

/// 1e-9 dB and the rounding of the coefficients: at the edges of the narrowest notch the gain
/// moves by 10^9 times what its center does.
#[test]
fn the_width_of_a_notch_is_that_of_both_passes() {
    for rate_hz in RATES {
        for (center, width) in [(0.001, 0.000_02), (0.02, 0.0005), (0.3, 0.1), (0.45, 0.02)] {
            let (center_hz, width_hz) = (center * rate_hz, width * rate_hz);
            let placed = notch(center_hz, width_hz);
            let (_, sections) = one_pass(&placed, rate_hz);
            // The half-power points of a digital notch of that width: their frequencies multiply
            // to the center's as tangents and lie that width apart (see the notch's formula).
            let (w, t) = ((PI * center_hz / rate_hz).tan(), (PI * width_hz / rate_hz).tan());
            let half = 0.5 * t * (1.0 + w * w);
            let upper = half + half.hypot(w);
            for edge in [upper, w * w / upper] {
                let edge_hz = edge.atan() / PI * rate_hz;
                let net_db = 2.0 * response::gain_db(&sections, edge_hz, rate_hz);
                let within = 1e-9 + 30.0 * 2f64.powi(-53) / (PI * width * w.min(1.0 / w));
                assert!((net_db + HALF_POWER_DB).abs() < within, "{net_db} dB at {edge_hz} Hz, {within:e}");
            }
            assert!(response::gain_db(&sections, center_hz, rate_hz) < -200.0);
        }
    }
}

/// One pass has half the gain and the same shape; the analog forms of the note "Audio EQ
/// Cookbook" have half their gain at a frequency that the gain does not move:
/// x = (W - 1/W)^2 = 1/Q^2 of a peak, W = 1 of a shelf.
#[test]
fn half_the_gain_in_two_passes_has_its_middle_where_one_pass_has_it() {
    let squared = |re: f64, im: f64| re * re + im * im;
    for gain_db in [-18.0, -3.0, 0.5, 12.0f64] {
        for q in [0.4, 0.707, 3.0] {
            let a = |gain_db: f64| 10f64.powf(gain_db / 40.0);
            let peak_db = |gain_db: f64, w: f64| {
                let (a, re) = (a(gain_db), 1.0 - w * w);
                10.0 * (squared(re, w * a / q) / squared(re, w / (a * q))).log10()
            };
            let shelf_db = |gain_db: f64| {
                let (a, im) = (a(gain_db), a(gain_db).sqrt() / q);
                10.0 * (a * a * squared(a - 1.0, im) / squared(1.0 - a, im)).log10()
            };
            let w = 0.5 / q + (0.25 / (q * q) + 1.0).sqrt();
            for passes in [1.0, 2.0] {
                assert!((passes * peak_db(gain_db / passes, w) - gain_db / 2.0).abs() < 1e-12);
                assert!((passes * shelf_db(gain_db / passes) - gain_db / 2.0).abs() < 1e-12);
            }
        }
        for (kind, shape) in [
            (EqualizerKind::Peak, EqualizerShape::Q(2.0)),
            (EqualizerKind::Lowshelf, EqualizerShape::Slope(0.7)),
            (EqualizerKind::Highshelf, EqualizerShape::Q(0.7)),
        ] {
            let stage = EqualizerStage { kind, hz: 1_000.0, gain_db, shape };
            let placed =
                PlacedStage { stage_index: 0, stage: Stage::Equalizer(stage), harmonic: None, edges_hz: vec![1_000.0] };
            let half = EqualizerStage { gain_db: gain_db / 2.0, ..stage };
            assert_eq!(recipe(&placed, Phase::Zero, 48_000.0).unwrap(), Recipe::Equalizer(half));
            assert_eq!(recipe(&placed, Phase::Causal, 48_000.0).unwrap(), Recipe::Equalizer(stage));
        }
    }
}

#[test]
fn a_whole_transfer_function_can_not_be_halved() {
    let stage = Stage::Weighting(WeightingStage { curve: Curve::A });
    let placed = PlacedStage { stage_index: 2, stage, harmonic: None, edges_hz: Vec::new() };
    let error = recipe(&placed, Phase::Zero, 48_000.0).unwrap_err();
    assert!(matches!(error, DesignError::ZeroPhase { .. }));
    let text = error.to_string();
    assert!(text.contains("stage 3 (weighting)") && text.contains("phase = \"causal\""), "{text}");
    assert!(recipe(&placed, Phase::Causal, 48_000.0).is_ok());
}
