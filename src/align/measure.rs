//! Delay, clock and polarity from pairs of chunks.

use super::correlator::NEEDED_RATIO;
use super::finder::SURE_RATIO;
use super::lags::{Relative, relative};
use super::line::{Fit, Lag, Line, consensus, fit, median};
use super::mean::{Extremum, Mean};
use super::notes;
use super::spectra::Spectra;
use super::track::Piece;
use super::{AMBIGUOUS_DELAY, AlignError, Alignment, Search};

/// Most rounds of cutting, aligning and fitting. Each leaves about a thirtieth of the error of
/// the slope before it (one chunk's share in the sum it is held against).
const ROUNDS: usize = 5;

/// Frames over all chunks by which the slope may still change.
const SETTLED_FRAMES: f64 = 1e-4;

/// Standard errors by which a clock difference must stand out.
const NEEDED_ERRORS: f64 = 3.0;

/// Lags without which there is no clock: two lie on a straight line whatever they are.
const FEWEST_LAGS: usize = 3;

/// Frames by which it must move the lag over the whole overlap.
const NEEDED_FRAMES: f64 = 1e-3;

/// Share of the chunks that sound that must match, unless their average does.
const NEEDED_SHARE: f64 = 0.3;

/// How far above its root mean square the averaged cross-correlation's peak must stand
/// where chunks do not match each other, as in a sweep. Of unrelated bursts, whose
/// cross-correlation is concentrated, two in 60 exceeded 7.5; a sweep's is 39.
const ALONE_RATIO: f64 = 12.0;

/// Energy below that of the loudest chunk at which one no longer counts as sounding: -30 dB.
const SOUNDING: f64 = 1e-3;

/// Delays this near to a whole number of frames are whole: rounding, not measurement.
const WHOLE: f64 = 1e-6;

/// What is known before the chunks are compared.
#[derive(Clone, Debug)]
pub(super) struct Known {
    /// A lag and the place in the recording before where it was found, frames.
    pub(super) origin: (f64, f64),
    /// Another lag that fits as well.
    pub(super) rival: Option<f64>,
}

/// Measures `pieces`, chunks of `chunk` frames each; at least one.
pub(super) fn measure(search: &Search, pieces: &[Piece], chunk: usize, known: &Known) -> Result<Alignment, AlignError> {
    let given = search.given_frames;
    let mut line = first_line(pieces, known, given);
    let mut spectra = Spectra::new(pieces, chunk);
    spectra.follow(line);
    let mean = Mean::of(&spectra);
    let first = if given.is_some() { mean.polarity() } else { mean.extremum(line.at_zero) };
    let Some(first) = first else { return Err(refused(search, 0.0)) };
    line.at_zero += first.lag;
    let inverted = first.inverted;

    let mut state = State { line, fit: None, lags: Vec::new() };
    for round in 0..ROUNDS {
        if round > 0 || first.lag != 0.0 {
            settle(&mut spectra, &mut state.line, inverted, given.is_some());
        }
        let before = state.line.slope;
        state.compare(&spectra, pieces, given.is_some(), false);
        if (state.line.slope - before).abs() * span(pieces) < SETTLED_FRAMES {
            break;
        }
    }
    let overlap = overlap_frames(search, state.line.at_zero);
    let enough = state.matching(pieces).len() >= FEWEST_LAGS;
    let stands_out = enough
        && state.fit.is_some_and(|fit| {
            state.line.slope.abs() >= NEEDED_ERRORS * fit.slope_error
                && state.line.slope.abs() * overlap >= NEEDED_FRAMES
        });
    let error = state.fit.map(|fit| fit.slope_error);
    if !stands_out {
        let center = state.fit.map_or(0.0, |fit| fit.center);
        state.line = Line { at_zero: given.unwrap_or(nearly_whole(state.line.at(center), 1e-3)), slope: 0.0 };
    }
    settle(&mut spectra, &mut state.line, inverted, given.is_some());
    let line = Line { at_zero: nearly_whole(state.line.at_zero, WHOLE), ..state.line };
    let slope = state.line.slope;
    state.compare(&spectra, pieces, given.is_some(), true);

    let matching = state.lags.iter().filter(|lag| lag.matches).count();
    let sounding = sounding(pieces, &spectra);
    let needed = (NEEDED_SHARE * sounding as f64).ceil() as usize;
    let doubtful = pieces.len() > 1 && matching < needed.max(1) && first.ratio < ALONE_RATIO;
    if doubtful && ratio_of(&spectra, line.at_zero) < ALONE_RATIO {
        return Err(AlignError::NotBorneOut {
            matching,
            sounding,
            needed: needed.max(1),
            delay: line.at_zero,
            given: given.is_some(),
        });
    }
    let notes = notes::of(line.at_zero, &first, known.rival, given.is_some(), (matching, sounding));
    let ambiguous = notes.iter().any(|note| note.starts_with(AMBIGUOUS_DELAY));
    // A peak that is believed alone needs no chunks to bear it out, as of a sweep.
    let unsupported = 2 * matching < sounding && first.ratio < SURE_RATIO;
    let rate = f64::from(search.rate_hz);
    let scatter = state.scatter(pieces, line, stands_out);
    Ok(Alignment {
        delay_frames: line.at_zero,
        clock_ppm: slope * 1e6,
        clock_error_ppm: error.filter(|error| *error < 1.0).map(|error| error * 1e6),
        inverted,
        scatter_s: scatter.map(|frames| frames / rate),
        certain: given.is_some() || !(ambiguous || unsupported),
        notes,
    })
}

/// What the chunks say along a line.
struct State {
    line: Line,
    fit: Option<Fit>,
    lags: Vec<Relative>,
}

impl State {
    /// Lags of all chunks relative to each other, and the slope of the line after them.
    fn compare(&mut self, spectra: &Spectra<'_>, pieces: &[Piece], pinned: bool, strict: bool) {
        if pieces.len() < 2 {
            return;
        }
        let weights = spectra.weights();
        let own = own_residues(pieces, self.line);
        self.lags = (0..pieces.len()).map(|i| relative(spectra, &weights, i, own[i].unwrap_or(0.0), strict)).collect();
        let lags = self.matching(pieces);
        if lags.len() < 2 {
            self.fit = None;
            return;
        }
        let fit = fit(&lags);
        self.line.slope += fit.line.slope;
        if !pinned {
            self.line.at_zero -= fit.line.slope * fit.center;
        }
        self.fit = Some(fit);
    }

    fn matching(&self, pieces: &[Piece]) -> Vec<Lag> {
        let pairs = self.lags.iter().zip(pieces).filter(|(lag, _)| lag.matches);
        pairs.map(|(lag, piece)| Lag { place: piece.middle(), lag: lag.lag, variance: lag.variance }).collect()
    }

    /// Root mean square of the lags about their line, frames. A chunk weighs as its error
    /// and that of the typical chunk allow, so that one in which little sounds says little.
    /// One whose own lag is distinct but lies elsewhere counts in full.
    fn scatter(&self, pieces: &[Piece], line: Line, sloped: bool) -> Option<f64> {
        let lags = self.matching(pieces);
        let typical = median(lags.iter().map(|lag| lag.variance).collect()).unwrap_or(1.0);
        let weight = |lag: &Lag| typical / (lag.variance + typical);
        let total: f64 = lags.iter().map(weight).sum();
        let fitted = fit(&lags).line;
        let mean = lags.iter().map(|lag| weight(lag) * lag.lag).sum::<f64>() / total;
        let about = |lag: &Lag| if sloped { lag.lag - fitted.at(lag.place) } else { lag.lag - mean };
        let freedom = lags.len() as f64 - if sloped { 2.0 } else { 1.0 };
        let square = lags.iter().map(|lag| weight(lag) * about(lag) * about(lag)).sum::<f64>() / total;
        let squares = if freedom > 0.0 { square * lags.len() as f64 / freedom } else { 0.0 };
        let strays = self.lags.iter().zip(pieces).zip(own_residues(pieces, line)).filter(|((lag, _), _)| !lag.matches);
        let far: Vec<f64> = strays.filter_map(|(_, own)| own).filter(|own| own.abs() > 3.0).collect();
        let count = lags.len() + far.len();
        let sum = squares * lags.len() as f64 + far.iter().map(|off| off * off).sum::<f64>();
        (count > 2).then(|| (sum / count as f64).sqrt())
    }
}

/// The line to start from: through the distinct lags, else level from the first found.
fn first_line(pieces: &[Piece], known: &Known, given: Option<f64>) -> Line {
    let points: Vec<(f64, f64)> = pieces.iter().filter_map(|piece| Some((piece.middle(), piece.lag?))).collect();
    // Of a sweep no chunk's lag is distinct, but the higher its frequencies the nearer.
    let rough = pieces.iter().filter_map(|piece| piece.rough).min_by(|a, b| a.1.total_cmp(&b.1));
    let within = pieces.first().map_or(0.0, |piece| 0.125 * piece.before.len() as f64);
    let (place, lag) = rough.filter(|rough| rough.1 < within).map_or(known.origin, |rough| (0.0, rough.0));
    let found = consensus(&points);
    let slope = found.map_or(0.0, |line| line.slope);
    let height = found.map(|line| line.at_zero).or(points.first().map(|(_, lag)| *lag));
    Line { at_zero: given.or(height).unwrap_or(lag - slope * place), slope }
}

/// Brings the line to the middle of the averaged cross-correlation's peak.
fn settle(spectra: &mut Spectra<'_>, line: &mut Line, inverted: bool, pinned: bool) {
    spectra.follow(*line);
    if !pinned {
        let off = Mean::of(spectra).refine(0.0, inverted);
        if off.abs() < 2.0 {
            line.at_zero += off;
        }
    }
}

/// Own lags beyond the line, less what they have in common (a filter's share).
fn own_residues(pieces: &[Piece], line: Line) -> Vec<Option<f64>> {
    let off = |piece: &Piece| piece.lag.map(|lag| lag - line.at(piece.middle()));
    let common = median(pieces.iter().filter_map(off).collect()).unwrap_or(0.0);
    pieces.iter().map(|piece| off(piece).map(|off| off - common)).collect()
}

fn span(pieces: &[Piece]) -> f64 {
    let [first, last] = [pieces.first(), pieces.last()].map(|piece| piece.map_or(0.0, Piece::middle));
    last - first
}

fn sounding(pieces: &[Piece], spectra: &Spectra<'_>) -> usize {
    let energies: Vec<f64> = spectra.power.iter().map(|power| power.iter().map(|p| f64::from(*p)).sum()).collect();
    let loudest = energies.iter().copied().fold(0.0, f64::max);
    debug_assert_eq!(energies.len(), pieces.len());
    energies.iter().filter(|energy| **energy >= SOUNDING * loudest).count()
}

fn ratio_of(spectra: &Spectra<'_>, at_zero: f64) -> f64 {
    Mean::of(spectra).extremum(at_zero).map_or(0.0, |Extremum { ratio, .. }| ratio)
}

fn overlap_frames(search: &Search, delay: f64) -> f64 {
    let (before, after) = (search.frames_before as f64, search.frames_after as f64);
    (before.min(after - delay) - (-delay).max(0.0)).max(0.0)
}

fn nearly_whole(frames: f64, within: f64) -> f64 {
    if (frames - frames.round()).abs() < within { frames.round() } else { frames }
}

/// Nothing stands out.
pub(super) fn refused(search: &Search, peak: f64) -> AlignError {
    AlignError::NothingInCommon { max_delay_s: search.max_delay_s, peak, needed: NEEDED_RATIO }
}
