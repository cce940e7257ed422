//! What chance does to gains.
//!
//! With n independent values in a sub-band (segments * bins / 2.76) and g2 its coherence
//! the true complex gain lies, but for a chance of alpha, in a circle around the one seen,
//! of radius r relative to it:
//!
//! ```text
//! r^2 = k (1 - g2)/g2,   k = alpha^(-1/(n - 3/2)) - 1
//! ```
//!
//! That is the confidence region of a frequency response (J. S. Bendat and A. G. Piersol,
//! Random Data, chapter 9: F distribution with 2 and 2n - 2 degrees of freedom, whose tail
//! has this closed form) with half a complex value less for the delay that is fitted, too.
//! In standard errors e = sqrt((1 - g2)/(2 g2 n)) of a gain it is
//!
//! ```text
//! r = q e,   q = sqrt(2 n k),   q -> sqrt(2 ln(1/alpha)) for large n
//! ```
//!
//! A bound of 3.5 errors on one side fails by chance once in 4299; with 32 sub-bands that
//! is 0.0074 a band. Where there are S, alpha = 0.0074/S keeps it so: 4.1 errors for 32, 5.2
//! for 6000, and more where n is small, since the error is then itself uncertain: 8.9 for
//! 6000 with n = 10. A circle is left on all sides, a limit passed on one: of what alpha
//! grants chance takes a tenth, enough for the delays that are tried and for the groups
//! that `keep` looks at besides.

/// Chance that noise makes one of the gains of a band lie outside its bound: 32 times
/// that of one sub-band beyond 3.5 standard errors on one side, 2.326e-4.
const IN_A_BAND: f64 = 32.0 * ONE_SIDE;

/// Chance beyond 3.5 standard errors on one side.
pub const ONE_SIDE: f64 = 2.326e-4;

/// Parameters fitted to a sub-band, in complex values: gain and phase one, delay half.
const FITTED: f64 = 1.5;

/// Chance granted to each of `tests` gains of a band.
pub fn of_each(tests: usize) -> f64 {
    IN_A_BAND / tests.max(1) as f64
}

/// What remains of `independent` values after fitting; 0 where nothing does.
pub fn freedom(independent: f64) -> f64 {
    (independent - FITTED).max(0.0)
}

/// k + 1 = alpha^(-1/freedom); infinite without freedom.
pub fn spread(alpha: f64, freedom: f64) -> f64 {
    if freedom > 0.0 { libm::pow(alpha, -1.0 / freedom) } else { f64::INFINITY }
}

/// q: how many standard errors the radius has.
pub fn errors(alpha: f64, independent: f64, freedom: f64) -> f64 {
    (2.0 * independent * (spread(alpha, freedom) - 1.0)).sqrt()
}

/// q for many values: of what is not a matter of their number.
pub fn errors_of_many(alpha: f64) -> f64 {
    (-2.0 * libm::log(alpha)).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn many_values_need_as_many_errors_as_the_comment_says() {
        for (tests, n, q) in [(32, 1e6, 4.09), (6000, 1e6, 5.22), (6000, 10.0, 8.89), (32, 10.0, 5.79)] {
            let alpha = of_each(tests);
            let seen = errors(alpha, n, freedom(n));
            assert!((seen - q).abs() < 0.06, "{tests} {n}: {seen}");
            assert!(seen >= errors_of_many(alpha) - 1e-4);
        }
    }

    #[test]
    fn two_values_and_less_tell_nothing() {
        assert_eq!(errors(1e-3, 1.5, freedom(1.5)), f64::INFINITY);
        assert_eq!(spread(1e-3, freedom(0.0)), f64::INFINITY);
    }
}
