//! Turning the figures of a cascade until its least slack is as large as can be.
//!
//! The least of many smooth functions has no gradient at its top, where several of them are
//! equal. So each step solves the linearized problem for all points at once within a trust
//! region, which grows where the linear forecast comes true and shrinks where it does not.
//! K. Madsen, An algorithm for minimax solution of overdetermined systems of non-linear
//! equations, J. Inst. Maths Applics 16 (1975), from memory.

use super::linear;
use super::points::Points;
use super::slot::Slot;
use crate::spec::Phase;
use rayon::prelude::*;

/// Step of the differences that stand for gradients, in steps of a parameter.
const DIFFERENCE: f64 = 1e-5;
/// First trust region, in steps of a parameter.
const FIRST_RADIUS: f64 = 0.5;
/// It does not grow beyond this.
const LARGEST_RADIUS: f64 = 2.0;
/// Below this the top is reached.
const SMALLEST_RADIUS: f64 = 1e-5;
/// A forecast of less than this is none, nepers.
const NO_GAIN: f64 = 1e-6;
/// Steps at most.
const MOST_STEPS: usize = 60;

/// A cascade held against points.
#[derive(Clone, Debug)]
pub struct Cascade {
    /// Its stages.
    pub slots: Vec<Slot>,
    /// Attenuation of each slot at each point, dB.
    tables: Vec<Vec<f64>>,
}

impl Cascade {
    /// With the present figures of `slots`; `None` where one of them is no filter.
    pub fn new(slots: Vec<Slot>, points: &Points, phase: Phase) -> Option<Cascade> {
        let tables: Option<Vec<Vec<f64>>> =
            slots.iter().map(|slot| slot.attenuations(&slot.values(), points, phase)).collect();
        Some(Cascade { tables: tables?, slots })
    }

    /// Second-order sections.
    pub fn sections(&self) -> u32 {
        self.slots.iter().map(Slot::sections).sum()
    }

    /// The least slack over all points, nepers.
    pub fn least_slack(&self, points: &Points) -> f64 {
        slacks(&self.sum(points.all.len()), points).fold(f64::INFINITY, f64::min)
    }

    fn sum(&self, count: usize) -> Vec<f64> {
        let mut sum = vec![0.0; count];
        for table in &self.tables {
            sum.iter_mut().zip(table).for_each(|(sum, own)| *sum += own);
        }
        sum
    }

    /// Turns the figures until the least slack is `enough` or can't be raised; returns it.
    pub fn climb(&mut self, points: &Points, phase: Phase, enough: f64) -> f64 {
        let mut least = self.least_slack(points);
        let mut radius = FIRST_RADIUS;
        for _ in 0..MOST_STEPS {
            if least >= enough || radius < SMALLEST_RADIUS {
                break;
            }
            let linear = self.linearized(points, phase);
            // The gradients stay while only the region shrinks.
            loop {
                let (step, forecast) = linear.step(radius);
                if forecast - least < NO_GAIN {
                    return least;
                }
                let moved = self.moved(&step, points, phase);
                let reached = moved.as_ref().map_or(f64::NEG_INFINITY, |moved| moved.least_slack(points));
                let kept = (reached - least) / (forecast - least);
                if kept > 0.1 {
                    if let Some(moved) = moved {
                        *self = moved;
                    }
                    least = reached;
                    if kept > 0.7 {
                        radius = (2.0 * radius).min(LARGEST_RADIUS);
                    } else if kept < 0.3 {
                        radius *= 0.5;
                    }
                    break;
                }
                radius *= 0.3;
                if radius < SMALLEST_RADIUS {
                    return least;
                }
            }
        }
        least
    }

    fn moved(&self, step: &[f64], points: &Points, phase: Phase) -> Option<Cascade> {
        let mut moved = self.clone();
        let mut steps = step.iter();
        for (slot, table) in moved.slots.iter_mut().zip(&mut moved.tables) {
            let mut turned = false;
            for (parameter, step) in slot.parameters.iter_mut().zip(&mut steps) {
                let value = parameter.moved(*step);
                turned |= value != parameter.value;
                parameter.value = value;
            }
            if turned {
                *table = slot.attenuations(&slot.values(), points, phase)?;
            }
        }
        Some(moved)
    }

    fn linearized(&self, points: &Points, phase: Phase) -> Linear {
        let sum = self.sum(points.all.len());
        let slacks: Vec<f64> = slacks(&sum, points).collect();
        let slots = self.slots.iter().zip(&self.tables);
        let figures: Vec<_> =
            slots.flat_map(|(slot, table)| (0..slot.parameters.len()).map(move |index| (slot, table, index))).collect();
        let along = |(slot, table, index): (&Slot, &Vec<f64>, usize)| {
            let parameter = &slot.parameters[index];
            let (down, up) = parameter.reach();
            let difference = if up > DIFFERENCE { DIFFERENCE } else { -DIFFERENCE };
            let mut values = slot.values();
            values[index] = parameter.moved(difference);
            let column = match slot.attenuations(&values, points, phase) {
                Some(other) => {
                    let own = sum.iter().zip(table).zip(&other).zip(&points.all).zip(&slacks);
                    own.map(|((((sum, before), after), point), slack)| {
                        (point.slack(sum + (after - before)) - slack) / difference
                    })
                    .collect()
                }
                None => vec![0.0; slacks.len()],
            };
            (column, (down, up))
        };
        let (columns, reach) = figures.into_par_iter().map(along).unzip();
        Linear { slacks, columns, reach }
    }
}

fn slacks<'a>(sum: &'a [f64], points: &'a Points) -> impl Iterator<Item = f64> + 'a {
    sum.iter().zip(&points.all).map(|(attenuation_db, point)| point.slack(*attenuation_db))
}

/// Slacks and their slopes along each figure.
struct Linear {
    slacks: Vec<f64>,
    columns: Vec<Vec<f64>>,
    reach: Vec<(f64, f64)>,
}

impl Linear {
    /// The best step within `radius`, and the least slack it forecasts.
    fn step(&self, radius: f64) -> (Vec<f64>, f64) {
        let low: Vec<f64> = self.reach.iter().map(|reach| reach.0.max(-radius)).collect();
        let high: Vec<f64> = self.reach.iter().map(|reach| reach.1.min(radius)).collect();
        let spread = |index: usize| {
            let farthest = low.iter().zip(&high).map(|(low, high)| high.max(-low));
            self.columns.iter().zip(farthest).map(|(column, far)| (column[index] * far).abs()).sum::<f64>()
        };
        let spreads: Vec<f64> = (0..self.slacks.len()).map(spread).collect();
        let ceiling =
            self.slacks.iter().zip(&spreads).map(|(slack, spread)| slack + spread).fold(f64::INFINITY, f64::min);
        // Whatever can't come down to what the lowest may rise to has no say.
        let (mut slacks, mut gradients) = (Vec::new(), Vec::new());
        for (index, (slack, spread)) in self.slacks.iter().zip(&spreads).enumerate() {
            if slack - spread <= ceiling {
                slacks.push(*slack);
                gradients.push(self.columns.iter().map(|column| column[index]).collect());
            }
        }
        linear::best_step(&slacks, &gradients, &low, &high)
    }
}
