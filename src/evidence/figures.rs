//! All figures of a band, put together.

use super::ranges::shows_gains;
use super::verdicts::Outcome;
use super::view::{Channel, View};
use super::{BandFigures, BandTask, Measured, ReasonCode, Verdict, reasons};
use crate::spec::Requirement;
use crate::spectrum::band_bins;

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

impl Channel<'_> {
    fn judge(&self, band: &BandTask) -> BandFigures {
        let measured = self.measured;
        let mut own = self.own(band);
        if own.pieces.is_empty() || measured.spectra.segments == 0 {
            return without_bins(measured, band);
        }
        if let Some(pair) = measured.pair.filter(|pair| pair.falls_short_of(band, measured.rate_hz)) {
            own = own.below(pair.reaches_hz, self.bin_hz());
            // A level of half a band says nothing of the band; a response does of its part.
            if !shows_gains(&band.requirement) || own.pieces.is_empty() {
                return unproven(band, ReasonCode::OutOfRange, reasons::interpolated(band, pair.reaches_hz));
            }
        }
        let view = View::new(self, &own, &band.requirement);
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

/// The verdict of an outcome.
pub fn verdict_of(outcome: Outcome) -> Verdict {
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
