//! Law: a spec, written in its own keys and read again, is the same spec.

use bandproof::spec::{self, *};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;

fn choice<T: Copy + std::fmt::Debug + 'static>(all: &'static [T]) -> impl Strategy<Value = T> {
    proptest::sample::select(all)
}

fn frequency() -> impl Strategy<Value = f64> {
    prop_oneof![1e-3..1e6_f64, (1_u32..200_000).prop_map(f64::from)]
}

fn order() -> impl Strategy<Value = u32> {
    1_u32..=20
}

/// A row of lines that don't overlap: a width below the distance of the lines, or a Q
/// above the number of lines less a half. 0.999 and 1.001 keep clear of rounding.
fn row() -> impl Strategy<Value = Row> {
    let width = prop_oneof![(1e-6..0.999_f64).prop_map(Ok), (1.001..100.0_f64).prop_map(Err)];
    (frequency(), 1_u32..30, width).prop_map(|(center_hz, harmonics, width)| {
        let width = match width {
            Ok(share) => Width::Hz(center_hz * share),
            Err(times) => Width::Q((f64::from(harmonics) - 0.5) * times),
        };
        Row { center_hz, width, harmonics }
    })
}

fn edges() -> impl Strategy<Value = [f64; 2]> {
    (frequency(), 1e-6..10.0_f64).prop_map(|(low, share)| [low, low * (1.0 + share)])
}

fn placement(kind: FilterKind) -> BoxedStrategy<Placement> {
    let edges = edges().prop_map(|edges_hz| Placement::Edges { edges_hz });
    match kind {
        FilterKind::Lowpass | FilterKind::Highpass => {
            frequency().prop_map(|edge_hz| Placement::Edge { edge_hz }).boxed()
        }
        FilterKind::Bandstop => prop_oneof![edges, row().prop_map(Placement::Row)].boxed(),
        // One line, or two that share frequencies: 1.5 + 0.5 times the share is above
        // 2 - 0.5 times the share from 1 on.
        FilterKind::Bandpass => {
            let one = row().prop_map(|row| Placement::Row(Row { harmonics: 1, ..row }));
            let two = (frequency(), 1.01..1.99_f64).prop_map(|(center_hz, share)| {
                Placement::Row(Row { center_hz, width: Width::Hz(center_hz * share), harmonics: 2 })
            });
            prop_oneof![edges, one, two].boxed()
        }
    }
}

fn stage() -> impl Strategy<Value = Stage> {
    let filter = (choice(FilterKind::ALL), choice(Family::ALL), order(), 1e-3..12.0_f64, 12.001..200.0_f64)
        .prop_flat_map(|(kind, family, order, ripple, stop)| {
            placement(kind).prop_map(move |placement| {
                let takes_ripple = matches!(family, Family::Chebyshev1 | Family::Elliptic);
                let takes_stop = matches!(family, Family::Chebyshev2 | Family::Elliptic);
                Stage::Filter(FilterStage {
                    kind,
                    family,
                    order: if family == Family::Elliptic { order.min(14) } else { order },
                    placement,
                    ripple_db: takes_ripple.then_some(ripple),
                    stop_db: takes_stop.then_some(stop),
                })
            })
        });
    prop_oneof![3 => filter, 1 => row().prop_map(|row| Stage::Notch(NotchStage { row }))]
}

/// Names get their number at the end, so that no two are equal.
fn bands() -> impl Strategy<Value = Vec<Band>> {
    let range = (prop_oneof![Just(0.0), frequency()], 1e-3..1e5_f64)
        .prop_map(|(from_hz, width)| Extent::Range { from_hz, to_hz: from_hz + width });
    let extent = prop_oneof![range, row().prop_map(Extent::Row)];
    let requirement = prop_oneof![
        (1e-3..200.0_f64).prop_map(|reduce_db| Requirement::Reduce { reduce_db }),
        (1e-3..200.0_f64).prop_map(|keep_db| Requirement::Keep { keep_db, except: Vec::new() }),
        (-200.0..0.0_f64).prop_map(|residual_dbfs| Requirement::Residual { residual_dbfs }),
        Just(Requirement::Observe),
    ];
    proptest::collection::vec(("\\PC{0,12}", extent, requirement), 0..6).prop_map(|entries| {
        let named = entries.into_iter().enumerate();
        let mut bands: Vec<_> = named
            .map(|(index, (name, extent, requirement))| Band { name: format!("{name} #{index}"), extent, requirement })
            .collect();
        // Whatever must be reduced is excepted from whatever must be kept.
        let reduced: Vec<_> =
            bands.iter().filter(|band| band.requirement.reduce_db().is_some()).map(|band| band.name.clone()).collect();
        for band in &mut bands {
            if let Requirement::Keep { except, .. } = &mut band.requirement {
                except.clone_from(&reduced);
            }
        }
        bands
    })
}

/// One of the bands that can be the reference, if there is any.
fn reference_band(bands: &[Band], index: proptest::sample::Index) -> Option<String> {
    let shows_gains = |band: &&Band| matches!(band.requirement, Requirement::Keep { .. } | Requirement::Observe);
    let names: Vec<_> = bands.iter().filter(shows_gains).flat_map(Band::named).map(|band| band.name).collect();
    (!names.is_empty()).then(|| index.get(&names).clone())
}

fn any_spec() -> impl Strategy<Value = Spec> {
    let output = (
        choice(OutputEncoding::ALL),
        choice(Dither::ALL),
        choice(Overload::ALL),
        prop_oneof![Just(0.0), -200.0..200.0_f64],
        any::<bool>(),
    )
        .prop_map(|(encoding, dither, overload, gain_db, history)| OutputSpec {
            encoding,
            dither,
            overload,
            gain_db,
            history,
        });
    let rate = proptest::option::of(choice(RateMeaning::ALL));
    let title = proptest::option::of("\\PC{0,30}");
    let stages = proptest::collection::vec(stage(), 0..5);
    let reference = proptest::option::of(any::<proptest::sample::Index>());
    (title, choice(BeyondHalfRate::ALL), output, stages, bands(), reference, rate)
        .prop_map(|(title, beyond_half_rate, output, stages, bands, reference, rate)| Spec {
            title,
            beyond_half_rate,
            rate,
            output,
            reference_band: reference.and_then(|index| reference_band(&bands, index)),
            stages,
            bands,
        })
        .prop_filter("an empty spec is none", |spec| !spec.stages.is_empty() || !spec.bands.is_empty())
}

proptest! {
    // The same cases on every run.
    #![proptest_config(ProptestConfig {
        cases: 500,
        rng_seed: RngSeed::Fixed(1),
        failure_persistence: None,
        ..ProptestConfig::default()
    })]

    #[test]
    fn through_json(spec in any_spec()) {
        let json = serde_json::to_string_pretty(&spec).unwrap();
        let again = spec::parse(json.as_bytes(), SpecSyntax::Json, "spec.json");
        prop_assert_eq!(again.map_err(|error| error.to_string()), Ok(spec), "{}", json);
    }

    #[test]
    fn through_toml(spec in any_spec()) {
        let text = toml::to_string(&spec).unwrap();
        let again = spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml");
        prop_assert_eq!(again.map_err(|error| error.to_string()), Ok(spec), "{}", text);
    }
}
