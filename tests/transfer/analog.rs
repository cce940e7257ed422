//! Transfer functions in s: handbook polynomials against designed stages, and what the
//! bilinear transform keeps.

use crate::support::{all_exact, analog, assert_within, designed, exact, frequencies, polynomials, root, times};
use bandproof::design::recipe::Recipe;
use bandproof::design::{response, transfer};
use bandproof::spec::{AnalogStage, Coefficient, RootUnit, Transfer};
use std::f64::consts::{PI, TAU};

const RATE: f64 = 48_000.0;
const EDGE_HZ: f64 = 3_000.0;

fn lowpass(family: &str, order: usize, figures: &str) -> Vec<bandproof::section::Section> {
    let toml = format!(
        "[[stage]]\nkind = \"lowpass\"\nfamily = \"{family}\"\norder = {order}\nedge_hz = {EDGE_HZ}\n{figures}"
    );
    designed(&toml, 48_000).sections
}

/// Coefficients for an edge at 1 rad/s, highest power first, moved to [`EDGE_HZ`].
fn moved(c: &[f64]) -> Vec<f64> {
    c.iter().enumerate().map(|(i, c)| c * (TAU * EDGE_HZ).powi(i32::try_from(i).unwrap())).collect()
}

/// Quadratics s^2 + d s + 1 of Butterworth prototypes, printed in any filter handbook
/// (Williams and Taylor, Electronic Filter Design Handbook; recalled, recomputed), to ten
/// digits: each factor is off by at most 5e-10/d, all of them by 7e-8 dB.
#[test]
#[allow(clippy::approx_constant)] // the table's digits
fn handbook_butterworth_quadratics_become_the_designed_stage() {
    let table: [(usize, &[f64]); 9] = [
        (2, &[1.414213562]),
        (3, &[1.0]),
        (4, &[0.7653668647, 1.847759065]),
        (5, &[0.6180339887, 1.618033989]),
        (6, &[0.5176380902, 1.414213562, 1.931851653]),
        (7, &[0.4450418679, 1.246979604, 1.801937736]),
        (8, &[0.390180644, 1.111140466, 1.662939225, 1.961570561]),
        (9, &[0.3472963553, 1.0, 1.532088886, 1.879385242]),
        (10, &[0.3128689301, 0.9079809995, 1.414213562, 1.782013048, 1.975376681]),
    ];
    for (order, damping) in table {
        let start = if order % 2 == 1 { vec![1.0, 1.0] } else { vec![1.0] };
        let denominator = moved(&damping.iter().fold(start, |product, d| times(&product, &[1.0, *d, 1.0])));
        let numerator = all_exact(&denominator[order..]);
        let stage = analog(polynomials(numerator, all_exact(&denominator)), Some(EDGE_HZ));
        let (got, want) = (transfer::analog(&stage, RATE).unwrap(), lowpass("butterworth", order, ""));
        assert_eq!(got.len(), want.len());
        for hz in frequencies(RATE) {
            let (got, want) = (response::gain_db(&got, hz, RATE), response::gain_db(&want, hz, RATE));
            assert!((got - want).abs() < 1e-7 || want < -200.0, "order {order} at {hz} Hz: {got} for {want}");
        }
        assert_eq!(got.iter().map(|s| s.b[1] / s.b[0]).filter(|ratio| *ratio == 2.0).count(), order / 2);
    }
}

/// Denominators of Chebyshev I prototypes (`chebyshev1_polynomials.csv`: the tables of the filter
/// handbooks, recalled and recomputed) to nine digits: the designed stage lies within them.
#[test]
fn handbook_chebyshev_polynomials_have_the_designed_stage_within_their_digits() {
    let text = include_str!("../reference/chebyshev1_polynomials.csv");
    let mut seen = 0;
    for line in text.lines().filter(|line| !line.starts_with('#')).skip(1) {
        let columns: Vec<&str> = line.split(',').collect();
        let (ripple_db, order): (f64, usize) = (columns[0].parse().unwrap(), columns[1].parse().unwrap());
        // Nine digits are in doubt by half a unit of the ninth; where the row shows fewer, zeros
        // were left out.
        let digits = |value: f64| Coefficient { value, unit: 10f64.powf(value.abs().log10().floor() - 8.0) };
        let low: Vec<Coefficient> = columns[3].split(' ').map(|c| digits(c.parse().unwrap())).collect();
        let monic: Vec<Coefficient> = [exact(1.0)].into_iter().chain(low.into_iter().rev()).collect();
        let powers = moved(&vec![1.0; order + 1]);
        let denominator: Vec<Coefficient> = monic
            .iter()
            .zip(&powers)
            .map(|(c, power)| Coefficient { value: c.value * power, unit: c.unit * power })
            .collect();
        let at_rest = if order % 2 == 0 { 10f64.powf(-ripple_db / 20.0) } else { 1.0 };
        let last = denominator[order];
        let numerator = vec![Coefficient { value: last.value * at_rest, unit: last.unit }];
        let recipe = Recipe::Analog(analog(polynomials(numerator, denominator), Some(EDGE_HZ)));
        let want = lowpass("chebyshev1", order, &format!("ripple_db = {ripple_db}\n"));
        for hz in frequencies(RATE) {
            assert_within(&recipe, hz, RATE, response::gain_db(&want, hz, RATE), line);
        }
        seen += 1;
    }
    assert_eq!(seen, 40);
}

/// Poles in Hz, on a circle whose radius is the edge.
#[test]
fn roots_in_hz_become_the_designed_stage() {
    for order in [1, 2, 5, 8, 12] {
        let mut poles = if order % 2 == 1 { vec![root(-EDGE_HZ, 0.0)] } else { vec![] };
        for k in 0..order / 2 {
            let angle = PI * (0.5 + (f64::from(k) + 0.5) / f64::from(order));
            let (re, im) = (EDGE_HZ * angle.cos(), EDGE_HZ * angle.sin());
            poles.extend([root(re, im), root(re, -im)]);
        }
        let transfer = Transfer::Roots { zeros: vec![], poles, gain: exact(EDGE_HZ.powi(order)) };
        let stage = AnalogStage { unit: RootUnit::Hertz, ..analog(transfer, Some(EDGE_HZ)) };
        let got = transfer::analog(&stage, RATE).unwrap();
        let want = lowpass("butterworth", usize::try_from(order).unwrap(), "");
        for hz in frequencies(RATE) {
            let (got, want) = (response::gain_db(&got, hz, RATE), response::gain_db(&want, hz, RATE));
            assert!((got - want).abs() < 1e-10 || want < -200.0, "order {order} at {hz} Hz: {got} for {want}");
        }
    }
}

/// |H| of s/(s + p) at s = j 2 pi f, in dB.
fn one_pole_db(pole_hz: f64, hz: f64) -> f64 {
    -10.0 * (1.0 + (pole_hz / hz).powi(2)).log10()
}

#[test]
fn the_matched_frequency_has_the_response_of_the_transfer_function() {
    for pole_hz in [20.0, 1_500.0, 30_000.0] {
        let transfer = || polynomials(all_exact(&[1.0, 0.0]), all_exact(&[1.0, TAU * pole_hz]));
        for match_hz in [15.0, 997.0, 12_000.0, 23_900.0] {
            let sections = transfer::analog(&analog(transfer(), Some(match_hz)), RATE).unwrap();
            let (got, want) = (response::gain_db(&sections, match_hz, RATE), one_pole_db(pole_hz, match_hz));
            assert!(
                (got - want).abs() < 1e-12 * (1.0 + want.abs()),
                "{pole_hz} Hz matched at {match_hz} Hz: {got} for {want}"
            );
        }
        // Without it, nothing but 0 Hz is kept, and low frequencies nearly.
        let sections = transfer::analog(&analog(transfer(), None), RATE).unwrap();
        let low_hz = 10.0;
        let off_db = response::gain_db(&sections, low_hz, RATE) - one_pole_db(pole_hz, low_hz);
        assert!(off_db.abs() < 1e-5 && response::gain_db(&sections, 0.0, RATE) == f64::NEG_INFINITY, "{off_db}");
    }
}

/// A figure after `before` in a sentence.
fn figure(text: &str, before: &str) -> f64 {
    let rest = &text[text.find(before).unwrap_or_else(|| panic!("no \"{before}\" in {text}")) + before.len()..];
    rest.split(' ').next().unwrap().parse().unwrap()
}

/// The tangent in closed form: the figures of the remark are where it departs by as much.
#[test]
fn the_remark_says_where_the_axis_is_bent() {
    let pole_hz = 5_000.0;
    let toml = format!("[[stage]]\nkind = \"analog\"\nnumerator = [{0}]\ndenominator = [1, {0}]\n", TAU * pole_hz);
    let design = designed(&toml, 48_000);
    let remark = design.stages[0].remarks.iter().find(|remark| remark.contains("bends")).unwrap();
    let departs_db = |hz: f64| {
        let gain_db = |ratio: f64| -10.0 * (1.0 + ratio * ratio).log10();
        (gain_db((PI * hz / RATE).tan() * RATE / PI / pole_hz) - gain_db(hz / pole_hz)).abs()
    };
    for (db, words) in [(0.1, "by 0.1 dB at "), (1.0, "by 1 dB at ")] {
        let hz = figure(remark, words);
        assert!((departs_db(hz) - db).abs() < 1e-5, "{remark}: {} dB", departs_db(hz));
    }
    // Low in the range the axis is straight: no word.
    let toml = format!("[[stage]]\nkind = \"analog\"\nnumerator = [1, 0]\ndenominator = [1, {}]\n", TAU * 20.0);
    assert!(designed(&toml, 384_000).stages[0].remarks.is_empty());
}
