//! Finished sections against exact coefficients: how near rounding lets them come.
//!
//! `exact_sections.txt` has coefficients from mpmath to 2^-80. What rounding does to a
//! response follows from the differences of coefficients, so no error of evaluating a
//! response gets in the way:
//!
//! ```text
//! d ln|H| = sum Re(dB / B) - sum Re(dA / A) + d gain / gain
//! ```
//!
//! Errors of a response below -120 dB count as parts of -120 dB: they stay finite at zeros.
//!
//! The floor is what rounding costs: each exact coefficient rounded to the nearest f64,
//! with the gain of the whole in the section whose zeros are farthest from both ends,
//! and powers of two, which round nothing, in the others.

use crate::support::{Filter, family, kind};
use bandproof::design::DesignError;
use bandproof::design::recipe::recipe;
use bandproof::design::rounding::{self, Rounded};
use bandproof::design::sections::finish_stage;
use bandproof::section::Section;
use bandproof::spec::{FilterKind, Phase};
use num_complex::Complex64;
use std::f64::consts::{LN_10, PI};
use std::sync::OnceLock;

/// Times 2^80.
type Fixed = i128;

const ONE: Fixed = 1 << 80;

/// Where the response is lower than this, its errors are parts of this level, dB.
const DEEPEST_DB: f64 = -120.0;

/// Beyond twice the floor, dB: what one rounding more or less does at high frequencies,
/// where the floor is below 1e-13 dB for a single section.
const SLACK_DB: f64 = 1e-12;

fn fixed(text: &str) -> Fixed {
    Fixed::from_str_radix(text, 16).unwrap()
}

fn float(value: Fixed) -> f64 {
    value as f64 / ONE as f64
}

/// Mantissa and exponent: `value` is their product with a power of two.
fn parts(value: f64) -> (Fixed, i32) {
    let bits = value.to_bits();
    let exponent = (bits >> 52 & 0x7ff) as i32;
    let mantissa = Fixed::from(bits & ((1 << 52) - 1) | u64::from(exponent > 0) << 52);
    (if value < 0.0 { -mantissa } else { mantissa }, exponent.max(1) - 1075)
}

fn shifted(value: Fixed, by: i32) -> Fixed {
    if by >= 0 { value << by } else { value >> (-by).min(127) }
}

/// Exact but for what is below 2^-80.
fn of_f64(value: f64) -> Fixed {
    let (mantissa, exponent) = parts(value);
    shifted(mantissa, exponent + 80)
}

/// a / b, |a| no more than 2 |b|.
fn quotient(a: f64, b: f64) -> Fixed {
    let ((a, a_exponent), (b, b_exponent)) = (parts(a), parts(b));
    let high = (a << 70) / b;
    let rest = (a << 70) % b;
    shifted((high << 14) + (rest << 14) / b, a_exponent - b_exponent - 4)
}

/// The nearest f64.
fn nearest(value: Fixed) -> f64 {
    // i128 to f64 rounds to nearest, and the scale is a power of two.
    float(value)
}

/// Polynomials 1 + c1 z^-1 + c2 z^-2 and the gain before their product.
struct Coefficients {
    pairs: Vec<[Fixed; 2]>,
    single: Vec<Fixed>,
    zeros: Vec<Fixed>,
    /// Relative to the exact gain, less 1.
    gain_error: f64,
}

struct Case {
    filter: Filter,
    exact: Coefficients,
    gain: f64,
    gain_rest: f64,
}

fn parse(line: &str) -> Case {
    let columns: Vec<Vec<&str>> = line
        .split('|')
        .map(|column| column.split_whitespace().filter(|word| *word != "-" || column.contains(' ')).collect())
        .collect();
    let words = &columns[0];
    let figure = |text: &str| (text != "-").then(|| text.parse().unwrap());
    let filter = Filter {
        family: family(words[0]),
        kind: kind(words[1]),
        order: words[2].parse().unwrap(),
        ripple_db: figure(words[3]),
        stop_db: figure(words[4]),
        rate_hz: words[5].parse().unwrap(),
        edges_hz: words[6].split(',').map(|edge| edge.parse().unwrap()).collect(),
    };
    let listed = |column: usize| columns[column].iter().filter(|word| **word != "-");
    let pairs: Vec<[Fixed; 2]> = listed(1)
        .map(|pair| {
            let (a1, a2) = pair.split_once(',').unwrap();
            [fixed(a1), fixed(a2)]
        })
        .collect();
    let single = listed(2).map(|a1| fixed(a1)).collect();
    let mut zeros: Vec<Fixed> = listed(3).map(|b1| fixed(b1)).collect();
    if filter.kind == FilterKind::Bandstop && zeros.len() == 1 {
        zeros = vec![zeros[0]; pairs.len()];
    }
    let [gain, gain_rest] = [columns[4][0], columns[4][1]].map(|text| text.parse().unwrap());
    Case { filter, exact: Coefficients { pairs, single, zeros, gain_error: 0.0 }, gain, gain_rest }
}

impl Case {
    /// Every exact coefficient rounded to the nearest f64.
    fn rounded(&self) -> Coefficients {
        let round = |value: Fixed| of_f64(nearest(value));
        let mut zeros: Vec<Fixed> = self.exact.zeros.iter().copied().map(round).collect();
        let fixed_zeros = self.exact.pairs.len() > zeros.len() || !self.exact.single.is_empty();
        let farthest = (0..zeros.len()).min_by_key(|&i| self.exact.zeros[i].abs()).filter(|_| !fixed_zeros);
        if let Some(i) = farthest {
            // gain b1 with all its digits, then rounded: the product of two f64 and what
            // they leave out is exact in 2^-120 or so.
            let b1 = self.exact.zeros[i];
            let (mantissa, _) = parts(self.gain);
            let rest = self.gain_rest / self.gain * mantissa as f64 * float(b1);
            let middle = (mantissa * (b1 >> 8) + (rest * 2f64.powi(72)) as Fixed) as f64;
            zeros[i] = quotient(middle / 2f64.powi(72), mantissa as f64);
        }
        Coefficients {
            pairs: self.exact.pairs.iter().map(|pair| pair.map(round)).collect(),
            single: self.exact.single.iter().copied().map(round).collect(),
            zeros,
            gain_error: -self.gain_rest / self.gain,
        }
    }

    /// Those of finished sections, each next to the exact one it stands for.
    fn finished(&self, sections: &[Section]) -> Coefficients {
        let is_single = |section: &&Section| section.a[2] == 0.0 && section.b[2] == 0.0;
        let mut pairs: Vec<[Fixed; 2]> = sections
            .iter()
            .filter(|section| !is_single(section))
            .map(|section| [of_f64(section.a[1]), of_f64(section.a[2])])
            .collect();
        let mut single: Vec<Fixed> = sections.iter().filter(is_single).map(|section| of_f64(section.a[1])).collect();
        let mut zeros: Vec<Fixed> = sections
            .iter()
            .filter(|section| section.b[2] == section.b[0] && section.b[1].abs() < 2.0 * section.b[0])
            .map(|section| quotient(section.b[1], section.b[0]))
            .collect();
        let gain: f64 = sections.iter().map(|section| section.b[0]).product();
        let found = Coefficients {
            pairs: self.exact.pairs.iter().map(|pair| take(&mut pairs, |own| distance(own, pair))).collect(),
            single: self.exact.single.iter().map(|one| take(&mut single, |own| (own - one).abs())).collect(),
            zeros: self.exact.zeros.iter().map(|zero| take(&mut zeros, |own| (own - zero).abs())).collect(),
            gain_error: (gain / self.gain - 1.0) - self.gain_rest / self.gain,
        };
        assert!(pairs.is_empty() && single.is_empty() && zeros.is_empty());
        found
    }

    /// Angles, radians a frame: around poles and zeros, the edges, between and beyond.
    fn angles(&self) -> Vec<f64> {
        let mut angles = vec![0.0, PI, 1e-9, PI - 1e-9, PI / 2.0];
        let mut depths = Vec::new();
        for &[a1, a2] in &self.exact.pairs {
            let (a1, a2, end) = (float(a1), float(a2), float(ONE + a1 + a2));
            let discriminant = 4.0 * a2 - a1 * a1;
            if discriminant > 0.0 {
                let (angle, depth) = (discriminant.sqrt().atan2(-a1), (1.0 - a2) / (1.0 + a2.sqrt()));
                depths.push((angle, depth));
                let around =
                    [-8.0, -4.0, -2.0, -1.4, -1.0, -0.7, -0.5, -0.25, 0.0, 0.25, 0.5, 0.7, 1.0, 1.4, 2.0, 4.0, 8.0];
                angles.extend(around.map(|part| angle + part * depth));
            } else {
                angles.extend([0.5, 1.0, 2.0].map(|part| part * end.abs().sqrt()));
            }
        }
        for &b1 in &self.exact.zeros {
            // 4 sin^2(w/2) = 2 + b1.
            let angle = if b1 < 0 {
                2.0 * (0.5 * float(2 * ONE + b1).sqrt()).asin()
            } else {
                PI - 2.0 * (0.5 * float(2 * ONE - b1).sqrt()).asin()
            };
            let nearest = depths.iter().map(|&(pole, depth)| (pole - angle).hypot(depth)).fold(PI, f64::min);
            let beside = (0..=24).map(|i| 10f64.powf(-0.25 * f64::from(i)) * nearest);
            angles.extend(beside.flat_map(|distance| [angle - distance, angle + distance]));
        }
        let edges: Vec<f64> = self.filter.edges_hz.iter().map(|hz| 2.0 * PI * hz / self.filter.rate_hz).collect();
        angles.extend(&edges);
        if let [low, high] = *edges {
            angles.extend((0..=30).map(|i| low + (high - low) * (f64::from(i) / 10.0 - 1.0)));
        }
        let lowest = edges[0] / 30.0;
        angles.extend((0..60).map(|i| lowest * (PI / lowest).powf(f64::from(i) / 59.0)));
        angles.retain(|angle| (0.0..=PI).contains(angle));
        angles
    }

    /// The largest error of `own`, dB, and where, Hz; parts of `deepest_db` below that.
    fn largest_error(&self, own: &Coefficients, angles: &[f64], deepest_db: f64) -> (f64, f64) {
        let mut largest = (0.0, 0.0);
        for &angle in angles {
            let (half_sin, half_cos) = (angle / 2.0).sin_cos();
            let (cos, sin) = (angle.cos(), angle.sin());
            let back = Complex64::new(cos, -sin);
            let low = angle < PI / 2.0;
            let mut log_gain = self.gain.ln();
            let mut log_error = own.gain_error;
            // (1 + c1 z^-1 + c2 z^-2) z, from sums without rounding.
            let second = |c1: Fixed, c2: Fixed| {
                let re = if low {
                    float(ONE + c1 + c2) - 2.0 * half_sin * half_sin * float(ONE + c2)
                } else {
                    2.0 * half_cos * half_cos * float(ONE + c2) - float(ONE - c1 + c2)
                };
                Complex64::new(re, float(ONE - c2) * sin)
            };
            let mut part = |exact: Complex64, change: Complex64, sign: f64| {
                log_gain += sign * exact.norm().max(1e-300).ln();
                log_error += sign * (change / exact).re;
            };
            for (&[a1, a2], own) in self.exact.pairs.iter().zip(&own.pairs) {
                part(second(a1, a2), float(own[0] - a1) + float(own[1] - a2) * back, -1.0);
            }
            for (&a1, own) in self.exact.single.iter().zip(&own.single) {
                let exact = Complex64::new(float(ONE + a1) * half_cos, float(ONE - a1) * half_sin);
                part(exact, float(own - a1) * Complex64::new(half_cos, -half_sin), -1.0);
            }
            for (&b1, own) in self.exact.zeros.iter().zip(&own.zeros) {
                part(second(b1, ONE), float(own - b1).into(), 1.0);
            }
            let fixed = (self.exact.pairs.len() - self.exact.zeros.len()) as f64;
            let (pairs, singles) = (2.0 * fixed, self.exact.single.len() as f64);
            let nothing = |x: f64| x.max(1e-300).ln();
            log_gain += match self.filter.kind {
                FilterKind::Lowpass => (pairs + singles) * nothing(2.0 * half_cos),
                FilterKind::Highpass => (pairs + singles) * nothing(2.0 * half_sin),
                FilterKind::Bandpass => fixed * nothing(2.0 * sin),
                FilterKind::Bandstop => 0.0,
            };
            let counted = (log_gain - deepest_db * LN_10 / 20.0).min(0.0).exp();
            let error_db = (20.0 / LN_10 * log_error * counted).abs();
            if error_db > largest.0 {
                largest = (error_db, angle / (2.0 * PI) * self.filter.rate_hz);
            }
        }
        largest
    }
}

fn distance(own: &[Fixed; 2], exact: &[Fixed; 2]) -> Fixed {
    (own[0] - exact[0]).abs() + (own[1] - exact[1]).abs()
}

/// Takes out the one that is nearest.
fn take<T: Copy>(from: &mut Vec<T>, distance: impl Fn(&T) -> Fixed) -> T {
    let nearest = (0..from.len()).min_by_key(|&i| distance(&from[i])).unwrap();
    from.swap_remove(nearest)
}

fn cases() -> impl Iterator<Item = (Case, Result<Vec<Rounded>, DesignError>)> {
    include_str!("../reference/exact_sections.txt").lines().filter(|line| !line.starts_with('#')).map(|line| {
        let case = parse(line);
        let placed = case.filter.placed();
        let made = recipe(&placed, Phase::Causal, case.filter.rate_hz).unwrap();
        let sections = finish_stage(&placed, &made, case.filter.rate_hz);
        (case, sections)
    })
}

fn plain(sections: &[Rounded]) -> Vec<Section> {
    sections.iter().map(|one| one.section).collect()
}

/// What became of a filter.
#[derive(Debug)]
struct Figures {
    filter: Filter,
    /// Largest error and what rounding costs, counted down to [`DEEPEST_DB`].
    error_db: f64,
    floor_db: f64,
    /// Largest error counted down to [`rounding::DEEPEST_DB`], and what the program says of it.
    audible_db: f64,
    told_db: f64,
}

fn figures() -> &'static [Figures] {
    static FIGURES: OnceLock<Vec<Figures>> = OnceLock::new();
    FIGURES.get_or_init(all_figures)
}

fn all_figures() -> Vec<Figures> {
    let mut refused = Vec::new();
    let figures = cases()
        .filter_map(|(case, sections)| {
            let sections = match sections {
                Ok(sections) => sections,
                Err(DesignError::PoleAtUnitCircle { .. } | DesignError::PoleAtEnd { .. }) => {
                    refused.push(case.filter);
                    return None;
                }
                Err(error) => panic!("{:?}: {error}", case.filter),
            };
            let angles = case.angles();
            let finished = case.finished(&plain(&sections));
            let (error_db, _) = case.largest_error(&finished, &angles, DEEPEST_DB);
            let (floor_db, _) = case.largest_error(&case.rounded(), &angles, DEEPEST_DB);
            let (audible_db, _) = case.largest_error(&finished, &angles, rounding::DEEPEST_DB);
            let told_db = rounding::largest(&sections, 1).db;
            Some(Figures { filter: case.filter, error_db, floor_db, audible_db, told_db })
        })
        .collect();
    assert_eq!(refused.len(), 2, "{refused:?}");
    figures
}

fn largest(figures: &[Figures], value: fn(&Figures) -> f64) -> String {
    let worst = figures.iter().max_by(|a, b| value(a).total_cmp(&value(b))).unwrap();
    let above = figures.iter().filter(|f| value(f) > 1e-4).count();
    format!("{:.1e} dB, {above} above 1e-4 dB: {:?}", value(worst), worst.filter)
}

/// Every family, kind and order, edges from 20 Hz to 0.45 times the rate, bands down to
/// 0.1 %, ripples and attenuations near their limits.
#[test]
fn the_error_is_at_most_twice_what_rounding_costs() {
    let figures = figures();
    assert_eq!(figures.len(), 2383);
    let mut ratios: Vec<f64> = figures.iter().map(|f| f.error_db / f.floor_db.max(1e-14)).collect();
    ratios.sort_by(f64::total_cmp);
    let quantile = |part: f64| ratios[(part * (ratios.len() - 1) as f64) as usize];
    println!("error over floor: {:?}", [0.0, 0.1, 0.25, 0.5, 0.75, 0.9, 0.99, 1.0].map(|part| (part, quantile(part))));
    // Below, one rounding more or less decides.
    let counted = figures.iter().filter(|f| f.floor_db > 1e-11);
    println!("largest ratio above 1e-11 dB: {}", counted.map(|f| f.error_db / f.floor_db).fold(0.0, f64::max));
    println!("largest error {}", largest(figures, |f| f.error_db));
    println!("largest floor {}", largest(figures, |f| f.floor_db));
    println!("largest audible error {}", largest(figures, |f| f.audible_db));
    let beyond: Vec<_> = figures.iter().filter(|f| f.error_db > 2.0 * f.floor_db + SLACK_DB).collect();
    assert!(beyond.is_empty(), "{} beyond: {beyond:#?}", beyond.len());
}

/// Both look at as many frequencies as they think it takes, the program at fewer: between
/// them it may miss a quarter of the largest error, where it is above the rounding of its
/// own sums.
#[test]
fn the_program_says_how_far_off_its_sections_are() {
    let mut figures: Vec<&Figures> = figures().iter().filter(|f| f.audible_db > 1e-11).collect();
    let ratio = |f: &Figures| f.told_db / f.audible_db;
    figures.sort_by(|a, b| ratio(a).total_cmp(&ratio(b)));
    let (least, most) = (figures[0], figures[figures.len() - 1]);
    println!("told over found: {} for {least:?}, {} for {most:?}", ratio(least), ratio(most));
    assert!(figures.len() > 1000);
    assert!(ratio(least) > 0.75 && ratio(most) < 1.05, "{least:?}\n{most:?}");
}
