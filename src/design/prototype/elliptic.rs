//! Elliptic (Cauer): equal ripple in pass band and stop band.
//!
//! |H(jw)|^2 = 1 / (1 + e^2 F(w)^2), e^2 = 10^(ripple/10) - 1; the ripple ends at
//! w = 1, the stop band begins at w = 1/k. With k1 = e / sqrt(10^(stop/10) - 1) the
//! degree equation n K'(k)/K(k) = K'(k1)/K(k1) gives k, and with u = (2i-1)/n
//!
//! ```text
//! zeros  j / (k cd(u K, k)),    poles  j cd((u - j v) K, k),    -j sn(j v n K1, k1) = 1/e.
//! ```
//!
//! Formulas as in S. J. Orfanidis, Lecture Notes on Elliptic Filter Design, Rutgers
//! University 2006; what is done differently is how they are evaluated: k and its
//! complement k' are carried side by side, the functions are summed as theta series
//! in whichever nome is below e^-pi, so that moduli near 0 and near 1 both keep their
//! digits.

use super::{Prototype, chebyshev1, power_ratio_minus_one};
use crate::design::double::{Complex, Number};

/// Order 1 or more, `stop_db` > `ripple_db` > 0. An even order has the ripple's
/// floor at DC.
pub fn prototype<N: Number>(order: u32, ripple_db: f64, stop_db: f64) -> Prototype<N> {
    let n = f64::from(order);
    let (ripple, stop) = (power_ratio_minus_one(N::from(ripple_db)), power_ratio_minus_one(N::from(stop_db)));
    let k1 = (ripple / stop).root();
    // 1 - k1^2 from the difference of the two levels, not from k1 near 1.
    let between = power_ratio_minus_one(N::difference(stop_db, ripple_db));
    let k1_complement = ((ripple + 1.0) * between / stop).root();
    let period_ratio = arithmetic_geometric_mean(k1_complement) / arithmetic_geometric_mean(k1);
    let modulus = Modulus::new(period_ratio / n);

    // Where on the way from the pass band's period to the stop band's the poles lie:
    // v K = from_pass K', and 1 - from_pass = from_stop by sc(K1' - x, k1') =
    // cs(x, k1') / k1. Only the smaller of the two needs to be accurate.
    let from_pass = inverse_sc_of_complement(N::ONE / ripple.root(), k1, k1_complement) / period_ratio;
    let from_stop = inverse_sc_of_complement(stop.root(), k1, k1_complement) / period_ratio;
    let across = if from_pass.hi() <= from_stop.hi() { Fraction::of(from_pass) } else { Fraction::of_rest(from_stop) };
    let (s1, c1, d1) = modulus.complement().sn_cn_dn(across);

    let (mut zeros_rad, mut poles) = (Vec::new(), Vec::new());
    for i in 1..=order / 2 {
        // cd(uK) = sn(K - uK), and 1 - u is a ratio of whole numbers.
        let of_order = |m: u32| N::from(f64::from(m)) / n;
        let u = Fraction { part: of_order(order - (2 * i - 1)), rest: of_order(2 * i - 1) };
        let (s, c, d) = modulus.sn_cn_dn(u);
        zeros_rad.push(N::ONE / (modulus.k * s));
        let scale = c1.squared() + (modulus.k * s * s1).squared();
        poles.push(Complex { re: -c * d * s1 * c1 / scale, im: s * d1 / scale });
    }
    Prototype {
        zeros_rad,
        poles,
        real_pole: (order % 2 == 1).then_some(-s1 / c1),
        dc_gain: chebyshev1::dc_gain(order, ripple_db),
    }
}

/// The limit of repeated arithmetic and geometric means of 1 and `b` (0 < b <= 1).
/// K(k) = pi / (2 M(k')).
fn arithmetic_geometric_mean<N: Number>(mut b: N) -> N {
    let mut a = N::ONE;
    // Digits double with every step once the two are near each other; b = 1e-150
    // takes ten steps to get there.
    for _ in 0..17 {
        (a, b) = ((a + b) * 0.5, (a * b).root());
    }
    a
}

/// x / K(k) where sc(x, k') = `y` > 0, that is sn(jx, k) = jy, for the modulus `k` and
/// its complement: descending Landen transformations until the modulus is 0.
fn inverse_sc_of_complement<N: Number>(mut y: N, mut k: N, mut complement: N) -> N {
    for _ in 0..13 {
        let next = (k / (complement + 1.0)).squared();
        let ky = k * y;
        // The root is ky itself where the square would be too large for f64.
        let secant = if ky.hi() > 1e100 { ky } else { (ky.squared() + 1.0).root() };
        y = y * 2.0 / ((next + 1.0) * (secant + 1.0));
        complement = complement.root() * 2.0 / (complement + 1.0);
        k = next;
    }
    y.area_sinh() / N::FRAC_PI_2
}

/// A part of a quarter period and what is left of it, both accurate.
#[derive(Clone, Copy)]
struct Fraction<N> {
    part: N,
    rest: N,
}

impl<N: Number> Fraction<N> {
    fn of(part: N) -> Fraction<N> {
        Fraction { part, rest: N::ONE - part }
    }

    fn of_rest(rest: N) -> Fraction<N> {
        Fraction { part: N::ONE - rest, rest }
    }
}

/// A modulus, its complement, and the ratio of the quarter periods.
struct Modulus<N> {
    k: N,
    complement: N,
    /// K'(k) / K(k).
    period_ratio: N,
}

impl<N: Number> Modulus<N> {
    fn new(period_ratio: N) -> Modulus<N> {
        // With the nome q of the smaller modulus: k = (theta2/theta3)^2,
        // k' = (theta4/theta3)^2, all at 0.
        let above_one = period_ratio.hi() >= 1.0;
        let log_nome = -N::PI * if above_one { period_ratio } else { N::ONE / period_ratio };
        let [_, theta2, theta3, theta4] = theta_cos(N::ZERO, log_nome);
        let small = (log_nome * 0.5).exponential() * (theta2 / theta3).squared();
        let large = (theta4 / theta3).squared();
        let (k, complement) = if above_one { (small, large) } else { (large, small) };
        Modulus { k, complement, period_ratio }
    }

    fn complement(&self) -> Modulus<N> {
        Modulus { k: self.complement, complement: self.k, period_ratio: N::ONE / self.period_ratio }
    }

    /// sn, cn, dn at `x` K(k), each to its last digits.
    fn sn_cn_dn(&self, x: Fraction<N>) -> (N, N, N) {
        if x.part.hi() > x.rest.hi() {
            // sn(K - y) = cd y, cn(K - y) = k' sd y, dn(K - y) = k' nd y.
            let (s, c, d) = self.sn_cn_dn(Fraction { part: x.rest, rest: x.part });
            return (c / d, self.complement * s / d, self.complement / d);
        }
        let angle = N::FRAC_PI_2 * x.part;
        if self.period_ratio.hi() >= 1.0 {
            let log_nome = -N::PI * self.period_ratio;
            let [_, zero2, zero3, zero4] = theta_cos(N::ZERO, log_nome);
            let [at1, at2, at3, at4] = theta_cos(angle, log_nome);
            (zero3 * at1 / (zero2 * at4), zero4 * at2 / (zero2 * at4), zero4 * at3 / (zero3 * at4))
        } else {
            // Jacobi's imaginary transformation: sn(x, k) = -j sc(jx, k') and so on.
            let log_nome = -N::PI / self.period_ratio;
            let [_, zero2, zero3, zero4] = theta_cos(N::ZERO, log_nome);
            let [at1, at2, at3, at4] = theta_cosh(angle / self.period_ratio, log_nome);
            (zero3 * at1 / (zero4 * at2), zero2 * at4 / (zero4 * at2), zero2 * at3 / (zero3 * at2))
        }
    }
}

/// theta1 q^(-1/4), theta2 q^(-1/4), theta3, theta4 at the real `z`.
fn theta_cos<N: Number>(z: N, log_nome: N) -> [N; 4] {
    theta(log_nome, |m| (z * m).circular())
}

/// theta1 q^(-1/4) / j, theta2 q^(-1/4), theta3, theta4 at jy, 0 <= y <= -ln(q)/4.
fn theta_cosh<N: Number>(y: N, log_nome: N) -> [N; 4] {
    theta(log_nome, |m| (y * m).hyperbolic())
}

/// The four series (Abramowitz and Stegun, Handbook of Mathematical Functions,
/// 16.27) in the nome q <= e^-pi: the first term left out is below 2^-106 of the sum
/// even at the far end of [`theta_cosh`]. `waves` gives the odd and the even function
/// at a multiple of the argument.
fn theta<N: Number>(log_nome: N, waves: impl Fn(f64) -> (N, N)) -> [N; 4] {
    let mut sums = [N::ZERO, N::ZERO, N::ONE, N::ONE];
    for m in 0..6 {
        let (m, sign) = (f64::from(m), if m % 2 == 0 { 1.0 } else { -1.0 });
        let between = (log_nome * (m * (m + 1.0))).exponential() * 2.0;
        if between.hi() == 0.0 {
            break; // or an infinite cosh would meet it
        }
        let (odd, even) = waves(2.0 * m + 1.0);
        sums[0] = sums[0] + between * odd * sign;
        sums[1] = sums[1] + between * even;
        let square = (log_nome * ((m + 1.0) * (m + 1.0))).exponential() * 2.0;
        if square.hi() == 0.0 {
            break;
        }
        let (_, even) = waves(2.0 * m + 2.0);
        sums[2] = sums[2] + square * even;
        sums[3] = sums[3] - square * even * sign;
    }
    sums
}
