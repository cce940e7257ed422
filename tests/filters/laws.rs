//! What every design obeys.

use crate::support::{Filter, filter, notch, unavoidable_db};
use bandproof::design::{DesignError, prototype, response, sections};
use bandproof::section::Section;
use bandproof::spec::{Family, FilterKind, Stage};
use num_complex::Complex64;
use proptest::prelude::*;

const FAMILIES: [Family; 5] =
    [Family::Butterworth, Family::Chebyshev1, Family::Chebyshev2, Family::Elliptic, Family::Bessel];

/// A filter with two edges anywhere between 0.1 % and 90 % of half the rate, a factor
/// of 1.05 or more apart; low-pass and high-pass use the first.
fn any_filter() -> impl Strategy<Value = Filter> {
    let rates = prop::sample::select(vec![8_000.0, 48_000.0, 384_000.0]);
    let kinds = prop::sample::select(vec![
        FilterKind::Lowpass,
        FilterKind::Highpass,
        FilterKind::Bandpass,
        FilterKind::Bandstop,
    ]);
    let family = prop::sample::select(FAMILIES.to_vec());
    (family, kinds, 1..=20u32, rates, 0.0..1.0f64, 1.05..8.0f64, 0.05..3.0f64, 20.0..90.0f64).prop_map(
        |(family, kind, order, rate_hz, place, ratio, ripple_db, stop_db)| {
            let order = if family == Family::Elliptic { 1 + order % 10 } else { order };
            let (lowest, highest): (f64, f64) = (0.0005 * rate_hz, 0.45 * rate_hz / ratio);
            let low = lowest * (highest / lowest).powf(place);
            let edges_hz = match kind {
                FilterKind::Lowpass | FilterKind::Highpass => vec![low],
                FilterKind::Bandpass | FilterKind::Bandstop => vec![low, low * ratio],
            };
            Filter { family, kind, order, ripple_db: Some(ripple_db), stop_db: Some(stop_db), edges_hz, rate_hz }
        },
    )
}

/// The gain at an edge by definition, dB.
fn edge_db(filter: &Filter) -> f64 {
    match filter.family {
        Family::Butterworth | Family::Bessel => 10.0 * 0.5f64.log10(),
        Family::Chebyshev1 | Family::Elliptic => -filter.ripple_db.unwrap(),
        Family::Chebyshev2 => -filter.stop_db.unwrap(),
    }
}

/// The gain in the middle of the pass band (the image of the prototype's DC), dB.
fn middle_db(filter: &Filter) -> f64 {
    let ripples = matches!(filter.family, Family::Chebyshev1 | Family::Elliptic);
    if ripples && filter.order.is_multiple_of(2) { -filter.ripple_db.unwrap() } else { 0.0 }
}

fn mirrored(filter: &Filter) -> Filter {
    let kind = match filter.kind {
        FilterKind::Lowpass => FilterKind::Highpass,
        FilterKind::Highpass => FilterKind::Lowpass,
        kind => kind,
    };
    let edges_hz = filter.edges_hz.iter().rev().map(|edge| filter.rate_hz / 2.0 - edge).collect();
    Filter { kind, edges_hz, ..filter.clone() }
}

/// Largest gain on a grid around and between the edges, dB.
fn peak_db(sections: &[Section], filter: &Filter) -> f64 {
    let (low, high) = (filter.edges_hz[0], filter.edges_hz[filter.edges_hz.len() - 1]);
    let around = (0..400).map(|i| low * 10f64.powf(-1.0 + f64::from(i) * 0.01)).filter(|f| *f < filter.rate_hz / 2.0);
    let between = (0..100).map(|i| low + (high - low) * f64::from(i) / 99.0);
    around
        .chain(between)
        .chain([0.0, filter.rate_hz / 2.0])
        .map(|f| response::gain_db(sections, f, filter.rate_hz))
        .fold(f64::NEG_INFINITY, f64::max)
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn poles_lie_inside_the_unit_circle_by_the_margin(filter in any_filter()) {
        for section in filter.sections() {
            let radius = sections::pole_radius(&section);
            prop_assert!(radius <= 1.0 - sections::POLE_MARGIN, "{section:?}");
            prop_assert_eq!(section.a[0], 1.0);
            prop_assert!(section.b.iter().chain(&section.a).all(|c| c.is_finite()));
        }
    }

    /// Beyond what rounding the coefficients costs, steep filters turn the rounding of
    /// an edge frequency into dB, up to 1e-7.
    #[test]
    fn the_gain_at_an_edge_is_its_definition(filter in any_filter()) {
        let sections = filter.sections();
        for &edge_hz in &filter.edges_hz {
            let got = response::gain_db(&sections, edge_hz, filter.rate_hz);
            let within = 3e-7 + 2.0 * unavoidable_db(&filter, &sections, edge_hz);
            prop_assert!((got - edge_db(&filter)).abs() < within, "{got} dB at {edge_hz} Hz, within {within:e}");
        }
    }

    /// Gain is set there from the rounded coefficients; 2e-7 dB is what a numerator's
    /// gain may move for the sake of its zeros. At the far end of a band-stop the
    /// coefficients' rounding counts, up to 2^-53 / (1 + a1 + a2) a section.
    #[test]
    fn the_gain_in_the_middle_of_the_pass_band_is_that_of_the_prototype(filter in any_filter()) {
        let half = filter.rate_hz / 2.0;
        let sections = filter.sections();
        let ends: Vec<f64> = match filter.kind {
            FilterKind::Lowpass => vec![0.0],
            FilterKind::Highpass => vec![half],
            FilterKind::Bandstop => vec![0.0, half],
            FilterKind::Bandpass => {
                let warped = |f: &f64| (std::f64::consts::PI * f / filter.rate_hz).tan();
                let center = (warped(&filter.edges_hz[0]) * warped(&filter.edges_hz[1])).sqrt();
                vec![center.atan() / std::f64::consts::PI * filter.rate_hz]
            }
        };
        for frequency_hz in ends {
            let got = response::gain_db(&sections, frequency_hz, filter.rate_hz);
            prop_assert!((got - middle_db(&filter)).abs() < 3e-7, "{got} dB at {frequency_hz} Hz");
        }
    }

    /// A real filter: H(z) is real at z = 1 and z = -1, and its values at z and 1/z on
    /// the unit circle are conjugate, by plain arithmetic as by [`response::at`]. Plain
    /// arithmetic loses digits near both ends of the spectrum, which are left out.
    #[test]
    fn the_response_is_conjugate_symmetric(filter in any_filter(), place in 0.05..0.45f64) {
        let sections = filter.sections();
        let w = 2.0 * std::f64::consts::PI * place;
        let plain = |sign: f64| -> Complex64 {
            let z1 = Complex64::new(w.cos(), -sign * w.sin());
            let value = |p: [f64; 3]| p[0] + z1 * (p[1] + z1 * p[2]);
            sections.iter().map(|s| value(s.b) / value(s.a)).product()
        };
        let h = response::at(&sections, place * filter.rate_hz, filter.rate_hz);
        prop_assume!(h.norm() > 1e-5);
        prop_assert!((plain(1.0) - h).norm() < 1e-8 * h.norm(), "{} for {h}", plain(1.0));
        prop_assert!((plain(-1.0) - h.conj()).norm() < 1e-8 * h.norm());
        for end in [0.0, filter.rate_hz / 2.0] {
            prop_assert_eq!(response::at(&sections, end, filter.rate_hz).im, 0.0);
        }
    }

    /// The bilinear transform is antisymmetric: mirroring the edges at a quarter of the
    /// rate mirrors the response. Coefficients near z = 1 become ones near z = -1, both
    /// rounded: the tolerance is that rounding, and no deep stop band is compared.
    #[test]
    fn mirrored_edges_give_the_mirrored_response(filter in any_filter(), place in 0.0..0.5f64) {
        let frequency_hz = place * filter.rate_hz;
        let here = filter.gain_db(frequency_hz);
        let there = mirrored(&filter).gain_db(filter.rate_hz / 2.0 - frequency_hz);
        prop_assume!(here > -100.0);
        prop_assert!((here - there).abs() < 1e-6, "{here} and {there} dB");
    }

    /// The zeros are on the unit circle and delay nothing; the poles are those of the
    /// prototype, whose delay the transforms stretch: with x the prototype's frequency
    /// and W = tan(w/2) the delay in frames is tau(x) dx/dW (1 + W^2)/2.
    #[test]
    fn the_group_delay_is_that_of_the_prototype_stretched(filter in any_filter(), place in 0.001..0.499f64) {
        let prototype = prototype::new(filter.family, filter.order, filter.ripple_db, filter.stop_db).unwrap();
        let tau = |x: f64| -> f64 {
            let of = |re: f64, from_im: f64| -re / (re * re + from_im * from_im);
            let pair: f64 = prototype.poles.iter().map(|p| of(p.re.hi, x - p.im.hi) + of(p.re.hi, x + p.im.hi)).sum();
            pair + prototype.real_pole.map_or(0.0, |r| of(r.hi, x))
        };
        let warped = |f: f64| (std::f64::consts::PI * f / filter.rate_hz).tan();
        let frequency_hz = place * filter.rate_hz;
        let (w, low, high) = (warped(frequency_hz), warped(filter.edges_hz[0]), warped(*filter.edges_hz.last().unwrap()));
        let (center_square, width) = (low * high, high - low);
        let (x, slope) = match filter.kind {
            FilterKind::Lowpass => (w / low, 1.0 / low),
            FilterKind::Highpass => (-low / w, low / (w * w)),
            FilterKind::Bandpass => ((w * w - center_square) / (width * w), (w * w + center_square) / (width * w * w)),
            FilterKind::Bandstop => {
                let distance = center_square - w * w;
                (width * w / distance, width * (w * w + center_square) / (distance * distance))
            }
        };
        let want_s = tau(x) * slope * (1.0 + w * w) / 2.0 / filter.rate_hz;
        let got_s = response::group_delay_s(&filter.sections(), frequency_hz, filter.rate_hz);
        prop_assert!((got_s / want_s - 1.0).abs() < 1e-6, "{got_s} s for {want_s} s at {frequency_hz} Hz");
    }

    /// Only ratios to the sample rate matter.
    #[test]
    fn scaling_rate_and_edges_by_a_power_of_two_leaves_the_sections_alone(filter in any_filter()) {
        let scaled = Filter {
            edges_hz: filter.edges_hz.iter().map(|edge| edge * 4.0).collect(),
            rate_hz: filter.rate_hz * 4.0,
            ..filter.clone()
        };
        prop_assert_eq!(filter.sections(), scaled.sections());
    }

    /// The whole peaks at 0 dB. Gain is spread on a grid of frequencies; between them a
    /// partial product may be a little higher.
    #[test]
    fn no_partial_product_exceeds_the_whole(filter in any_filter()) {
        let sections = filter.sections();
        prop_assert!(peak_db(&sections, &filter) < 1e-6);
        for count in 1..sections.len() {
            let part = peak_db(&sections[..count], &filter);
            prop_assert!(part < 1.0, "{part} dB after {count} of {} sections", sections.len());
        }
    }

    #[test]
    fn the_size_of_a_stage_is_stated_as_built(filter in any_filter()) {
        let sections = filter.sections();
        let size = sections::size(&sections);
        prop_assert_eq!(size.sections as usize, sections.len());
        let edges = filter.edges_hz.len() as u32;
        prop_assert_eq!(size.total_order, edges * filter.order);
    }

    /// Half power at both ends of the width, found by bisection on the finished section.
    #[test]
    fn a_notch_has_its_center_and_its_digital_width(
        rate_hz in prop::sample::select(vec![8_000.0, 48_000.0, 384_000.0]),
        place in 0.001..0.9f64,
        relative_width in 0.001..0.1f64,
    ) {
        let center_hz = place * rate_hz / 2.0;
        let width_hz = center_hz * relative_width;
        let built = sections::build(&[notch(center_hz, width_hz)], rate_hz).unwrap();
        let gain = |f| response::gain_db(&built, f, rate_hz);
        prop_assert!(gain(center_hz) < -180.0, "{} dB", gain(center_hz));
        prop_assert!(gain(0.0).abs() < 3e-7 && gain(rate_hz / 2.0).abs() < 3e-7);
        let half_power = 10.0 * 0.5f64.log10();
        let crossing = |mut outside: f64| {
            let mut inside = center_hz;
            for _ in 0..200 {
                let middle = (inside + outside) / 2.0;
                *if gain(middle) < half_power { &mut inside } else { &mut outside } = middle;
            }
            inside
        };
        let (low, high) = (crossing(0.0), crossing(rate_hz / 2.0));
        prop_assert!(((high - low) / width_hz - 1.0).abs() < 1e-6, "{low} to {high} Hz for {width_hz} Hz");
    }
}

#[test]
fn stages_run_in_the_order_given_and_keep_their_own_gain() {
    let high = filter(Family::Butterworth, FilterKind::Highpass, 4, &[40.0], 48_000.0);
    let low = filter(Family::Bessel, FilterKind::Lowpass, 3, &[6_000.0], 48_000.0);
    let both = sections::build(&[high.placed(), notch(50.0, 1.0), low.placed()], 48_000.0).unwrap();
    let mut want = high.sections();
    want.extend(sections::build(&[notch(50.0, 1.0)], 48_000.0).unwrap());
    want.extend(low.sections());
    assert_eq!(both, want);
    assert!(sections::build(&[], 48_000.0).unwrap().is_empty());
}

#[test]
fn an_odd_order_has_one_first_order_section() {
    for kind in [FilterKind::Lowpass, FilterKind::Highpass] {
        let sections = filter(Family::Butterworth, kind, 5, &[1_000.0], 48_000.0).sections();
        let first: Vec<&Section> = sections.iter().filter(|s| s.a[2] == 0.0).collect();
        assert_eq!((sections.len(), first.len()), (3, 1));
        assert_eq!(first[0].b[2], 0.0);
    }
}

/// Zeros at DC and half the rate are exact, and those on the unit circle symmetric.
#[test]
fn zeros_lie_exactly_on_the_unit_circle() {
    for family in FAMILIES {
        for kind in [FilterKind::Lowpass, FilterKind::Highpass, FilterKind::Bandpass, FilterKind::Bandstop] {
            for order in 1..=8 {
                let edges: &[f64] = if kind == FilterKind::Lowpass || kind == FilterKind::Highpass {
                    &[200.0]
                } else {
                    &[200.0, 260.0]
                };
                let made = Filter {
                    ripple_db: Some(0.5),
                    stop_db: Some(50.0),
                    ..filter(family, kind, order, edges, 48_000.0)
                };
                for Section { b, .. } in made.sections() {
                    assert!(b[0] > 0.0 && (b[2] == b[0] || (b[1] == 0.0 && b[2] == -b[0]) || b[2] == 0.0), "{b:?}");
                }
            }
        }
    }
}

#[test]
fn the_pole_radius_is_that_of_the_outer_pole() {
    let section = |a1, a2| Section { b: [1.0, 0.0, 0.0], a: [1.0, a1, a2] };
    for (a1, a2, want) in [
        (0.0, 0.0, 0.0),
        (-0.5, 0.0, 0.5),
        (0.75, 0.0, 0.75),
        (0.0, 0.25, 0.5),
        (0.0, -0.25, 0.5),
        (-1.5, 0.5625, 0.75),
        (-1.25, 0.375, 0.75),
        (1.25, 0.375, 0.75),
        (-2.0, 1.0, 1.0),
    ] {
        assert!((sections::pole_radius(&section(a1, a2)) - want).abs() < 1e-15, "{a1} {a2}");
    }
}

#[test]
fn poles_too_near_the_unit_circle_are_an_error_that_names_stage_and_repair() {
    let mut placed = notch(1_000.0, 1e-9);
    placed.stage_index = 1;
    let error = sections::build(&[placed], 48_000.0).unwrap_err();
    assert!(
        matches!(error, DesignError::PoleAtUnitCircle { frequency_hz, .. } if (frequency_hz - 1_000.0).abs() < 1e-3)
    );
    let message = error.to_string();
    for says in ["stage 2 (1000 Hz)", "48000 Hz", "1000.0", "wider band"] {
        assert!(message.contains(says), "{message}");
    }
}

#[test]
fn an_elliptic_filter_too_steep_for_f64_is_an_error() {
    let made = Filter {
        ripple_db: Some(10.0),
        stop_db: Some(10.5),
        ..filter(Family::Elliptic, FilterKind::Lowpass, 14, &[5_000.0], 48_000.0)
    };
    let error = sections::build(&[made.placed()], 48_000.0).unwrap_err();
    assert!(matches!(error, DesignError::PoleAtUnitCircle { .. }), "{error}");
    assert!(error.to_string().contains("stop_db farther from ripple_db"), "{error}");
}

#[test]
fn edges_too_near_an_end_for_f64_are_an_error() {
    for (edge_hz, kind, end) in
        [(0.005, FilterKind::Highpass, "0 Hz"), (192_000.0 - 0.005, FilterKind::Lowpass, "half the sample rate")]
    {
        let made = filter(Family::Butterworth, kind, 2, &[edge_hz], 384_000.0);
        let error = sections::build(&[made.placed()], 384_000.0).unwrap_err();
        assert!(error.to_string().contains(end), "{error}");
        // A single pole has digits enough.
        let single = Filter { order: 1, ..made };
        assert!(sections::build(&[single.placed()], 384_000.0).is_ok());
    }
}

#[test]
fn edges_out_of_order_or_range_are_errors() {
    let nothing: &[f64] = &[];
    for (kind, edges) in [
        (FilterKind::Lowpass, &[24_000.0][..]),
        (FilterKind::Lowpass, &[0.0]),
        (FilterKind::Lowpass, &[f64::NAN]),
        (FilterKind::Highpass, &[100.0, 200.0]),
        (FilterKind::Highpass, nothing),
        (FilterKind::Bandpass, &[200.0, 100.0]),
        (FilterKind::Bandpass, &[200.0, 200.0]),
        (FilterKind::Bandstop, &[200.0]),
        (FilterKind::Bandstop, &[200.0, f64::INFINITY]),
    ] {
        let mut placed = filter(Family::Butterworth, kind, 3, &[100.0], 48_000.0).placed();
        placed.edges_hz = edges.to_vec();
        let error = sections::build(&[placed], 48_000.0).unwrap_err();
        assert!(matches!(error, DesignError::Edges { .. }), "{error}");
    }
    let error = sections::build(&[notch(24_000.0, 10.0)], 48_000.0).unwrap_err();
    assert!(matches!(error, DesignError::Edges { .. }), "{error}");
}

#[test]
fn a_stage_without_a_prototype_is_an_error() {
    let mut placed = filter(Family::Elliptic, FilterKind::Lowpass, 3, &[100.0], 48_000.0).placed();
    let Stage::Filter(stage) = &mut placed.stage else { unreachable!() };
    stage.ripple_db = Some(1.0);
    let error = sections::build(&[placed], 48_000.0).unwrap_err();
    assert!(error.to_string().starts_with("stage 1 (100 Hz): elliptic needs stop_db"), "{error}");
}
