//! Which zeros go with which poles.

use crate::design::transform::{Analog, Poles, Zeros};

/// A section before it has coefficients.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Unit {
    pub poles: Poles,
    pub zeros: Zeros,
}

/// Pairs every pole pair, the least damped first, with the zeros nearest in log W: the
/// peak such a pole pair makes is then cut most by its own zeros. A single pole keeps
/// the single zero that stands in its place.
pub(super) fn pair(analog: &Analog) -> Vec<Unit> {
    let mut units = Vec::with_capacity(analog.poles.len());
    let (mut pairs, mut free) = (Vec::new(), Vec::new());
    for (&poles, &zeros) in analog.poles.iter().zip(&analog.zeros) {
        match poles {
            Poles::One { .. } => units.push(Unit { poles, zeros }),
            Poles::Two { half_sum, product } => {
                // Squared cosine of the angle to the negative real axis: above 1 for
                // two real poles.
                pairs.push((half_sum.hi * half_sum.hi / product.hi, product.hi, poles));
                free.push(zeros);
            }
        }
    }
    pairs.sort_by(|a, b| a.0.total_cmp(&b.0));
    for (_, product, poles) in pairs {
        let nearest = free.iter().enumerate().min_by(|a, b| far(*a.1, product).total_cmp(&far(*b.1, product)));
        if let Some((index, &zeros)) = nearest {
            // The order of the others decides ties: keep it.
            free.remove(index);
            units.push(Unit { poles, zeros });
        }
    }
    units
}

/// Distance between zeros and a pole pair in log W, as a ratio of squares of 1 or more.
fn far(zeros: Zeros, product: f64) -> f64 {
    match zeros {
        Zeros::Pair { square } => (square.hi / product).max(product / square.hi),
        Zeros::AtInfinity | Zeros::AtZero | Zeros::AtBoth => f64::INFINITY,
    }
}
