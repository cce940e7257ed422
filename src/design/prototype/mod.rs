//! Analog low-pass prototypes with their edge at 1 rad/s, as zeros and poles.
//!
//! One file a family. All are closed forms whose real and imaginary parts are
//! products of positive factors, so that both keep their digits however near the
//! imaginary axis a pole lies; of twice the digits of f64, which only the coefficients
//! of sections are rounded to.

mod bessel;
mod butterworth;
mod chebyshev1;
mod chebyshev2;
mod elliptic;

use super::double::{Complex, Double, Number};
use crate::spec::Family;

/// An analog low-pass whose edge is at 1 rad/s.
///
/// ```text
///                  prod (s^2 + Z^2)
/// H(s) = gain --------------------------
///              [s - r] prod |s - p|^2...
/// ```
///
/// The zeros are at +-jZ for each Z of `zeros_rad`, the poles at p and its conjugate
/// for each p of `poles`, and at r = `real_pole` where the order is odd.
#[derive(Clone, Debug, PartialEq)]
pub struct Prototype<N = Double> {
    /// Zeros on the positive imaginary axis, rad/s.
    pub zeros_rad: Vec<N>,
    /// Poles in the upper half-plane (re < 0, im > 0), rad/s.
    pub poles: Vec<Complex<N>>,
    /// The real pole of an odd order, rad/s, negative.
    pub real_pole: Option<N>,
    /// H(0): 1, or the ripple's floor for Chebyshev I and elliptic of even order.
    pub dc_gain: N,
}

impl<N: Number> Prototype<N> {
    /// Number of poles.
    pub fn order(&self) -> usize {
        2 * self.poles.len() + usize::from(self.real_pole.is_some())
    }

    /// The constant before the product of zeros over the product of poles.
    pub fn gain(&self) -> N {
        let poles = self.poles.iter().fold(N::ONE, |product, &p| product * p.squared_magnitude());
        let zeros = self.zeros_rad.iter().fold(N::ONE, |product, z| product * z.squared());
        self.dc_gain * poles * self.real_pole.map_or(N::ONE, |p| -p) / zeros
    }

    /// -20 log10 |H(jw)| at `frequency_rad` (0 or above, finite), dB, to the digits of f64;
    /// infinite at a zero.
    pub fn attenuation_db(&self, frequency_rad: f64) -> f64 {
        let w = frequency_rad;
        let pairs = self.poles.iter().map(|p| {
            // |jw - p|^2 |jw - p*|^2 / |p|^4: no difference of squares that would cancel.
            let (near, far) = (w - p.im.hi(), w + p.im.hi());
            let square = p.re.hi() * p.re.hi();
            let whole = square + p.im.hi() * p.im.hi();
            (square + near * near) / whole * ((square + far * far) / whole)
        });
        let real = self.real_pole.map(|r| 1.0 + (w / r.hi()) * (w / r.hi()));
        let falls: f64 = pairs.chain(real).map(libm::log10).sum();
        let rises: f64 =
            self.zeros_rad.iter().map(|z| libm::log10(((z.hi() - w) / z.hi() * ((z.hi() + w) / z.hi())).abs())).sum();
        10.0 * falls - 20.0 * (rises + libm::log10(self.dc_gain.hi()))
    }
}

/// Why there is no such prototype. A spec that was read has none of these.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum PrototypeError {
    /// The order is 0 or too high.
    #[error("order is {order}; a {} low-pass prototype has order 1 to {highest}", family_name(*.family))]
    Order {
        /// The family asked for.
        family: Family,
        /// The order asked for.
        order: u32,
        /// The highest order of the family.
        highest: u32,
    },
    /// A figure the family needs is missing or not a positive number of dB.
    #[error("{} needs {key} as a positive number of dB; it is {}", family_name(*.family), given(*.found))]
    Decibels {
        /// The family asked for.
        family: Family,
        /// `ripple_db` or `stop_db`.
        key: &'static str,
        /// What was given.
        found: Option<f64>,
    },
    /// The stop band is not below the pass band.
    #[error("stop_db is {stop_db} and ripple_db {ripple_db}; stop_db must be the larger")]
    StopWithinRipple {
        /// Pass band ripple, dB.
        ripple_db: f64,
        /// Stop band attenuation, dB.
        stop_db: f64,
    },
}

/// The prototype of a family.
///
/// `ripple_db` (positive) is needed by Chebyshev I and elliptic, `stop_db` (positive,
/// for elliptic above `ripple_db`) by Chebyshev II and elliptic; others ignore them.
///
/// # Errors
/// An order outside 1 to [`Family::highest_order`], a missing or non-positive figure.
pub fn new(
    family: Family,
    order: u32,
    ripple_db: Option<f64>,
    stop_db: Option<f64>,
) -> Result<Prototype, PrototypeError> {
    made(family, order, ripple_db, stop_db)
}

/// [`new`] in f64, in a fraction of the time: what searches go by.
///
/// # Errors
/// As [`new`].
pub fn approximate(
    family: Family,
    order: u32,
    ripple_db: Option<f64>,
    stop_db: Option<f64>,
) -> Result<Prototype<f64>, PrototypeError> {
    made(family, order, ripple_db, stop_db)
}

fn made<N: Number>(
    family: Family,
    order: u32,
    ripple_db: Option<f64>,
    stop_db: Option<f64>,
) -> Result<Prototype<N>, PrototypeError> {
    let highest = family.highest_order();
    if order == 0 || order > highest {
        return Err(PrototypeError::Order { family, order, highest });
    }
    let decibels = |key, found: Option<f64>| {
        found.filter(|db| *db > 0.0 && db.is_finite()).ok_or(PrototypeError::Decibels { family, key, found })
    };
    match family {
        Family::Butterworth => Ok(butterworth::prototype(order)),
        Family::Bessel => bessel::prototype(order).ok_or(PrototypeError::Order { family, order, highest }),
        Family::Chebyshev1 => Ok(chebyshev1::prototype(order, decibels("ripple_db", ripple_db)?)),
        Family::Chebyshev2 => Ok(chebyshev2::prototype(order, decibels("stop_db", stop_db)?)),
        Family::Elliptic => {
            let (ripple_db, stop_db) = (decibels("ripple_db", ripple_db)?, decibels("stop_db", stop_db)?);
            if stop_db <= ripple_db {
                return Err(PrototypeError::StopWithinRipple { ripple_db, stop_db });
            }
            Ok(elliptic::prototype(order, ripple_db, stop_db))
        }
    }
}

/// The family's name in prose.
pub(super) fn family_name(family: Family) -> &'static str {
    match family {
        Family::Butterworth => "Butterworth",
        Family::Chebyshev1 => "Chebyshev I",
        Family::Chebyshev2 => "Chebyshev II",
        Family::Elliptic => "elliptic",
        Family::Bessel => "Bessel",
    }
}

/// What was given for a figure.
fn given(found: Option<f64>) -> String {
    found.map_or_else(|| "missing".to_owned(), |db| db.to_string())
}

/// 10^(db/10) - 1 without loss for small `db`.
pub(super) fn power_ratio_minus_one<N: Number>(db: N) -> N {
    (db * N::LN_10 / 10.0).exponential_m1()
}

/// -a sin t + j b cos t at the `order / 2` angles t = (2k-1) pi / (2 order) below
/// pi/2, k = 1, 2, ...: the poles in the upper half-plane of the families whose poles
/// lie on a circle or ellipse. The cosine is taken as the sine of the rest to pi/2,
/// which keeps its digits near the real axis.
fn on_ellipse<N: Number>(order: u32, a: N, b: N) -> Vec<Complex<N>> {
    let sin = |m: u32| angle_sin::<N>(m, order);
    (1..=order / 2).map(|k| Complex { re: -a * sin(2 * k - 1), im: b * sin(order - (2 * k - 1)) }).collect()
}

/// sin(m pi / (2 order)).
fn angle_sin<N: Number>(m: u32, order: u32) -> N {
    (N::PI * f64::from(m) / f64::from(2 * order)).circular().0
}
