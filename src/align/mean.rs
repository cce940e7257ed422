//! The lag and polarity of the averaged cross-correlation.

use super::climb::{Bins, climb};
use super::peaks::Correlation;
use super::spectra::Spectra;
use num_complex::{Complex32, Complex64};
use rustfft::FftPlanner;

/// Points of the averaged cross-correlation between two frames.
const DENSITY: usize = 4;

/// Extrema that are lower than the highest by this share could be the delay as well.
const TOLERANCE: f64 = 0.01;

/// The same for the whitened ones, where those of the plain correlation are equal: a tone's
/// skirts, whitened, make its peaks fall off, but where there is more than a tone the line
/// alone has far less than a quarter of the whitened peak.
const WHITENED_TOLERANCE: f64 = 0.75;

/// Share of a minimum's height that the maximum beside it needs to be taken in its place.
/// Over a band of one octave, with a flat phase, the half period beside the peak has 0.83 of
/// its height (a sinc of a third), over two octaves 0.50. Where the phase is a quarter turn,
/// as of what is left far outside a third-octave filter's band, both are nearly the same: from
/// 0.85 (coherent up to 24 times its center) down to 0.64 (5 times).
const NARROW: f64 = 0.6;

/// Peaks that are equal to each other from which on a sound is periodic.
const PERIODIC: usize = 4;

/// How far from a given delay polarity is looked for, frames.
const GIVEN_REACH: f64 = 16.0;

/// The averaged cross-correlation, whitened: phases alone, each bin weighted by its coherence.
#[derive(Debug)]
pub(super) struct Mean {
    values: Vec<Complex64>,
    /// Weighted by signal over noise, to find the very top.
    weighted: Vec<Complex64>,
    /// Without whitening, only to tell equal peaks.
    plain: Vec<Complex64>,
    first: f64,
    step: f64,
    first_bin: usize,
    chunk: usize,
}

/// What the averaged cross-correlation says.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Extremum {
    /// Frames beyond the line.
    pub(super) lag: f64,
    /// Whether it is a minimum.
    pub(super) inverted: bool,
    /// Another lag beyond the line that is as good, and whether that one is a minimum.
    pub(super) rival: Option<(f64, bool)>,
    /// Height over the root mean square of the rest.
    pub(super) ratio: f64,
    /// The lag half a period away, with opposite sign, where the band is so narrow that it
    /// is nearly as good.
    pub(super) beside: Option<f64>,
}

impl Mean {
    pub(super) fn of(spectra: &Spectra<'_>) -> Self {
        let values = spectra.total.iter().zip(&spectra.coherence).map(|(total, coherence)| phase(total, *coherence));
        Self {
            values: values.collect(),
            weighted: spectra.total.iter().zip(spectra.weights()).map(|(total, weight)| phase(total, weight)).collect(),
            plain: plain(&spectra.total),
            first: spectra.first_angle(),
            step: spectra.angle_step(),
            first_bin: spectra.first_bin(),
            chunk: spectra.chunk(),
        }
    }

    /// The extremum of largest magnitude, of equal ones that with the smallest
    /// `|at_zero + lag|`.
    pub(super) fn extremum(&self, at_zero: f64) -> Option<Extremum> {
        let lag = |index: usize| self.lag(index);
        let values = self.correlation(&self.values);
        let correlation = Correlation::new(&values);
        let highest = correlation.choose(0.0, 0, lag)?.index;
        let mut equal = self.equals(&correlation, highest);
        equal.sort_by(|a, b| (at_zero + lag(*a)).abs().total_cmp(&(at_zero + lag(*b)).abs()));
        let mut index = *equal.first()?;
        // Of a tone half periods are equal: the nearest stays.
        let mut beside = Self::beside(&correlation, index, |i| at_zero + lag(i))
            .filter(|i| equal.len() < PERIODIC && !equal.contains(i));
        // A device that turns the sign is the rarer one.
        if let Some(upright) = beside.filter(|i| values[*i] > 0.0) {
            equal = Vec::new();
            (index, beside) = (upright, Some(index));
        }
        let inverted = values[index] < 0.0;
        Some(Extremum {
            lag: self.refine(lag(index), inverted),
            inverted,
            rival: equal.get(1).map(|rival| {
                let inverted = values[*rival] < 0.0;
                (self.refine_rival(lag(*rival), inverted), inverted)
            }),
            ratio: ratio(&values, highest),
            beside: beside.map(|i| self.refine(lag(i), !inverted)),
        })
    }

    /// The extremum of opposite sign next to the one at `index`, if it is nearly as high; of
    /// two practically equal ones that with the smaller lag.
    fn beside(correlation: &Correlation<'_>, index: usize, lag: impl Fn(usize) -> f64) -> Option<usize> {
        let sign = correlation.value(index).signum();
        let height = |i: usize| f64::from(-sign * correlation.value(i));
        let enough = NARROW as f32 * correlation.value(index).abs();
        let opposite = correlation.extrema(enough).filter(|i| height(*i) > 0.0);
        let (below, above): (Vec<usize>, Vec<usize>) = opposite.partition(|i| *i < index);
        // Nothing of the same sign in between, or it is another period's.
        let next = |i: &usize| {
            let between = (*i).min(index) + 1..(*i).max(index);
            let turns = between.clone().filter(|k| {
                let [a, b] = [k - 1, *k].map(|k| correlation.value(k) < 0.0);
                a != b
            });
            turns.count() <= 1
        };
        let sides = [below.last(), above.first()].into_iter().flatten().copied().filter(next);
        sides.reduce(|a, b| {
            let equal = (height(a) - height(b)).abs() <= TOLERANCE * height(a).max(height(b));
            let first = if equal { lag(a).abs() <= lag(b).abs() } else { height(a) > height(b) };
            if first { a } else { b }
        })
    }

    /// The extrema that could be the delay as well as the highest, which is among them.
    fn equals(&self, correlation: &Correlation<'_>, highest: usize) -> Vec<usize> {
        let height = f64::from(correlation.height());
        let plain = self.correlation(&self.plain);
        let plain_at =
            |i: usize| plain[i.saturating_sub(2)..(i + 3).min(plain.len())].iter().fold(0.0_f32, |h, v| h.max(v.abs()));
        let enough = plain_at(highest) * (1.0 - TOLERANCE as f32);
        let candidates = correlation.extrema((height * (1.0 - WHITENED_TOLERANCE)) as f32);
        let value = |i: usize| f64::from(correlation.value(i).abs());
        // Side lobes of a whitened peak turn their sign where a slow plain one does not.
        let turned = |i: usize| (correlation.value(i) < 0.0) != (plain[i] < 0.0);
        let same = |i: usize| turned(i) == turned(highest) && plain_at(i) >= enough;
        candidates.filter(|i| same(*i) || value(*i) >= height * (1.0 - TOLERANCE)).collect()
    }

    /// Polarity at a given lag (0 here): that of the value there, if it is part of the
    /// peak nearby; else of the peak.
    pub(super) fn polarity(&self) -> Option<Extremum> {
        let values = self.correlation(&self.values);
        let reach = (GIVEN_REACH as usize * DENSITY).min(values.len() / 2 - 1);
        let middle = values.len() / 2;
        let near = &values[middle - reach..=middle + reach];
        let lag = |index: usize| self.lag(middle - reach + index);
        let peak = Correlation::new(near).choose(TOLERANCE, 0, lag)?;
        let here = values[middle];
        let decides = if here.abs() > 0.3 * near[peak.index].abs() { here } else { near[peak.index] };
        let inverted = decides < 0.0;
        let all = Correlation::new(&values);
        let equal = self.equals(&all, middle - reach + peak.index);
        let others = equal.into_iter().filter(|i| (values[*i] < 0.0) != inverted);
        let rival = others.min_by_key(|i| i.abs_diff(middle));
        Some(Extremum {
            lag: 0.0,
            inverted,
            rival: rival.map(|rival| (self.refine_rival(self.lag(rival), !inverted), !inverted)),
            ratio: ratio(&values, middle - reach + peak.index),
            beside: None,
        })
    }

    /// The extremum of the given kind nearest to `start`, frames beyond the line.
    pub(super) fn refine(&self, start: f64, inverted: bool) -> f64 {
        self.top(&self.weighted, start, inverted)
    }

    /// The same for one that is as good only without whitening, if it is near.
    fn refine_rival(&self, start: f64, inverted: bool) -> f64 {
        let plain = self.top(&self.plain, start, inverted);
        if (plain - start).abs() < 2.0 { plain } else { self.refine(start, inverted) }
    }

    fn top(&self, values: &[Complex64], start: f64, inverted: bool) -> f64 {
        let sign = if inverted { -1.0 } else { 1.0 };
        let values: Vec<Complex64> = values.iter().map(|v| v * sign).collect();
        climb(Bins { values: &values, first: self.first, step: self.step }, start, 8).lag
    }

    /// The correlation at lags from minus to plus a quarter chunk.
    fn correlation(&self, values: &[Complex64]) -> Vec<f32> {
        let size = DENSITY * self.chunk;
        let mut work = vec![Complex32::default(); size];
        for (slot, value) in work.iter_mut().skip(self.first_bin).zip(values) {
            *slot = Complex32::new(value.re as f32, value.im as f32);
        }
        FftPlanner::new().plan_fft_inverse(size).process(&mut work);
        let quarter = size / 4;
        let negative = work[size - quarter..].iter();
        negative.chain(&work[..=quarter]).map(|z| z.re).collect()
    }

    fn lag(&self, index: usize) -> f64 {
        (index as f64 - (DENSITY * self.chunk / 4) as f64) / DENSITY as f64
    }
}

/// A phasor of this magnitude.
fn phase(value: &Complex64, magnitude: f64) -> Complex64 {
    let scale = magnitude / value.norm_sqr().sqrt();
    if scale.is_finite() { value * scale } else { Complex64::default() }
}

/// The cross-spectrum scaled so that f32 holds it.
fn plain(total: &[Complex64]) -> Vec<Complex64> {
    let largest = total.iter().map(Complex64::norm_sqr).fold(0.0, f64::max).sqrt();
    total.iter().map(|s| if largest > 0.0 { s / largest } else { *s }).collect()
}

/// The value at `index` over the root mean square of those more than 8 frames away.
fn ratio(values: &[f32], index: usize) -> f64 {
    let near = index.saturating_sub(8 * DENSITY)..(index + 8 * DENSITY + 1).min(values.len());
    let ratio = f64::from(values[index].abs()) / Correlation::new(values).mean_square_outside(&near).sqrt();
    if ratio.is_finite() { ratio } else { 0.0 }
}
