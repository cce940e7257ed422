//! What is no filter that can run, and the sentences that say so.

use crate::support::{all_exact, analog, decimals, designed, digital, exact, expand, polynomials, root, significant};
use bandproof::design::recipe::Recipe;
use bandproof::design::transfer::{self, Context, TransferError};
use bandproof::spec::{AnalogStage, Coefficient, DigitalFilter, Root, RootUnit, Transfer, WrittenSection};

const RATE: f64 = 48_000.0;

fn refused(stage: &DigitalFilter) -> TransferError {
    match transfer::digital(stage, RATE) {
        Err(error) => error,
        Ok(sections) => panic!("{stage:?} became {sections:?}"),
    }
}

fn refused_analog(stage: &AnalogStage) -> TransferError {
    match transfer::analog(stage, RATE) {
        Err(error) => error,
        Ok(sections) => panic!("{stage:?} became {sections:?}"),
    }
}

fn zeros_poles(zeros: Vec<Root>, poles: Vec<Root>, gain: f64) -> Transfer {
    Transfer::Roots { zeros, poles, gain: exact(gain) }
}

fn remarks(stage: DigitalFilter) -> Vec<String> {
    let own = transfer::digital(&stage, RATE).unwrap();
    let context = Context { own: &own, others: [&[], &[]], bands: &[], rate_hz: RATE };
    transfer::remarks(&Recipe::Digital(stage), context)
}

/// 1.25 e^(+-j pi/3) beside 0.5: z^2 - 1.25 z + 1.5625, at a sixth of the rate.
#[test]
fn a_pole_outside_the_unit_circle_is_named_with_radius_and_frequency() {
    let stage = digital(&[1.0], &[1.0, -1.75, 2.1875, -0.78125]);
    let TransferError::Unstable { distance, at_hz, .. } = refused(&stage) else { panic!() };
    assert!((distance + 0.25).abs() < 1e-15 && (at_hz - 8_000.0).abs() < 1e-9, "{distance} at {at_hz} Hz");
    assert_eq!(
        refused(&stage).to_string(),
        "it has a pole of radius 1.25 at 8000 Hz, outside the unit circle, so the output would never die away; the \
         denominator is 1 + a1 z^-1 + a2 z^-2 + ..., so feedback coefficients that a source adds change their signs; \
         or put the pole inside"
    );
    let roots = zeros_poles(vec![], vec![root(0.5, 0.0), root(0.0, 1.0), root(0.0, -1.0)], 1.0);
    let text = refused(&DigitalFilter::Transfer(roots)).to_string();
    assert_eq!(
        text,
        "pole 2 in poles, [0, 1], has the radius 1 at 12000 Hz, on the unit circle, so the output would never die \
         away; the poles of a digital stage are points of the z plane inside the unit circle; poles in rad/s or Hz belong \
         to kind = \"analog\""
    );
    let section = WrittenSection { b: [1.0, 0.0, 0.0].map(exact), a: [2.0, 3.0, 0.0].map(exact) };
    let text = refused(&DigitalFilter::Sections(vec![section])).to_string();
    assert!(text.starts_with("section 1 has a pole of radius 1.5 at 24000 Hz, outside"), "{text}");
    assert!(text.contains("change their signs") && !text.contains("the denominator is"), "{text}");
    // The worst of several, and what its own digits may have done.
    let given = |value: f64| Coefficient { value, unit: if value.fract() == 0.0 { 0.0 } else { 0.1 } };
    let one = |a: [f64; 3]| WrittenSection { b: [1.0, 0.0, 0.0].map(given), a: a.map(given) };
    let sections = vec![one([1.0, -0.5, 0.0]), one([1.0, -2.1, 1.1]), one([1.0, -2.0, 1.0])];
    let text = refused(&DigitalFilter::Sections(sections)).to_string();
    assert!(text.starts_with("section 2 has a pole of radius 1.1 at 0 Hz, outside the unit circle"), "{text}");
    assert!(text.contains("coefficients are given to 1 decimal, and rounding"), "{text}");
    assert!(text.contains("copy more digits") && !text.contains("or sections"), "{text}");
}

/// Roots too have digits.
#[test]
fn a_pole_that_its_digits_may_have_put_outside_is_named_as_written() {
    let given = |value: f64, unit: f64| Coefficient { value, unit };
    let pair = |im: f64| Root { re: given(0.7, 0.1), im: given(im, 1e-2) };
    let poles = vec![root(0.5, 0.0), pair(0.72), pair(-0.72)];
    let text = refused(&DigitalFilter::Transfer(zeros_poles(vec![], poles, 1.0))).to_string();
    assert!(text.starts_with("pole 2 in poles, [0.7, 0.72], has the radius 1.004191 at "), "{text}");
    assert!(text.contains("copy more digits") && !text.contains("zeros, poles and gain"), "{text}");
}

/// 1 + a1 + a2 + a3 + a4 = 0 in the digits, so there is a pole at z = 1.
#[test]
fn a_pole_that_is_off_the_unit_circle_by_rounding_is_on_it() {
    let denominator = decimals(&[1.0, -3.911, 5.737, -3.741, 0.915], 3);
    let stage = DigitalFilter::Transfer(polynomials(all_exact(&[1.0]), denominator));
    let text = refused(&stage).to_string();
    assert!(text.starts_with("it has a pole of radius 1 at 0 Hz, on the unit circle, "), "{text}");
    // The nearest that f64 can put outside: z - 1 - 2^-52, and a pair with the square 1 + 2^-52.
    let next = 1.0 + f64::EPSILON;
    for a in [[1.0, -next, 0.0], [1.0, 0.5, next]] {
        let text = refused(&digital(&[1.0], &a)).to_string();
        assert!(text.contains(", outside the unit circle, "), "{text}");
    }
    let text = refused(&digital(&[1.0], &[1.0, -(1.0 + 1e-9)])).to_string();
    assert!(text.starts_with("it has a pole of radius 1 + 1.0e-9 at 0 Hz, outside"), "{text}");
}

/// Order 8 at 20 Hz and 48 kHz: the denominator on the unit circle comes down to 1e-21, so no
/// number of digits that f64 holds is enough.
#[test]
fn an_expanded_polynomial_at_a_low_frequency_is_caught() {
    let toml = "[[stage]]\nkind = \"lowpass\"\nfamily = \"butterworth\"\norder = 8\nedge_hz = 20\n";
    let (b, a) = expand(&designed(toml, 48_000).sections);
    for (b, a, digits) in [
        (significant(&b, 6), decimals(&a, 6), "6"),
        (significant(&b, 6), significant(&a, 6), "6 significant digits"),
        (significant(&b, 12), significant(&a, 12), "12 significant digits"),
    ] {
        let stage = DigitalFilter::Transfer(polynomials(b, a));
        let text = match transfer::digital(&stage, RATE) {
            Err(error) => error.to_string(),
            Ok(_) => remarks(stage).join("\n"),
        };
        assert!(text.contains(digits), "{text}");
        assert!(
            text.contains("rounding to them may have put it there") || text.contains("could move a pole"),
            "{text}"
        );
        assert!(text.contains("give zeros, poles and gain, or sections"), "{text}");
    }
    // The sections themselves are fine.
    assert!(designed(toml, 48_000).max_pole_radius < 1.0);
}

/// Of second order, stable if and only if |a2| < 1 and |a1| < 1 + a2: the corners of what the
/// digits leave open decide.
#[test]
fn digits_that_leave_stability_open_are_told_with_those_that_settle_it() {
    let stable = |a1: f64, a2: f64| a2.abs() < 1.0 && a1.abs() < 1.0 + a2;
    let corners = |(a1, half1): (f64, f64), (a2, half2): (f64, f64)| {
        let signs = [(1.0, 1.0), (1.0, -1.0), (-1.0, 1.0), (-1.0, -1.0)];
        signs.iter().all(|(s1, s2)| stable(a1 + s1 * half1, a2 + s2 * half2))
    };
    let half = |places: i32| 0.5 * 10f64.powi(-places);
    let cases = [
        ((-1.96, 2), (0.98, 2)),
        ((-1.953, 3), (0.955, 3)),
        ((0.3, 1), (0.9996, 4)),
        ((-1.2, 1), (0.5, 1)),
        ((-1.9, 1), (0.9312, 4)),
        ((-1.97, 2), (0.97234, 5)),
        ((1.9934, 4), (0.994, 3)),
        ((0.125, 3), (-0.87, 2)),
    ];
    let mut open = 0;
    for ((a1, places1), (a2, places2)) in cases {
        let given = |value, places| Coefficient { value, unit: 2.0 * half(places) };
        let denominator = vec![exact(1.0), given(a1, places1), given(a2, places2)];
        let stage = DigitalFilter::Transfer(polynomials(all_exact(&[1.0]), denominator));
        let told = remarks(stage).into_iter().find(|remark| remark.contains("could move a pole"));
        let holds = |more: i32| corners((a1, half(places1 + more)), (a2, half(places2 + more)));
        assert_eq!(told.is_none(), holds(0), "{a1} {a2}: {told:?}");
        let Some(told) = told else { continue };
        open += 1;
        let (_, rest) = told.rsplit_once("; ").unwrap();
        let settled: i32 = rest.split(' ').next().unwrap().parse().unwrap();
        assert!(holds(settled) && !holds(settled - 1), "{a1} {a2}: {told}");
    }
    assert_eq!(open, 3);
}

#[test]
fn analog_poles_on_or_right_of_the_axis_are_named() {
    // (s - 3)(s + 5) and s^2 + 4.
    let stage = analog(polynomials(all_exact(&[1.0]), all_exact(&[1.0, 2.0, -15.0])), None);
    let TransferError::UnstableAnalog { re, at_hz, .. } = refused_analog(&stage) else { panic!() };
    assert!((re - 3.0).abs() < 1e-12 && at_hz == 0.0);
    let text = refused_analog(&stage).to_string();
    assert!(text.contains("right of the imaginary axis") && text.contains("the same sign"), "{text}");
    let stage = analog(polynomials(all_exact(&[1.0]), all_exact(&[1.0, 0.0, 4.0])), None);
    let TransferError::UnstableAnalog { re, at_hz, .. } = refused_analog(&stage) else { panic!() };
    assert!(re == 0.0 && (at_hz - 1.0 / std::f64::consts::PI).abs() < 1e-12);
    let poles = vec![root(10.0, 440.0), root(10.0, -440.0)];
    let stage = AnalogStage { unit: RootUnit::Hertz, ..analog(zeros_poles(vec![], poles, 1.0), None) };
    let text = refused_analog(&stage).to_string();
    assert_eq!(
        text,
        "pole 1 in poles_hz, [10, 440], has a positive real part, right of the imaginary axis, so the output would \
         never die away; poles of a stable filter have negative ones: write [-10, 440] and [-10, -440]"
    );
    let stage = analog(zeros_poles(vec![], vec![root(-5.0, 0.0), root(6.5, 0.0)], 1.0), None);
    let text = refused_analog(&stage).to_string();
    assert!(
        text.starts_with("pole 2 in poles, 6.5, has a positive real part") && text.ends_with(": write -6.5"),
        "{text}"
    );
    let stage = analog(zeros_poles(vec![], vec![root(-5.0, 0.0), root(0.0, 0.0)], 1.0), None);
    let text = refused_analog(&stage).to_string();
    assert!(text.starts_with("pole 2 in poles, 0, has a real part of 0, on the imaginary axis"), "{text}");
    for (denominator, told) in [
        (vec![1.0, -6.27], "at 0 Hz with a real part of 6.27 rad/s, right of"),
        (vec![1.0, 0.0], "at 0 Hz with a real part of 0 rad/s, on"),
        (vec![1.0, 2.0, 3.0, 4.0, 5.0], "with a real part of 0.287815 rad/s, right of"),
    ] {
        let stage = analog(polynomials(all_exact(&[1.0]), all_exact(&denominator)), None);
        let text = refused_analog(&stage).to_string();
        assert!(text.starts_with("it has a pole at ") && text.contains(told), "{text}");
    }
    // An integrator.
    let text = refused_analog(&analog(polynomials(all_exact(&[1.0]), all_exact(&[1.0, 0.0])), None)).to_string();
    assert!(text.contains("a pole at 0 Hz") && text.contains(", on the imaginary axis"), "{text}");
}

#[test]
fn what_is_wrong_with_a_transfer_function_is_said_with_the_repair() {
    let none: [f64; 0] = [];
    let cases: Vec<(TransferError, &[&str])> = vec![
        (refused(&digital(&[0.0, 0.0], &[1.0])), &["numerator is zero", "nothing would come out"]),
        (refused(&digital(&[1.0], &[0.0, 1.0])), &["first coefficient of denominator is 0", "leading zeros"]),
        (refused(&digital(&[1.0], &[0.0])), &["first coefficient of denominator is 0"]),
        (refused(&digital(&[1.0], &[1.0, f64::NAN])), &["coefficient 2 of denominator is NaN"]),
        (refused(&digital(&[f64::INFINITY], &[1.0])), &["coefficient 1 of numerator is inf"]),
        (refused(&digital(&none, &[1.0])), &["numerator is empty"]),
        (refused(&digital(&[1.0; 65], &[1.0])), &["numerator", "64 is more than 63", "several stages"]),
        (refused(&DigitalFilter::Sections(vec![])), &["sections is empty"]),
        (refused(&digital(&[1e20, 1e20], &[1.0])), &["gain at rest (0 Hz) is 406 dB", "lower the gain"]),
        (refused(&digital(&[1e200, 1e200], &[1.0])), &["gain at rest (0 Hz) is beyond what f64 holds"]),
        (
            refused(&DigitalFilter::Transfer(zeros_poles(vec![root(1.0, 0.0)], vec![], 1.0))),
            &["1 zero and 0 poles", "before the input", "add poles at 0"],
        ),
        (
            refused(&DigitalFilter::Transfer(zeros_poles(vec![], vec![root(0.5, -0.25)], 1.0))),
            &["pole 1 lies at 0.5 - 0.25j", "conjugate", "give both"],
        ),
        (refused(&DigitalFilter::Transfer(zeros_poles(vec![], vec![], 0.0))), &["gain is zero"]),
        (
            refused_analog(&analog(polynomials(all_exact(&[1.0, 0.0, 0.0]), all_exact(&[1.0, 1.0])), None)),
            &["numerator has degree 2 in s and the denominator 1", "add poles"],
        ),
        (
            refused_analog(&analog(zeros_poles(vec![root(-1.0, 0.0); 2], vec![root(-1.0, 0.0)], 1.0), None)),
            &["2 zeros and 1 pole", "add poles"],
        ),
        (
            refused_analog(&analog(polynomials(all_exact(&[1.0]), all_exact(&[1.0, 1.0])), Some(24_000.0))),
            &["match_hz = 24000", "below half the sample rate, 24000 Hz", "leave it out"],
        ),
        (
            refused_analog(&analog(polynomials(all_exact(&[1.0]), all_exact(&[0.0, 1.0])), None)),
            &["first coefficient of denominator is 0", "highest power of s"],
        ),
    ];
    for (error, words) in cases {
        let text = error.to_string();
        assert!(words.iter().all(|word| text.contains(word)), "{text}: {words:?}");
    }
}

#[test]
fn conjugates_that_differ_within_their_digits_are_one_anothers() {
    let given = |value: f64, unit: f64| Coefficient { value, unit };
    let pair = |re: Coefficient, im: Coefficient| {
        let poles = vec![Root { re: given(0.5, 1e-1), im: given(0.7, 1e-1) }, Root { re, im }];
        DigitalFilter::Transfer(Transfer::Roots { zeros: vec![], poles, gain: exact(1.0) })
    };
    // The finer given of the two decides.
    let sections = transfer::digital(&pair(given(0.5012, 1e-4), given(-0.7034, 1e-4)), RATE).unwrap();
    let [_, a1, a2] = sections[0].a;
    assert!((a1 + 1.0024).abs() < 1e-15 && (a2 - (0.5012f64.powi(2) + 0.7034f64.powi(2))).abs() < 2e-16);
    // 0.56 is not within half a unit of 0.5.
    assert!(matches!(refused(&pair(given(0.5601, 1e-4), given(-0.7, 1e-1))), TransferError::Unpaired { .. }));
}

#[test]
fn written_sections_keep_their_order_and_gain() {
    let one = |b: [f64; 3], a: [f64; 3]| WrittenSection { b: b.map(exact), a: a.map(exact) };
    let written = vec![
        one([8.0, 0.0, 0.0], [2.0, 1.0, 0.0]),
        one([0.0, 0.25, 0.0], [1.0, 0.0, 0.81]),
        one([1.0, 0.0, 1.0], [4.0, 0.0, 2.0]),
    ];
    let sections = transfer::digital(&DigitalFilter::Sections(written), RATE).unwrap();
    let rows: Vec<([f64; 3], [f64; 3])> = sections.iter().map(|s| (s.b, s.a)).collect();
    assert_eq!(
        rows,
        [
            ([4.0, 0.0, 0.0], [1.0, 0.5, 0.0]),
            ([0.0, 0.25, 0.0], [1.0, 0.0, 0.81]),
            ([0.25, 0.0, 0.25], [1.0, 0.0, 0.5])
        ]
    );
}
