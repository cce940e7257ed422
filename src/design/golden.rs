//! Golden-section search.
//!
//! J. Kiefer, Sequential minimax search for a maximum, Proc. Amer. Math. Soc. 4, 1953.

/// (sqrt(5) - 1) / 2.
const RATIO: f64 = 0.618_033_988_749_894_9;

/// Steps at most: 0.618^90 is 1e-19, less than one unit in the last place.
const STEPS: usize = 90;

/// Place and value of the maximum of `f` between `low` and `high`, in which `f` rises
/// and then falls; the search ends when nothing in the interval left stands out by
/// more than `flat`. With 0 the place is as good as `f` is: for a smooth summit half
/// of the digits, for a cusp all of them.
pub fn maximum(mut low: f64, mut high: f64, flat: f64, f: impl Fn(f64) -> f64) -> (f64, f64) {
    let mut left = high - RATIO * (high - low);
    let mut right = low + RATIO * (high - low);
    let (mut f_low, mut f_left, mut f_right, mut f_high) = (f(low), f(left), f(right), f(high));
    let mut best = if f_left >= f_right { (left, f_left) } else { (right, f_right) };
    for _ in 0..STEPS {
        if !(low < left && left < right && right < high) || best.1 - f_low.min(f_high) < flat {
            break;
        }
        if f_left >= f_right {
            (high, right) = (right, left);
            (f_high, f_right) = (f_right, f_left);
            left = high - RATIO * (high - low);
            f_left = f(left);
            if f_left > best.1 {
                best = (left, f_left);
            }
        } else {
            (low, left) = (left, right);
            (f_low, f_left) = (f_left, f_right);
            right = low + RATIO * (high - low);
            f_right = f(right);
            if f_right > best.1 {
                best = (right, f_right);
            }
        }
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cusp_is_found_to_the_last_digits_and_a_smooth_summit_to_half_of_them() {
        let (cusp, _) = maximum(49.0, 51.5, 0.0, |x| -libm::log10((x - 50.123).abs() + 1e-300).max(-400.0));
        assert!((cusp - 50.123).abs() < 2e-14);
        let (summit, value) = maximum(0.0, 3.0, 0.0, |x| 1.0 - (x - 1.25) * (x - 1.25));
        assert!((summit - 1.25).abs() < 2e-8 && value == 1.0);
        let (_, value) = maximum(0.0, 3.0, 1e-6, |x| 1.0 - (x - 1.25) * (x - 1.25));
        assert!(1.0 - value < 1e-6);
    }

    #[test]
    fn a_summit_at_an_end_and_an_interval_of_no_width_are_no_trouble() {
        let (place, value) = maximum(1.0, 2.0, 0.0, |x| x);
        assert!(2.0 - place < 1e-15 && 2.0 - value < 1e-15);
        assert_eq!(maximum(1.0, 1.0, 0.0, |x| x), (1.0, 1.0));
    }
}
