//! How many digits or bits.

use super::holding::{Loss, Reference};
use super::integers::Integers;
use super::scaling::{self, Scaling};
use super::{ExportError, Form, Request, integers, rounding, sentences};
use crate::design::BandDesign;
use crate::section::Section;

pub use rounding::MOST_DIGITS;

/// Shortest word length, bits.
pub const FEWEST_BITS: u32 = 8;

/// Longest word length, bits: the products of such words fit into 64 bits.
pub const MOST_BITS: u32 = 32;

/// The numbers of digits at which every requirement holds; at least one, since all of them do.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Holding {
    /// Bit d for d digits.
    mask: u32,
}

impl Holding {
    /// Those of 1 to [`MOST_DIGITS`] that `holds` is true of, and the last.
    fn new(holds: impl Fn(u32) -> bool) -> Holding {
        let found = (1..MOST_DIGITS).filter(|&digits| holds(digits));
        Holding { mask: found.fold(1 << MOST_DIGITS, |mask, digits| mask | 1 << digits) }
    }

    /// Each of them, the smallest first.
    pub fn each(self) -> impl Iterator<Item = u32> {
        (1..=MOST_DIGITS).filter(move |digits| self.mask >> digits & 1 == 1)
    }

    /// The smallest.
    pub fn fewest(self) -> u32 {
        self.each().next().unwrap_or(MOST_DIGITS)
    }

    /// `7 digits or more`; `7, 8, 10 and 12 or more digits` where some in between do not hold.
    pub fn text(self) -> String {
        let mut each: Vec<u32> = self.each().collect();
        // From where on all do.
        let mut from = MOST_DIGITS;
        while each.len() > 1 && each[each.len() - 2] == from - 1 {
            from -= 1;
            each.pop();
        }
        each.pop();
        let more = if from < MOST_DIGITS { " or more" } else { "" };
        if each.is_empty() {
            return format!("{}{more}", digits_text(from));
        }
        let each: Vec<String> = each.iter().map(u32::to_string).collect();
        format!("{} and {from}{more} digits", each.join(", "))
    }
}

/// How the coefficients are rounded, and how few digits or bits would do.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Precision {
    /// Not at all.
    Full {
        /// The fewest digits that hold; `None` without a requirement.
        fewest: Option<u32>,
    },
    /// To as few significant decimal digits as hold every requirement.
    FewestDigits {
        /// So many.
        digits: u32,
    },
    /// To significant decimal digits as asked for.
    Digits {
        /// So many.
        digits: u32,
        /// Those that hold; `None` without a requirement.
        holding: Option<Holding>,
    },
    /// To words.
    Bits {
        /// So long.
        bits: u32,
        /// Whether that was asked for.
        is_asked: bool,
        /// The shortest that holds; `None` without a requirement, or where none does.
        fewest: Option<u32>,
        /// Whether there is a requirement.
        required: bool,
    },
}

impl Precision {
    /// What was asked for, `9 digits`; `None` where nothing was.
    pub fn asked(self) -> Option<String> {
        match self {
            Precision::Digits { digits, .. } => Some(digits_text(digits)),
            Precision::Bits { bits, is_asked: true, .. } => Some(bits_text(bits)),
            _ => None,
        }
    }

    /// What holds every requirement in its stead, `7 digits or more hold`; `None` where
    /// nothing was asked for, or nothing is known to hold.
    pub fn holding(self) -> Option<String> {
        match self {
            Precision::Digits { holding, .. } => holding.map(|holding| format!("{} hold", holding.text())),
            Precision::Bits { is_asked: true, fewest, .. } => fewest.map(shortest_text),
            _ => None,
        }
    }
}

/// `16 bits hold, and no fewer do`. Whether all longer words hold is not looked into.
fn shortest_text(bits: u32) -> String {
    format!("{} hold, and no fewer do", bits_text(bits))
}

/// `9 digits`, `1 digit`.
pub(super) fn digits_text(digits: u32) -> String {
    if digits == 1 { "1 digit".to_owned() } else { format!("{digits} digits") }
}

/// `16 bits`.
pub(super) fn bits_text(bits: u32) -> String {
    format!("{bits} bits")
}

/// Sections as they are written.
#[derive(Clone, Debug)]
pub struct Rounded {
    /// One pass of the cascade.
    pub sections: Vec<Section>,
    /// What they promise, without the times.
    pub bands: Vec<BandDesign>,
    /// What they do less well than those in full.
    pub losses: Vec<Loss>,
    /// The same sections as integers, with their scaling.
    pub words: Option<(Vec<Integers>, Scaling)>,
}

/// Rounds the sections of `reference` as `request` asks for, or as few digits as hold.
///
/// # Errors
/// [`ExportError::Lost`] and [`ExportError::NoWordLength`].
pub(super) fn round(reference: &Reference, request: &Request<'_>) -> Result<(Precision, Rounded), ExportError> {
    if request.form == Form::Fixed {
        return to_words(reference, request.bits);
    }
    let fewest = || fewest_digits(reference);
    let precision = match (request.digits, request.form) {
        (Some(digits), _) => Precision::Digits { digits, holding: holding_digits(reference) },
        (None, Form::Equation) => {
            fewest().map_or(Precision::Full { fewest: None }, |digits| Precision::FewestDigits { digits })
        }
        (None, _) => Precision::Full { fewest: fewest() },
    };
    let digits = match precision {
        Precision::Digits { digits, .. } | Precision::FewestDigits { digits } => digits,
        Precision::Full { .. } | Precision::Bits { .. } => MOST_DIGITS,
    };
    let sections = with_digits(reference, digits);
    let (bands, losses) = reference.hold(&sections);
    let refused = sentences(losses.iter().filter(|loss| loss.is_refused));
    if !refused.is_empty() {
        let (asked, holding) = (digits_text(digits), precision.holding());
        return Err(ExportError::Lost { asked, losses: refused, holding });
    }
    Ok((precision, Rounded { sections, bands, losses, words: None }))
}

/// The sections of `reference` with `digits` significant digits.
pub fn with_digits(reference: &Reference, digits: u32) -> Vec<Section> {
    reference.sections.iter().map(|section| rounding::to_digits(section, digits)).collect()
}

/// The smallest number of digits at which every requirement holds, from 1 on one by one:
/// rounding may well hold with 5, not with 6, and again with 7. `None` without a requirement.
pub fn fewest_digits(reference: &Reference) -> Option<u32> {
    let fewest = || (1..MOST_DIGITS).find(|&digits| holds(reference, digits)).unwrap_or(MOST_DIGITS);
    reference.has_requirements().then(fewest)
}

/// Every number of digits at which every requirement holds; `None` without a requirement.
///
/// A stage whose order was found from limits touches them, so that any rounding may cross one.
pub fn holding_digits(reference: &Reference) -> Option<Holding> {
    reference.has_requirements().then(|| Holding::new(|digits| holds(reference, digits)))
}

fn holds(reference: &Reference, digits: u32) -> bool {
    reference.hold(&with_digits(reference, digits)).1.is_empty()
}

fn to_words(reference: &Reference, asked: Option<u32>) -> Result<(Precision, Rounded), ExportError> {
    let found = shortest_words(reference);
    let fewest = found.as_ref().map(|(bits, _)| *bits);
    let (bits, rounded) = match (asked, found) {
        (Some(bits), _) => (bits, with_bits(reference, bits)),
        (None, Some((bits, rounded))) => (bits, Ok(rounded)),
        (None, None) => (MOST_BITS, with_bits(reference, MOST_BITS)),
    };
    let rate_hz = reference.rate_hz();
    let none = |losses: &[Loss]| ExportError::NoWordLength { rate_hz, reason: sentences(losses).join("; ") };
    match (asked, rounded) {
        (None, Err(losses)) => Err(none(&losses)),
        (None, Ok(rounded)) if !rounded.losses.is_empty() => Err(none(&rounded.losses)),
        (Some(_), Err(losses)) => {
            let losses = sentences(losses.iter().filter(|loss| loss.is_refused));
            Err(ExportError::Lost { asked: bits_text(bits), losses, holding: fewest.map(shortest_text) })
        }
        (_, Ok(rounded)) => {
            let required = reference.has_requirements();
            Ok((Precision::Bits { bits, is_asked: asked.is_some(), fewest, required }, rounded))
        }
    }
}

/// The shortest words at which every requirement holds and nothing can overflow, from 8 bits
/// on one by one; `None` without a requirement, or where none do.
pub fn shortest_words(reference: &Reference) -> Option<(u32, Rounded)> {
    if !reference.has_requirements() {
        return None;
    }
    (FEWEST_BITS..=MOST_BITS).find_map(|bits| {
        // Scaling takes longest, so the response is looked at first.
        let sections: Vec<Section> = words(reference, bits).iter().map(Integers::section).collect();
        if !reference.hold(&sections).1.is_empty() {
            return None;
        }
        let rounded = with_bits(reference, bits).ok()?;
        rounded.losses.is_empty().then_some((bits, rounded))
    })
}

/// The sections of `reference` in words of `bits` bits, scaled.
///
/// # Errors
/// What keeps them from being stable or from being scaled, or which requirement is out
/// of their reach.
pub fn with_bits(reference: &Reference, bits: u32) -> Result<Rounded, Vec<Loss>> {
    let words = words(reference, bits);
    let sections: Vec<Section> = words.iter().map(Integers::section).collect();
    let (bands, mut losses) = reference.hold(&sections);
    if losses.iter().any(|loss| loss.is_refused) {
        return Err(losses);
    }
    match scaling::scale(&words, bits, reference.passes()) {
        Ok(scaling) => {
            losses.extend(scaling.noise_dbfs.and_then(|noise_dbfs| reference.drowned(noise_dbfs)));
            Ok(Rounded { sections, bands, losses, words: Some((words, scaling)) })
        }
        Err(error) => Err(vec![Loss { sentence: error.to_string(), is_refused: true }]),
    }
}

fn words(reference: &Reference, bits: u32) -> Vec<Integers> {
    reference.sections.iter().map(|section| integers::to_integers(section, bits)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_of_digits_read_like_this() {
        let of = |numbers: &[u32]| Holding::new(|digits| numbers.contains(&digits)).text();
        assert_eq!(of(&(7..=17).collect::<Vec<_>>()), "7 digits or more");
        assert_eq!(of(&[7, 8, 10, 12, 13, 14, 15, 16]), "7, 8, 10 and 12 or more digits");
        assert_eq!(of(&[3, 16]), "3 and 16 or more digits");
        assert_eq!(of(&[5, 15]), "5, 15 and 17 digits");
        assert_eq!(of(&[]), "17 digits");
        assert_eq!(of(&(1..=17).collect::<Vec<_>>()), "1 digit or more");
    }
}
