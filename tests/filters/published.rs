//! Designs and tables printed elsewhere. The mark after each source says how the
//! figures came here: copied, or recalled from the text and recomputed.

use crate::support::{Filter, Tol, check_table, filter};
use bandproof::design::{prototype, response};
use bandproof::section::Section;
use bandproof::spec::{Family, FilterKind};
use std::f64::consts::PI;

/// Frequencies in cycles a sample are Hz at this rate.
const UNIT_RATE: f64 = 1.0;

/// Coefficients of the product of two polynomials.
fn times(a: &[f64], b: &[f64]) -> Vec<f64> {
    let mut product = vec![0.0; a.len() + b.len() - 1];
    for (i, x) in a.iter().enumerate() {
        for (j, y) in b.iter().enumerate() {
            product[i + j] += x * y;
        }
    }
    product
}

/// Numerator and denominator of a whole cascade.
fn expand(sections: &[Section]) -> (Vec<f64>, Vec<f64>) {
    sections.iter().fold((vec![1.0], vec![1.0]), |(b, a), section| (times(&b, &section.b), times(&a, &section.a)))
}

/// Every wanted row of figures is that of some section, each section used once.
fn assert_rows(got: &[Vec<f64>], want: &[&[f64]], tolerance: f64) {
    let mut left = got.to_vec();
    for row in want {
        let found = left.iter().position(|have| have.iter().zip(*row).all(|(x, y)| (x - y).abs() < tolerance));
        assert!(found.is_some(), "{row:?} is not among {got:?}");
        left.remove(found.unwrap());
    }
    assert!(left.is_empty(), "{left:?} beside {want:?}");
}

fn denominators(sections: &[Section]) -> Vec<Vec<f64>> {
    sections.iter().map(|s| if s.a[2] == 0.0 { vec![s.a[1]] } else { s.a[1..].to_vec() }).collect()
}

/// Numerators with b0 = 1.
fn numerators(sections: &[Section]) -> Vec<Vec<f64>> {
    sections.iter().map(|s| s.b[1..].iter().map(|b| b / s.b[0]).collect()).collect()
}

fn gain(sections: &[Section]) -> f64 {
    sections.iter().map(|s| s.b[0]).product()
}

/// Quadratic factors s^2 + d s + 1 of Butterworth prototypes, printed in any filter
/// handbook (Williams and Taylor, Electronic Filter Design Handbook; recalled,
/// recomputed). Ten digits are printed.
#[test]
#[allow(clippy::approx_constant)] // the table's digits
fn butterworth_quadratics_are_those_of_the_handbooks() {
    let table: [(u32, &[f64]); 9] = [
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
        let made = prototype::new(Family::Butterworth, order, None, None).unwrap();
        assert_eq!(made.real_pole.map(|pole| pole.hi), (order % 2 == 1).then_some(-1.0));
        assert_eq!(made.poles.len(), damping.len());
        for (pole, d) in made.poles.iter().zip(damping) {
            let (re, im) = (pole.re.hi, pole.im.hi);
            assert!((-2.0 * re - d).abs() < 6e-10 && (re.hypot(im) - 1.0).abs() < 1e-15, "order {order}: {pole:?}");
        }
    }
}

/// Denominators of Chebyshev I prototypes; nine digits are printed.
#[test]
fn chebyshev_polynomials_are_those_of_the_handbooks() {
    let text = include_str!("../reference/chebyshev1_polynomials.csv");
    let mut seen = 0;
    for line in text.lines().filter(|line| !line.starts_with('#')).skip(1) {
        let columns: Vec<&str> = line.split(',').collect();
        let (ripple_db, order) = (columns[0].parse().unwrap(), columns[1].parse().unwrap());
        let made = prototype::new(Family::Chebyshev1, order, Some(ripple_db), None).unwrap();
        let mut polynomial = made.real_pole.map_or(vec![1.0], |pole| vec![-pole.hi, 1.0]);
        for pole in &made.poles {
            let (re, im) = (pole.re.hi, pole.im.hi);
            polynomial = times(&polynomial, &[re * re + im * im, -2.0 * re, 1.0]);
        }
        let want: Vec<f64> = columns[3].split(' ').map(|c| c.parse().unwrap()).collect();
        assert_eq!(polynomial.len(), want.len() + 1);
        for (got, want) in polynomial.iter().zip(&want) {
            assert!((got / want - 1.0).abs() < 6e-9, "{ripple_db} dB, order {order}: {polynomial:?}");
        }
        seen += 1;
    }
    assert_eq!(seen, 40);
}

/// Smith's tables (see `smith_chebyshev.json`; copied). His cutoff lies where the gain
/// is -3 dB, cosh(acosh(1/e)/n) times the edge of the ripple on the prewarped axis,
/// and his gain is 1 at DC (half the rate) where an even order has the ripple's floor.
/// Seven digits are printed; the recursion of his program is in single precision, which
/// the six-pole sets feel most.
#[test]
fn chebyshev_filters_are_those_of_smiths_tables() {
    let file: serde_json::Value = serde_json::from_str(include_str!("../reference/smith_chebyshev.json")).unwrap();
    let entries = file["entries"].as_array().unwrap();
    for entry in entries {
        let order = u32::try_from(entry["poles"].as_u64().unwrap()).unwrap();
        let floor = 1.0 - entry["ripple_percent"].as_f64().unwrap() / 100.0;
        let epsilon = (1.0 / (floor * floor) - 1.0).sqrt();
        let stretch = ((1.0 / epsilon).acosh() / f64::from(order)).cosh();
        let cutoff = (PI * entry["fc"].as_f64().unwrap()).tan();
        let (kind, edge) = match entry["type"].as_str().unwrap() {
            "lowpass" => (FilterKind::Lowpass, cutoff / stretch),
            _ => (FilterKind::Highpass, cutoff * stretch),
        };
        let made = Filter {
            ripple_db: Some(-20.0 * floor.log10()),
            ..filter(Family::Chebyshev1, kind, order, &[edge.atan() / PI], UNIT_RATE)
        };
        let (b, a) = expand(&made.sections());
        for (got, want) in b.iter().zip(entry["a"].as_array().unwrap()) {
            let want = want.as_f64().unwrap();
            assert!((got / floor - want).abs() < 4e-7, "{entry}: {b:?}");
        }
        let within = if order == 6 { 3e-6 } else { 1e-6 };
        for (got, want) in a[1..].iter().zip(entry["b"].as_array().into_iter().flatten()) {
            assert!((got + want.as_f64().unwrap()).abs() < within, "{entry}: {a:?}");
        }
    }
    assert_eq!(entries.len(), 17);
}

/// Two sets of intermediate results on p. 342 of the same book (copied): the first pole
/// pair of a 4-pole Butterworth low-pass, the second of a 4-pole high-pass with 10 %
/// ripple. Six decimals are printed.
#[test]
fn pole_pairs_are_those_of_smiths_intermediate_results() {
    let low = filter(Family::Butterworth, FilterKind::Lowpass, 4, &[0.1], UNIT_RATE);
    let epsilon = (1.0f64 / 0.81 - 1.0).sqrt();
    let edge = (PI * 0.1).tan() * ((1.0 / epsilon).acosh() / 4.0).cosh();
    let high = Filter {
        ripple_db: Some(-20.0 * 0.9f64.log10()),
        ..filter(Family::Chebyshev1, FilterKind::Highpass, 4, &[edge.atan() / PI], UNIT_RATE)
    };
    for (made, want) in [(low, [-1.048600, 0.296140]), (high, [-1.446913, 0.836653])] {
        let rows = denominators(&made.sections());
        assert!(rows.iter().any(|a| (a[0] - want[0]).abs() < 1e-6 && (a[1] - want[1]).abs() < 1e-6), "{rows:?}");
    }
}

/// A. V. Oppenheim and R. W. Schafer, Discrete-Time Signal Processing, 2nd ed., example
/// 7.3 (recalled, recomputed): Butterworth of order 6 that has 0.17783 at 0.3 pi exactly,
/// Omega_c = 0.766 at T = 1. Four decimals are printed.
#[test]
fn oppenheim_and_schafers_butterworth_is_reproduced() {
    let omega_c = 2.0 * (0.15 * PI).tan() / (1.0 / 0.17783f64.powi(2) - 1.0).powf(1.0 / 12.0);
    assert!((omega_c - 0.766).abs() < 5e-4);
    let edge = (omega_c / 2.0).atan() / PI;
    let made = filter(Family::Butterworth, FilterKind::Lowpass, 6, &[edge], UNIT_RATE);
    let sections = made.sections();
    assert_rows(&denominators(&sections), &[&[-1.2686, 0.7051], &[-1.0106, 0.3583], &[-0.9044, 0.2155]], 1e-4);
    assert_rows(&numerators(&sections), &[&[2.0, 1.0][..]; 3], 1e-12);
    assert!((gain(&sections) - 0.0007378).abs() < 6e-8);
    // What it was designed for: at least 0.89125 up to 0.2 pi.
    let stop_db = 20.0 * 0.17783f64.log10();
    check_table(&sections, UNIT_RATE, &[(0.0, Tol::GainDb(0.0, 1e-12)), (0.15, Tol::GainDb(stop_db, 1e-9))]);
    assert!(response::gain_db(&sections, 0.1, UNIT_RATE) >= 20.0 * 0.89125f64.log10());
}

/// V. K. Ingle and J. G. Proakis, Digital Signal Processing, ch. 8 (recalled,
/// recomputed): ripple 1 dB up to 0.2 pi, 15 dB from 0.3 pi. Four decimals are printed.
#[test]
fn ingle_and_proakis_designs_are_reproduced() {
    let low = |family, order, edge| Filter {
        ripple_db: Some(1.0),
        stop_db: Some(15.0),
        ..filter(family, FilterKind::Lowpass, order, &[edge], UNIT_RATE)
    };
    let chebyshev1 = low(Family::Chebyshev1, 4, 0.1).sections();
    assert_rows(&denominators(&chebyshev1), &[&[-1.5548, 0.6493], &[-1.4996, 0.8482]], 1e-4);
    assert!((gain(&chebyshev1) - 0.0018).abs() < 5e-5);

    let chebyshev2 = low(Family::Chebyshev2, 4, 0.15).sections();
    assert_rows(&denominators(&chebyshev2), &[&[-1.1325, 0.7183], &[-0.4183, 0.1503]], 1e-4);
    assert_rows(&numerators(&chebyshev2), &[&[-1.0671, 1.0], &[0.5574, 1.0]], 1e-4);
    assert!((gain(&chebyshev2) - 0.1797).abs() < 5e-5);
    // As printed, the zeros nearest the pass band are with the poles nearest them.
    let resonant = chebyshev2.iter().find(|s| s.a[2] > 0.5).unwrap();
    assert!(resonant.b[1] < 0.0);

    let elliptic = low(Family::Elliptic, 3, 0.1).sections();
    assert_rows(&denominators(&elliptic), &[&[-1.4928, 0.8612], &[-0.6183]], 1e-4);
    assert_rows(&numerators(&elliptic), &[&[-1.4211, 1.0], &[1.0, 0.0]], 1e-4);
    assert!((gain(&elliptic) - 0.1214).abs() < 5e-5);
    check_table(&elliptic, UNIT_RATE, &[(0.1, Tol::GainDb(-1.0, 1e-12)), (0.15, Tol::GainBelowDb(-15.0))]);
}

/// J. G. Proakis and D. G. Manolakis, Digital Signal Processing, 3rd ed., example 8.3.5
/// (recalled, recomputed): one pole, -3 dB at 0.2 pi, printed as .245 and .509 (.5095).
#[test]
fn proakis_and_manolakis_one_pole_is_reproduced() {
    let sections = filter(Family::Butterworth, FilterKind::Lowpass, 1, &[0.1], UNIT_RATE).sections();
    assert_eq!(sections.len(), 1);
    let Section { b, a } = sections[0];
    assert!((b[0] - 0.245).abs() < 5e-4 && b[1] == b[0] && b[2] == 0.0, "{b:?}");
    assert!((a[1] + 0.509).abs() < 6e-4 && a[0] == 1.0 && a[2] == 0.0, "{a:?}");
}
