//! Law: a spec, written in its own keys and read again, is the same spec.

use bandproof::spec::document::{Comments, document};
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

/// A filter with an order.
fn ordered() -> impl Strategy<Value = Stage> {
    (choice(FilterKind::ALL), choice(Family::ALL), order(), 1e-3..12.0_f64, 12.001..200.0_f64).prop_flat_map(
        |(kind, family, order, ripple, stop)| {
            placement(kind).prop_map(move |placement| {
                let takes_ripple = matches!(family, Family::Chebyshev1 | Family::Elliptic);
                let takes_stop = matches!(family, Family::Chebyshev2 | Family::Elliptic);
                Stage::Filter(FilterStage {
                    kind,
                    family,
                    order: Order::Given(if family == Family::Elliptic { order.min(14) } else { order }),
                    placement,
                    ripple_db: takes_ripple.then_some(ripple),
                    stop_db: takes_stop.then_some(stop),
                })
            })
        },
    )
}

/// A filter with limits: the inner ones of two or four rising edges belong to what lies
/// inside.
fn limited() -> impl Strategy<Value = Stage> {
    let gaps = [1e-6..2.0_f64, 1e-6..2.0, 1e-6..2.0];
    (choice(FilterKind::ALL), choice(Family::ALL), frequency(), gaps, 1e-3..12.0_f64, 12.001..200.0_f64).prop_map(
        |(kind, family, first, [a, b, c], ripple, stop)| {
            let second = first * (1.0 + a);
            let (third, fourth) = (second * (1.0 + b), second * (1.0 + b) * (1.0 + c));
            let (inner, outer) = ([second, third], [first, fourth]);
            let one = |edge_hz, stop_hz| (Placement::Edge { edge_hz }, StopEdges::One(stop_hz));
            let (placement, stop_edges) = match kind {
                FilterKind::Lowpass => one(first, second),
                FilterKind::Highpass => one(second, first),
                FilterKind::Bandpass => (Placement::Edges { edges_hz: inner }, StopEdges::Two(outer)),
                FilterKind::Bandstop => (Placement::Edges { edges_hz: outer }, StopEdges::Two(inner)),
            };
            let order = Order::Limits(stop_edges);
            Stage::Filter(FilterStage { kind, family, order, placement, ripple_db: Some(ripple), stop_db: Some(stop) })
        },
    )
}

fn equalizer() -> impl Strategy<Value = Stage> {
    let gain_db = prop_oneof![-60.0..-1e-6_f64, 1e-6..60.0_f64];
    let q = (0.01..1000.0_f64).prop_map(EqualizerShape::Q);
    let shape = prop_oneof![q, (0.001..1.0_f64).prop_map(EqualizerShape::Slope)];
    (choice(EqualizerKind::ALL), frequency(), gain_db, shape, 0.01..1000.0_f64).prop_map(
        |(kind, hz, gain_db, shape, q)| {
            let shape = if kind == EqualizerKind::Peak { EqualizerShape::Q(q) } else { shape };
            Stage::Equalizer(EqualizerStage { kind, hz, gain_db, shape })
        },
    )
}

/// Numbers of every size, with zeros at their end.
fn coefficient() -> impl Strategy<Value = Coefficient> {
    use proptest::num::f64::{NEGATIVE, NORMAL, POSITIVE, SUBNORMAL};
    let any = POSITIVE | NEGATIVE | NORMAL | SUBNORMAL;
    let value = prop_oneof![
        2 => -2.0..2.0_f64,
        1 => (-200_i32..200).prop_map(|hundredths| f64::from(hundredths) / 100.0),
        1 => (-9_i32..9).prop_map(f64::from),
        1 => any
    ];
    (value, 0_i32..5).prop_map(|(value, zeros)| {
        let shortest = Coefficient::shortest(value);
        // The power of ten of its unit, zeros later; below the smallest number there is none.
        let power = format!("{:e}", shortest.unit).split_once('e').unwrap().1.parse::<i32>().unwrap() - zeros;
        let unit: f64 = format!("1e{power}").parse().unwrap();
        if shortest.unit == 0.0 || unit == 0.0 { shortest } else { Coefficient { value, unit } }
    })
}

fn nonzero() -> impl Strategy<Value = Coefficient> {
    coefficient().prop_filter("0 is refused", |coefficient| coefficient.value != 0.0)
}

/// Real roots and conjugate pairs, mixed up; `most` of the smallest parts.
fn roots(least: usize, most: usize) -> impl Strategy<Value = Vec<Root>> {
    let part = prop_oneof![
        coefficient().prop_map(|re| vec![Root { re, im: Coefficient::shortest(0.0) }]),
        (coefficient(), nonzero()).prop_map(|(re, im)| {
            let other = Coefficient { value: -im.value, ..im };
            vec![Root { re, im }, Root { re, im: other }]
        }),
    ];
    proptest::collection::vec(part, least..=most).prop_map(|parts| parts.concat()).prop_shuffle()
}

/// The longer list last: in s it is that of the poles.
fn zeros_and_poles() -> impl Strategy<Value = (Vec<Root>, Vec<Root>)> {
    (roots(0, 8), roots(1, 8)).prop_map(|(a, b)| if a.len() > b.len() { (b, a) } else { (a, b) })
}

fn transfer() -> impl Strategy<Value = Stage> {
    let list = || (nonzero(), proptest::collection::vec(coefficient(), 0..64));
    let polynomials = (list(), list(), any::<bool>());
    let polynomials = polynomials.prop_map(|((first, mut above), (leading, mut below), is_swapped)| {
        above.push(first);
        below.insert(0, leading);
        if above.len() > below.len() && is_swapped {
            above.truncate(below.len());
            above[0] = first;
        }
        Transfer::Polynomials { numerator: above, denominator: below }
    });
    let roots =
        (zeros_and_poles(), nonzero()).prop_map(|((zeros, poles), gain)| Transfer::Roots { zeros, poles, gain });
    let unit = prop_oneof![Just(RootUnit::RadiansPerSecond), Just(RootUnit::Hertz)];
    let match_hz = proptest::option::of(frequency());
    let three = || (nonzero(), coefficient(), coefficient());
    let section =
        (three(), three()).prop_map(|((b0, b1, b2), (a0, a1, a2))| WrittenSection { b: [b1, b0, b2], a: [a0, a1, a2] });
    let sections = proptest::collection::vec(section, 1..10).prop_map(DigitalFilter::Sections);
    let any = (prop_oneof![polynomials, roots], unit, match_hz, any::<bool>());
    let of_transfer = any.prop_map(|(transfer, unit, match_hz, is_analog)| match (&transfer, is_analog) {
        (Transfer::Polynomials { numerator, denominator }, true) if numerator.len() <= denominator.len() => {
            Stage::Analog(AnalogStage { transfer, unit: RootUnit::RadiansPerSecond, match_hz })
        }
        (Transfer::Roots { .. }, true) => Stage::Analog(AnalogStage { transfer, unit, match_hz }),
        _ => crate::any_rate(DigitalFilter::Transfer(transfer)),
    });
    let stage = prop_oneof![3 => of_transfer, 1 => sections.prop_map(crate::any_rate)];
    (stage, proptest::option::of(1_u32..)).prop_map(|(stage, rate_hz)| match stage {
        Stage::Digital(DigitalStage { filter, .. }) => Stage::Digital(DigitalStage { filter, rate_hz }),
        other => other,
    })
}

/// A stage that runs forward and backward.
fn stage() -> impl Strategy<Value = Stage> {
    let notch = row().prop_map(|row| Stage::Notch(NotchStage { row }));
    prop_oneof![3 => ordered(), 2 => limited(), 1 => notch, 1 => equalizer()]
}

/// A stage that does not.
fn whole_stage() -> impl Strategy<Value = Stage> {
    let weighting = choice(Curve::ALL).prop_map(|curve| Stage::Weighting(WeightingStage { curve }));
    prop_oneof![1 => weighting, 4 => transfer()]
}

/// The cascade: its phase, and stages or a search for them.
fn cascade() -> impl Strategy<Value = (Phase, Option<Auto>, Vec<Stage>)> {
    let zero = proptest::collection::vec(stage(), 0..5).prop_map(|stages| (Phase::Zero, None, stages));
    let any = prop_oneof![2 => stage().boxed(), 1 => whole_stage().boxed()];
    let causal = proptest::collection::vec(any, 0..5).prop_map(|stages| (Phase::Causal, None, stages));
    let auto = (proptest::option::of(choice(Family::ALL)), proptest::option::of(1_u32..=200), choice(Phase::ALL));
    let auto = auto.prop_map(|(family, max_sections, phase)| (phase, Some(Auto { family, max_sections }), Vec::new()));
    prop_oneof![3 => causal, 1 => zero, 1 => auto]
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

/// Whether a cascade can be found from the bands.
fn can_be_found(bands: &[Band]) -> bool {
    let is = |wanted: fn(&Requirement) -> bool| bands.iter().any(|band| wanted(&band.requirement));
    is(|limit| limit.reduce_db().is_some()) && !is(|limit| matches!(limit, Requirement::Residual { .. }))
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
    let reference = proptest::option::of(any::<proptest::sample::Index>());
    (title, choice(BeyondHalfRate::ALL), output, cascade(), bands(), reference, rate)
        .prop_map(|(title, beyond_half_rate, output, (phase, auto, stages), bands, reference, rate)| Spec {
            phase,
            // What it can't be asked together with is left out.
            auto: auto.filter(|_| can_be_found(&bands)),
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
        let text = document(&spec, SpecSyntax::Toml, &Comments::default()).unwrap();
        let again = spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml");
        prop_assert_eq!(again.map_err(|error| error.to_string()), Ok(spec), "{}", text);
    }
}
