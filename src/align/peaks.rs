//! Which of many peaks is the delay.

use std::ops::Range;

/// Values whose largest magnitude is kept together.
const BLOCK: usize = 256;

/// The values of a correlation, with what makes searching a million of them quick.
#[derive(Debug)]
pub(super) struct Correlation<'a> {
    values: &'a [f32],
    /// The largest magnitude of each block.
    blocks: Vec<f32>,
}

/// The chosen extremum of a correlation, and what else it could have been.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Peak {
    /// Its index.
    pub(super) index: usize,
    /// The index of another extremum of practically the same height, the nearest to lag 0
    /// of those further away than asked for.
    pub(super) rival: Option<usize>,
}

impl<'a> Correlation<'a> {
    pub(super) fn new(values: &'a [f32]) -> Self {
        Self { values, blocks: values.chunks(BLOCK).map(largest).collect() }
    }

    /// The largest magnitude.
    pub(super) fn height(&self) -> f32 {
        largest(&self.blocks)
    }

    /// The largest magnitude outside a range.
    pub(super) fn height_outside(&self, range: &Range<usize>) -> f32 {
        let blocks = self.blocks.iter().zip(self.values.chunks(BLOCK)).enumerate();
        let outside = blocks.map(|(number, (block, values))| {
            let start = number * BLOCK;
            if range.start >= start + values.len() || range.end <= start {
                return *block;
            }
            let cut = |index: usize| index.saturating_sub(start).min(values.len());
            largest(&values[..cut(range.start)]).max(largest(&values[cut(range.end)..]))
        });
        outside.fold(0.0, f32::max)
    }

    /// Mean of the squares outside a range.
    pub(super) fn mean_square_outside(&self, range: &Range<usize>) -> f64 {
        let (below, above) = (&self.values[..range.start], &self.values[range.end..]);
        (energy(below) + energy(above)) / (below.len() + above.len()).max(1) as f64
    }

    /// The largest `|values[i]|`; among local extrema that are lower by at most
    /// the share `tolerance`, the one of smallest `|lag(i)|`. Extrema within `apart` of the
    /// chosen one are no rivals.
    pub(super) fn choose(&self, tolerance: f64, apart: usize, lag: impl Fn(usize) -> f64) -> Option<Peak> {
        let highest = self.height();
        if highest.is_nan() || highest <= 0.0 {
            return None;
        }
        let enough = (f64::from(highest) * (1.0 - tolerance)) as f32;
        let candidates: Vec<usize> = self.extrema(enough).collect();
        let nearest = |apart_from: Option<usize>| {
            let far = candidates.iter().filter(|i| apart_from.is_none_or(|from| i.abs_diff(from) > apart));
            far.min_by(|a, b| lag(**a).abs().total_cmp(&lag(**b).abs())).copied()
        };
        let index = nearest(None)?;
        Some(Peak { index, rival: nearest(Some(index)) })
    }

    /// One value; 0 beyond the ends.
    pub(super) fn value(&self, index: usize) -> f32 {
        self.values.get(index).copied().unwrap_or(0.0)
    }

    /// Local extrema of at least this magnitude.
    pub(super) fn extrema(&self, enough: f32) -> impl Iterator<Item = usize> {
        let magnitude = |i: usize| self.value(i).abs();
        let blocks = self.blocks.iter().enumerate().filter(move |(_, block)| **block >= enough);
        let indices = blocks.flat_map(|(number, _)| number * BLOCK..((number + 1) * BLOCK).min(self.values.len()));
        indices.filter(move |i| {
            let (here, before) = (magnitude(*i), if *i == 0 { 0.0 } else { magnitude(i - 1) });
            here >= enough && here >= before && here > magnitude(i + 1)
        })
    }
}

/// The largest magnitude, in lanes for speed.
fn largest(values: &[f32]) -> f32 {
    let (chunks, rest) = values.as_chunks::<8>();
    let mut lanes = [0.0_f32; 8];
    for chunk in chunks {
        for (lane, value) in lanes.iter_mut().zip(chunk) {
            *lane = if value.abs() > *lane { value.abs() } else { *lane };
        }
    }
    lanes.iter().chain(rest).fold(0.0, |largest, value| largest.max(value.abs()))
}

/// Sum of squares: f32 within a block, f64 over blocks.
fn energy(values: &[f32]) -> f64 {
    let block = |values: &[f32]| {
        let (chunks, rest) = values.as_chunks::<8>();
        let mut lanes = [0.0_f32; 8];
        for chunk in chunks {
            for (lane, value) in lanes.iter_mut().zip(chunk) {
                *lane += value * value;
            }
        }
        lanes.iter().map(|lane| f64::from(*lane)).sum::<f64>() + rest.iter().map(|v| f64::from(v * v)).sum::<f64>()
    };
    values.chunks(BLOCK).map(block).sum()
}

/// Offset of a parabola's vertex through three neighbors from the middle one, -1/2 to 1/2.
pub(super) fn vertex(before: f64, here: f64, after: f64) -> f64 {
    let curve = before - 2.0 * here + after;
    let offset = 0.5 * (before - after) / curve;
    if offset.is_finite() { offset.clamp(-0.5, 0.5) } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn wave(period: usize, count: usize) -> Vec<f32> {
        (0..count).map(|i| if i % period == 7 { 1.0 } else { 0.0 }).collect()
    }

    #[test]
    fn of_equal_peaks_the_nearest_is_chosen_and_the_next_named() {
        let mut values = wave(100, 3000);
        values[2307] = -1.004;
        let peak = Correlation::new(&values).choose(0.01, 50, |i| i as f64 - 1290.0);
        assert_eq!(peak, Some(Peak { index: 1307, rival: Some(1207) }));
        let peak = Correlation::new(&values).choose(0.001, 50, |i| i as f64 - 1290.0);
        assert_eq!(peak, Some(Peak { index: 2307, rival: None }));
    }

    #[test]
    fn what_lies_outside_a_range_is_measured_there() {
        let mut values = vec![0.5; 2000];
        values[700] = -3.0;
        values[5] = 0.75;
        let correlation = Correlation::new(&values);
        assert_eq!((correlation.height(), correlation.height_outside(&(692..709))), (3.0, 0.75));
        let expected = (1982.0 * 0.25 + 0.5625) / 1983.0;
        assert!((correlation.mean_square_outside(&(692..709)) - expected).abs() < 1e-7);
    }

    #[test]
    fn nothing_has_no_peak() {
        assert_eq!(Correlation::new(&[]).choose(0.01, 0, |i| i as f64), None);
        assert_eq!(Correlation::new(&[0.0; 9]).choose(0.01, 0, |i| i as f64), None);
    }
}
