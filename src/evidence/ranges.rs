//! Which bins belong to what.

use super::BandTask;
use crate::spec::Requirement;
use crate::spectrum::{FIRST_BAND_BIN, Spectra, band_bins};
use num_complex::Complex64;
use std::ops::Range;

/// Bins for which the cross-spectrum must be kept: the union of the keep and
/// observed bands, rising and disjoint.
pub fn cross_ranges(rate_hz: u32, segment_frames: usize, bands: &[BandTask]) -> Vec<Range<usize>> {
    union_of(rate_hz, segment_frames, bands.iter().filter(|band| shows_gains(&band.requirement)))
}

/// Bins for which the cross-spectrum of a pair must be kept: the union of all bands,
/// rising and disjoint. In reduce and residual bands it tells what the device adds.
pub fn pair_ranges(rate_hz: u32, segment_frames: usize, bands: &[BandTask]) -> Vec<Range<usize>> {
    union_of(rate_hz, segment_frames, bands.iter())
}

fn union_of<'a>(rate_hz: u32, segment_frames: usize, bands: impl Iterator<Item = &'a BandTask>) -> Vec<Range<usize>> {
    let mut ranges: Vec<Range<usize>> = bands
        .map(|band| band_bins(rate_hz, segment_frames, band.from_hz, band.to_hz))
        .filter(|range| !range.is_empty())
        .collect();
    ranges.sort_by_key(|range| (range.start, range.end));
    let mut union: Vec<Range<usize>> = Vec::with_capacity(ranges.len());
    for range in ranges {
        match union.last_mut() {
            Some(last) if range.start <= last.end => last.end = last.end.max(range.end),
            _ => union.push(range),
        }
    }
    union
}

/// Keep and observed bands show gains; reduce and residual bands show a line instead.
pub fn shows_gains(requirement: &Requirement) -> bool {
    match requirement {
        Requirement::Keep { .. } | Requirement::Observe => true,
        Requirement::Reduce { .. } | Requirement::Residual { .. } => false,
    }
}

/// The averaged cross-spectrum conj(X) Y over `bins`; `None` where it was not kept.
pub fn cross_slice(spectra: &Spectra, bins: Range<usize>) -> Option<&[Complex64]> {
    let mut at = 0;
    for kept in &spectra.cross_bins {
        if kept.start <= bins.start && bins.end <= kept.end {
            let start = at + (bins.start - kept.start);
            return spectra.sxy.get(start..start + bins.len());
        }
        at += kept.len();
    }
    None
}

/// The bins of a band that speak for it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Owned {
    /// The band's bins without those in excepted ranges: rising, disjoint, not empty.
    pub pieces: Vec<Range<usize>>,
    /// Bins of the band below [`FIRST_BAND_BIN`], which no figure sees.
    pub hidden: usize,
    /// Bins of the band that [`Self::below`] left out.
    pub beyond: usize,
}

impl Owned {
    /// The bins of `band`, less its excepted ranges and the bins next to their ends (at
    /// an end the response has already fallen by the limit, and a range narrower than a
    /// bin must not slip through between two).
    pub fn of(band: &BandTask, rate_hz: u32, segment_frames: usize) -> Self {
        let bins_per_hz = segment_frames as f64 / f64::from(rate_hz);
        let whole = band_bins(rate_hz, segment_frames, band.from_hz, band.to_hz);
        let mut pieces = Vec::new();
        let mut start = whole.start;
        for &(from_hz, to_hz) in &band.excepted_hz {
            // `as` saturates: a negative or huge edge ends up at an end of the range.
            let first = ((from_hz * bins_per_hz).floor() as usize).clamp(start, whole.end.max(start));
            let after = ((to_hz * bins_per_hz).ceil() as usize).saturating_add(1);
            if first > start {
                pieces.push(start..first);
            }
            start = start.max(after);
        }
        if start < whole.end {
            pieces.push(start..whole.end);
        }
        let excepted = |hz: f64| band.excepted_hz.iter().any(|&(from_hz, to_hz)| from_hz <= hz && hz <= to_hz);
        let hidden = (0..FIRST_BAND_BIN.min(segment_frames / 2 + 1))
            .map(|bin| bin as f64 / bins_per_hz)
            .filter(|&hz| band.from_hz <= hz && hz < band.to_hz && !excepted(hz))
            .count();
        Owned { pieces, hidden, beyond: 0 }
    }

    /// The bins up to `reaches_hz` of them; the rest counts as beyond.
    pub fn below(mut self, reaches_hz: f64, bin_hz: f64) -> Self {
        let all = self.bins();
        // NaN saturates to 0, a huge frequency to the last bin there can be.
        let end = ((reaches_hz / bin_hz).floor() as usize).saturating_add(1);
        self.pieces.iter_mut().for_each(|piece| piece.end = piece.end.min(end));
        self.pieces.retain(|piece| !piece.is_empty());
        self.beyond += all - self.bins();
        self
    }

    /// Number of bins.
    pub fn bins(&self) -> usize {
        self.pieces.iter().map(ExactSizeIterator::len).sum()
    }

    /// Whether `bin` is one of them.
    pub fn contains(&self, bin: usize) -> bool {
        let next = self.pieces.partition_point(|piece| piece.end <= bin);
        self.pieces.get(next).is_some_and(|piece| piece.contains(&bin))
    }

    /// Whether all of `bins` are among them.
    pub fn spans(&self, bins: &Range<usize>) -> bool {
        let next = self.pieces.partition_point(|piece| piece.end <= bins.start);
        self.pieces.get(next).is_some_and(|piece| piece.start <= bins.start && bins.end <= piece.end)
    }

    /// The sum of `spectrum` over them.
    pub fn sum(&self, spectrum: &[f64]) -> f64 {
        self.pieces.iter().map(|piece| sum(spectrum, piece)).sum()
    }
}

/// The sum of `spectrum` over the part of `bins` that it has.
pub fn sum(spectrum: &[f64], bins: &Range<usize>) -> f64 {
    let end = bins.end.min(spectrum.len());
    spectrum.get(bins.start.min(end)..end).map_or(0.0, |slice| slice.iter().sum())
}
