//! Designs whose orders follow from limits, and what they say of themselves.

use bandproof::design::limits::{self, LimitsError};
use bandproof::design::recipe::{Recipe, recipe};
use bandproof::design::{Check, Design, DesignError, PlacedStage, design, response};
use bandproof::spec::{self, Family, FilterKind, FilterStage, Order, Phase, Placement, Stage, StopEdges};

fn designed(toml: &str, rate_hz: u32) -> Result<Design, DesignError> {
    let spec = spec::parse(toml.as_bytes(), spec::SpecSyntax::Toml, "spec.toml").unwrap();
    design(&spec, rate_hz)
}

const FAMILIES: [(&str, f64); 5] =
    [("butterworth", 2.0), ("chebyshev1", 1.4), ("chebyshev2", 1.4), ("elliptic", 1.1), ("bessel", 20.0)];

/// The check of bands, which knows nothing of stages, finds the limits guaranteed as well.
#[test]
fn bands_with_the_figures_of_the_limits_are_guaranteed() {
    for (family, factor) in FAMILIES {
        for rate_hz in [8_000, 48_000] {
            for (kind, edge_hz, stop_hz, kept, reduced) in [
                ("lowpass", 150.0, 150.0 * factor, (0.0, 150.0), (150.0 * factor, f64::from(rate_hz / 2))),
                ("highpass", 150.0, 150.0 / factor, (150.0, f64::from(rate_hz / 2)), (0.0, 150.0 / factor)),
            ] {
                let toml = format!(
                    "[[stage]]\nkind = \"{kind}\"\nfamily = \"{family}\"\nedge_hz = {edge_hz}\n\
                     stop_edge_hz = {stop_hz}\nripple_db = 0.5\nstop_db = 60\n\
                     [[band]]\nname = \"kept\"\nfrom_hz = {}\nto_hz = {}\nkeep_db = 0.5\n\
                     [[band]]\nname = \"reduced\"\nfrom_hz = {}\nto_hz = {}\nreduce_db = 60\n",
                    kept.0, kept.1, reduced.0, reduced.1
                );
                let design = designed(&toml, rate_hz).unwrap();
                let checks: Vec<_> = design.bands.iter().map(|band| band.check).collect();
                assert_eq!(checks, [Some(Check::Guaranteed); 2], "{family} {kind} at {rate_hz} Hz: {:?}", design.bands);
                let [stage] = design.stages.as_slice() else { panic!("one stage") };
                let edges: Vec<_> = stage.slack.iter().map(|one| (one.is_stop, one.at_hz, one.limit_db)).collect();
                assert_eq!(edges, [(false, edge_hz, 0.5), (true, stop_hz, 60.0)]);
                assert!(stage.remarks.is_empty(), "{:?}", stage.remarks);
                for (slack, band) in stage.slack.iter().zip(&design.bands) {
                    let left_db = match slack.is_stop {
                        false => 0.5 - band.attenuation_max_db,
                        true => band.attenuation_min_db - 60.0,
                    };
                    assert!((slack.slack_db - left_db).abs() < 1e-9, "{slack:?}, {left_db} dB left in {band:?}");
                }
            }
        }
    }
}

fn limited(kind: FilterKind, family: Family, edges_hz: &[f64], stop: StopEdges) -> PlacedStage {
    let placement = match *edges_hz {
        [low, high] => Placement::Edges { edges_hz: [low, high] },
        _ => Placement::Edge { edge_hz: edges_hz[0] },
    };
    let order = Order::Limits(stop);
    let stage = FilterStage { kind, family, order, placement, ripple_db: Some(0.5), stop_db: Some(60.0) };
    PlacedStage { stage_index: 0, stage: Stage::Filter(stage), harmonic: None, edges_hz: edges_hz.to_vec() }
}

/// Stop edges far off the center of the pass edges: with the lower pass edge moved the
/// response at both stop edges is the same, and an order is saved.
#[test]
fn a_pass_edge_of_a_band_stop_moves_where_that_saves_an_order_and_the_stage_says_so() {
    let stage = |stop| {
        format!(
            "[[stage]]\nkind = \"bandstop\"\nfamily = \"butterworth\"\nedges_hz = [40, 300]\n\
             stop_edges_hz = {stop}\nripple_db = 0.5\nstop_db = 60\n"
        )
    };
    let lopsided = &designed(&stage("[150, 180]"), 48_000).unwrap().stages[0];
    let [lower, upper, stops @ ..] = lopsided.slack.as_slice() else { panic!("four edges") };
    assert!(lower.slack_db > 0.1 && upper.slack_db.abs() < 1e-6, "{:?}", lopsided.slack);
    assert!((stops[0].slack_db - stops[1].slack_db).abs() < 1e-6 && stops[0].slack_db >= 0.0, "{:?}", lopsided.slack);
    let [remark] = lopsided.remarks.as_slice() else { panic!("one remark: {:?}", lopsided.remarks) };
    // W1 = Ws1 Ws2 / W2 of tangents, which is nearly 90 Hz.
    assert!(remark.starts_with("its lower pass edge was moved from 40 to 89.994 Hz, toward the stop"), "{remark}");
    let centered = &designed(&stage("[100, 120]"), 48_000).unwrap().stages[0];
    assert!(centered.remarks.is_empty());
    assert!(centered.slack[..2].iter().all(|pass| pass.slack_db.abs() < 1e-6), "{:?}", centered.slack);
}

#[test]
fn limits_of_two_passes_are_net_and_one_pass_is_told() {
    for (family, factor) in FAMILIES {
        let placed = limited(FilterKind::Lowpass, family_of(family), &[150.0], StopEdges::One(150.0 * factor));
        let recipe = recipe(&placed, Phase::Zero, 48_000.0).unwrap();
        let one = bandproof::design::sections::build_stage(&placed, &recipe, 48_000.0).unwrap();
        let at = |hz: f64| -2.0 * response::gain_db(&one, hz, 48_000.0);
        assert!((at(150.0) - 0.5).abs() < 1e-6 && at(150.0 * factor) >= 60.0 - 1e-6, "{family}");
        let remarks = bandproof::design::recipe::remarks(&placed, &recipe, Phase::Zero, 48_000.0);
        let order = recipe.order().unwrap();
        let text = format!(
            "each of the two passes has order {order} and holds half of ripple_db and stop_db; together they fall \
             with twice the slope of order {order}"
        );
        assert_eq!(remarks, [text]);
        assert!(bandproof::design::recipe::remarks(&placed, &recipe, Phase::Causal, 48_000.0).is_empty());
    }
}

fn family_of(name: &str) -> Family {
    match name {
        "butterworth" => Family::Butterworth,
        "chebyshev1" => Family::Chebyshev1,
        "chebyshev2" => Family::Chebyshev2,
        "elliptic" => Family::Elliptic,
        _ => Family::Bessel,
    }
}

/// With zero phase a stage says what one pass is.
#[test]
fn the_passes_of_each_kind_of_stage_are_told() {
    let remark = |stage: &str| {
        let toml = format!("phase = \"zero\"\n[[stage]]\n{stage}\n");
        let spec = spec::parse(toml.as_bytes(), spec::SpecSyntax::Toml, "spec.toml").unwrap();
        let placed = bandproof::design::placement::place(&spec, 48_000).unwrap();
        let recipe = recipe(&placed.stages[0], spec.phase, 48_000.0).unwrap();
        bandproof::design::recipe::remarks(&placed.stages[0], &recipe, spec.phase, 48_000.0).join(" / ")
    };
    let slope = |order| format!("; together they fall with twice the slope of order {order}");
    let filter = |family: &str, kind: &str, rest: &str| {
        remark(&format!("kind = \"{kind}\"\nfamily = \"{family}\"\norder = 4\n{rest}"))
    };
    // 40 Hz (sqrt 2 - 1)^(1/8) = 35.83 Hz.
    let text = filter("butterworth", "highpass", "edge_hz = 40");
    assert_eq!(text, format!("each of the two passes has order 4 with its half-power point at 35.827 Hz{}", slope(4)));
    let text = filter("bessel", "bandpass", "edges_hz = [40, 400]");
    assert!(text.contains("order 4 with its half-power points at ") && text.contains(" and "), "{text}");
    let text = filter("chebyshev1", "lowpass", "edge_hz = 40\nripple_db = 0.5");
    assert_eq!(text, format!("each of the two passes has order 4 with half the ripple, 0.25 dB{}", slope(4)));
    let text = filter("chebyshev2", "lowpass", "edge_hz = 40\nstop_db = 45");
    assert_eq!(text, format!("each of the two passes has order 4 with half the stop attenuation, 22.5 dB{}", slope(4)));
    let text = filter("elliptic", "lowpass", "edge_hz = 40\nripple_db = 0.1\nstop_db = 45");
    assert!(text.contains("half the ripple, 0.05 dB, and half the stop attenuation, 22.5 dB"), "{text}");
    // tan(pi 2 / 48000) sqrt(sqrt 2 - 1).
    let text = remark("kind = \"notch\"\ncenter_hz = 50\nwidth_hz = 2");
    assert_eq!(text, "each of the two passes is a notch 1.287189 Hz wide between half-power points");
    let text = remark("kind = \"peak\"\ncenter_hz = 50\nq = 2\ngain_db = -9");
    assert_eq!(text, "each of the two passes has half the gain, -4.5 dB");
}

/// What the message names holds; this is its wording.
#[test]
fn limits_that_no_order_holds_are_an_error_with_figures_and_repair() {
    let error = |kind, family, edges_hz: &[f64], stop, phase| {
        recipe(&limited(kind, family, edges_hz, stop), phase, 48_000.0).unwrap_err().to_string()
    };
    let lowpass = (FilterKind::Lowpass, StopEdges::One(1_050.0));
    let text = error(lowpass.0, Family::Butterworth, &[1_000.0], lowpass.1, Phase::Causal);
    // v = (Ws / Wp)^20 of tangents: 10 log10(1 + (10^0.05 - 1) v^2) = 2.7 dB, which no spec may ask for.
    assert_eq!(
        text,
        "stage 1 (1000 Hz): at a sample rate of 48000 Hz no Butterworth lowpass up to order 20, the highest, holds \
         stop_db = 60 from 1050 Hz on: order 20 has 2.7 dB there, and 60 dB from 1486.235 Hz on; set stop_edge_hz = 1486.235, or raise ripple_db, or \
         take a family with a steeper edge"
    );
    let text = error(
        FilterKind::Bandpass,
        Family::Elliptic,
        &[1_000.0, 2_000.0],
        StopEdges::Two([999.999_9, 2_000.000_1]),
        Phase::Zero,
    );
    for part in
        ["up to order 14, the highest", "stop_db = 60 up to 999.9999 Hz and from 2000.0001 Hz on", "stop_edges_hz = ["]
    {
        assert!(text.contains(part), "{part}: {text}");
    }
    assert!(!text.contains("steeper edge"), "{text}");
    let text = error(FilterKind::Bandstop, Family::Bessel, &[40.0, 60.0], StopEdges::Two([45.0, 55.0]), Phase::Causal);
    assert!(text.contains("no Bessel bandstop") && text.contains("holds stop_db = 60 from 45 to 55 Hz"), "{text}");
}

#[test]
fn limits_out_of_order_are_errors_by_hand_too() {
    let find = |kind, edges_hz: &[f64], stop, ripple_db, stop_db| {
        let Stage::Filter(stage) = limited(kind, Family::Butterworth, edges_hz, stop).stage else { panic!("a filter") };
        let stage = FilterStage { ripple_db, stop_db, ..stage };
        limits::recipe(&stage, edges_hz, stop, 1, 8_000.0).unwrap_err()
    };
    let figures = (Some(0.5), Some(60.0));
    for (kind, edges_hz, stop, expected) in [
        (FilterKind::Lowpass, vec![100.0], StopEdges::One(100.0), "stop_edge_hz above edge_hz"),
        (FilterKind::Lowpass, vec![100.0], StopEdges::One(4_000.0), "below half the sample rate, 4000 Hz"),
        (FilterKind::Highpass, vec![100.0], StopEdges::One(200.0), "stop_edge_hz below edge_hz"),
        (FilterKind::Highpass, vec![100.0], StopEdges::One(0.0), "all above 0"),
        (FilterKind::Highpass, vec![100.0], StopEdges::One(f64::NAN), "stop_edge_hz below edge_hz"),
        (FilterKind::Bandpass, vec![100.0, 200.0], StopEdges::Two([110.0, 300.0]), "on either side of edges_hz"),
        (FilterKind::Bandstop, vec![100.0, 200.0], StopEdges::Two([50.0, 150.0]), "between edges_hz"),
        (FilterKind::Bandstop, vec![100.0, 200.0], StopEdges::One(150.0), "two edges_hz and two stop_edges_hz"),
        (FilterKind::Lowpass, vec![100.0, 200.0], StopEdges::One(150.0), "one edge_hz and one stop_edge_hz"),
    ] {
        let error = find(kind, &edges_hz, stop, figures.0, figures.1);
        assert!(matches!(error, LimitsError::Edges { .. }), "{error}");
        assert!(error.to_string().contains(expected), "{error}");
    }
    let lowpass = |ripple_db, stop_db| find(FilterKind::Lowpass, &[100.0], StopEdges::One(200.0), ripple_db, stop_db);
    for (ripple_db, stop_db) in
        [(None, Some(60.0)), (Some(0.5), None), (Some(0.0), Some(60.0)), (Some(60.0), Some(60.0))]
    {
        let error = lowpass(ripple_db, stop_db);
        assert!(matches!(error, LimitsError::Figures { .. }), "{error}");
    }
    assert!(lowpass(None, Some(60.0)).to_string().ends_with("they are missing and 60"));
}

#[test]
fn poles_that_f64_can_not_hold_are_reported_as_for_a_given_order() {
    let toml = "[[stage]]\nkind = \"lowpass\"\nfamily = \"butterworth\"\nedge_hz = 0.001\nstop_edge_hz = 0.004\n\
                ripple_db = 0.5\nstop_db = 60\n";
    assert!(matches!(designed(toml, 384_000), Err(DesignError::PoleAtEnd { .. })));
    assert!(
        designed(&toml.replace("0.001", "10").replace("0.004", "40"), 384_000)
            .is_ok_and(|design| design.stages[0].slack.len() == 2)
    );
}

/// At the low end of high rates rounding would cost the limits a part of a decibel: the filter
/// is designed with as much in hand, and holds.
#[test]
fn what_rounding_costs_is_kept_in_hand() {
    let mut in_hand = 0;
    for center_hz in [0.5, 1.0, 2.0, 3.7, 5.0] {
        let edges_hz = [center_hz * 0.97, center_hz * 1.03];
        let stop = StopEdges::Two([center_hz * 0.99, center_hz * 1.01]);
        let placed = limited(FilterKind::Bandstop, Family::Elliptic, &edges_hz, stop);
        let Recipe::Filter(recipe) = recipe(&placed, Phase::Causal, 384_000.0).unwrap() else { panic!("a filter") };
        let built = bandproof::design::sections::build_stage(&placed, &Recipe::Filter(recipe.clone()), 384_000.0);
        let Stage::Filter(stage) = &placed.stage else { panic!("a filter") };
        let slack = limits::slack(stage, &edges_hz, &recipe, &built.unwrap(), 384_000.0);
        assert!(slack.iter().all(|one| one.slack_db >= -2.5e-7), "{center_hz} Hz: {slack:?}");
        in_hand += usize::from(recipe.ripple_db < Some(0.5));
    }
    assert!(in_hand > 0);
}

/// A ripple below what rounding costs there: no order helps, and the message says why.
#[test]
fn a_ripple_that_rounding_exceeds_is_an_error_of_its_own() {
    let stop = StopEdges::Two([0.99, 1.01]);
    let Stage::Filter(stage) = limited(FilterKind::Bandstop, Family::Elliptic, &[0.97, 1.03], stop).stage else {
        panic!("a filter")
    };
    let stage = FilterStage { ripple_db: Some(1e-6), ..stage };
    let error = limits::recipe(&stage, &[0.97, 1.03], stop, 1, 384_000.0).unwrap_err();
    let LimitsError::Rounding { order, missed_db, .. } = error else { panic!("{error}") };
    assert!(order < 14 && missed_db > 1e-6, "order {order}, {missed_db} dB");
    assert!(error.to_string().contains("ripple_db = 0.000001 and stop_db = 60, but rounding"), "{error}");
    // At a rate that suits the edges the same limits hold.
    assert!(limits::recipe(&stage, &[0.97, 1.03], stop, 1, 100.0).is_ok());
}
