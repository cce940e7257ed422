//! Numbers of the report: finite by construction, rounded where more digits would
//! only be noise.
//!
//! JSON has no NaN and no infinity, and a bare `f64` that holds one would come out
//! as `null` without a word. These types can't hold one: whoever makes a figure
//! gets `None` from `new` and has to say why there is no figure.

use schemars::{JsonSchema, Schema, SchemaGenerator, json_schema};
use serde::{Deserialize, Serialize};
use std::borrow::Cow;
use std::time::Duration;

/// A number that JSON cannot hold.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
#[error("{0} is no finite number, and a report holds finite numbers only; write null and a reason instead")]
pub struct NotFinite(pub f64);

/// `value` rounded to a multiple of `1 / per_unit`, without a negative zero. Values
/// too large to have such digits stay as they are.
fn rounded(value: f64, per_unit: f64) -> f64 {
    let scaled = value * per_unit;
    if scaled.abs() < 4_503_599_627_370_496.0 { scaled.round() / per_unit + 0.0 } else { value }
}

macro_rules! number {
    ($(#[doc = $doc:literal])* $name:ident, $round:expr, $schema:tt) => {
        $(#[doc = $doc])*
        #[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Serialize, Deserialize)]
        #[serde(try_from = "f64", into = "f64")]
        pub struct $name(f64);

        impl $name {
            /// Rounds and keeps `value`; `None` for NaN and the infinities.
            pub fn new(value: f64) -> Option<Self> {
                let round: fn(f64) -> f64 = $round;
                value.is_finite().then(|| $name(round(value)))
            }

            /// The number as written in the report.
            pub fn get(self) -> f64 {
                self.0
            }
        }

        impl JsonSchema for $name {
            fn schema_name() -> Cow<'static, str> {
                stringify!($name).into()
            }

            fn json_schema(_: &mut SchemaGenerator) -> Schema {
                let mut schema = json_schema!($schema);
                schema.insert("description".to_owned(), concat!($($doc, "\n"),*).trim().into());
                schema
            }
        }

        impl TryFrom<f64> for $name {
            type Error = NotFinite;

            fn try_from(value: f64) -> Result<Self, NotFinite> {
                $name::new(value).ok_or(NotFinite(value))
            }
        }

        impl From<$name> for f64 {
            fn from(number: $name) -> f64 {
                number.0
            }
        }
    };
}

number! {
    /// A level (dBFS), attenuation or gain (dB), rounded to 0.001.
    Db, |value| rounded(value, 1e3), {"type": "number"}
}
number! {
    /// A frequency or the width of a range, Hz, rounded to a millionth: harmonics of
    /// a decimal center come out as people write them (150.3, not 150.29999999999998).
    Hz, |value| rounded(value, 1e6), {"type": "number", "minimum": 0}
}
number! {
    /// A time, seconds, rounded to a microsecond.
    Seconds, |value| rounded(value, 1e6), {"type": "number"}
}
number! {
    /// A part of a whole, 0 to 1, rounded to a millionth.
    Share, |value| rounded(value, 1e6), {"type": "number", "minimum": 0, "maximum": 1}
}
number! {
    /// A number written in full: its shortest decimal form that reads back as the same bits.
    Finite, |value| value, {"type": "number"}
}

impl Seconds {
    /// The time `frames` take at `rate_hz`; a rate of 0 counts as 1.
    pub fn of_frames(frames: u64, rate_hz: u32) -> Self {
        Seconds(rounded(frames as f64 / f64::from(rate_hz.max(1)), 1e6))
    }
}

impl Finite {
    /// How many times `one` is `other`; an `other` of 0 counts as 1.
    pub fn ratio(one: u32, other: u32) -> Self {
        Finite(f64::from(one) / f64::from(other.max(1)))
    }
}

impl From<Duration> for Seconds {
    fn from(duration: Duration) -> Self {
        Seconds(rounded(duration.as_secs_f64(), 1e6))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn what_is_not_finite_is_no_number() {
        for value in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            assert_eq!(Db::new(value), None);
            assert_eq!(Finite::new(value), None);
            assert!(Hz::try_from(value).is_err());
        }
    }

    #[test]
    fn rounding_is_to_the_nearest_and_never_a_negative_zero() {
        for (value, written) in
            [(54.8004, "54.8"), (54.8006, "54.801"), (-0.0004, "0.0"), (-3.2, "-3.2"), (180.0, "180.0")]
        {
            assert_eq!(serde_json::to_string(&Db::new(value)).unwrap(), written);
        }
        assert_eq!(serde_json::to_string(&Hz::new(50.1 * 3.0)).unwrap(), "150.3");
        assert_eq!(serde_json::to_string(&Seconds::of_frames(48_001, 48_000)).unwrap(), "1.000021");
        assert_eq!(serde_json::to_string(&Finite::new(1.0 / 3.0)).unwrap(), "0.3333333333333333");
        assert_eq!(Db::new(f64::MAX).map(Db::get), Some(f64::MAX));
    }

    #[test]
    fn a_report_with_a_number_out_of_range_does_not_read_back() {
        assert!(serde_json::from_str::<Db>("1e999").is_err());
        assert!(serde_json::from_str::<Db>("null").is_err());
    }

    proptest! {
        #[test]
        fn rounding_twice_is_rounding_once(value in -1e6..1e6f64) {
            let once = Db::new(value).unwrap();
            prop_assert_eq!(Db::new(once.get()), Some(once));
            prop_assert!((once.get() - value).abs() <= 0.0005 + 1e-9);
        }

        #[test]
        fn full_numbers_read_back_as_the_same_bits(value in any::<f64>().prop_filter("finite", |v| v.is_finite())) {
            let text = serde_json::to_string(&Finite::new(value).unwrap()).unwrap();
            let back: Finite = serde_json::from_str(&text).unwrap();
            prop_assert_eq!(back.get().to_bits(), value.to_bits());
        }
    }
}
