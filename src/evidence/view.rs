//! One band in one channel: its levels and floors, and what is judged from them.

use super::figures::verdict_of;
use super::floors::{Floor, Side, block_sums};
use super::gains::response;
use super::incoherent;
use super::keep::keep;
use super::line::{Peak, largest_peak, lobe_power, stands_out};
use super::ranges::{Owned, shows_gains};
use super::response::Response;
use super::verdicts::{FEWEST_TO_MISS, Outcome, Shown};
use super::{BandFigures, BandTask, Measured, ReasonCode, Verdict, db, reasons};
use crate::spec::Requirement;
use crate::spectrum::NOISE_BANDWIDTH_BINS;

/// A channel with what all its bands need.
pub struct Channel<'a> {
    /// What was measured.
    pub measured: &'a Measured<'a>,
    before_blocks: Vec<f64>,
    after_blocks: Vec<f64>,
    /// Power of both sides.
    transformed: f64,
}

impl<'a> Channel<'a> {
    /// Sums what all bands share.
    pub fn new(measured: &'a Measured<'a>) -> Self {
        let before_blocks = block_sums(&measured.spectra.sxx);
        let after_blocks = block_sums(&measured.spectra.syy);
        let transformed = before_blocks.iter().chain(&after_blocks).sum();
        Channel { measured, before_blocks, after_blocks, transformed }
    }

    /// The bins of `band`.
    pub fn own(&self, band: &BandTask) -> Owned {
        Owned::of(band, self.measured.rate_hz, self.measured.spectra.segment_frames)
    }

    /// Distance of the bins, Hz.
    pub fn bin_hz(&self) -> f64 {
        f64::from(self.measured.rate_hz) / self.measured.spectra.segment_frames.max(1) as f64
    }
}

/// One band in one channel with its levels and floors.
pub struct View<'a> {
    measured: &'a Measured<'a>,
    own: &'a Owned,
    before: Side<'a>,
    after: Side<'a>,
    /// Power by which figures after are taken back.
    gain_power: f64,
    bin_hz: f64,
    before_floor: Floor,
    after_floor: Floor,
    shown: Shown,
}

impl<'a> View<'a> {
    /// Levels and floors of the bins `own` of a band that asks for `requirement`.
    pub fn new(channel: &'a Channel<'a>, own: &'a Owned, requirement: &Requirement) -> Self {
        let Channel { measured, before_blocks, after_blocks, transformed } = channel;
        let spectra = measured.spectra;
        let mut before = Side::new(&spectra.sxx, before_blocks, *transformed, measured.rounding_power_before, own);
        let mut after = Side::new(&spectra.syy, after_blocks, *transformed, measured.rounding_power_after, own);
        let square = measured.gain * measured.gain;
        let gain_power = if square.is_finite() && square > 0.0 { square } else { 1.0 };

        let level_before = own.sum(&spectra.sxx);
        let level_after = own.sum(&spectra.syy) / gain_power;
        let before_floor = before.floor_of_all(&own.pieces).capped(level_before);
        let bare = after.floor_of_all(&own.pieces);
        let (device, known) = incoherent::of_band(measured, own, requirement, &bare, FEWEST_TO_MISS);
        let after_floor = Floor { device, ..bare }.scaled(1.0 / gain_power).capped(level_after);
        if measured.pair.is_some() && shows_gains(requirement) {
            before = before.with_many_targets();
            after = after.with_many_targets();
        }
        let noise = after_floor.rounding + after_floor.arithmetic;
        let shown = Shown {
            before_dbfs: db::level_dbfs(level_before),
            before_floor_dbfs: db::level_dbfs(before_floor.total()),
            after_dbfs: db::level_dbfs(level_after),
            after_floor_dbfs: db::level_dbfs(after_floor.total()),
            noise_share: if noise > 0.0 { noise / after_floor.total() } else { 0.0 },
            device_share: if after_floor.device > 0.0 { after_floor.device / after_floor.total() } else { 0.0 },
            // Levels are shown relative to a full-scale sine, of mean square 1/2.
            known: known.scaled(2.0 / gain_power),
            bins: own.bins(),
            segments: measured.independent_segments,
        };
        let bin_hz = channel.bin_hz();
        View { measured, own, before, after, gain_power, bin_hz, before_floor, after_floor, shown }
    }

    /// Levels and floors as figures.
    pub fn levels(&self) -> BandFigures {
        let measured_db = match (self.shown.before_dbfs, self.shown.after_dbfs) {
            (Some(before), Some(after)) => Some(db::rounded(before - after)),
            _ => None,
        };
        BandFigures {
            before_dbfs: self.shown.before_dbfs,
            before_floor_dbfs: self.shown.before_floor_dbfs,
            after_dbfs: self.shown.after_dbfs,
            after_floor_dbfs: self.shown.after_floor_dbfs,
            measured_attenuation_db: measured_db,
            demonstrable_attenuation_db: self.shown.demonstrable_db(),
            ..BandFigures::default()
        }
    }

    /// Reduce and residual bands.
    pub fn judge_line(&self, band: &BandTask, figures: &mut BandFigures) {
        let spectra = self.measured.spectra;
        figures.resolution_hz = Some(db::rounded(NOISE_BANDWIDTH_BINS * self.bin_hz));
        if let Some(peak) = self.peak(&spectra.sxx) {
            figures.line_before_dbfs = db::level_dbfs(lobe_power(&spectra.sxx, peak.bin));
            // A peak below what is shown is one of arithmetic: its place means nothing.
            if figures.line_before_dbfs.is_some() {
                figures.line_hz = Some(db::rounded(peak.place * self.bin_hz));
                figures.line_after_dbfs = db::level_dbfs(lobe_power(&spectra.syy, peak.bin) / self.gain_power);
            }
        }
        let outcome = match band.requirement {
            Requirement::Reduce { reduce_db } => self.shown.reduce(reduce_db),
            Requirement::Residual { residual_dbfs } => self.shown.residual(residual_dbfs),
            Requirement::Keep { .. } | Requirement::Observe => return,
        };
        let (code, reason) = match outcome {
            Outcome::Met => (None, None),
            Outcome::Missed => (None, Some(self.what_remains())),
            Outcome::TooFewBins => {
                (Some(ReasonCode::TooShort), Some(reasons::too_few_bins(band, self.measured.seconds, self.shown.bins)))
            }
            Outcome::NothingThere => {
                (Some(ReasonCode::NothingThere), Some(reasons::nothing_there(&self.shown, &self.before_floor)))
            }
            Outcome::Open => {
                let (limiting, after) = self.limiting_floor();
                reasons::open(&self.shown, &band.requirement, limiting, after, incoherent::enough_s(self.measured))
            }
        };
        figures.verdict = Some(verdict_of(outcome));
        figures.reason_code = code;
        figures.reason = reason;
    }

    /// The floor that takes the larger share of its level, and whether it is the one after.
    fn limiting_floor(&self) -> (&Floor, bool) {
        let share = |floor: Option<f64>, level: Option<f64>| match (floor, level) {
            (Some(floor), Some(level)) => floor - level,
            _ => f64::NEG_INFINITY,
        };
        let before = share(self.shown.before_floor_dbfs, self.shown.before_dbfs);
        let after = share(self.shown.after_floor_dbfs, self.shown.after_dbfs);
        if before > after { (&self.before_floor, false) } else { (&self.after_floor, true) }
    }

    fn peak(&self, spectrum: &[f64]) -> Option<Peak> {
        let peaks = self.own.pieces.iter().filter_map(|piece| largest_peak(spectrum, piece));
        let power = |peak: &Peak| spectrum.get(peak.bin).copied().unwrap_or(0.0);
        peaks.max_by(|a, b| power(a).total_cmp(&power(b)))
    }

    fn what_remains(&self) -> String {
        let syy = &self.measured.spectra.syy;
        let line = self.peak(syy).filter(|peak| stands_out(syy, peak.bin, self.measured.independent_segments));
        reasons::remains(
            line.map(|peak| (peak.place * self.bin_hz, db::level_dbfs(lobe_power(syy, peak.bin) / self.gain_power))),
        )
    }

    /// The response in the band's sub-bands; `None` where no cross-spectrum was kept.
    pub fn response(&self) -> Option<Response> {
        response(self.measured, &self.before, &self.after, self.own, self.bin_hz, self.gain_power.sqrt())
    }

    /// Keep and observed bands.
    pub fn judge_response(&self, band: &BandTask, figures: &mut BandFigures) {
        let Some(response) = self.response() else {
            *figures = BandFigures {
                verdict: (band.requirement != Requirement::Observe).then_some(Verdict::Unproven),
                reason_code: Some(ReasonCode::OutOfRange),
                reason: Some("no cross-spectrum was kept for this band".to_owned()),
                ..figures.clone()
            };
            return;
        };
        figures.gain_min_db = response.lowest().map(|sub| sub.gain_db);
        figures.gain_max_db = response.highest().map(|sub| sub.gain_db);
        figures.resolved = Some(response.resolved);
        figures.resolution_hz = response.resolution_hz().map(db::rounded);
        let (bins, seconds) = (self.shown.bins, self.measured.seconds);
        let keep_db = match band.requirement {
            Requirement::Keep { keep_db, .. } => keep_db,
            // An observed band shows what a keep band without limit would.
            _ => f64::INFINITY,
        };
        let mut kept = keep(&response, keep_db, bins);
        figures.gain_error_db = kept.decides.map(|sub| sub.error_db);
        let (code, reason) = match kept.outcome {
            Outcome::Met => (None, None),
            Outcome::Missed => (None, reasons::keep_missed(&kept, keep_db)),
            Outcome::TooFewBins | Outcome::NothingThere => {
                (Some(ReasonCode::TooShort), Some(reasons::too_few_bins(band, seconds, bins)))
            }
            Outcome::Open => reasons::keep_open(&response, &kept, keep_db, band, self.measured, bins),
        };
        figures.reason_code = code;
        figures.reason = reason;
        if band.requirement == Requirement::Observe {
            // Figures are not judged; a reason stands only where one is missing.
            if figures.gain_min_db.is_some() {
                figures.reason_code = None;
                figures.reason = None;
            }
            return;
        }
        let pair = self.measured.pair;
        let wanders =
            pair.and_then(|pair| Some((pair.delay_scatter_s, pair.wanders_beyond(band, self.measured.rate_hz)?)));
        if let Some((scatter_s, allowed_s)) = wanders {
            kept.outcome = Outcome::Open;
            figures.reason_code = Some(ReasonCode::DeviceNoise);
            figures.reason = Some(reasons::wanders(scatter_s, allowed_s));
        }
        if pair.is_some_and(|pair| !pair.delay_certain) && matches!(kept.outcome, Outcome::Missed) {
            kept.outcome = Outcome::Open;
            figures.reason_code = Some(ReasonCode::DeviceNoise);
            figures.reason = Some(reasons::uncertain_delay(figures.reason.take()));
        }
        figures.verdict = Some(verdict_of(kept.outcome));
    }
}
