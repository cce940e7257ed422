//! Sums and products that keep what rounding drops.

/// a + b as the rounded sum and its exact error (Knuth, The Art of Computer
/// Programming vol. 2, 4.2.2, theorem B).
pub fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let b_part = sum - a;
    let a_part = sum - b_part;
    (sum, (a - a_part) + (b - b_part))
}

/// a + b as [`two_sum`], for |a| >= |b| or a = 0 (Dekker, Numer. Math. 18, 1971).
pub fn quick_two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    (sum, b - (sum - a))
}

/// a b as the rounded product and its exact error, without a fused multiply-add: each
/// factor is split into halves whose products are exact (T. J. Dekker, A floating-point
/// technique for extending the available precision, Numer. Math. 18, 1971).
///
/// Exact as long as neither factor is above 2^995 and the product is above 2^-969 or zero.
pub fn two_product(a: f64, b: f64) -> (f64, f64) {
    let product = a * b;
    let ((a_high, a_low), (b_high, b_low)) = (halves(a), halves(b));
    let error = ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low;
    (product, error)
}

/// `a` as a sum of two f64 of 26 digits each.
fn halves(a: f64) -> (f64, f64) {
    let scaled = 134_217_729.0 * a; // 2^27 + 1
    let high = scaled - (scaled - a);
    (high, a - high)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Both parts of the product of two 26-bit integers over a power of two are known.
    #[test]
    fn a_product_and_its_error_are_exact() {
        let (a, b) = (1.0 + f64::EPSILON, 1.0 - f64::EPSILON);
        assert_eq!(two_product(a, b), (1.0, -f64::EPSILON * f64::EPSILON));
        for (a, b) in [(94_906_267_u64, 94_906_249_u64), (134_217_727, 123_456_789), (6_700_417, 4_294_967_291)] {
            let exact = u128::from(a) * u128::from(b);
            let (product, error) = two_product(a as f64, b as f64);
            assert_eq!(i128::try_from(exact).unwrap() - product as i128, error as i128);
        }
    }
}
