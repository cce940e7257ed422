//! Straight lines through lags.

/// `at_zero + slope t`.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Line {
    pub(super) at_zero: f64,
    pub(super) slope: f64,
}

impl Line {
    pub(super) fn at(&self, place: f64) -> f64 {
        self.at_zero + self.slope * place
    }
}

/// No two clocks of recorders differ by more.
pub(super) const STEEPEST: f64 = 500e-6;

/// A lag at a place, with its variance.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Lag {
    pub(super) place: f64,
    pub(super) lag: f64,
    pub(super) variance: f64,
}

/// A line through lags and what is known of it.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Fit {
    pub(super) line: Line,
    /// The place at which the line's height and its slope are independent.
    pub(super) center: f64,
    /// One standard error of the slope.
    pub(super) slope_error: f64,
}

/// The median of the values.
pub(super) fn median(mut values: Vec<f64>) -> Option<f64> {
    values.sort_by(f64::total_cmp);
    let middle = values.len() / 2;
    let high = values.get(middle)?;
    if values.len() % 2 == 1 { Some(*high) } else { values.get(middle - 1).map(|low| 0.5 * (low + high)) }
}

/// The median of the slopes of all pairs of `(place, lag)` that are at least a third of
/// the whole apart (H. Theil 1950, P. K. Sen, J. Am. Stat. Assoc. 63, 1968): up to a
/// quarter of the lags may be wrong.
pub(super) fn steady_slope(points: &[(f64, f64)]) -> Option<f64> {
    let first = points.iter().map(|p| p.0).reduce(f64::min)?;
    let last = points.iter().map(|p| p.0).reduce(f64::max)?;
    let apart = (last - first) / 3.0;
    let pairs = points.iter().enumerate().flat_map(|(i, a)| points[..i].iter().map(move |b| (a, b)));
    median(
        pairs
            .filter(|(a, b)| (a.0 - b.0).abs() >= apart && a.0 != b.0)
            .map(|(a, b)| (a.1 - b.1) / (a.0 - b.0))
            .collect(),
    )
}

/// The slope of the pair of `(place, lag)` whose line passes most of the others within two
/// frames (consensus, as M. A. Fischler and R. C. Bolles, Commun. ACM 24, 1981, but of all
/// pairs), the least steep of equals. A gap splits lags in two; the longer part then has
/// the line, not what lies between.
pub(super) fn consensus(points: &[(f64, f64)]) -> Option<Line> {
    let through = |a: &(f64, f64), b: &(f64, f64)| {
        let slope = (a.1 - b.1) / (a.0 - b.0);
        Line { at_zero: a.1 - slope * a.0, slope }
    };
    let near = |line: &Line| points.iter().filter(|(place, lag)| (lag - line.at(*place)).abs() < 2.0).count();
    let pairs = points.iter().enumerate().flat_map(|(i, a)| points[..i].iter().map(move |b| through(a, b)));
    let lines = pairs.filter(|line| line.slope.abs() <= STEEPEST).map(|line| (near(&line), line));
    let best = lines.max_by(|a, b| a.0.cmp(&b.0).then(b.1.slope.abs().total_cmp(&a.1.slope.abs())))?.1;
    // Two lags close together say little of a slope: those near the line say it together.
    let kept: Vec<(f64, f64)> = points.iter().copied().filter(|(p, lag)| (lag - best.at(*p)).abs() < 2.0).collect();
    let slope = steady_slope(&kept).unwrap_or(best.slope);
    let at_zero = median(kept.iter().map(|(place, lag)| lag - slope * place).collect())?;
    Some(Line { at_zero, slope })
}

/// Weighted least squares; variances grow by what the lags wander beyond them, and lags
/// more than three standard errors off weigh less (P. J. Huber, Ann. Math. Stat. 35, 1964).
pub(super) fn fit(lags: &[Lag]) -> Fit {
    let mut weights: Vec<f64> = lags.iter().map(|lag| 1.0 / lag.variance).collect();
    let mut fit = weighted(lags, &weights);
    for _ in 0..3 {
        let residue = |lag: &Lag| lag.lag - fit.line.at(lag.place);
        let freedom = (lags.len() as f64 - 2.0).max(1.0);
        let excess = lags.iter().map(|lag| residue(lag) * residue(lag) - lag.variance).sum::<f64>() / freedom;
        // Not above what the middle of the lags says, or one stray lag would hide itself.
        let typical = median(lags.iter().map(|lag| residue(lag) * residue(lag)).collect()).unwrap_or(0.0);
        let wander = excess.clamp(0.0, 4.0 * typical);
        for (weight, lag) in weights.iter_mut().zip(lags) {
            let variance = lag.variance + wander;
            let off = residue(lag).abs() / variance.sqrt();
            *weight = (3.0 / off).min(1.0) / variance;
        }
        fit = weighted(lags, &weights);
    }
    fit
}

fn weighted(lags: &[Lag], weights: &[f64]) -> Fit {
    let sum =
        |each: &dyn Fn(&Lag) -> f64| lags.iter().zip(weights).map(|(lag, weight)| weight * each(lag)).sum::<f64>();
    let total = sum(&|_| 1.0);
    let center = sum(&|lag| lag.place) / total;
    let height = sum(&|lag| lag.lag) / total;
    let spread = sum(&|lag| (lag.place - center) * (lag.place - center));
    let slope = sum(&|lag| (lag.place - center) * (lag.lag - height)) / spread;
    if !slope.is_finite() {
        return Fit {
            line: Line { at_zero: finite(height), slope: 0.0 },
            center: finite(center),
            slope_error: f64::MAX,
        };
    }
    Fit { line: Line { at_zero: height - slope * center, slope }, center, slope_error: (1.0 / spread).sqrt() }
}

fn finite(value: f64) -> f64 {
    if value.is_finite() { value } else { 0.0 }
}
