//! The lag of one chunk of the recording before within a stretch of the one after.
//!
//! Both are whitened by [short filters](super::whitening), so that neither a line nor the
//! slope of a spectrum makes the peak periodic or broad. The cross-correlation
//! `c[l] = sum over n of x[n] y[n + l]` of the whitened signals is taken block by block
//! with transforms, two blocks of the real signal y in one complex transform.

use super::peaks::{self, Correlation};
use super::ring::Ring;
use super::slots::{Chunk, difference_energy};
use super::whitening::{ORDER, Whitening};
use num_complex::{Complex32, Complex64};
use rustfft::{Fft, FftPlanner};
use std::ops::RangeInclusive;
use std::sync::Arc;

/// How far above its root mean square a cross-correlation's peak must stand. Of the 10^6
/// lags of +-10 s at 48 kHz Gaussian noise exceeds 7.5 once in 10^7 searches.
pub(super) const NEEDED_RATIO: f64 = 7.5;

/// Correlation coefficient from which on a peak counts although the cross-correlation is
/// so periodic that none stands out: half the whitened amplitude is in common.
const NEEDED_COEFFICIENT: f64 = 0.5;

/// Ratio from which on a peak is clear without a look at its coefficient.
const CLEAR_RATIO: f64 = 30.0;

/// The same without whitening, where slow noises resemble each other by chance.
/// A hum 17 dB above all else, which any two recordings may share, is no evidence yet.
const PLAIN_COEFFICIENT: f64 = 0.99;

/// Share of the highest peak at which another comes near.
const NEAR: f64 = 0.7;

/// Frames on both sides of a peak that belong to it.
const PEAK_FRAMES: usize = 8;

/// What a search found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Found {
    /// The lag, frames, of the chunk's middle; between frames by a parabola.
    pub(super) lag: f64,
    /// The highest peak over the root mean square of the cross-correlation.
    pub(super) ratio: f64,
    /// Whether it is evidence that both hold the same sound.
    pub(super) stands_out: bool,
    /// Whether besides there is no second lag that comes near.
    pub(super) distinct: bool,
    /// How far, in frames, extrema lie that come near: what the lag may be off by where it
    /// is not distinct.
    pub(super) spread: f64,
    /// Another lag of practically the same height, more than half a chunk away.
    pub(super) rival: Option<f64>,
}

/// Looks for chunks of one length.
pub(super) struct Correlator {
    chunk: usize,
    before: Whitening,
    after: Whitening,
    needed_coefficient: f64,
    planner: FftPlanner<f32>,
    /// Responses of the filter for the recording after, by length of the transform.
    responses: Vec<(usize, Vec<Complex32>)>,
}

impl std::fmt::Debug for Correlator {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        formatter.debug_struct("Correlator").field("chunk", &self.chunk).finish_non_exhaustive()
    }
}

impl Correlator {
    /// With filters that whiten the chunk, and the frames after at `lags` from it.
    pub(super) fn new(chunk: &Chunk, after: &Ring, lags: &RangeInclusive<i64>) -> Self {
        const PIECES: i64 = 16;
        let length = chunk.samples.len();
        let piece = (length / 4).clamp(2 * ORDER, 2048);
        let (from, to) = (chunk.start as i64 + lags.start(), chunk.start as i64 + lags.end() + length as i64);
        let apart = ((to - from - piece as i64) / (PIECES - 1)).max(1);
        let pieces: Vec<Vec<f32>> = (0..PIECES).map(|i| after.copy(from + i * apart, piece)).collect();
        Self {
            chunk: length,
            before: Whitening::of([chunk.samples.as_slice()].into_iter()),
            after: Whitening::of(pieces.iter().map(Vec::as_slice)),
            needed_coefficient: NEEDED_COEFFICIENT,
            planner: FftPlanner::new(),
            responses: Vec::new(),
        }
    }

    /// Without whitening, for what is all tone.
    pub(super) fn plain(chunk: &Chunk) -> Self {
        Self {
            chunk: chunk.samples.len(),
            before: Whitening::none(),
            after: Whitening::none(),
            needed_coefficient: PLAIN_COEFFICIENT,
            planner: FftPlanner::new(),
            responses: Vec::new(),
        }
    }

    /// Looks for `chunk` at `lags`; `None` where one side has no sound.
    pub(super) fn search(&mut self, chunk: &Chunk, after: &Ring, lags: RangeInclusive<i64>) -> Option<Found> {
        let (first_lag, last_lag) = lags.into_inner();
        let count = usize::try_from(last_lag - first_lag + 1).ok().filter(|count| *count > 0)?;
        let start = chunk.start as i64 + first_lag;
        let mut stretch = after.copy(start - ORDER as i64, ORDER + count + self.chunk);
        fade(&mut stretch, after.start() - (start - ORDER as i64), after.end() - (start - ORDER as i64));
        normalize(&mut stretch)?;
        // Only what the filter makes of whole histories: at a sudden start or end it
        // would answer louder than to all that lies between.
        let mut template = self.before.apply(&chunk.samples);
        template.truncate(chunk.samples.len());
        template.iter_mut().take(ORDER).for_each(|x| *x = 0.0);
        normalize(&mut template)?;
        let mut values = self.correlate(&template, &stretch, count);
        temper(&mut values, &stretch[ORDER..], self.chunk);
        self.judge(&values, &template, &stretch, first_lag)
    }

    /// `count` values of the cross-correlation of `template` with the whitened stretch,
    /// which begins ORDER frames before the first lag.
    fn correlate(&mut self, template: &[f32], stretch: &[f32], count: usize) -> Vec<f32> {
        // Two chunks a transform for short searches, four for long ones.
        let size = (if count > 2 * self.chunk { 4 } else { 2 }) * self.chunk.next_power_of_two();
        let valid = size - template.len() - ORDER;
        let forward = self.planner.plan_fft_forward(size);
        let inverse = self.planner.plan_fft_inverse(size);
        let filter = self.filter(template, size, forward.as_ref());
        let mut scratch = vec![Complex32::default(); scratch_len(&forward, &inverse)];
        let mut work = vec![Complex32::default(); size];
        let mut values = Vec::with_capacity(count.next_multiple_of(2 * valid));
        while values.len() < count {
            let [one, two] = [values.len(), values.len() + valid].map(|from| stretch.get(from..).unwrap_or_default());
            work.fill(Complex32::default());
            work.iter_mut().zip(one).for_each(|(z, x)| z.re = *x);
            work.iter_mut().zip(two).for_each(|(z, x)| z.im = *x);
            forward.process_with_scratch(&mut work, &mut scratch);
            work.iter_mut().zip(&filter).for_each(|(z, f)| *z *= f);
            inverse.process_with_scratch(&mut work, &mut scratch);
            let ready = &work[ORDER..ORDER + valid];
            values.extend(ready.iter().map(|z| z.re));
            values.extend(ready.iter().map(|z| z.im));
        }
        values.truncate(count);
        values
    }

    /// Spectrum of the template, conjugated, times the response of the filter for the
    /// stretch, over the transform's length.
    fn filter(&mut self, template: &[f32], size: usize, forward: &dyn Fft<f32>) -> Vec<Complex32> {
        let mut filter = vec![Complex32::default(); size];
        filter.iter_mut().zip(template).for_each(|(z, x)| z.re = *x);
        forward.process(&mut filter);
        let scale = 1.0 / size as f32;
        for (f, r) in filter.iter_mut().zip(self.response(size)) {
            *f = f.conj() * r * scale;
        }
        filter
    }

    fn response(&mut self, size: usize) -> &[Complex32] {
        let index = self.responses.iter().position(|(length, _)| *length == size).unwrap_or_else(|| {
            let mut work = vec![Complex64::default(); size];
            work.iter_mut().zip(self.after.taps).for_each(|(z, tap)| z.re = tap);
            FftPlanner::new().plan_fft_forward(size).process(&mut work);
            let narrow = work.iter().map(|z| Complex32::new(z.re as f32, z.im as f32));
            self.responses.push((size, narrow.collect()));
            self.responses.len() - 1
        });
        &self.responses[index].1
    }

    fn judge(&self, values: &[f32], template: &[f32], stretch: &[f32], first_lag: i64) -> Option<Found> {
        let lag = |index: usize| (first_lag + index as i64) as f64;
        let correlation = Correlation::new(values);
        let highest = correlation.choose(0.0, 0, lag)?.index;
        let near = highest.saturating_sub(PEAK_FRAMES)..(highest + PEAK_FRAMES + 1).min(values.len());
        let height = f64::from(correlation.height());
        let mean_square = correlation.mean_square_outside(&near);
        let ratio = if mean_square > 0.0 { (height / mean_square.sqrt()).min(1e6) } else { 1e6 };
        // Where the peak is that clear, its height is too, and costs a filter to know.
        let coefficient = if ratio < CLEAR_RATIO { self.coefficient(template, stretch, highest) } else { 1.0 };
        // Noise of the whitened residue on a peak, by which equal peaks differ.
        let square = (coefficient * coefficient).clamp(1e-6, 1.0);
        let noise = ((1.0 - square) / (square * self.chunk as f64)).sqrt();
        let tolerance = (2.8 * noise).clamp(0.01, 0.25);
        let peak = correlation.choose(tolerance, self.chunk / 2, lag)?;
        let whitened = self.needed_coefficient < PLAIN_COEFFICIENT;
        let stands_out = (whitened && ratio >= NEEDED_RATIO) || coefficient >= self.needed_coefficient;
        let second = f64::from(correlation.height_outside(&near));
        let [a, b, c] = [peak.index.wrapping_sub(1), peak.index, peak.index + 1]
            .map(|i| f64::from(values.get(i).copied().unwrap_or(0.0)));
        Some(Found {
            lag: lag(peak.index) + peaks::vertex(a, b, c),
            ratio,
            stands_out,
            distinct: stands_out && peak.index == highest && second < NEAR * height,
            spread: Self::spread(&correlation, peak.index),
            rival: peak.rival.map(lag),
        })
    }

    fn spread(correlation: &Correlation<'_>, index: usize) -> f64 {
        let near = correlation.extrema(NEAR as f32 * correlation.height());
        near.map(|i| i.abs_diff(index)).max().unwrap_or(0) as f64
    }

    /// Correlation coefficient of both whitened signals at one lag.
    fn coefficient(&self, template: &[f32], stretch: &[f32], index: usize) -> f64 {
        let part = stretch.get(index..).unwrap_or_default();
        let whitened = self.after.apply(&part[..part.len().min(template.len() + ORDER)]);
        let whitened = whitened.get(ORDER..).unwrap_or_default();
        let sum = |pairs: &mut dyn Iterator<Item = (f32, f32)>| pairs.map(|(a, b)| f64::from(a) * f64::from(b)).sum();
        let pairs = || template.iter().copied().zip(whitened.iter().copied());
        let product: f64 = sum(&mut pairs());
        let energy: f64 = sum(&mut pairs().map(|(_, y)| (y, y)));
        let template_energy: f64 = sum(&mut pairs().map(|(x, _)| (x, x)));
        let coefficient = product.abs() / (energy * template_energy).sqrt();
        if coefficient.is_finite() { coefficient } else { 0.0 }
    }
}

fn scratch_len(forward: &Arc<dyn Fft<f32>>, inverse: &Arc<dyn Fft<f32>>) -> usize {
    forward.get_inplace_scratch_len().max(inverse.get_inplace_scratch_len())
}

/// Fades in from `from` and out to `to`, where the recording begins and ends within the
/// stretch: whitened, a sudden start would be louder than the sound.
fn fade(stretch: &mut [f32], from: i64, to: i64) {
    const FRAMES: usize = 256;
    let gain = |n: usize| {
        let share = (n as f32 + 0.5) / FRAMES as f32;
        share * share * (3.0 - 2.0 * share)
    };
    if let Some(begin) = usize::try_from(from).ok().and_then(|from| stretch.get_mut(from..)) {
        begin.iter_mut().take(FRAMES).enumerate().for_each(|(n, x)| *x *= gain(n));
    }
    if let Some(end) = usize::try_from(to).ok().and_then(|to| stretch.get_mut(..to)) {
        end.iter_mut().rev().take(FRAMES).enumerate().for_each(|(n, x)| *x *= gain(n));
    }
}

/// Brings the root mean square to 1, so that f32 neither overflows nor vanishes.
fn normalize(samples: &mut [f32]) -> Option<()> {
    let energy: f64 = samples.iter().map(|x| f64::from(*x) * f64::from(*x)).sum();
    let scale = (samples.len() as f64 / energy).sqrt();
    if !scale.is_finite() {
        return None;
    }
    samples.iter_mut().for_each(|x| *x = (f64::from(*x) * scale) as f32);
    Some(())
}

/// Lowers the values at which the frames after are much livelier than on average: a loud
/// sound resembles any other more than a faint sound resembles itself.
fn temper(values: &mut [f32], stretch: &[f32], chunk: usize) {
    /// Energy over the mean from which on a place counts as loud.
    const LOUD: f64 = 2.0;
    let block = (chunk / 8).max(1);
    let mut sums = vec![0.0];
    let mut sum = 0.0;
    for block in stretch.chunks(block) {
        sum += difference_energy(block);
        sums.push(sum);
    }
    let mean = sum / stretch.len() as f64 * chunk as f64;
    let last = sums.len() - 1;
    for (index, values) in values.chunks_mut(block).enumerate() {
        let energy = sums[(index + 9).min(last)] - sums[index.min(last)];
        let loudness = energy / (LOUD * mean);
        if loudness > 1.0 {
            let scale = (1.0 / loudness.sqrt()) as f32;
            values.iter_mut().for_each(|v| *v *= scale);
        }
    }
}
