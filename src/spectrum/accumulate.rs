//! Sums over segments, and the spectra they average to.

use super::packed::Packed;
use super::transform::{Transform, Work};
use super::window;
use num_complex::Complex64;
use std::{ops::Range, sync::Arc};

/// Sums over segments for one channel, before and after.
///
/// One complex transform of `before + i after` serves both: with Z its result and
/// `M[k] = conj Z[L-k]`, `X = (Z + M)/2` and `Y = (Z - M)/(2i)`. The rounding of the
/// louder signal leaks into the quieter at about 1e-16 of its amplitude, so the quieter
/// spectrum has an arithmetic floor some 310 dB below the louder signal's power.
#[derive(Debug)]
pub struct Accumulator {
    transform: Arc<Transform>,
    cross_bins: Vec<Range<usize>>,
    segments: usize,
    // Sums of |Z + M|^2, |Z - M|^2 and conj(Z + M)(Z - M)/i, scaled when finished.
    sxx: Vec<f64>,
    syy: Vec<f64>,
    sxy: Vec<Complex64>,
    work: Work,
}

impl Accumulator {
    /// An empty sum. `cross_bins` are the bins for which the cross-spectrum is kept:
    /// sorted, disjoint, within 0 to L/2 (what lies above is cut off).
    pub fn new(transform: Arc<Transform>, cross_bins: Vec<Range<usize>>) -> Self {
        let frames = transform.segment_frames();
        let bins = frames / 2 + 1;
        let cross_bins: Vec<_> =
            cross_bins.into_iter().map(|r| r.start.min(bins)..r.end.min(bins)).filter(|r| !r.is_empty()).collect();
        let kept = cross_bins.iter().map(ExactSizeIterator::len).sum();
        Self {
            segments: 0,
            sxx: vec![0.0; bins],
            syy: vec![0.0; bins],
            sxy: vec![Complex64::new(0.0, 0.0); kept],
            work: transform.work(),
            cross_bins,
            transform,
        }
    }

    /// Memory of one accumulator for segments of `segment_frames` frames, in bytes, at
    /// most; a shared [`Transform`] takes up to three quarters as much again.
    pub fn memory_bytes(segment_frames: usize) -> usize {
        // Result and scratch 16 bytes a frame each, two real spectra over half as many
        // bins 8, the cross-spectrum over all of them 8.
        segment_frames.saturating_mul(16 + 16 + 8 + 8)
    }

    /// Adds one segment: both slices have L frames, in units of full scale.
    /// Frames that are missing count as zeros, further ones are not looked at.
    pub fn add(&mut self, before: &[f64], after: &[f64]) {
        let mut packed = Packed::new(&self.transform);
        packed.take(before, after);
        self.add_packed(packed);
    }

    /// Adds one segment that was filled sample by sample, for the same transform.
    pub fn add_packed(&mut self, packed: Packed) {
        self.transform.run(packed.into_frames(), &mut self.work);
        self.add_powers();
        self.add_cross();
        self.segments += 1;
    }

    fn add_powers(&mut self) {
        let result = &self.work.result;
        let half = result.len() / 2;
        // Bins 0 and L/2 mirror onto themselves; they are the packed transform's own
        // real and imaginary parts, doubled to match the others.
        for (k, z) in [(0, result[0]), (half, result[half])] {
            self.sxx[k] += 4.0 * z.re * z.re;
            self.syy[k] += 4.0 * z.im * z.im;
        }
        let (low, high) = (&result[1..half], &result[half + 1..]);
        let sums = self.sxx[1..half].iter_mut().zip(&mut self.syy[1..half]);
        for ((sxx, syy), (z, m)) in sums.zip(low.iter().zip(high.iter().rev())) {
            let (xr, xi) = (z.re + m.re, z.im - m.im);
            let (yr, yi) = (z.im + m.im, m.re - z.re);
            *sxx += xr * xr + xi * xi;
            *syy += yr * yr + yi * yi;
        }
    }

    fn add_cross(&mut self) {
        let result = &self.work.result;
        let frames = result.len();
        let bins = self.cross_bins.iter().cloned().flatten();
        for (sum, k) in self.sxy.iter_mut().zip(bins) {
            let (z, m) = (result[k], result[(frames - k) % frames]);
            let (xr, xi) = (z.re + m.re, z.im - m.im);
            let (yr, yi) = (z.im + m.im, m.re - z.re);
            *sum += Complex64::new(xr * yr + xi * yi, xr * yi - xi * yr);
        }
    }

    /// The averaged spectra; all zero where no segment was added.
    pub fn finish(self) -> Spectra {
        let frames = self.transform.segment_frames();
        let half = frames / 2;
        self.transform.take_back(self.work);
        // The sums hold 4 |X|^2.
        let norm = 4.0 * frames as f64 * frames as f64 * window::MEAN_SQUARE * self.segments.max(1) as f64;
        let scale = |k: usize| if k == 0 || k == half { 1.0 / norm } else { 2.0 / norm };
        let power = |mut sums: Vec<f64>| {
            sums.iter_mut().enumerate().for_each(|(k, s)| *s *= scale(k));
            sums
        };
        let bins = self.cross_bins.iter().cloned().flatten();
        Spectra {
            segment_frames: frames,
            segments: self.segments,
            sxx: power(self.sxx),
            syy: power(self.syy),
            sxy: self.sxy.iter().zip(bins).map(|(s, k)| s * scale(k)).collect(),
            cross_bins: self.cross_bins,
        }
    }
}

/// Averaged spectra of one channel.
///
/// `sxx[k]` and `syy[k]` are one-sided **power spectra**: the mean over segments of
/// `|X[k]|^2 / (L * sum w^2)`, doubled except at k = 0 and k = L/2, X the unnormalized
/// DFT of the windowed segment. Their sum over all bins is the mean
/// square of the signal (Parseval, for a window of unit mean square); a band's
/// level is 10 log10(2 * sum over its bins) dBFS.
#[derive(Clone, Debug)]
pub struct Spectra {
    /// L, frames.
    pub segment_frames: usize,
    /// Segments averaged.
    pub segments: usize,
    /// Before, L/2 + 1 bins, (full scale)^2 a bin.
    pub sxx: Vec<f64>,
    /// After, L/2 + 1 bins, (full scale)^2 a bin.
    pub syy: Vec<f64>,
    /// conj(X) Y with the same scaling, for the bins of `cross_bins`, concatenated.
    pub sxy: Vec<Complex64>,
    /// The ranges `sxy` covers: those asked for, cut off at L/2, without empty ones.
    pub cross_bins: Vec<Range<usize>>,
}
