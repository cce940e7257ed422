//! All figures of a band, put together.

use super::floors::{Floor, Side, block_sums};
use super::gains::response;
use super::line::{Peak, largest_peak, lobe_power, stands_out};
use super::ranges::{Owned, shows_gains};
use super::verdicts::{Outcome, Shown, keep};
use super::{BandFigures, BandTask, Measured, ReasonCode, Verdict, db, reasons};
use crate::spec::Requirement;
use crate::spectrum::{NOISE_BANDWIDTH_BINS, band_bins};

/// Judges one band of one measured channel.
///
/// Pure, and a figure is never invented: a band without bins has none, and says why.
pub fn judge(measured: &Measured<'_>, band: &BandTask) -> BandFigures {
    Channel::new(measured).judge(band)
}

/// Judges all bands of one measured channel: [`judge`] for each, with what they share
/// computed once.
pub fn judge_all(measured: &Measured<'_>, bands: &[BandTask]) -> Vec<BandFigures> {
    let channel = Channel::new(measured);
    bands.iter().map(|band| channel.judge(band)).collect()
}

/// A channel with what all its bands need.
struct Channel<'a> {
    measured: &'a Measured<'a>,
    before_blocks: Vec<f64>,
    after_blocks: Vec<f64>,
    /// Power of both sides.
    transformed: f64,
}

impl<'a> Channel<'a> {
    fn new(measured: &'a Measured<'a>) -> Self {
        let before_blocks = block_sums(&measured.spectra.sxx);
        let after_blocks = block_sums(&measured.spectra.syy);
        let transformed = before_blocks.iter().chain(&after_blocks).sum();
        Channel { measured, before_blocks, after_blocks, transformed }
    }

    fn judge(&self, band: &BandTask) -> BandFigures {
        let measured = self.measured;
        let own = Owned::of(band, measured.rate_hz, measured.spectra.segment_frames);
        if own.pieces.is_empty() || measured.spectra.segments == 0 {
            return without_bins(measured, band);
        }
        let view = View::new(self, &own);
        let mut figures = view.levels();
        if shows_gains(&band.requirement) {
            view.judge_response(band, &mut figures);
        } else {
            view.judge_line(band, &mut figures);
        }
        explain_missing(&mut figures, !shows_gains(&band.requirement));
        figures
    }
}

/// The figures of a band in a recording of `seconds` of which nothing is settled.
pub fn unsettled(seconds: f64, band: &BandTask) -> BandFigures {
    unproven(band, ReasonCode::Unsettled, reasons::unsettled(band, seconds))
}

fn without_bins(measured: &Measured<'_>, band: &BandTask) -> BandFigures {
    if band.from_hz >= f64::from(measured.rate_hz) / 2.0 {
        unproven(band, ReasonCode::OutOfRange, reasons::out_of_range(band, measured.rate_hz))
    } else if !band_bins(measured.rate_hz, measured.spectra.segment_frames, band.from_hz, band.to_hz).is_empty()
        && measured.spectra.segments > 0
    {
        unproven(band, ReasonCode::OutOfRange, reasons::ALL_EXCEPTED.to_owned())
    } else {
        unproven(band, ReasonCode::TooShort, reasons::too_few_bins(band, measured.seconds, 0))
    }
}

fn unproven(band: &BandTask, code: ReasonCode, reason: String) -> BandFigures {
    let verdict = (band.requirement != Requirement::Observe).then_some(Verdict::Unproven);
    BandFigures { verdict, reason_code: Some(code), reason: Some(reason), ..BandFigures::default() }
}

/// One band in one channel with its levels and floors.
struct View<'a> {
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
    fn new(channel: &'a Channel<'a>, own: &'a Owned) -> Self {
        let Channel { measured, before_blocks, after_blocks, transformed } = channel;
        let spectra = measured.spectra;
        let before = Side::new(&spectra.sxx, before_blocks, *transformed, measured.rounding_power_before, own);
        let after = Side::new(&spectra.syy, after_blocks, *transformed, measured.rounding_power_after, own);
        let square = measured.gain * measured.gain;
        let gain_power = if square.is_finite() && square > 0.0 { square } else { 1.0 };

        let level_before = own.sum(&spectra.sxx);
        let level_after = own.sum(&spectra.syy) / gain_power;
        let before_floor = before.floor_of_all(&own.pieces).capped(level_before);
        let after_floor = after.floor_of_all(&own.pieces).scaled(1.0 / gain_power).capped(level_after);
        let noise = after_floor.rounding + after_floor.arithmetic;
        let shown = Shown {
            before_dbfs: db::level_dbfs(level_before),
            before_floor_dbfs: db::level_dbfs(before_floor.total()),
            after_dbfs: db::level_dbfs(level_after),
            after_floor_dbfs: db::level_dbfs(after_floor.total()),
            noise_share: if noise > 0.0 { noise / after_floor.total() } else { 0.0 },
            bins: own.bins(),
            segments: measured.independent_segments,
        };
        let bin_hz = f64::from(measured.rate_hz) / spectra.segment_frames.max(1) as f64;
        View { measured, own, before, after, gain_power, bin_hz, before_floor, after_floor, shown }
    }

    fn levels(&self) -> BandFigures {
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
    fn judge_line(&self, band: &BandTask, figures: &mut BandFigures) {
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
                reasons::open(&self.shown, &band.requirement, limiting, after)
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

    /// Keep and observed bands.
    fn judge_response(&self, band: &BandTask, figures: &mut BandFigures) {
        let gain = self.gain_power.sqrt();
        let (before, after) = (&self.before, &self.after);
        let Some(response) = response(self.measured, before, after, self.own, self.bin_hz, gain) else {
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
        let (outcome, decides) = keep(&response, keep_db, bins);
        figures.gain_error_db = decides.map(|sub| sub.error_db);
        let (code, reason) = match outcome {
            Outcome::Met => (None, None),
            Outcome::Missed => (None, decides.map(|sub| reasons::keep_missed(&sub, keep_db))),
            Outcome::TooFewBins | Outcome::NothingThere => {
                (Some(ReasonCode::TooShort), Some(reasons::too_few_bins(band, seconds, bins)))
            }
            Outcome::Open => reasons::keep_open(&response, decides.as_ref(), keep_db, band, seconds, bins),
        };
        figures.reason_code = code;
        figures.reason = reason;
        if band.requirement == Requirement::Observe {
            // Figures are not judged; a reason stands only where one is missing.
            if figures.gain_min_db.is_some() {
                figures.reason_code = None;
                figures.reason = None;
            }
        } else {
            figures.verdict = Some(verdict_of(outcome));
        }
    }
}

fn verdict_of(outcome: Outcome) -> Verdict {
    match outcome {
        Outcome::Met => Verdict::Met,
        Outcome::Missed => Verdict::Missed,
        Outcome::TooFewBins | Outcome::NothingThere | Outcome::Open => Verdict::Unproven,
    }
}

/// A figure that is missing has its reason beside it, whatever the verdict.
fn explain_missing(figures: &mut BandFigures, has_line: bool) {
    if figures.reason.is_some() {
        return;
    }
    let missing: Vec<&str> = [
        (figures.before_dbfs, "the level before"),
        (figures.before_floor_dbfs, "the floor before"),
        (figures.after_dbfs, "the level after"),
        (figures.after_floor_dbfs, "the floor after"),
        (figures.line_before_dbfs, "the line before"),
        (figures.line_after_dbfs, "the line after"),
    ]
    .into_iter()
    .take(if has_line { 6 } else { 4 })
    .filter_map(|(figure, name)| figure.is_none().then_some(name))
    .collect();
    if !missing.is_empty() {
        figures.reason = Some(format!("below -200 dBFS, where figures end: {}", missing.join(", ")));
    }
}
