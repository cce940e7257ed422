//! Cross-spectra of pairs of chunks, aligned along a line.

use super::line::Line;
use super::track::Piece;
use num_complex::{Complex32, Complex64};
use rustfft::{Fft, FftPlanner};
use std::f64::consts::TAU;
use std::sync::Arc;

/// Neighboring bins of a Hann window tell partly the same: N sum w^4 / (sum w^2)^2.
pub(super) const BINS_PER_INDEPENDENT: f64 = 1.944;

/// Bins that hold an offset and its main lobe.
const FIRST_BIN: usize = 4;

/// Bins on both sides over which coherence is averaged.
const SMOOTHED: usize = 2;

/// Signal over noise above which a bin weighs no more: what it adds then no longer
/// depends on noise but on how steady the device is.
const HIGHEST_SNR: f64 = 1000.0;

/// Coherence, as a share of the highest, below which a bin does not count.
const LEAST_COHERENCE: f64 = 0.15;

/// The spectra of one pair.
#[derive(Debug)]
struct Pair {
    before: Vec<Complex32>,
    after: Vec<Complex32>,
    /// Frames by which the chunk after was cut later than the one before.
    shift: Option<i64>,
}

/// Spectra of all pairs under a Hann window.
pub(super) struct Spectra<'a> {
    pieces: &'a [Piece],
    chunk: usize,
    bins: usize,
    window: Vec<f32>,
    /// Powers of two that bring either side near full scale: f32 must hold products of
    /// spectra, however loud or faint; phases stay as they are.
    scales: [f32; 2],
    fft: Arc<dyn Fft<f32>>,
    pairs: Vec<Pair>,
    /// `conj(X) Y` of each pair, the lag of the line taken out.
    pub(super) cross: Vec<Vec<Complex32>>,
    /// `|X|^2` of each pair.
    pub(super) power: Vec<Vec<f32>>,
    /// The sum of `cross`.
    pub(super) total: Vec<Complex64>,
    /// The sum of `power`.
    pub(super) total_power: Vec<f64>,
    /// The sum of `|Y|^2`.
    total_after: Vec<f64>,
    /// Coherence of both sides, squared, less its bias, 0 to 1.
    pub(super) coherence: Vec<f64>,
}

impl<'a> Spectra<'a> {
    /// For pieces of `chunk` frames, 128 or more.
    pub(super) fn new(pieces: &'a [Piece], chunk: usize) -> Self {
        let step = TAU / chunk as f64;
        let window: Vec<f32> = (0..chunk).map(|n| (0.5 - 0.5 * ((n as f64 + 0.5) * step).cos()) as f32).collect();
        let fft = FftPlanner::new().plan_fft_forward(chunk);
        // The last 3 % below half the rate are the converters' filters.
        let bins = (chunk / 2 - chunk / 64).saturating_sub(FIRST_BIN);
        let mut spectra = Self {
            pieces,
            chunk,
            bins,
            window,
            scales: [scale_for(pieces.iter().map(|p| &p.before)), scale_for(pieces.iter().map(|p| &p.after))],
            fft,
            pairs: Vec::new(),
            cross: vec![Vec::new(); pieces.len()],
            power: Vec::new(),
            total: Vec::new(),
            total_power: vec![0.0; bins],
            total_after: Vec::new(),
            coherence: Vec::new(),
        };
        for piece in pieces {
            let before = spectra.transform(&piece.before, spectra.scales[0]);
            let power: Vec<f32> = before.iter().map(Complex32::norm_sqr).collect();
            spectra.total_power.iter_mut().zip(&power).for_each(|(sum, p)| *sum += f64::from(*p));
            spectra.power.push(power);
            spectra.pairs.push(Pair { before, after: Vec::new(), shift: None });
        }
        spectra
    }

    /// Radians a frame of the bin at `index`.
    pub(super) fn first_angle(&self) -> f64 {
        FIRST_BIN as f64 * self.angle_step()
    }

    /// Radians a frame from bin to bin.
    pub(super) fn angle_step(&self) -> f64 {
        TAU / self.chunk as f64
    }

    /// Frames of a chunk.
    pub(super) fn chunk(&self) -> usize {
        self.chunk
    }

    /// Index of the first bin in the transform.
    pub(super) fn first_bin(&self) -> usize {
        FIRST_BIN
    }

    /// Neighboring bins that tell the same: a burst that is short within its chunk varies
    /// slowly over frequency. C sum p^2 / (sum p)^2 of the power p over time.
    pub(super) fn bins_per_independent(&self, index: usize) -> f64 {
        let powers = self.pieces[index].before.iter().zip(&self.window).map(|(x, w)| f64::from(x * w * self.scales[0]));
        let (sum, squares) = powers.map(|x| x * x).fold((0.0, 0.0), |(sum, squares), p| (sum + p, squares + p * p));
        // Gaussian noise has three times the mean square of its power's square.
        let bins = self.chunk as f64 * squares / (sum * sum) / 3.0;
        if bins.is_finite() { bins.max(BINS_PER_INDEPENDENT) } else { BINS_PER_INDEPENDENT }
    }

    /// Takes the lags of `line` out of all pairs.
    pub(super) fn follow(&mut self, line: Line) {
        let mut after_power = vec![0.0; self.bins];
        self.total = vec![Complex64::default(); self.bins];
        for index in 0..self.pieces.len() {
            let lag = line.at(self.pieces[index].middle());
            let shift = lag.round() as i64;
            if self.pairs[index].shift != Some(shift) {
                self.pairs[index].after = self.cut(&self.pieces[index], shift);
                self.pairs[index].shift = Some(shift);
            }
            let pair = &self.pairs[index];
            let left = lag - shift as f64;
            let mut turn = Turn::new(self.first_angle() * left, self.angle_step() * left);
            let cross: Vec<Complex32> = pair.before.iter().zip(&pair.after).map(|(x, y)| x.conj() * y).collect();
            let cross = if left == 0.0 { cross } else { cross.into_iter().map(|s| s * turn.next()).collect() };
            for ((sum, s), (power, y)) in self.total.iter_mut().zip(&cross).zip(after_power.iter_mut().zip(&pair.after))
            {
                *sum += Complex64::new(f64::from(s.re), f64::from(s.im));
                *power += f64::from(y.norm_sqr());
            }
            self.cross[index] = cross;
        }
        self.coherence = self.coherence_of(&after_power);
        self.total_after = after_power;
    }

    /// Weight of each bin: its signal over noise.
    pub(super) fn weights(&self) -> Vec<f64> {
        self.coherence.iter().map(|c| weight(*c)).collect()
    }

    /// The same from all pairs but one.
    pub(super) fn weights_without(&self, index: usize) -> Vec<f64> {
        let bias = 1.0 / (self.pieces.len() as f64 - 1.0).max(1.5);
        let own = self.cross[index].iter().zip(&self.power[index]).zip(&self.pairs[index].after);
        let all = self.total.iter().zip(&self.total_power).zip(&self.total_after);
        own.zip(all)
            .map(|(((cross, power), after), ((total, total_power), total_after))| {
                let rest = total - Complex64::new(f64::from(cross.re), f64::from(cross.im));
                let powers = (total_power - f64::from(*power)) * (total_after - f64::from(after.norm_sqr()));
                let fair = (rest.norm_sqr() / powers - bias) / (1.0 - bias);
                if fair > 0.0 && fair.is_finite() { weight(fair.min(1.0)) } else { 0.0 }
            })
            .collect()
    }

    fn cut(&self, piece: &Piece, shift: i64) -> Vec<Complex32> {
        let from = piece.start as i64 + shift - piece.after_start;
        let frames: Vec<f32> = (from..from + self.chunk as i64)
            .map(|frame| usize::try_from(frame).ok().and_then(|frame| piece.after.get(frame)).copied().unwrap_or(0.0))
            .collect();
        self.transform(&frames, self.scales[1])
    }

    fn transform(&self, frames: &[f32], scale: f32) -> Vec<Complex32> {
        let mut work: Vec<Complex32> =
            frames.iter().zip(&self.window).map(|(x, w)| Complex32::new(x * scale * w, 0.0)).collect();
        self.fft.process(&mut work);
        work.drain(..FIRST_BIN.min(work.len()));
        work.truncate(self.bins);
        work
    }

    fn coherence_of(&self, after_power: &[f64]) -> Vec<f64> {
        let (re, im): (Vec<f64>, Vec<f64>) = self.total.iter().map(|s| (s.re, s.im)).unzip();
        let [re, im, before, after] = [&re, &im, &self.total_power, after_power].map(smoothed);
        let independent = (self.pieces.len() * (2 * SMOOTHED + 1)) as f64 / BINS_PER_INDEPENDENT;
        let bias = 1.0 / independent.max(1.0 + 1e-9);
        let mut coherence: Vec<f64> = (0..self.bins)
            .map(|k| {
                let raw = (re[k] * re[k] + im[k] * im[k]) / (before[k] * after[k]);
                let fair = (raw - bias) / (1.0 - bias);
                if fair.is_finite() { fair.clamp(0.0, 1.0) } else { 0.0 }
            })
            .collect();
        // Thousands of bins that are coherent by chance would outweigh the few of a tone.
        let least = LEAST_COHERENCE * coherence.iter().copied().fold(0.0, f64::max);
        coherence.iter_mut().filter(|c| **c < least).for_each(|c| *c = 0.0);
        coherence
    }
}

/// Signal over noise of a coherence.
fn weight(coherence: f64) -> f64 {
    coherence / (1.0 - coherence + 1.0 / HIGHEST_SNR)
}

/// Sums over neighboring bins.
fn smoothed(values: &[f64]) -> Vec<f64> {
    (0..values.len())
        .map(|k| values[k.saturating_sub(SMOOTHED)..(k + SMOOTHED + 1).min(values.len())].iter().sum())
        .collect()
}

fn scale_for<'p>(sides: impl Iterator<Item = &'p Vec<f32>>) -> f32 {
    let loudest = sides.flatten().fold(0.0_f32, |loudest, x| loudest.max(x.abs()));
    if loudest < f32::MIN_POSITIVE || !loudest.is_finite() {
        return 1.0;
    }
    // Clearing the mantissa leaves a power of two; its inverse is one too.
    1.0 / f32::from_bits(loudest.to_bits() & 0x7F80_0000)
}

/// `exp(i (first + step n))` for n = 0, 1, ...
pub(super) struct Turn {
    here: Complex64,
    step: Complex64,
}

impl Turn {
    pub(super) fn new(first: f64, step: f64) -> Self {
        let unit = |angle: f64| Complex64::new(angle.cos(), angle.sin());
        Self { here: unit(first), step: unit(step) }
    }

    pub(super) fn next_wide(&mut self) -> Complex64 {
        let here = self.here;
        self.here *= self.step;
        here
    }

    fn next(&mut self) -> Complex32 {
        let here = self.next_wide();
        Complex32::new(here.re as f32, here.im as f32)
    }
}
