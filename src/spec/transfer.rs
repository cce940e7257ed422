//! A user's own transfer functions in a normalized spec.

/// A number of a user's transfer function, with the place of its last given digit.
///
/// A normalized spec has it with as many digits, zeros at its end and all: `0.7050` has the
/// unit 1e-4, and reads the same again. A spec in a report or another JSON document is without
/// such zeros, since those are put together from values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Coefficient {
    /// The number.
    pub value: f64,
    /// One unit of the last digit that was written: 1e-4 for `0.7051`, 1e-8 for
    /// `7.738860E-02`; 0 for numbers with a whole value (`1`, `2.0`), which count as exact.
    pub unit: f64,
}

impl Coefficient {
    /// The number with as many digits as tell it from its neighbors.
    pub fn shortest(value: f64) -> Self {
        Self::written(&format!("{value:e}"), value)
    }

    /// The number `value` that was written as `literal`: decimal digits with or without a
    /// point and an exponent, and no separators.
    pub(super) fn written(literal: &str, value: f64) -> Self {
        let unit = if value.fract() == 0.0 { 0.0 } else { last_place(literal).unwrap_or(0.0) };
        Self { value, unit }
    }

    /// The number in TOML and JSON, with the last digit that [`Coefficient::unit`] says; in its
    /// shortest form where that says nothing, or is not the place of a digit.
    pub(crate) fn literal(&self) -> String {
        let shortest = || serde_json::to_string(&self.value).unwrap_or_else(|_| format!("{:e}", self.value));
        self.with_last_place().unwrap_or_else(shortest)
    }

    fn with_last_place(&self) -> Option<String> {
        let power_of = |number: f64| -> Option<i32> { format!("{number:e}").split_once('e')?.1.parse().ok() };
        if !(self.unit > 0.0 && self.value.is_finite()) {
            return None;
        }
        let (places, power) = (-power_of(self.unit)?, power_of(self.value)?);
        let text = if (-5..15).contains(&power) {
            format!("{:.*}", usize::try_from(places).ok()?, self.value)
        } else {
            format!("{:.*e}", usize::try_from(power + places).ok()?, self.value)
        };
        // Too few digits for the number, or a unit that is no power of ten.
        (Self::written(&text, text.parse().ok()?) == *self).then_some(text)
    }
}

/// One unit of the last digit of a decimal number; nothing of what is none.
fn last_place(literal: &str) -> Option<f64> {
    let (digits, exponent) = match literal.split_once(['e', 'E']) {
        Some((digits, exponent)) => (digits, exponent.parse::<i64>().ok()?),
        None => (literal, 0),
    };
    let places = digits.split_once('.').map_or(0, |(_, fraction)| fraction.len());
    let exponent = exponent.checked_sub(i64::try_from(places).ok()?)?;
    format!("1e{exponent}").parse().ok()
}

/// A zero or pole of a user's transfer function. A root off the real axis stands in its list
/// together with its conjugate; both parts of the two are equal within half a unit of their
/// last given digits, and need not be equal to the last bit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Root {
    /// Real part.
    pub re: Coefficient,
    /// Imaginary part.
    pub im: Coefficient,
}

/// A transfer function as a user writes it.
#[derive(Clone, Debug, PartialEq)]
pub enum Transfer {
    /// `numerator` and `denominator`: of a digital stage in powers of z^-1, constant term
    /// first; of an analog one in powers of s in rad/s, highest first. Each has 1 to 64
    /// coefficients, not all of them 0; the first of the denominator is not 0. The degree of
    /// an analog numerator, without zeros in front, is at most that of its denominator.
    Polynomials {
        /// Numerator.
        numerator: Vec<Coefficient>,
        /// Denominator.
        denominator: Vec<Coefficient>,
    },
    /// `zeros`, `poles` and `gain`: of an analog stage gain times the product of (s - zero)
    /// over that of (s - pole), with at least one pole; of a digital one gain times the
    /// product of (z - zero) over that of (z - pole), so that each zero fewer than there are
    /// poles delays by one sample. There are no more zeros than poles.
    Roots {
        /// Zeros, 64 at most.
        zeros: Vec<Root>,
        /// Poles, 64 at most.
        poles: Vec<Root>,
        /// Gain, not 0.
        gain: Coefficient,
    },
}

/// A stage that is given in z.
#[derive(Clone, Debug, PartialEq)]
pub struct DigitalStage {
    /// The transfer function.
    pub filter: DigitalFilter,
    /// The sample rate that the coefficients are for, Hz, 1 or more: a design for any other is
    /// an error. Without it they are the same at every rate, and the response moves with it.
    pub rate_hz: Option<u32>,
}

/// A transfer function in z.
#[derive(Clone, Debug, PartialEq)]
pub enum DigitalFilter {
    /// Polynomials, or roots.
    Transfer(Transfer),
    /// `sections`, as in the report, 1 to 64 of them; `a[0]` is not 0 and need not be 1, and
    /// `b` is not all 0.
    Sections(Vec<WrittenSection>),
}

impl DigitalStage {
    /// The word for this kind of stage in spec and report.
    pub const KIND_NAME: &str = "digital";
}

/// A second-order section as a user writes it, see [`crate::section::Section`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WrittenSection {
    /// Numerator, constant term first, in powers of z^-1.
    pub b: [Coefficient; 3],
    /// Denominator likewise.
    pub a: [Coefficient; 3],
}

/// A transfer function in s, brought to z by the bilinear transform.
#[derive(Clone, Debug, PartialEq)]
pub struct AnalogStage {
    /// The transfer function.
    pub transfer: Transfer,
    /// What s is counted in where roots are given; [`RootUnit::RadiansPerSecond`] for
    /// polynomials.
    pub unit: RootUnit,
    /// Frequency at which the digital response is that of the transfer function, Hz: the
    /// transform is prewarped for it. Without it, it agrees at 0 Hz alone.
    pub match_hz: Option<f64>,
}

impl AnalogStage {
    /// The word for this kind of stage in spec and report.
    pub const KIND_NAME: &str = "analog";
}

/// What s is counted in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RootUnit {
    /// `zeros`, `poles`: s = j 2 pi f.
    RadiansPerSecond,
    /// `zeros_hz`, `poles_hz`: s = j f; the gain belongs to this s.
    Hertz,
}
