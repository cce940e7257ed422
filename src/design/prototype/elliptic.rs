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
use core::f64::consts::{FRAC_PI_2, PI};
use num_complex::Complex64;

/// Order 1 or more, `stop_db` > `ripple_db` > 0. An even order has the ripple's
/// floor at DC.
pub fn prototype(order: u32, ripple_db: f64, stop_db: f64) -> Prototype {
    let n = f64::from(order);
    let (ripple, stop) = (power_ratio_minus_one(ripple_db), power_ratio_minus_one(stop_db));
    let k1 = libm::sqrt(ripple / stop);
    // 1 - k1^2 from the difference of the two levels, not from k1 near 1.
    let k1_complement = libm::sqrt((1.0 + ripple) * power_ratio_minus_one(stop_db - ripple_db) / stop);
    let period_ratio = arithmetic_geometric_mean(k1_complement) / arithmetic_geometric_mean(k1);
    let modulus = Modulus::new(period_ratio / n);

    // Where on the way from the pass band's period to the stop band's the poles lie:
    // v K = from_pass K', and 1 - from_pass = from_stop by sc(K1' - x, k1') =
    // cs(x, k1') / k1. Only the smaller of the two needs to be accurate.
    let from_pass = inverse_sc_of_complement(1.0 / libm::sqrt(ripple), k1, k1_complement) / period_ratio;
    let from_stop = inverse_sc_of_complement(libm::sqrt(stop), k1, k1_complement) / period_ratio;
    let across = if from_pass <= from_stop { Fraction::of(from_pass) } else { Fraction::of_rest(from_stop) };
    let (s1, c1, d1) = modulus.complement().sn_cn_dn(across);

    let (mut zeros_rad, mut poles) = (Vec::new(), Vec::new());
    for i in 1..=order / 2 {
        // cd(uK) = sn(K - uK), and 1 - u is a ratio of whole numbers.
        let u = Fraction { part: f64::from(order - (2 * i - 1)) / n, rest: f64::from(2 * i - 1) / n };
        let (s, c, d) = modulus.sn_cn_dn(u);
        zeros_rad.push(1.0 / (modulus.k * s));
        let scale = c1 * c1 + (modulus.k * s * s1) * (modulus.k * s * s1);
        poles.push(Complex64::new(-c * d * s1 * c1 / scale, s * d1 / scale));
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
fn arithmetic_geometric_mean(mut b: f64) -> f64 {
    let mut a = 1.0;
    // Digits double with every step once the two are near each other; b = 1e-150
    // takes ten steps to get there.
    for _ in 0..16 {
        (a, b) = ((a + b) / 2.0, libm::sqrt(a * b));
    }
    a
}

/// x / K(k) where sc(x, k') = `y` > 0, that is sn(jx, k) = jy, for the modulus `k` and
/// its complement: descending Landen transformations until the modulus is 0.
fn inverse_sc_of_complement(mut y: f64, mut k: f64, mut complement: f64) -> f64 {
    for _ in 0..12 {
        let next = (k / (1.0 + complement)) * (k / (1.0 + complement));
        let ky = k * y;
        // hypot: y may be large where the ripple is small.
        y = 2.0 * y / ((1.0 + next) * (1.0 + libm::hypot(1.0, ky)));
        complement = 2.0 * libm::sqrt(complement) / (1.0 + complement);
        k = next;
    }
    libm::asinh(y) / FRAC_PI_2
}

/// A part of a quarter period and what is left of it, both accurate.
#[derive(Clone, Copy)]
struct Fraction {
    part: f64,
    rest: f64,
}

impl Fraction {
    fn of(part: f64) -> Fraction {
        Fraction { part, rest: 1.0 - part }
    }

    fn of_rest(rest: f64) -> Fraction {
        Fraction { part: 1.0 - rest, rest }
    }
}

/// A modulus, its complement, and the ratio of the quarter periods.
struct Modulus {
    k: f64,
    complement: f64,
    /// K'(k) / K(k).
    period_ratio: f64,
}

impl Modulus {
    fn new(period_ratio: f64) -> Modulus {
        // With the nome q of the smaller modulus: k = (theta2/theta3)^2,
        // k' = (theta4/theta3)^2, all at 0.
        let log_nome = -PI * if period_ratio >= 1.0 { period_ratio } else { 1.0 / period_ratio };
        let [_, theta2, theta3, theta4] = theta_cos(0.0, log_nome);
        let small = libm::exp(log_nome / 2.0) * (theta2 / theta3) * (theta2 / theta3);
        let large = (theta4 / theta3) * (theta4 / theta3);
        if period_ratio >= 1.0 {
            Modulus { k: small, complement: large, period_ratio }
        } else {
            Modulus { k: large, complement: small, period_ratio }
        }
    }

    fn complement(&self) -> Modulus {
        Modulus { k: self.complement, complement: self.k, period_ratio: 1.0 / self.period_ratio }
    }

    /// sn, cn, dn at `x` K(k), each to its last digits.
    fn sn_cn_dn(&self, x: Fraction) -> (f64, f64, f64) {
        if x.part > x.rest {
            // sn(K - y) = cd y, cn(K - y) = k' sd y, dn(K - y) = k' nd y.
            let (s, c, d) = self.sn_cn_dn(Fraction { part: x.rest, rest: x.part });
            return (c / d, self.complement * s / d, self.complement / d);
        }
        if self.period_ratio >= 1.0 {
            let log_nome = -PI * self.period_ratio;
            let [_, zero2, zero3, zero4] = theta_cos(0.0, log_nome);
            let [at1, at2, at3, at4] = theta_cos(FRAC_PI_2 * x.part, log_nome);
            (zero3 * at1 / (zero2 * at4), zero4 * at2 / (zero2 * at4), zero4 * at3 / (zero3 * at4))
        } else {
            // Jacobi's imaginary transformation: sn(x, k) = -j sc(jx, k') and so on.
            let log_nome = -PI / self.period_ratio;
            let [_, zero2, zero3, zero4] = theta_cos(0.0, log_nome);
            let [at1, at2, at3, at4] = theta_cosh(FRAC_PI_2 * x.part / self.period_ratio, log_nome);
            (zero3 * at1 / (zero4 * at2), zero2 * at4 / (zero4 * at2), zero2 * at3 / (zero3 * at2))
        }
    }
}

/// theta1 q^(-1/4), theta2 q^(-1/4), theta3, theta4 at the real `z`.
fn theta_cos(z: f64, log_nome: f64) -> [f64; 4] {
    theta(log_nome, |m| libm::sin(m * z), |m| libm::cos(m * z))
}

/// theta1 q^(-1/4) / j, theta2 q^(-1/4), theta3, theta4 at jy, 0 <= y <= -ln(q)/4.
fn theta_cosh(y: f64, log_nome: f64) -> [f64; 4] {
    theta(log_nome, |m| libm::sinh(m * y), |m| libm::cosh(m * y))
}

/// The four series (Abramowitz and Stegun, Handbook of Mathematical Functions,
/// 16.27) in the nome q <= e^-pi: the first term left out is below 2^-53 of the sum
/// even at the far end of [`theta_cosh`].
fn theta(log_nome: f64, odd: impl Fn(f64) -> f64, even: impl Fn(f64) -> f64) -> [f64; 4] {
    let mut sums = [0.0, 0.0, 1.0, 1.0];
    for m in 0..6 {
        let (m, sign) = (f64::from(m), if m % 2 == 0 { 1.0 } else { -1.0 });
        let between = libm::exp(log_nome * m * (m + 1.0));
        if between == 0.0 {
            break; // or an infinite cosh would meet it
        }
        sums[0] += 2.0 * sign * between * odd(2.0 * m + 1.0);
        sums[1] += 2.0 * between * even(2.0 * m + 1.0);
        let square = libm::exp(log_nome * (m + 1.0) * (m + 1.0));
        if square == 0.0 {
            break;
        }
        sums[2] += 2.0 * square * even(2.0 * m + 2.0);
        sums[3] -= 2.0 * sign * square * even(2.0 * m + 2.0);
    }
    sums
}
