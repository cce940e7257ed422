//! Sums that keep what rounding drops.

/// a + b as the rounded sum and its exact error (Knuth, The Art of Computer
/// Programming vol. 2, 4.2.2, theorem B).
pub fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let b_part = sum - a;
    let a_part = sum - b_part;
    (sum, (a - a_part) + (b - b_part))
}
