//! Which lines of which stages and bands fit below half a sample rate.
//!
//! The bilinear transform maps half the rate to infinity, so a stage's edges and stop edges
//! must lie below it, and so must the `match_hz` of an analog one. A band is only looked at:
//! its upper end may be half the rate itself.
//! Lines of a row of two or more are left out quietly where they do not fit, as long
//! as the first does; whatever else does not fit is the spec's to decide.

use super::wording::figure;
use super::{DesignError, limits};
use crate::spec::{Band, BeyondHalfRate, EqualizerKind, FilterStage, Line, NamedBand, Order, Placement, Spec, Stage};

/// Relative excess over half the rate that a plain band's end may have from the
/// arithmetic of center and span.
const ROUNDING: f64 = 1e-12;

/// A stage, or one line of a row, with its edges at this rate.
#[derive(Clone, Debug, PartialEq)]
pub struct PlacedStage {
    /// Index of the stage in the spec.
    pub stage_index: usize,
    /// The stage as written.
    pub stage: Stage,
    /// Number of the line in its row; `None` for a stage that is no row of two or more.
    pub harmonic: Option<u32>,
    /// Edges, Hz: one for low-pass and high-pass, two for the others (a notch: half
    /// its width below and above the center as written; the digital notch keeps
    /// center and width exactly, so its -3 dB points lie slightly off these). One for the
    /// frequency of a peak or shelf, none for a weighting or a transfer function.
    pub edges_hz: Vec<f64>,
}

impl PlacedStage {
    /// `stage 2, line 7 (350 Hz)`; the number is the one a reader of the spec counts.
    pub fn label(&self) -> String {
        let line = self.harmonic.map(|harmonic| format!(", line {harmonic}")).unwrap_or_default();
        let place = match *self.edges_hz {
            [edge] => format!("{} Hz", figure(edge)),
            [low, high] => format!("{} Hz", figure((low + high) / 2.0)),
            _ => self.stage.kind_name().to_owned(),
        };
        format!("stage {}{line} ({place})", self.stage_index + 1)
    }
}

/// Something that does not fit and is left out at this rate.
#[derive(Clone, Debug, PartialEq)]
pub struct LeftOut {
    /// What it is: `stage 2, line 7 (350 Hz)`, `stage 3 (notch)`, `band "whine"`.
    pub what: String,
    /// Why, with figures.
    pub reason: String,
}

/// What fits at one rate.
#[derive(Clone, Debug, PartialEq)]
pub struct Placed {
    /// Stages in the spec's order, rows line by line, lowest first.
    pub stages: Vec<PlacedStage>,
    /// Bands in the spec's order, rows line by line.
    pub bands: Vec<NamedBand>,
    /// What does not fit.
    pub left_out: Vec<LeftOut>,
}

/// Places a spec's stages and bands at a sample rate.
///
/// # Errors
/// [`DesignError::BeyondHalfRate`] where a stage or band, or every line of a row, does
/// not fit and the spec does not say `beyond_half_rate = "leave-out"`; all of them
/// are named.
pub fn place(spec: &Spec, rate_hz: u32) -> Result<Placed, DesignError> {
    let half = HalfRate { rate_hz };
    let mut placed = Placed { stages: Vec::new(), bands: Vec::new(), left_out: Vec::new() };
    let mut misfits = Vec::new();
    for (stage_index, stage) in spec.stages.iter().enumerate() {
        let outcome = place_stage(stage_index, stage, half, &mut placed);
        settle(outcome, spec.beyond_half_rate, &mut placed.left_out, &mut misfits);
    }
    for band in &spec.bands {
        let outcome = place_band(band, half, &mut placed);
        settle(outcome, spec.beyond_half_rate, &mut placed.left_out, &mut misfits);
    }
    if misfits.is_empty() { Ok(placed) } else { Err(DesignError::BeyondHalfRate { rate_hz, misfits }) }
}

/// A whole stage or band that does not fit is left out or an error, as the spec has it.
fn settle(
    outcome: Result<(), LeftOut>,
    beyond: BeyondHalfRate,
    left_out: &mut Vec<LeftOut>,
    misfits: &mut Vec<LeftOut>,
) {
    if let Err(misfit) = outcome {
        match beyond {
            BeyondHalfRate::LeaveOut => left_out.push(misfit),
            BeyondHalfRate::Error => misfits.push(misfit),
        }
    }
}

#[derive(Clone, Copy)]
struct HalfRate {
    rate_hz: u32,
}

impl HalfRate {
    fn hz(self) -> f64 {
        f64::from(self.rate_hz) / 2.0
    }

    fn reached_by(self, edge: &str, edge_hz: f64) -> String {
        let (edge_hz, half_hz) = (figure(edge_hz), figure(self.hz()));
        format!("its {edge}, {edge_hz} Hz, is not below half the sample rate, {half_hz} Hz")
    }

    /// Of a row in which not even the first line fits.
    fn row_reached_by(self, lines: u32, edge_hz: f64) -> String {
        let reason = self.reached_by("upper edge", edge_hz);
        if lines == 1 { reason } else { format!("not even its first line fits: {reason}") }
    }
}

fn place_stage(stage_index: usize, stage: &Stage, half: HalfRate, placed: &mut Placed) -> Result<(), LeftOut> {
    let number = stage_index + 1;
    let whole = |reason| LeftOut { what: format!("stage {number} ({})", stage.kind_name()), reason };
    let one = |harmonic, edges_hz| PlacedStage { stage_index, stage: stage.clone(), harmonic, edges_hz };
    let (row, edges_hz) = match stage {
        Stage::Notch(notch) => (Some(notch.row), Vec::new()),
        Stage::Equalizer(equalizer) => (None, vec![equalizer.hz]),
        Stage::Weighting(_) | Stage::Digital(_) => (None, Vec::new()),
        Stage::Analog(analog) => match analog.match_hz.filter(|match_hz| *match_hz >= half.hz()) {
            Some(match_hz) => return Err(whole(half.reached_by("match_hz", match_hz))),
            None => (None, Vec::new()),
        },
        Stage::Filter(filter) => match &filter.placement {
            Placement::Row(row) => (Some(*row), Vec::new()),
            Placement::Edge { edge_hz } => (None, vec![*edge_hz]),
            Placement::Edges { edges_hz } => (None, edges_hz.to_vec()),
        },
    };
    let Some(row) = row else {
        let is_peak = matches!(stage, Stage::Equalizer(equalizer) if equalizer.kind == EqualizerKind::Peak);
        let edge = if is_peak { "center" } else { "edge" };
        let stop_hz = stop_edges_hz(stage);
        for (hz, one, upper) in [(edges_hz.as_slice(), edge, "upper edge"), (stop_hz, "stop edge", "upper stop edge")] {
            if let Some(edge_hz) = hz.last().filter(|edge_hz| **edge_hz >= half.hz()) {
                return Err(whole(half.reached_by(if hz.len() == 1 { one } else { upper }, *edge_hz)));
            }
        }
        placed.stages.push(one(None, edges_hz));
        return Ok(());
    };
    let (fitting, beyond): (Vec<Line>, Vec<Line>) = row.lines().partition(|line| line.to_hz < half.hz());
    match (fitting.first(), beyond.first()) {
        (None, Some(first)) => return Err(whole(half.row_reached_by(row.harmonics, first.to_hz))),
        _ => placed.stages.extend(
            fitting
                .iter()
                .map(|line| one((row.harmonics >= 2).then_some(line.harmonic), vec![line.from_hz, line.to_hz])),
        ),
    }
    placed.left_out.extend(beyond.into_iter().map(|line| LeftOut {
        what: format!("stage {number}, line {} ({} Hz)", line.harmonic, figure(line.center_hz)),
        reason: half.reached_by("upper edge", line.to_hz),
    }));
    Ok(())
}

/// Stop edges of a stage whose order follows from limits, Hz. Where one reaches half the rate
/// there is no stop band for an order to follow from, so the stage does not fit.
fn stop_edges_hz(stage: &Stage) -> &[f64] {
    match stage {
        Stage::Filter(FilterStage { order: Order::Limits(stop), .. }) => limits::stop_edges_hz(stop),
        _ => &[],
    }
}

fn place_band(band: &Band, half: HalfRate, placed: &mut Placed) -> Result<(), LeftOut> {
    let whole = |reason| LeftOut { what: format!("band \"{}\"", band.name), reason };
    let named = band.named();
    let count = u32::try_from(named.len()).unwrap_or(u32::MAX);
    let (fitting, beyond): (Vec<_>, Vec<_>) = named.into_iter().partition(|one| {
        if one.in_row { one.line.to_hz < half.hz() } else { one.line.to_hz <= half.hz() * (1.0 + ROUNDING) }
    });
    if let (None, Some(first)) = (fitting.first(), beyond.first()) {
        let to_hz = first.line.to_hz;
        return Err(whole(if count == 1 {
            format!("its upper end, {} Hz, lies above half the sample rate, {} Hz", figure(to_hz), figure(half.hz()))
        } else {
            half.row_reached_by(count, to_hz)
        }));
    }
    placed.bands.extend(fitting.into_iter().map(|mut one| {
        one.line.to_hz = one.line.to_hz.min(half.hz());
        one
    }));
    placed.left_out.extend(beyond.into_iter().map(|one| LeftOut {
        what: format!("band \"{}\"", one.name),
        reason: half.reached_by("upper edge", one.line.to_hz),
    }));
    Ok(())
}
