//! What keeps a transfer function from being a filter.

use crate::design::wording::{figure, radius};

/// What keeps a transfer function from being a filter.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum TransferError {
    /// A coefficient, root or gain is NaN or infinite.
    #[error("{what} is {value}; it must be a finite number")]
    NotFinite {
        /// Which.
        what: String,
        /// What it is.
        value: f64,
    },
    /// A polynomial or list of sections without entries.
    #[error("{what} is empty; give at least one")]
    Empty {
        /// Which.
        what: &'static str,
    },
    /// More than the program factors.
    #[error("{what}: degree or number {degree} is more than {highest}; give the filter as several stages")]
    Degree {
        /// `numerator`, `denominator`, `zeros`, `poles` or `sections`.
        what: &'static str,
        /// Its degree, or their number.
        degree: usize,
        /// The highest.
        highest: usize,
    },
    /// Nothing would come out.
    #[error("{what} is zero, so nothing would come out; give at least one coefficient that is not 0")]
    AllZero {
        /// Which.
        what: String,
    },
    /// The coefficient on which everything is scaled is missing.
    #[error("the first coefficient of {what} is 0; {repair}")]
    ZeroLeading {
        /// Which.
        what: String,
        /// What to do.
        repair: &'static str,
    },
    /// More zeros than poles.
    #[error("{what}; {repair}")]
    Improper {
        /// The two degrees.
        what: String,
        /// What to do.
        repair: &'static str,
    },
    /// A complex root without its conjugate.
    #[error(
        "{what} {index} lies at {re} {sign} {im}j and its conjugate is not in the list, so the output would not be \
         real; give both, or 0 as the imaginary part of a real one",
        sign = if *.im < 0.0 { '-' } else { '+' }, im = .im.abs()
    )]
    Unpaired {
        /// `zero` or `pole`.
        what: &'static str,
        /// Its place in the list, 1 for the first.
        index: usize,
        /// Real part.
        re: f64,
        /// Imaginary part.
        im: f64,
    },
    /// A pole on or outside the unit circle.
    #[error(
        "{pole} {} at {} Hz, {} the unit circle, so the output would never die away; {hint}",
        radius(*.distance), figure(*.at_hz), if *.distance < 0.0 { "outside" } else { "on" }
    )]
    Unstable {
        /// Beginning of the sentence: `it has a pole of radius`, `section 2 has a pole of radius`,
        /// `pole 1 in poles, 1.5, has the radius`.
        pole: String,
        /// 1 - radius: 0 on the circle, negative outside.
        distance: f64,
        /// Frequency of the pole, Hz.
        at_hz: f64,
        /// What may be the reason, and what to do.
        hint: String,
    },
    /// A pole on or right of the imaginary axis.
    #[error(
        "{pole}, {} the imaginary axis, so the output would never die away; {hint}",
        if *.re > 0.0 { "right of" } else { "on" }
    )]
    UnstableAnalog {
        /// Beginning of the sentence: `it has a pole at 0 Hz with a real part of 3 rad/s`,
        /// `pole 1 in poles_hz, 1000, has a positive real part`.
        pole: String,
        /// Real part, rad/s.
        re: f64,
        /// Imaginary part as a frequency, Hz.
        at_hz: f64,
        /// What may be the reason, and what to do.
        hint: String,
    },
    /// `match_hz` can't be matched.
    #[error(
        "match_hz = {match_hz} must lie above 0 and below half the sample rate, {} Hz; lower it, or leave it out",
        figure(.rate_hz / 2.0)
    )]
    MatchHz {
        /// As given, Hz.
        match_hz: f64,
        /// Sample rate, Hz.
        rate_hz: f64,
    },
    /// The gain is beyond anything that could be filtered.
    #[error(
        "its gain at rest (0 Hz) is {}, and more than {MOST_GAIN_DB} dB overflows; lower the gain, or move the poles away \
         from 0 Hz",
        if .gain_db.is_finite() { format!("{gain_db:.0} dB") } else { "beyond what f64 holds".to_owned() }
    )]
    GainAtRest {
        /// dB.
        gain_db: f64,
    },
    /// Coefficients that f64 can't hold together.
    #[error("{what} spans more than f64 can hold on one scale; give zeros, poles and gain, or sections")]
    Range {
        /// What does.
        what: &'static str,
    },
    /// The factors are not those of the polynomial.
    #[error(
        "the factors that were found for {what} miss the coefficient with index {index} by {times:.1} times its own \
         rounding; give zeros, poles and gain, or sections"
    )]
    Factoring {
        /// Which polynomial.
        what: &'static str,
        /// Index of the coefficient that is missed most, 0 for the first.
        index: usize,
        /// Error in parts of what its rounding allows.
        times: f64,
    },
}

/// Gain at 0 Hz above which a filter is refused, dB.
pub const MOST_GAIN_DB: f64 = 200.0;

impl TransferError {
    /// Whether another sample rate may help.
    pub fn depends_on_rate(&self) -> bool {
        // In s coefficients and roots are scaled with the rate before they are taken apart.
        matches!(self, TransferError::MatchHz { .. } | TransferError::Range { .. } | TransferError::Factoring { .. })
    }
}
