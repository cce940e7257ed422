//! Digital filters printed elsewhere, through a digital stage: the design they are of lies
//! within what their printed digits leave open. The mark after each source says how the
//! figures came here: copied, or recalled from the text and recomputed.

use crate::support::{assert_within, decimals, designed, exact, frequencies, polynomials};
use bandproof::design::recipe::Recipe;
use bandproof::design::{response, transfer};
use bandproof::section::Section;
use bandproof::spec::{Coefficient, DigitalFilter, WrittenSection};
use std::f64::consts::PI;

const RATE_HZ: u32 = 48_000;
const RATE: f64 = 48_000.0;

fn lowpass(family: &str, order: u32, edge_hz: f64, figures: &str) -> Vec<Section> {
    let toml = format!(
        "[[stage]]\nkind = \"lowpass\"\nfamily = \"{family}\"\norder = {order}\nedge_hz = {edge_hz}\n{figures}"
    );
    designed(&toml, RATE_HZ).sections
}

/// Rows of (numerator, denominator) with their decimals; the gain stands by itself.
fn sections(gain: Coefficient, rows: &[([f64; 3], [f64; 3])], places: usize) -> DigitalFilter {
    let three = |row: [f64; 3]| -> [Coefficient; 3] {
        let given = decimals(&row, places);
        // Whole numbers are exact.
        core::array::from_fn(|i| if row[i].fract() == 0.0 { exact(row[i]) } else { given[i] })
    };
    let gain = WrittenSection { b: [gain, exact(0.0), exact(0.0)], a: [1.0, 0.0, 0.0].map(exact) };
    let rows = rows.iter().map(|&(b, a)| WrittenSection { b: three(b), a: three(a) });
    DigitalFilter::Sections([gain].into_iter().chain(rows).collect())
}

fn holds(stage: DigitalFilter, want: &[Section], offset_db: f64, what: &str) {
    let own = transfer::digital(&stage, RATE).unwrap();
    let recipe = Recipe::Digital(stage);
    for hz in frequencies(RATE) {
        assert_within(&recipe, hz, RATE, response::gain_db(want, hz, RATE) + offset_db, what);
        // And what runs is what is printed.
        let printed_db = transfer::gain_bounds(&recipe, hz, RATE).unwrap().level_db;
        if printed_db > -120.0 {
            assert!((response::gain_db(&own, hz, RATE) - printed_db).abs() < 1e-9, "{what} at {hz} Hz");
        }
    }
}

/// A. V. Oppenheim and R. W. Schafer, Discrete-Time Signal Processing, 2nd ed., example 7.3
/// (recalled, recomputed): Butterworth of order 6 with 0.17783 at 0.3 pi.
#[test]
fn oppenheim_and_schafers_butterworth() {
    let omega_c = 2.0 * (0.15 * PI).tan() / (1.0 / 0.17783f64.powi(2) - 1.0).powf(1.0 / 12.0);
    let want = lowpass("butterworth", 6, (omega_c / 2.0).atan() / PI * RATE, "");
    let rows = [[1.0, -1.2686, 0.7051], [1.0, -1.0106, 0.3583], [1.0, -0.9044, 0.2155]].map(|a| ([1.0, 2.0, 1.0], a));
    holds(sections(decimals(&[0.0007378], 7)[0], &rows, 4), &want, 0.0, "sections");
    // Multiplied out, as a reader may do it: 0.0007378 (1 + z^-1)^6 over the product.
    let numerator = [1.0, 6.0, 15.0, 20.0, 15.0, 6.0, 1.0].map(|c| c * 0.0007378);
    let denominator = rows.iter().fold(vec![1.0], |product, (_, a)| crate::support::times(&product, a));
    let stage = DigitalFilter::Transfer(polynomials(decimals(&numerator, 7), decimals(&denominator, 4)));
    let multiple = transfer::digital(&stage, RATE).unwrap();
    assert!(multiple.iter().all(|s| s.b[1] == 2.0 * s.b[0] && s.b[2] == s.b[0]), "{multiple:?}");
}

/// V. K. Ingle and J. G. Proakis, Digital Signal Processing, ch. 8 (recalled, recomputed):
/// 1 dB up to 0.2 pi, 15 dB from 0.3 pi.
#[test]
fn ingle_and_proakis_designs() {
    let figures = "ripple_db = 1\n";
    let rows = [[1.0, -1.5548, 0.6493], [1.0, -1.4996, 0.8482]].map(|a| ([1.0, 2.0, 1.0], a));
    let want = lowpass("chebyshev1", 4, 0.1 * RATE, figures);
    holds(sections(decimals(&[0.0018], 4)[0], &rows, 4), &want, 0.0, "Chebyshev I");

    let rows = [([1.0, 0.5574, 1.0], [1.0, -0.4183, 0.1503]), ([1.0, -1.0671, 1.0], [1.0, -1.1325, 0.7183])];
    let want = lowpass("chebyshev2", 4, 0.15 * RATE, "stop_db = 15\n");
    holds(sections(decimals(&[0.1797], 4)[0], &rows, 4), &want, 0.0, "Chebyshev II");

    let rows = [([1.0, -1.4211, 1.0], [1.0, -1.4928, 0.8612]), ([1.0, 1.0, 0.0], [1.0, -0.6183, 0.0])];
    let want = lowpass("elliptic", 3, 0.1 * RATE, "ripple_db = 1\nstop_db = 15\n");
    holds(sections(decimals(&[0.1214], 4)[0], &rows, 4), &want, 0.0, "elliptic");
}

/// J. G. Proakis and D. G. Manolakis, Digital Signal Processing, 3rd ed., example 8.3.5
/// (recalled, recomputed): -3 dB at 0.2 pi. The 0.509 is 0.5095 cut off, not rounded, so its last
/// digit is in doubt by all of a unit and a little.
#[test]
fn proakis_and_manolakis_one_pole() {
    let third = |value| Coefficient { value, unit: 0.0011 };
    let stage = polynomials(vec![third(0.245); 2], vec![exact(1.0), third(-0.509)]);
    holds(DigitalFilter::Transfer(stage), &lowpass("butterworth", 1, 0.1 * RATE, ""), 0.0, "one pole");
}

/// S. W. Smith, The Scientist and Engineer's Guide to Digital Signal Processing, tables 20-1 and
/// 20-2 (copied; see `smith_chebyshev.json`): 0.5 % ripple, the edge where the gain is -3 dB, gain
/// 1 where the ripple's floor is. Seven digits are printed, computed in single precision: those
/// of the numerators are off by up to 4e-6 of themselves (six poles: 2e-5), the last of the
/// others by one (four).
#[test]
fn smiths_tables() {
    let file: serde_json::Value = serde_json::from_str(include_str!("../reference/smith_chebyshev.json")).unwrap();
    let mut seen = 0;
    for entry in file["entries"].as_array().unwrap() {
        let order = u32::try_from(entry["poles"].as_u64().unwrap()).unwrap();
        let Some(feedback) = entry["b"].as_array() else { continue };
        let (part, units) = if order == 6 { (4e-5, 8.0) } else { (8e-6, 2.0) };
        let forward = |value: f64| Coefficient { value, unit: part * value.abs() };
        let back = |value: f64| Coefficient { value, unit: units * 10f64.powf(value.abs().log10().floor() - 6.0) };
        let b = entry["a"].as_array().unwrap().iter().map(|c| forward(c.as_f64().unwrap())).collect();
        let a = feedback.iter().map(|c| back(-c.as_f64().unwrap()));
        let stage = DigitalFilter::Transfer(polynomials(b, [exact(1.0)].into_iter().chain(a).collect()));

        let floor = 1.0 - entry["ripple_percent"].as_f64().unwrap() / 100.0;
        let epsilon = (1.0 / (floor * floor) - 1.0).sqrt();
        let stretch = ((1.0 / epsilon).acosh() / f64::from(order)).cosh();
        let cutoff = (PI * entry["fc"].as_f64().unwrap()).tan();
        let kind = entry["type"].as_str().unwrap();
        let edge = if kind == "lowpass" { cutoff / stretch } else { cutoff * stretch };
        let toml = format!(
            "[[stage]]\nkind = \"{kind}\"\nfamily = \"chebyshev1\"\norder = {order}\nedge_hz = {}\nripple_db = {}\n",
            edge.atan() / PI * RATE,
            -20.0 * floor.log10()
        );
        let want = designed(&toml, RATE_HZ).sections;
        holds(stage, &want, -20.0 * floor.log10(), &entry.to_string());
        seen += 1;
    }
    assert_eq!(seen, 16);
}
