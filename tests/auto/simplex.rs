//! The simplex method of J. A. Nelder and R. Mead (1965, from memory).

/// Numbers from -1 to 1, the same every time.
pub struct Random(pub u64);

impl Random {
    pub fn next(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    }
}

/// Where `cost` is least, as found from `begin` with a simplex of `size`; ends early below 0.
pub fn simplex(begin: &[f64], size: f64, evaluations: usize, cost: &dyn Fn(&[f64]) -> f64) -> (Vec<f64>, f64) {
    let dimensions = begin.len();
    let mut corners: Vec<(Vec<f64>, f64)> = (0..=dimensions)
        .map(|index| {
            let mut x = begin.to_vec();
            if index > 0 {
                x[index - 1] += size;
            }
            let value = cost(&x);
            (x, value)
        })
        .collect();
    let mut spent = corners.len();
    while spent < evaluations {
        corners.sort_by(|a, b| a.1.total_cmp(&b.1));
        let (best, worst) = (corners[0].1, corners[dimensions].1);
        if best <= 0.0 || worst - best < 1e-7 {
            break;
        }
        let middle: Vec<f64> = (0..dimensions)
            .map(|j| corners[..dimensions].iter().map(|corner| corner.0[j]).sum::<f64>() / dimensions as f64)
            .collect();
        let along = |factor: f64| -> (Vec<f64>, f64) {
            let x: Vec<f64> = middle
                .iter()
                .zip(&corners[dimensions].0)
                .map(|(middle, worst)| middle + factor * (middle - worst))
                .collect();
            let value = cost(&x);
            (x, value)
        };
        let reflected = along(1.0);
        spent += 1;
        if reflected.1 < best {
            let expanded = along(2.0);
            spent += 1;
            corners[dimensions] = if expanded.1 < reflected.1 { expanded } else { reflected };
        } else if reflected.1 < corners[dimensions - 1].1 {
            corners[dimensions] = reflected;
        } else {
            let contracted = along(if reflected.1 < worst { 0.5 } else { -0.5 });
            spent += 1;
            if contracted.1 < worst.min(reflected.1) {
                corners[dimensions] = contracted;
            } else {
                let first = corners[0].0.clone();
                for corner in &mut corners[1..] {
                    corner.0.iter_mut().zip(&first).for_each(|(x, best)| *x = 0.5 * (*x + best));
                    corner.1 = cost(&corner.0);
                }
                spent += dimensions;
            }
        }
    }
    corners.sort_by(|a, b| a.1.total_cmp(&b.1));
    corners.swap_remove(0)
}
