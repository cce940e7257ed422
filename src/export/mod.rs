//! The cascade of a spec at one sample rate, written for other programs.
//!
//! [`rounding`] and [`integers`] bring coefficients to fewer digits or to words of so many
//! bits, [`holding`] says which requirements the rounded sections still hold, [`precision`]
//! looks for the fewest digits or bits, [`scaling`] keeps integers from overflowing. `head`
//! is what every form says about itself; the forms have a file each.
//!
//! # Which digits
//! `json`, `c`, `rust` and `numpy` carry each coefficient in full unless digits are asked
//! for: the shortest decimal that reads back as the same f64. `equation` and `fixed` take
//! the fewest digits, or bits, at which every requirement still [holds](holding), the
//! smallest number that does, whatever numbers beyond it do: where a stage touches a limit, 7
//! digits may hold it and 9 not. Without a requirement that is
//! every digit, or 32 bits.

mod c;
mod document;
mod equation;
mod fixed;
mod head;
pub mod holding;
pub mod integers;
mod json;
mod numpy;
pub mod precision;
pub mod rounding;
mod rust;
pub mod scaling;

use crate::design::auto::{self, AutoError};
use crate::design::{self, DesignError, placement};
use crate::spec::SpecFile;
use head::Head;
use holding::{Loss, Reference};

/// What the cascade is written as.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    /// Sections as JSON.
    Json,
    /// A C99 file with a block function.
    C,
    /// A Rust module with a block function.
    Rust,
    /// A Python file with the array that SciPy's `sosfilt` takes.
    Numpy,
    /// Difference equations, one line a section.
    Equation,
    /// Integers of a given word length, as JSON.
    Fixed,
}

impl Form {
    /// The word for it on the command line and in the forms.
    pub fn name(self) -> &'static str {
        match self {
            Form::Json => "json",
            Form::C => "c",
            Form::Rust => "rust",
            Form::Numpy => "numpy",
            Form::Equation => "equation",
            Form::Fixed => "fixed",
        }
    }
}

/// What to write.
#[derive(Clone, Copy, Debug)]
pub struct Request<'a> {
    /// The spec.
    pub spec: &'a SpecFile,
    /// Name of its file, for the form's head.
    pub file_name: &'a str,
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// As what.
    pub form: Form,
    /// Significant digits of the coefficients, 1 to 17; every form but `fixed`.
    pub digits: Option<u32>,
    /// Word length, 8 to 32 bits; `fixed` alone.
    pub bits: Option<u32>,
}

/// A cascade as text.
#[derive(Clone, Debug, PartialEq)]
pub struct Exported {
    /// The whole file.
    pub text: String,
    /// A sentence for each requirement that the rounded sections hold less well than those
    /// in full; empty unless digits or bits were asked for.
    pub weaker: Vec<String>,
}

/// Why a cascade can't be written. Nothing is written then.
#[derive(Debug, thiserror::Error)]
pub enum ExportError {
    /// `digits` asked of integers.
    #[error("fixed has no decimal digits; give its word length with --bits, or leave both out")]
    DigitsOfIntegers,
    /// `bits` asked of decimals.
    #[error("--bits is the word length of fixed, and {form} has decimal coefficients; give their digits with --digits")]
    BitsOfDecimals {
        /// The form that was asked for.
        form: &'static str,
    },
    /// No cascade is found for the bands.
    #[error(transparent)]
    Auto(#[from] AutoError),
    /// No design at this rate.
    #[error(transparent)]
    Design(#[from] DesignError),
    /// Requirements that the sections in full don't hold, a sentence each.
    #[error("{}", .0.join("\n"))]
    Impossible(Vec<String>),
    /// The rounded sections are unstable, or a requirement is out of their reach.
    #[error("{}", lost(.asked, .losses, .holding.as_deref()).join("\n"))]
    Lost {
        /// What was asked for: `3 digits`.
        asked: String,
        /// What it comes to, a sentence each.
        losses: Vec<String>,
        /// What holds, where there is such: `7 digits or more hold`.
        holding: Option<String>,
    },
    /// No word length holds.
    #[error(
        "at {rate_hz} Hz no word length up to {most} bits holds every requirement without overflow; with {most}: {reason}; \
         use a form with decimal coefficients, wider stages, or a lower sample rate",
        most = precision::MOST_BITS
    )]
    NoWordLength {
        /// Sample rate, Hz.
        rate_hz: u32,
        /// What fails at the largest word length.
        reason: String,
    },
    /// A figure that no form can carry.
    #[error("the sections can't be put into JSON: {0}")]
    Json(String),
}

/// A sentence for each loss, the last one with what holds.
fn lost(asked: &str, losses: &[String], holding: Option<&str>) -> Vec<String> {
    let mut sentences: Vec<_> = losses.iter().map(|loss| format!("with {asked}: {loss}")).collect();
    if let (Some(last), Some(holding)) = (sentences.last_mut(), holding) {
        last.push_str("; ");
        last.push_str(holding);
    }
    sentences
}

/// Writes the cascade of `request.spec` at `request.rate_hz`.
///
/// # Errors
/// Nothing can be designed, the design check finds a requirement `impossible` before or
/// after rounding, or rounding makes the cascade unstable.
pub fn export(request: &Request<'_>) -> Result<Exported, ExportError> {
    match request.form {
        Form::Fixed if request.digits.is_some() => return Err(ExportError::DigitsOfIntegers),
        Form::Fixed => {}
        form if request.bits.is_some() => return Err(ExportError::BitsOfDecimals { form: form.name() }),
        _ => {}
    }
    let spec = auto::resolve(&request.spec.spec, &[request.rate_hz])?;
    let design = design::design(&spec, request.rate_hz)?;
    let impossible = design.impossible();
    if !impossible.is_empty() {
        return Err(ExportError::Impossible(impossible));
    }
    let reference = Reference::new(&design, placement::place(&spec, request.rate_hz)?);
    let (precision, rounded) = precision::round(&reference, request)?;
    let head = Head::new(request, &design, &precision, &rounded);
    let text = match request.form {
        Form::Json => json::text(&head, &rounded.sections)?,
        Form::C => c::text(&head, &rounded.sections),
        Form::Rust => rust::text(&head, &rounded.sections),
        Form::Numpy => numpy::text(&head, &rounded.sections),
        Form::Equation => equation::text(&head, &rounded.sections),
        Form::Fixed => fixed::text(&head, &rounded)?,
    };
    let with = precision.asked().unwrap_or_default();
    let weaker = lost(&with, &sentences(&rounded.losses), precision.holding().as_deref());
    Ok(Exported { text, weaker })
}

/// The sentences of losses.
fn sentences<'a>(losses: impl IntoIterator<Item = &'a Loss>) -> Vec<String> {
    losses.into_iter().map(|loss| loss.sentence.clone()).collect()
}
