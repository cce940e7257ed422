//! Stages whose order follows from limits, in the design's entry and in the methods.

use crate::methods::designed;
use bandproof::report::{DesignEntry, EdgeDefinition, LimitEdge};

const FAMILIES: [(&str, f64); 5] =
    [("butterworth", 1.9), ("chebyshev1", 1.5), ("chebyshev2", 1.5), ("elliptic", 1.2), ("bessel", 14.0)];

/// Kind, edges and stop edges at a factor of `by`, as a spec has them.
fn kinds(by: f64) -> [(&'static str, Vec<f64>, Vec<f64>); 4] {
    [
        ("lowpass", vec![900.0], vec![900.0 * by]),
        ("highpass", vec![900.0], vec![900.0 / by]),
        ("bandpass", vec![900.0, 1_500.0], vec![900.0 / (by * by), 1_500.0 * by]),
        ("bandstop", vec![900.0 / (by * by), 1_500.0 * by], vec![1_100.0, 1_300.0]),
    ]
}

#[test]
fn every_family_has_its_limits_in_the_entry_and_its_transition_from_the_ripple_to_the_stop() {
    for (family, by) in FAMILIES {
        for (kind, edges_hz, stop_hz) in kinds(by) {
            let keys = match edges_hz.len() {
                1 => format!("edge_hz = {}\nstop_edge_hz = {}", edges_hz[0], stop_hz[0]),
                _ => format!("edges_hz = {edges_hz:?}\nstop_edges_hz = {stop_hz:?}"),
            };
            let figures = "ripple_db = 0.5\nstop_db = 45";
            let toml = format!("[[stage]]\nkind = \"{kind}\"\nfamily = \"{family}\"\n{keys}\n{figures}\n");
            let design = designed(&toml, 48_000);
            let entry = DesignEntry::new(&design, "none", None).unwrap();
            let [stage] = entry.stages.as_slice() else { panic!("one stage") };
            assert_eq!(stage.order, design.stages[0].recipe.order());
            assert_eq!((stage.ripple_db.map(f64::from), stage.stop_db.map(f64::from)), (Some(0.5), Some(45.0)));
            let near = |a: f64, b: f64| (a - b).abs() <= 5e-7;
            assert!(stage.edges_hz.iter().zip(&edges_hz).all(|(a, b)| near(a.get(), *b)), "edges stay as written");
            let (pass, stop): (Vec<_>, Vec<_>) = stage.limits.iter().partition(|one| one.edge == LimitEdge::Pass);
            assert_eq!((pass.len(), stop.len()), (edges_hz.len(), edges_hz.len()));
            assert!(stage.limits.iter().all(|one| one.slack_db.get() >= 0.0), "{family} {kind}: {:?}", stage.limits);
            let at = |limits: &[_], edges_hz: &[f64]| {
                let pairs = limits.iter().zip(edges_hz);
                pairs.into_iter().all(|(limit, hz): (&&bandproof::report::LimitEntry, _)| near(limit.at_hz.get(), *hz))
            };
            assert!(at(&pass, &edges_hz) && at(&stop, &stop_hz));
            let methods = &entry.methods.stages[0];
            assert_eq!(methods.edge_definition, Some(EdgeDefinition::RippleEnds), "{family} {kind}");
            for ((edge_hz, stop_hz), transition) in edges_hz.iter().zip(&stop_hz).zip(&methods.lines[0].transitions) {
                assert!(near(transition.pass_hz.unwrap().get(), *edge_hz));
                assert_eq!((transition.pass_db.get(), transition.stop_db.unwrap().get()), (0.5, 45.0));
                // Reached no later than at the stop edge.
                let (reached_hz, width_hz) = (transition.stop_hz.unwrap().get(), transition.width_hz.unwrap().get());
                assert!((reached_hz - edge_hz).signum() == (stop_hz - edge_hz).signum(), "{family} {kind}");
                assert!(width_hz <= (stop_hz - edge_hz).abs() + 1e-6, "{family} {kind}: {transition:?}");
            }
        }
    }
}

/// A stage of a given order has none.
#[test]
fn a_given_order_has_no_limits() {
    let design = designed("[[stage]]\nkind = \"lowpass\"\nfamily = \"bessel\"\norder = 3\nedge_hz = 100\n", 8_000);
    let entry = DesignEntry::new(&design, "none", None).unwrap();
    assert!(entry.stages[0].limits.is_empty() && entry.stages[0].remarks.is_empty());
}

/// Two Butterworth passes whose net edge is at We: v^(2n) = sqrt 2 - 1 there, so both together
/// are down by D dB where v^(2n) = 10^(D/20) - 1 (|H|^2 = 1 / (1 + v^2n), handbook).
#[test]
fn transitions_of_two_passes_are_net() {
    let toml = "phase = \"zero\"\n[[stage]]\nkind = \"lowpass\"\nfamily = \"butterworth\"\norder = 4\nedge_hz = 900\n\
                [[band]]\nname = \"b\"\nfrom_hz = 3000\nto_hz = 4000\nreduce_db = 40\n";
    let design = designed(toml, 48_000);
    let entry = DesignEntry::new(&design, "none", None).unwrap();
    let transition = entry.methods.stages[0].lines[0].transitions[0];
    let v = libm::pow((libm::pow(10.0, 2.0) - 1.0) / (libm::sqrt(2.0) - 1.0), 1.0 / 8.0);
    let turn = std::f64::consts::PI / 48_000.0;
    let stop_hz = libm::atan(libm::tan(900.0 * turn) * v) / turn;
    assert_eq!((transition.pass_hz.unwrap().get(), transition.stop_db.unwrap().get()), (900.0, 40.0));
    assert!((transition.stop_hz.unwrap().get() - stop_hz).abs() < 1e-6, "{transition:?}, {stop_hz} Hz");
    assert_eq!(entry.stages[0].remarks.len(), 1);
}
