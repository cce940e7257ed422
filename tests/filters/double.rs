//! Numbers of twice the digits against mpmath.

use bandproof::design::double::Double;

/// Errors are parts of the value, but for what the functions say of themselves: a sum of the
/// larger part, sine beyond 0.8 and cosine of 1.
fn scale(function: &str, arguments: &[Double], value: f64) -> f64 {
    match function {
        "add" => arguments.iter().map(|argument| argument.hi.abs()).fold(0.0, f64::max),
        "sin" if arguments[0].hi.abs() > 0.8 => 1.0,
        "cos" => 1.0,
        _ => value.abs(),
    }
}

/// The bounds are units of 2^-106: those of the source for arithmetic (3 for sums, 5 for
/// products, 10 for quotients; for sums of numbers of opposite signs of the larger), and
/// for functions what a series of some ten terms and up to nine doublings add up to.
fn bound(function: &str) -> f64 {
    match function {
        "add" => 4.0,
        "mul" => 8.0,
        "div" | "sqrt" => 16.0,
        _ => 200.0,
    }
}

#[test]
fn arithmetic_and_functions_are_good_to_twice_the_digits() {
    let mut worst = std::collections::BTreeMap::<&str, f64>::new();
    let mut seen = 0;
    for line in include_str!("../reference/double_functions.txt").lines().filter(|line| !line.starts_with('#')) {
        let (function, numbers) = line.split_once(' ').unwrap();
        let numbers: Vec<f64> = numbers.split(' ').map(|number| number.parse().unwrap()).collect();
        let numbers: Vec<Double> = numbers.chunks(2).map(|pair| Double { hi: pair[0], lo: pair[1] }).collect();
        let (want, arguments) = numbers.split_last().unwrap();
        let x = arguments[0];
        let got = match function {
            "add" => x + arguments[1],
            "mul" => x * arguments[1],
            "div" => x / arguments[1],
            "sqrt" => x.sqrt(),
            "exp" => x.exp(),
            "exp_m1" => x.exp_m1(),
            "sinh" => x.sinh_cosh().0,
            "cosh" => x.sinh_cosh().1,
            "asinh" => x.asinh(),
            "sin" => x.sin_cos().0,
            "cos" => x.sin_cos().1,
            _ => panic!("{function}"),
        };
        // Both parts of the difference are exact: the first are equal or neighbors.
        let error = ((got.hi - want.hi) + (got.lo - want.lo)).abs() / scale(function, arguments, want.hi);
        let units = error * 2f64.powi(106);
        assert!(units <= bound(function), "{units} units: {line}\n{got:?}");
        let most = worst.entry(function).or_default();
        *most = most.max(units);
        seen += 1;
    }
    println!("largest errors in units of 2^-106: {worst:?}");
    assert_eq!(seen, 440);
}

#[test]
fn the_first_part_is_the_number_rounded() {
    let third = Double::ONE / 3.0;
    assert_eq!(third.hi, 1.0 / 3.0);
    let back = third * 3.0 - 1.0;
    assert!(back.hi.abs() < 2f64.powi(-104), "{back:?}");
    assert_eq!(Double::difference(0.3, 0.1).hi, 0.3 - 0.1);
    assert_eq!(Double::from(-4.0).sqrt(), Double::ZERO);
    assert_eq!(Double::from(-700.0).exp(), Double::ZERO);
}
