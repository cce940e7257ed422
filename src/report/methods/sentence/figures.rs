//! Figures as a methods section shows them: few digits, no trailing zeros.

/// No figure needs more: the report's decibels are thousandths, and a thousandth of a
/// millisecond is a twentieth of a sample.
const MOST_DECIMALS: f64 = 3.0;

/// `value` in at most `digits` significant digits, to the nearest.
pub fn nearest(value: f64, digits: i32) -> String {
    shown(value, digits, libm::round)
}

/// The same, never above `value`: for what is promised to be reached at least.
pub fn down(value: f64, digits: i32) -> String {
    shown(value, digits, libm::floor)
}

/// The same, never below `value`: for what is promised not to be exceeded.
pub fn up(value: f64, digits: i32) -> String {
    shown(value, digits, libm::ceil)
}

/// A frequency, Hz: seven digits keep the edges that people write.
pub fn hertz(value: f64) -> String {
    nearest(value, 7)
}

/// A sample rate: `48 kHz`, `22.05 kHz`, `500 Hz`.
pub fn rate(rate_hz: u32) -> String {
    if rate_hz < 1000 {
        return format!("{rate_hz} Hz");
    }
    // In full: a sample rate is a name as much as a figure.
    let (whole, rest) = (rate_hz / 1000, format!("{:03}", rate_hz % 1000));
    match rest.trim_end_matches('0') {
        "" => format!("{whole} kHz"),
        rest => format!("{whole}.{rest} kHz"),
    }
}

/// The least and the largest of `values`: `0.41 to 0.44`, one figure where they look alike.
pub fn span(values: impl Iterator<Item = f64> + Clone, digits: i32) -> String {
    let (least, largest) = (values.clone().fold(f64::INFINITY, f64::min), values.fold(f64::NEG_INFINITY, f64::max));
    let (least, largest) = (nearest(least, digits), nearest(largest, digits));
    if least == largest { least } else { format!("{least} to {largest}") }
}

/// `a`, `a and b`, `a, b, and c`.
pub fn listed(items: &[impl AsRef<str>]) -> String {
    let items: Vec<&str> = items.iter().map(AsRef::as_ref).collect();
    match items.as_slice() {
        [] => String::new(),
        [one] => (*one).to_owned(),
        [one, two] => format!("{one} and {two}"),
        [most @ .., last] => format!("{}, and {last}", most.join(", ")),
    }
}

fn shown(value: f64, digits: i32, round: fn(f64) -> f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return "0".to_owned();
    }
    // Digits after the point; figures above 10^digits keep their whole part.
    let magnitude = libm::floor(libm::log10(value.abs()));
    let decimals = (f64::from(digits) - 1.0 - magnitude).clamp(0.0, MOST_DECIMALS);
    let scale = libm::pow(10.0, decimals);
    // A promise of 40 dB that f64 coefficients hold to 39.99999999 is still one of 40.
    let slack = 1e-7;
    let scaled = value * scale;
    let near = libm::round(scaled);
    let rounded = if (scaled - near).abs() <= slack * near.abs().max(1.0) { near } else { round(scaled) };
    let text = format!("{:.*}", decimals as usize, rounded / scale);
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    if text == "-0" { "0".to_owned() } else { text.to_owned() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn few_digits_and_no_trailing_zeros() {
        for (value, digits, text) in [
            (11.6349, 3, "11.6"),
            (0.430_91, 2, "0.43"),
            (0.004_309_1, 3, "0.004"),
            (39.999_9, 3, "40"),
            (15_931.666_67, 7, "15931.67"),
            (1122.018, 7, "1122.018"),
            (123_456.7, 3, "123457"),
            (-0.000_4, 1, "0"),
            (0.0, 3, "0"),
            (400.0, 3, "400"),
        ] {
            assert_eq!(nearest(value, digits), text);
        }
    }

    #[test]
    fn promises_are_rounded_to_the_side_on_which_they_hold() {
        for (value, low, high) in [
            (39.846, "39.8", "39.9"),
            (40.0, "40", "40"),
            (0.362, "0.362", "0.362"),
            (2.0401, "2.04", "2.05"),
            (0.000_47, "0", "0.001"),
        ] {
            assert_eq!((down(value, 3).as_str(), up(value, 3).as_str()), (low, high));
        }
        assert_eq!((down(0.3 * 10.0 - 1e-16, 3).as_str(), up(0.1 + 0.2, 3).as_str()), ("3", "0.3"));
    }

    #[test]
    fn rates_are_told_in_full() {
        for (rate_hz, text) in
            [(500, "500 Hz"), (44_100, "44.1 kHz"), (11_025, "11.025 kHz"), (48_000, "48 kHz"), (48_001, "48.001 kHz")]
        {
            assert_eq!(rate(rate_hz), text);
        }
    }

    #[test]
    fn lists_and_spans_read_well() {
        assert_eq!(listed(&["a"]), "a");
        assert_eq!(listed(&["a", "b"]), "a and b");
        assert_eq!(listed(&["a", "b", "c"]), "a, b, and c");
        assert_eq!(span([0.412, 0.44, 0.43].into_iter(), 2), "0.41 to 0.44");
        assert_eq!(span([0.4401, 0.44].into_iter(), 2), "0.44");
    }
}
