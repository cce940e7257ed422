//! The best step of a linearized search: a small linear program, solved by the simplex
//! method on a dense table.
//!
//! G. B. Dantzig, Linear Programming and Extensions, 1963; Bland's rule (R. G. Bland, 1977)
//! ends what would go round in circles. Both from memory.

/// Below this a figure of the table counts as 0.
const TINY: f64 = 1e-11;

/// The step d that makes the least of `slacks[i] + gradients[i] . d` largest, where
/// `low[j] <= d[j] <= high[j]`, and that least slack. `low` is not above `high`.
///
/// In u = d - low and t = t0 + v, with t0 the least slack at u = 0, every right side is 0
/// or more and u = 0, v = 0 is a corner to start from.
pub fn best_step(slacks: &[f64], gradients: &[Vec<f64>], low: &[f64], high: &[f64]) -> (Vec<f64>, f64) {
    let dimensions = low.len();
    let at_low: Vec<f64> = slacks
        .iter()
        .zip(gradients)
        .map(|(slack, gradient)| slack + gradient.iter().zip(low).map(|(g, l)| g * l).sum::<f64>())
        .collect();
    let start = at_low.iter().copied().fold(f64::INFINITY, f64::min);
    let mut rows: Vec<Row> = at_low
        .iter()
        .zip(gradients)
        .map(|(slack, gradient)| Row { right: slack - start, left: gradient.iter().map(|g| -g).chain([1.0]).collect() })
        .collect();
    rows.extend((0..dimensions).map(|own| Row {
        right: high[own] - low[own],
        left: (0..=dimensions).map(|other| if other == own { 1.0 } else { 0.0 }).collect(),
    }));
    let mut table = Table::new(rows, dimensions);
    table.solve();
    let values = table.values();
    let step = values.iter().zip(low).zip(high).map(|((u, l), h)| (u + l).clamp(*l, *h)).collect();
    (step, start + values[dimensions])
}

/// `left . x <= right`.
struct Row {
    left: Vec<f64>,
    right: f64,
}

/// Each row's own variable is `right - left . (variables at 0)`.
struct Table {
    rows: Vec<Row>,
    /// What the objective gains for each variable at 0.
    gains: Vec<f64>,
    /// Which variable is at 0 in each column: below the number of columns the ones sought,
    /// from there on those of the rows.
    columns: Vec<usize>,
    /// Which variable each row stands for.
    owners: Vec<usize>,
}

impl Table {
    /// The objective is the last of `dimensions + 1` variables.
    fn new(rows: Vec<Row>, dimensions: usize) -> Table {
        let count = dimensions + 1;
        Table {
            gains: (0..count).map(|j| if j == dimensions { 1.0 } else { 0.0 }).collect(),
            columns: (0..count).collect(),
            owners: (count..count + rows.len()).collect(),
            rows,
        }
    }

    fn solve(&mut self) {
        let patience = 20 + 3 * self.columns.len();
        for turn in 0..20 * patience {
            let rising = (0..self.gains.len()).filter(|&j| self.gains[j] > TINY);
            let column = if turn < patience {
                rising.max_by(|&i, &j| self.gains[i].total_cmp(&self.gains[j]))
            } else {
                rising.min_by_key(|&j| self.columns[j])
            };
            let Some(column) = column else { return };
            let row = (0..self.rows.len()).filter(|&i| self.rows[i].left[column] > TINY).min_by(|&i, &j| {
                let ratio = |i: usize| self.rows[i].right / self.rows[i].left[column];
                ratio(i).total_cmp(&ratio(j)).then(self.owners[i].cmp(&self.owners[j]))
            });
            let Some(row) = row else { return };
            self.exchange(row, column);
        }
    }

    fn exchange(&mut self, row: usize, column: usize) {
        let pivot = self.rows[row].left[column];
        let own = &mut self.rows[row];
        for left in &mut own.left {
            *left /= pivot;
        }
        own.left[column] = 1.0 / pivot;
        own.right /= pivot;
        let pivot_row = Row { left: self.rows[row].left.clone(), right: self.rows[row].right };
        let eliminate = |left: &mut [f64]| {
            let factor = left[column];
            if factor != 0.0 {
                left[column] = 0.0;
                left.iter_mut().zip(&pivot_row.left).for_each(|(value, by)| *value -= factor * by);
            }
            factor
        };
        for (index, other) in self.rows.iter_mut().enumerate() {
            if index != row {
                let factor = eliminate(&mut other.left);
                // Rounding must not make a right side negative.
                other.right = (other.right - factor * pivot_row.right).max(0.0);
            }
        }
        eliminate(&mut self.gains);
        std::mem::swap(&mut self.columns[column], &mut self.owners[row]);
    }

    fn values(&self) -> Vec<f64> {
        let mut values = vec![0.0; self.columns.len()];
        for (owner, row) in self.owners.iter().zip(&self.rows) {
            if let Some(value) = values.get_mut(*owner) {
                *value = row.right;
            }
        }
        values
    }
}

#[cfg(test)]
mod tests {
    use super::best_step;

    #[test]
    fn two_slopes_meet_where_they_are_equal() {
        // 1 + d and 3 - d are equal at d = 1.
        let (step, least) = best_step(&[1.0, 3.0], &[vec![1.0], vec![-1.0]], &[-2.0], &[2.0]);
        assert!((step[0] - 1.0).abs() < 1e-12 && (least - 2.0).abs() < 1e-12, "{step:?} {least}");
        // Out of reach: as far as allowed.
        let (step, least) = best_step(&[1.0, 3.0], &[vec![1.0], vec![-1.0]], &[-0.5], &[0.5]);
        assert!((step[0] - 0.5).abs() < 1e-12 && (least - 1.5).abs() < 1e-12, "{step:?} {least}");
    }

    #[test]
    fn three_planes_meet_in_a_corner() {
        // min(x, y, 3 - x - y) is largest, 1, at x = y = 1.
        let gradients = [vec![1.0, 0.0], vec![0.0, 1.0], vec![-1.0, -1.0]];
        let (step, least) = best_step(&[0.0, 0.0, 3.0], &gradients, &[-5.0, -5.0], &[5.0, 5.0]);
        assert!(step.iter().all(|d| (d - 1.0).abs() < 1e-12) && (least - 1.0).abs() < 1e-12, "{step:?} {least}");
    }

    #[test]
    fn it_is_never_worse_than_any_step_of_a_fine_grid() {
        // A fixed hash of the index stands for a random number.
        let number = |i: u32| f64::from(i.wrapping_mul(2_654_435_761) >> 8) / f64::from(1 << 24) - 0.5;
        for case in 0..50 {
            let slacks: Vec<f64> = (0..12).map(|i| number(100 * case + i)).collect();
            let gradients: Vec<Vec<f64>> =
                (0..12).map(|i| vec![number(100 * case + 20 + i), number(100 * case + 40 + i)]).collect();
            let least = |x: f64, y: f64| {
                let slack = slacks.iter().zip(&gradients).map(|(s, g)| s + g[0] * x + g[1] * y);
                slack.fold(f64::INFINITY, f64::min)
            };
            let (step, found) = best_step(&slacks, &gradients, &[-1.0, -0.3], &[0.7, 1.0]);
            assert!((least(step[0], step[1]) - found).abs() < 1e-9);
            for i in 0..=40 {
                for j in 0..=40 {
                    let (x, y) = (-1.0 + 1.7 * f64::from(i) / 40.0, -0.3 + 1.3 * f64::from(j) / 40.0);
                    assert!(least(x, y) <= found + 1e-12);
                }
            }
        }
    }
}
