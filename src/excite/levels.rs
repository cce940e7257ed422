//! What the excitation puts into a band, and what can be shown with it.

use super::{Layout, Pink};
use crate::design::BandDesign;
use crate::design::response;
use crate::section::Section;
use crate::spec::{NamedBand, Requirement};
use crate::spectrum::{FIRST_BAND_BIN, LeakageKernel, MAIN_LOBE_BINS, leakage_kernel};

/// A band with the level in it.
#[derive(Clone, Debug, PartialEq)]
pub struct BandLevel {
    /// The band at this rate.
    pub band: NamedBand,
    /// Level over the whole recording, both parts, dBFS.
    pub level_dbfs: f64,
    /// The share of the noise in it alone, over the whole recording, dBFS. A sweep is
    /// through a narrow band in a moment, which may fall where no segment of a measurement
    /// listens well; the noise is there in all of them.
    pub noise_dbfs: f64,
    /// Largest attenuation that can be shown where the device is recorded with 16 bits and
    /// triangular dither, dB: the noise over the floor of rounding and of what leaks in from
    /// outside the band. The device is taken to be like the spec's stages, or, where
    /// there are none, to stop a main lobe's width more than the band. `None` for bands that
    /// need no attenuation.
    pub shown_16_bit_db: Option<f64>,
    /// The same with 24 bits, dB.
    pub shown_24_bit_db: Option<f64>,
    /// Attenuation that the requirement comes to with this excitation, dB: `reduce_db`, or
    /// what lies between the level and `residual_dbfs`. `None` for other bands.
    pub required_db: Option<f64>,
    /// How much of this excitation the spec's own stages take out of the band, dB; `None`
    /// without stages. A requirement may hold for a line in the middle of a band and not
    /// for noise all over it.
    pub own_stages_db: Option<f64>,
    /// Shortest recording in which the band can be judged, seconds; `None` without a
    /// requirement.
    pub shortest_s: Option<f64>,
}

impl BandLevel {
    pub(super) fn new(layout: &Layout, design: &BandDesign, sections: &[Section]) -> Self {
        let band = design.band.clone();
        let bin_hz = f64::from(layout.rate_hz) / layout.segment_frames as f64;
        // The lowest bins hold the offset and belong to no band.
        let lowest_hz = FIRST_BAND_BIN as f64 * bin_hz;
        let from_hz = if lowest_hz < band.line.to_hz { band.line.from_hz.max(lowest_hz) } else { band.line.from_hz };
        let to_hz = band.line.to_hz;
        let whole_s = layout.frames as f64 / f64::from(layout.rate_hz);
        let noise_share = layout.noise_share();
        let noise = layout.pink.power(from_hz, to_hz) * noise_share;
        let level = noise + layout.sweep.energy(from_hz, to_hz) / whole_s;
        let leakage = leakage(layout, sections, (from_hz, to_hz), bin_hz) * noise_share;
        let shown_db =
            |bits: i32| ratio_db(noise / (dithered_rounding(bits, layout.rate_hz, to_hz - from_hz) + leakage));
        let (level_dbfs, noise_dbfs) = (ratio_db(2.0 * level), ratio_db(2.0 * noise));
        let required_db = match band.requirement {
            Requirement::Reduce { reduce_db } => Some(reduce_db),
            Requirement::Residual { residual_dbfs } => Some(level_dbfs - residual_dbfs),
            Requirement::Keep { .. } | Requirement::Observe => None,
        };
        BandLevel {
            required_db,
            own_stages_db: (!sections.is_empty())
                .then(|| -ratio_db(passed(sections, f64::from(layout.rate_hz), from_hz, to_hz))),
            shown_16_bit_db: required_db.map(|_| shown_db(16)),
            shown_24_bit_db: required_db.map(|_| shown_db(24)),
            shortest_s: design.shortest_s,
            level_dbfs,
            noise_dbfs,
            band,
        }
    }

    /// Whether the spec's own stages, were they the device, would fall short of what is
    /// required, by more than the figure's own uncertainty.
    pub fn own_stages_fall_short(&self) -> bool {
        const UNCERTAIN_DB: f64 = 0.1;
        match (self.required_db, self.own_stages_db) {
            (Some(required_db), Some(own_db)) => own_db < required_db - UNCERTAIN_DB,
            _ => false,
        }
    }
}

/// 10 log10 of a power ratio.
pub(super) fn ratio_db(ratio: f64) -> f64 {
    10.0 * libm::log10(ratio)
}

/// Mean square of rounding with triangular dither in a band of `width_hz`: step^2/4, even
/// to half the rate (see [`crate::output::triangular`]).
fn dithered_rounding(bits: i32, rate_hz: u32, width_hz: f64) -> f64 {
    let step = libm::ldexp(1.0, 1 - bits);
    step * step / 4.0 * width_hz / (0.5 * f64::from(rate_hz))
}

/// What the window lets into a band from the noise that the device leaves outside it,
/// (full scale)^2: as the floors of a measurement have it, with the expected spectrum in
/// place of a measured one.
///
/// To 64 bins off bin by bin from [`LeakageKernel`], twice that beyond the main lobe (a
/// line between two bins); farther away cell by cell from the kernel's bound, which
/// falls as 1/x^2, twice for images, and there the device is taken to let all through.
fn leakage(layout: &Layout, sections: &[Section], (from_hz, to_hz): (f64, f64), bin_hz: f64) -> f64 {
    let (pink, rate_hz) = (&layout.pink, f64::from(layout.rate_hz));
    let half_hz = 0.5 * rate_hz;
    let bins = ((to_hz - from_hz) / bin_hz).max(1.0);
    let mut sum = far(pink, from_hz / bin_hz, bin_hz, bins, from_hz)
        + far(pink, (half_hz - to_hz) / bin_hz, bin_hz, bins, -to_hz);
    for away in 1..=LeakageKernel::REACH {
        let distance_hz = (away as f64 - 0.5) * bin_hz;
        let outside = [from_hz - distance_hz, to_hz + distance_hz];
        for hz in outside.into_iter().filter(|hz| (0.0..half_hz).contains(hz)) {
            sum += pink.line(hz) * bin_hz * left(sections, hz, rate_hz, away) * into_band(away, bins);
        }
    }
    sum
}

/// Share of the power `away` bins outside a band that the device leaves: that of the spec's
/// stages, or, where there are none, of a stop that reaches a main lobe's width beyond
/// the band.
fn left(sections: &[Section], hz: f64, rate_hz: f64, away: usize) -> f64 {
    if sections.is_empty() {
        return if away > 2 * MAIN_LOBE_BINS { 1.0 } else { 0.0 };
    }
    libm::pow(10.0, response::gain_db(sections, hz, rate_hz) / 10.0)
}

/// Share of a bin's power that gets into a band of `bins` bins whose nearest lies `away`
/// bins off; what lies beyond the kernel's table is left to [`far`].
fn into_band(away: usize, bins: f64) -> f64 {
    const BETWEEN_BINS: f64 = 2.0;
    let last = LeakageKernel::REACH.min((away as f64 + bins) as usize);
    let share =
        |distance: usize| leakage_kernel().share(distance) * if distance > MAIN_LOBE_BINS { BETWEEN_BINS } else { 1.0 };
    (away..=last).map(share).sum()
}

/// From the kernel's reach to the end of the spectrum, `span` bins away, on the side of the
/// edge at `edge_hz`: below it where that is positive, above it where it is negative.
fn far(pink: &Pink, span: f64, bin_hz: f64, bins: f64, edge_hz: f64) -> f64 {
    const IMAGES: f64 = 2.0;
    let reach = LeakageKernel::REACH as f64 + 0.5;
    let mut sum = 0.0;
    let mut near = reach;
    while near < span {
        let end = (2.0 * near).min(span);
        // The larger density of a cell's two ends stands for all of it.
        let density = pink.line((edge_hz - near * bin_hz).abs()).max(pink.line((edge_hz - end * bin_hz).abs()));
        let share = IMAGES * leakage_kernel().beyond * reach * reach * (1.0 / near - 1.0 / (near + bins));
        sum += density * (end - near) * bin_hz * share;
        near = end;
    }
    sum
}

/// Share of a 1/f spectrum's power in a band that `sections` let through.
fn passed(sections: &[Section], rate_hz: f64, from_hz: f64, to_hz: f64) -> f64 {
    const POINTS: u32 = 512;
    let mut sum = 0.0;
    for point in 0..POINTS {
        let place = (f64::from(point) + 0.5) / f64::from(POINTS);
        // Even steps of the logarithm are even shares of the power.
        let hz = if from_hz > 0.0 { from_hz * libm::pow(to_hz / from_hz, place) } else { to_hz * place };
        sum += libm::pow(10.0, response::gain_db(sections, hz, rate_hz) / 10.0);
    }
    sum / f64::from(POINTS)
}
