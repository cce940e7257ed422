//! A real polynomial as a product of real factors of second and first degree.
//!
//! Roots from [`super::roots`] are put together to factors, which are then improved in real
//! arithmetic all at once: for the factor q among factors with the product q Q, the
//! correction D of lower degree with D Q = P mod q is Newton's step of q (A. A. Grau, The
//! simultaneous improvement of a complete set of approximate factors of a polynomial, SIAM J.
//! Numer. Anal. 8, 1971). Where that does not reach the coefficients, multiple roots are tried
//! ([`super::multiple`]). All in doubled precision; at the end the factors are multiplied out
//! and held against the coefficients.

use super::TransferError;
use super::multiple::gathered;
use super::roots::roots;
use crate::design::double::{ComplexDouble, Double};

/// Sweeps of the improvement at most; multiple roots converge by halves.
const SWEEPS: usize = 120;

/// Error of the product, in parts of the sums of the terms' sizes, that arithmetic leaves.
const REACHED: f64 = 1e-29;

/// What the product may be off by in parts of the sums of the terms' sizes where a
/// coefficient has cancelled to less: a fiftieth of what rounding the factors to f64 costs.
const CANCELLED: f64 = 2e-18;

/// How far apart roots may come out, relative, that are tried as one: from double roots on.
const TOGETHER: [f64; 5] = [1e-12, 1e-8, 1e-5, 1e-3, 3e-2];

/// Backward error, in parts of what is allowed, that needs no second try.
const GOOD: f64 = 1e-3;

/// A monic factor.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Factor {
    /// t + c.
    Linear(Double),
    /// t^2 + u t + v.
    Quadratic(Double, Double),
}

impl Factor {
    pub fn degree(self) -> usize {
        match self {
            Factor::Linear(_) => 1,
            Factor::Quadratic(..) => 2,
        }
    }

    /// A quadratic with real roots in two, anything else as it is.
    pub fn split(self) -> Vec<Factor> {
        let Factor::Quadratic(u, v) = self else { return vec![self] };
        let discriminant = u * u - v.scaled(2);
        if discriminant < Double::ZERO {
            return vec![self];
        }
        let root = discriminant.sqrt();
        // The larger without cancellation, the other from the product.
        let larger = (if u.hi < 0.0 { u - root } else { u + root }).scaled(-1);
        if larger.is_zero() {
            return vec![Factor::Linear(Double::ZERO); 2];
        }
        vec![Factor::Linear(larger), Factor::Linear(v / larger)]
    }

    /// With the roots multiplied by 2^`exponent`.
    fn stretched(self, exponent: i32) -> Factor {
        match self {
            Factor::Linear(c) => Factor::Linear(c.scaled(exponent)),
            Factor::Quadratic(u, v) => Factor::Quadratic(u.scaled(exponent), v.scaled(exponent.saturating_mul(2))),
        }
    }

    fn coefficients(self) -> Vec<Double> {
        match self {
            Factor::Linear(c) => vec![Double::ONE, c],
            Factor::Quadratic(u, v) => vec![Double::ONE, u, v],
        }
    }
}

/// a b, leading or constant term first alike.
pub(super) fn product(a: &[Double], b: &[Double]) -> Vec<Double> {
    let mut product = vec![Double::ZERO; (a.len() + b.len()).saturating_sub(1)];
    for (i, &x) in a.iter().enumerate() {
        for (j, &y) in b.iter().enumerate() {
            product[i + j] = product[i + j] + x * y;
        }
    }
    product
}

/// Factors of c\[0\] t^n + ... + c\[n\], leading and last coefficient not 0. `halves` are half
/// units of the last given digits; a coefficient with 0 counts as given to f64.
///
/// # Errors
/// [`TransferError::Range`] where roots lie so far apart that f64 can't hold the
/// coefficients on one scale; [`TransferError::Factoring`] where the product differs from
/// a coefficient by more than its rounding.
pub(super) fn factor(name: &'static str, c: &[Double], halves: &[f64]) -> Result<Vec<Factor>, TransferError> {
    let degree = c.len().saturating_sub(1);
    if degree == 0 {
        return Ok(Vec::new());
    }
    // With t = 2^k x the roots x have a geometric mean near 1.
    let mean_log2 = (libm::log2(c[degree].hi.abs()) - libm::log2(c[0].hi.abs())) / degree as f64;
    let exponent = libm::round(mean_log2) as i32;
    let shift = |i: usize| 0i32.saturating_sub(exponent.saturating_mul(i32::try_from(i).unwrap_or(i32::MAX)));
    let monic: Vec<Double> = c.iter().enumerate().map(|(i, &c_i)| (c_i / c[0]).scaled(shift(i))).collect();
    if monic.iter().zip(c).any(|(scaled, c_i)| !scaled.is_finite() || (scaled.is_zero() && !c_i.is_zero())) {
        return Err(TransferError::Range { what: name });
    }
    let limits: Vec<f64> = (0..=degree)
        .map(|i| libm::scalbn(halves[i] / c[0].hi.abs(), shift(i)).max(f64::EPSILON / 2.0 * monic[i].hi.abs()))
        .collect();
    let roots = roots(&monic);
    let mut best = together(&roots);
    improve(&mut best, &monic);
    let (mut worst, mut backward_error) = miss(&best, &monic, &limits);
    for reach in TOGETHER {
        if backward_error <= GOOD {
            break;
        }
        let Some(factors) = gathered(&roots, &monic, reach) else { continue };
        let (index, error) = miss(&factors, &monic, &limits);
        if error < backward_error {
            (best, worst, backward_error) = (factors, index, error);
        }
    }
    if backward_error.is_nan() || backward_error > 1.0 {
        return Err(TransferError::Factoring { what: name, index: worst, times: backward_error });
    }
    Ok(best.into_iter().map(|factor| factor.stretched(exponent)).collect())
}

/// The coefficient of the monic `c` that the product misses most, and by how much in parts of
/// its limit.
fn miss(factors: &[Factor], c: &[Double], limits: &[f64]) -> (usize, f64) {
    let (product, terms) = multiplied(factors);
    let error = |i: usize| (product[i] - c[i]).hi.abs() / limits[i].max(CANCELLED * terms[i]);
    let worst = (0..c.len()).max_by(|&a, &b| error(a).total_cmp(&error(b))).unwrap_or(0);
    (worst, error(worst))
}

/// The product of the factors, and the same with every coefficient's size in its place.
fn multiplied(factors: &[Factor]) -> (Vec<Double>, Vec<f64>) {
    let (mut exact, mut sizes) = (vec![Double::ONE], vec![Double::ONE]);
    for factor in factors {
        let c = factor.coefficients();
        exact = product(&exact, &c);
        sizes = product(&sizes, &c.iter().map(|c| c.abs()).collect::<Vec<_>>());
    }
    (exact, sizes.into_iter().map(|size| size.hi).collect())
}

/// Roots to factors: conjugates by twos, then real ones by twos.
fn together(roots: &[ComplexDouble]) -> Vec<Factor> {
    let mut left: Vec<ComplexDouble> = roots.to_vec();
    left.sort_by(|a, b| b.im.hi.abs().total_cmp(&a.im.hi.abs()));
    let (mut factors, mut real) = (Vec::new(), Vec::new());
    while !left.is_empty() {
        let root = left.remove(0);
        let apart = |other: &ComplexDouble| libm::hypot((root.re - other.re).hi, (root.im + other.im).hi);
        let mate = (0..left.len()).min_by(|&a, &b| apart(&left[a]).total_cmp(&apart(&left[b])));
        match mate {
            // Nearer to its conjugate than to the real axis.
            Some(mate) if apart(&left[mate]) < root.im.hi.abs() => {
                let other = left.remove(mate);
                let (re, im) = ((root.re + other.re).scaled(-1), (root.im - other.im).scaled(-1));
                factors.push(Factor::Quadratic(-re.scaled(1), re * re + im * im));
            }
            _ => real.push(root.re),
        }
    }
    real.sort_by(|a, b| a.hi.total_cmp(&b.hi));
    for pair in real.chunks(2) {
        factors.push(match *pair {
            [a, b] => Factor::Quadratic(-(a + b), a * b),
            _ => Factor::Linear(-pair[0]),
        });
    }
    factors
}

/// Improves all factors of the monic `c` until their product no longer comes nearer.
fn improve(factors: &mut Vec<Factor>, c: &[Double]) {
    let off = |factors: &[Factor]| {
        let (product, terms) = multiplied(factors);
        let parts =
            product.iter().zip(c).zip(&terms).map(|((p, c), size)| (*p - *c).hi.abs() / size.max(f64::MIN_POSITIVE));
        parts.fold(0.0, f64::max)
    };
    let mut current = factors.clone();
    let mut least = off(factors);
    let mut idle = 0;
    for _ in 0..SWEEPS {
        if least <= REACHED || idle == 4 {
            return;
        }
        for k in 0..current.len() {
            current[k] = corrected(&current, k, c);
        }
        let now = off(&current);
        idle = if now < 0.9 * least { 0 } else { idle + 1 };
        if now < least {
            least = now;
            factors.clone_from(&current);
        }
    }
}

/// c1 t + c0.
type Remainder = [Double; 2];

fn corrected(factors: &[Factor], k: usize, c: &[Double]) -> Factor {
    let q = factors[k];
    let [r1, r0] = remainder(c, q);
    let one = [Double::ZERO, Double::ONE];
    let others = factors.iter().enumerate().filter(|(j, _)| *j != k);
    let [q1, q0] = others.fold(one, |rest, (_, other)| times(rest, remainder(&other.coefficients(), q), q));
    let fresh = match q {
        Factor::Linear(c0) => Factor::Linear(c0 + r0 / q0),
        Factor::Quadratic(u, v) => {
            // (d1 t + d0)(q1 t + q0) = r1 t + r0 mod q.
            let (a, b) = (q0 - u * q1, q1);
            let (c, d) = (-(v * q1), q0);
            let determinant = a * d - b * c;
            Factor::Quadratic(u + (r1 * d - b * r0) / determinant, v + (a * r0 - c * r1) / determinant)
        }
    };
    let finite = fresh.coefficients().iter().all(|c| c.is_finite());
    if finite { fresh } else { q }
}

/// p mod q.
fn remainder(p: &[Double], q: Factor) -> Remainder {
    let mut rest = [Double::ZERO, Double::ZERO];
    for &c in p {
        // rest t + c.
        rest = match q {
            Factor::Linear(c0) => [Double::ZERO, c - c0 * rest[1]],
            Factor::Quadratic(u, v) => [rest[1] - u * rest[0], c - v * rest[0]],
        };
    }
    rest
}

/// a b mod q.
fn times(a: Remainder, b: Remainder, q: Factor) -> Remainder {
    match q {
        Factor::Linear(_) => [Double::ZERO, a[1] * b[1]],
        Factor::Quadratic(u, v) => {
            let square = a[0] * b[0];
            [a[0] * b[1] + a[1] * b[0] - u * square, a[1] * b[1] - v * square]
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Whole numbers below 2^31, the same on every machine (D. H. Lehmer's generator).
    fn noise(seed: u64) -> impl Iterator<Item = f64> {
        let mut state = seed;
        core::iter::from_fn(move || {
            state = state * 48_271 % 2_147_483_647;
            Some(state as f64 / 1_073_741_823.5 - 1.0)
        })
    }

    fn doubles(c: &[f64]) -> Vec<Double> {
        c.iter().map(|&c| Double::from(c)).collect()
    }

    /// The factors, and how far their product is from c in parts of its rounding to f64.
    fn factored(c: &[f64]) -> (Vec<Factor>, f64) {
        let (c, halves) = (doubles(c), vec![0.0; c.len()]);
        let factors = factor("numerator", &c, &halves).unwrap_or_else(|error| panic!("{error}: {c:?}"));
        let monic: Vec<Double> = c.iter().map(|&c_i| c_i / c[0]).collect();
        let limits: Vec<f64> = monic.iter().map(|c| f64::EPSILON / 2.0 * c.hi.abs()).collect();
        let (_, off) = miss(&factors, &monic, &limits);
        (factors, off)
    }

    /// The product of the factors is the polynomial to far below the rounding of f64.
    #[test]
    fn factors_multiply_out_to_the_polynomial() {
        let mut worst = 0.0f64;
        for degree in 1..=63 {
            for seed in 1..=6 {
                let c: Vec<f64> = noise(seed * 1000 + degree).take(degree as usize + 1).collect();
                let (factors, off) = factored(&c);
                assert_eq!(factors.iter().map(|f| f.degree()).sum::<usize>(), degree as usize);
                worst = worst.max(off);
            }
        }
        println!("worst {worst:e} of what rounding allows");
        assert!(worst < 1e-9, "{worst:e}");
    }

    /// Roots at -1, -2, ... -20 (J. H. Wilkinson's polynomial), whose coefficients f64 holds only
    /// rounded, which moves the roots by tenths: the factors are those of the rounded ones.
    #[test]
    fn ill_conditioned_polynomials_are_factored_to_their_coefficients() {
        let mut exact = vec![Double::ONE];
        for k in 1..=20 {
            exact = product(&exact, &[Double::ONE, Double::from(f64::from(k))]);
        }
        let rounded: Vec<f64> = exact.iter().map(|c| c.hi).collect();
        assert!(factored(&rounded).1 < 1e-3);
        // Spread over nine decades.
        let spread = (0..10).fold(vec![Double::ONE], |product_of, k| {
            product(&product_of, &[Double::ONE, Double::from(libm::exp10(f64::from(k) - 2.0))])
        });
        let spread: Vec<f64> = spread.iter().map(|c| c.hi).collect();
        assert!(factored(&spread).1 < 1e-9);
    }

    /// Powers of one factor, exact in f64: its roots come out with all digits.
    #[test]
    fn multiple_roots_are_found_to_the_last_digit() {
        for (base, count) in
            [([1.0, 1.0, 0.25], 5), ([1.0, -0.5, 0.25], 6), ([1.0, 0.0, 0.25], 2), ([1.0, 0.0, 4.0], 10)]
        {
            let c = (0..count).fold(doubles(&[1.0]), |c, _| product(&c, &doubles(&base)));
            let c: Vec<f64> = c.iter().map(|c| c.hi).collect();
            let (factors, off) = factored(&c);
            assert!(off < 1e-9, "{base:?}^{count}: {off:e}");
            let all = factors.into_iter().flat_map(Factor::split);
            let moved = |factor: Factor| match factor {
                Factor::Linear(c) => (c.hi - base[1] / 2.0).abs(),
                Factor::Quadratic(u, v) => (u.hi - base[1]).abs().max((v.hi - base[2]).abs()),
            };
            assert!(all.map(moved).fold(0.0, f64::max) < 1e-15, "{base:?}^{count}");
        }
    }

    #[test]
    fn a_quadratic_splits_into_its_real_roots_without_cancellation() {
        let split = Factor::Quadratic(Double::from(1.0 + 1e-12), Double::from(1e-12)).split();
        let roots: Vec<f64> = split.iter().map(|f| if let Factor::Linear(c) = f { c.hi } else { f64::NAN }).collect();
        assert_eq!(roots, [1.0, 1e-12]);
        assert_eq!(Factor::Quadratic(Double::ZERO, Double::ONE).split().len(), 1);
        assert_eq!(Factor::Quadratic(Double::ZERO, Double::ZERO).split(), [Factor::Linear(Double::ZERO); 2]);
    }
}
