//! Numbers with a meaning, a unit and a range.

use std::cmp::Ordering;

use super::problems::Problems;
use super::tree::{Node, Value, show_number};

/// Upper ends from here on are guards, not advice.
const FAR: f64 = 1e9;

/// The lower end of a [`Quantity`].
#[derive(Clone, Copy)]
pub(super) enum Low {
    /// The number itself is too low.
    Above(f64),
    /// The number itself is allowed.
    From(f64),
}

/// What a number means and where it may lie.
pub(super) struct Quantity {
    /// With its article: `a frequency`.
    pub noun: &'static str,
    /// Its unit as written behind a number (`Hz`), or nothing.
    pub unit: &'static str,
    /// Lower end.
    pub low: Low,
    /// Upper end, allowed itself.
    pub high: f64,
}

impl Quantity {
    fn holds(&self, value: f64) -> bool {
        let low = match self.low {
            Low::Above(low) => value > low,
            Low::From(low) => value >= low,
        };
        low && value <= self.high
    }

    /// `a ripple above 0 and at most 12 dB`. An upper end that nobody comes near is named
    /// only where `value` lies above it.
    pub fn describe(&self, value: f64) -> String {
        let Self { noun, high, .. } = self;
        let unit = if self.unit.is_empty() { String::new() } else { format!(" {}", self.unit) };
        let is_far = *high >= FAR && value.partial_cmp(high) != Some(Ordering::Greater);
        match self.low {
            Low::Above(low) if is_far => format!("{noun} above {low}{unit}"),
            Low::From(low) if is_far => format!("{noun} of at least {low}{unit}"),
            Low::Above(low) => format!("{noun} above {low} and at most {high}{unit}"),
            Low::From(low) => format!("{noun} from {low} to {high}{unit}"),
        }
    }

    /// `a plain number in hertz`.
    fn plain(&self) -> String {
        match self.unit {
            "Hz" => "a plain number in hertz".to_owned(),
            "dB" => "a plain number in decibels".to_owned(),
            "dBFS" => "a plain number in decibels relative to full scale".to_owned(),
            _ => "a plain number".to_owned(),
        }
    }
}

/// Reads a finite number within the quantity's range, or says what is wrong with it.
pub(super) fn number(node: &Node, key: &str, quantity: &Quantity, problems: &mut Problems) -> Option<f64> {
    let value = match &node.value {
        Value::Number(number) => number.value,
        other => {
            let mut repair = format!("write {}", quantity.plain());
            if let Some(plain) = plain_number(other, quantity) {
                repair = format!("{repair}: {}", problems.assign(key, &plain));
            }
            problems.add(&node.place, format!("{key} is {}, not a number", other.show()), repair);
            return None;
        }
    };
    if !value.is_finite() {
        problems.add(
            &node.place,
            format!("{key} is {value}, not a finite number"),
            format!("give {}", quantity.describe(value)),
        );
        return None;
    }
    if !quantity.holds(value) {
        let repair = format!("give {}", quantity.describe(value));
        problems.add(&node.place, format!("{key} = {} is out of range", show_number(value)), repair);
        return None;
    }
    // Minus zero would be written back as such; it means zero.
    Some(value + 0.0)
}

/// `"1.5 kHz"` as the plain number it stands for, where that is clear.
fn plain_number(value: &Value, quantity: &Quantity) -> Option<String> {
    let Value::Text(text) = value else { return None };
    let text = text.trim();
    let digits = text.find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | '-' | '+'))).unwrap_or(text.len());
    let (number, unit) = text.split_at_checked(digits)?;
    let number: f64 = number.parse().ok()?;
    let factor = match unit.trim().to_lowercase().as_str() {
        "" => 1.0,
        "khz" if quantity.unit == "Hz" => 1000.0,
        unit if unit == quantity.unit.to_lowercase() => 1.0,
        "db" if quantity.unit == "dBFS" => 1.0,
        _ => return None,
    };
    let number = number * factor;
    number.is_finite().then(|| show_number(number))
}
