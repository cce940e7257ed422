//! Analog low-pass prototypes with their edge at 1 rad/s, as zeros and poles.
//!
//! One file a family. All are closed forms whose real and imaginary parts are
//! products of positive factors, so that both keep their digits however near the
//! imaginary axis a pole lies.

mod bessel;
mod butterworth;
mod chebyshev1;
mod chebyshev2;
mod elliptic;

use crate::spec::Family;
use core::f64::consts::{LN_10, PI};
use num_complex::Complex64;

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
pub struct Prototype {
    /// Zeros on the positive imaginary axis, rad/s.
    pub zeros_rad: Vec<f64>,
    /// Poles in the upper half-plane (re < 0, im > 0), rad/s.
    pub poles: Vec<Complex64>,
    /// The real pole of an odd order, rad/s, negative.
    pub real_pole: Option<f64>,
    /// H(0): 1, or the ripple's floor for Chebyshev I and elliptic of even order.
    pub dc_gain: f64,
}

impl Prototype {
    /// Number of poles.
    pub fn order(&self) -> usize {
        2 * self.poles.len() + usize::from(self.real_pole.is_some())
    }

    /// The constant before the product of zeros over the product of poles.
    pub fn gain(&self) -> f64 {
        let poles: f64 = self.poles.iter().map(|p| p.re * p.re + p.im * p.im).product();
        let zeros: f64 = self.zeros_rad.iter().map(|z| z * z).product();
        self.dc_gain * poles * self.real_pole.map_or(1.0, |p| -p) / zeros
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
fn family_name(family: Family) -> &'static str {
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
fn power_ratio_minus_one(db: f64) -> f64 {
    libm::expm1(db * (LN_10 / 10.0))
}

/// -a sin t + j b cos t at the `order / 2` angles t = (2k-1) pi / (2 order) below
/// pi/2, k = 1, 2, ...: the poles in the upper half-plane of the families whose poles
/// lie on a circle or ellipse. The cosine is taken as the sine of the rest to pi/2,
/// which keeps its digits near the real axis.
fn on_ellipse(order: u32, a: f64, b: f64) -> Vec<Complex64> {
    (1..=order / 2)
        .map(|k| Complex64::new(-a * angle_sin(2 * k - 1, order), b * angle_sin(order - (2 * k - 1), order)))
        .collect()
}

/// sin(m pi / (2 order)).
fn angle_sin(m: u32, order: u32) -> f64 {
    libm::sin(PI * f64::from(m) / f64::from(2 * order))
}
