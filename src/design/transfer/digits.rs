//! To how many digits a transfer function is given.

use crate::spec::{AnalogStage, Coefficient, DigitalFilter, Root, Transfer};

/// More digits than this no f64 holds, whatever its size: 17 significant ones always do.
const MOST_SIGNIFICANT: i32 = 17;

/// How the numbers of a stage are given that are not exact.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Digits {
    style: Style,
    /// How many digits can be added before the largest number has 17.
    pub room: i32,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Style {
    /// All to as many decimals.
    Decimals(i32),
    /// All to as many significant digits.
    Significant(i32),
    /// From so many significant digits to so many.
    Mixed(i32, i32),
}

impl Digits {
    /// `None` where all numbers are exact.
    pub fn new(numbers: &[Coefficient]) -> Option<Digits> {
        let rounded: Vec<&Coefficient> = numbers.iter().filter(|c| c.unit.is_finite() && c.unit > 0.0).collect();
        let decimals: Vec<i32> = rounded.iter().map(|c| -(libm::round(libm::log10(c.unit)) as i32)).collect();
        let significant: Vec<i32> = rounded
            .iter()
            .zip(&decimals)
            .filter(|(c, _)| c.value != 0.0)
            .map(|(c, decimals)| libm::floor(libm::log10(c.value.abs())) as i32 + 1 + decimals)
            .collect();
        let (first, same) = (*decimals.first()?, |all: &[i32]| all.windows(2).all(|two| two[0] == two[1]));
        let (least, most) = (significant.iter().min().copied(), significant.iter().max().copied());
        let style = match (least, most) {
            _ if same(&decimals) && first > 0 => Style::Decimals(first),
            (Some(least), Some(most)) if least == most => Style::Significant(least),
            (Some(least), Some(most)) => Style::Mixed(least, most),
            _ => Style::Decimals(first),
        };
        Some(Digits { style, room: (MOST_SIGNIFICANT - most.unwrap_or(0)).max(0) })
    }

    /// `coefficients are given to 4 decimals`.
    pub fn given(self) -> String {
        let how = match self.style {
            Style::Decimals(count) => counted(count, "decimal"),
            Style::Significant(count) => counted(count, "significant digit"),
            Style::Mixed(least, most) => format!("{least} to {most} significant digits"),
        };
        format!("coefficients are given to {how}")
    }

    /// `7 decimals` for three more.
    pub fn more(self, more: i32) -> String {
        match self.style {
            Style::Decimals(count) => counted(count + more, "decimal"),
            Style::Significant(count) => counted(count + more, "significant digit"),
            Style::Mixed(..) => format!("{} more", counted(more, "digit")),
        }
    }
}

fn counted(count: i32, what: &str) -> String {
    if count == 1 { format!("1 {what}") } else { format!("{count} {what}s") }
}

/// All numbers of a stage in z.
pub(super) fn of_digital(stage: &DigitalFilter) -> Vec<Coefficient> {
    match stage {
        DigitalFilter::Transfer(transfer) => of_transfer(transfer),
        DigitalFilter::Sections(sections) => sections.iter().flat_map(|s| s.b.into_iter().chain(s.a)).collect(),
    }
}

/// All numbers of a stage in s.
pub(super) fn of_analog(stage: &AnalogStage) -> Vec<Coefficient> {
    of_transfer(&stage.transfer)
}

fn of_transfer(transfer: &Transfer) -> Vec<Coefficient> {
    match transfer {
        Transfer::Polynomials { numerator, denominator } => numerator.iter().chain(denominator).copied().collect(),
        Transfer::Roots { zeros, poles, gain } => {
            let parts = |roots: &[Root]| roots.iter().flat_map(|root| [root.re, root.im]).collect::<Vec<_>>();
            [parts(zeros), parts(poles), vec![*gain]].concat()
        }
    }
}
