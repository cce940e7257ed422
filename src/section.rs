//! The second-order section: what `design` makes and `cascade` runs.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// One second-order section.
///
/// ```text
///         b[0] + b[1] z^-1 + b[2] z^-2
/// H(z) = ------------------------------
///         a[0] + a[1] z^-1 + a[2] z^-2
///
/// y[n] = b[0] x[n] + b[1] x[n-1] + b[2] x[n-2] - a[1] y[n-1] - a[2] y[n-2]
/// ```
///
/// `a[0]` is always 1. The denominator's signs are those of H(z): a source that
/// prints feedback coefficients to be *added* has `-a[1]`, `-a[2]`. A first-order
/// section has `b[2] == 0` and `a[2] == 0`.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Section {
    /// Numerator, constant term first, in powers of z^-1.
    pub b: [f64; 3],
    /// Denominator, constant term first, in powers of z^-1; the first is 1.
    #[schemars(extend("prefixItems" = [{"const": 1.0}]))]
    pub a: [f64; 3],
}
