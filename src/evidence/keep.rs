//! Whether a keep band is kept.

use super::chance;
use super::db;
use super::gains::DB_PER_NEPER;
use super::response::{Dip, Response, SubGain};
use super::verdicts::{FEWEST_TO_MEET, FEWEST_TO_MISS, OUTSIDE_ERRORS, Outcome};

/// A keep band must be resolved to this share to be met.
const RESOLVED: f64 = 0.5;

/// The same of a pair, where no design backs the rest.
const RESOLVED_OF_PAIR: f64 = 0.9;

/// Standard errors by which a gain must lie inside to be met: one that lies just at the
/// limit passes once in 44. Each of thousands must, and chance takes the farthest of them
/// four errors off, so that a band is met as a rule if all gains lie inside by six.
const INSIDE_ERRORS: f64 = 2.0;

/// By how much more the level of a band must have fallen for `missed` where nothing of it is
/// coherent, dB: on the demo a delay that was off by 0.4 s left 0.6 dB.
const UNSEEN_DB: f64 = 10.0;

/// Sub-bands of a pair are also taken together in this many groups.
const GROUPS: usize = 32;

/// What a keep band came to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Kept {
    /// The verdict.
    pub outcome: Outcome,
    /// The gain that decides: the one outside, or the extreme closest to the limit.
    pub decides: Option<SubGain>,
    /// What decides in its place: a range that hardly anything comes out of.
    pub dip: Option<Dip>,
}

/// Share of its band that a response must resolve.
pub fn least_resolved(response: &Response) -> f64 {
    if response.of_pair { RESOLVED_OF_PAIR } else { RESOLVED }
}

/// Judges `keep_db` in a band of `bins` bins.
///
/// Sounds shorter than a segment may read off by the window error, which adds to the
/// other in squares; where it exceeds the limit itself nothing is met. Leakage biases a
/// gain by a bounded amount; a sub-band lies outside only if it does after that much is
/// granted.
pub fn keep(response: &Response, keep_db: f64, bins: usize) -> Kept {
    let decides = deciding(response);
    if bins < FEWEST_TO_MEET {
        return Kept { outcome: Outcome::TooFewBins, decides, dip: None };
    }
    let found = if response.of_pair { outside_in_pair(response, keep_db) } else { outside(response, keep_db) };
    if found.is_outside() {
        let outcome = if bins < FEWEST_TO_MISS { Outcome::TooFewBins } else { Outcome::Missed };
        return Kept { outcome, decides: found.gain.or(decides), dip: found.dip };
    }
    let inside = |sub: &SubGain| {
        sub.window_db <= keep_db && db::rounded(sub.gain_db.abs() + INSIDE_ERRORS * sub.error_db) <= keep_db
    };
    // A range that hardly anything comes out of is no part that is kept.
    let dip = response
        .dips
        .iter()
        .filter(|dip| dip.at_most_db < -keep_db)
        .min_by(|a, b| a.at_most_db.total_cmp(&b.at_most_db));
    // The report shows both extremes with one error; they must pass by that, too.
    let error_db = decides.map_or(0.0, |sub| sub.error_db);
    let shown_inside = |sub: &SubGain| inside(&SubGain { error_db, ..*sub });
    let met = decides.is_some()
        && response.resolved >= least_resolved(response)
        && response.unclear == 0
        && dip.is_none()
        && response.counting.iter().all(inside)
        && response.lowest().is_none_or(shown_inside)
        && response.highest().is_none_or(shown_inside);
    Kept { outcome: if met { Outcome::Met } else { Outcome::Open }, decides, dip: dip.copied() }
}

/// What lies outside for certain.
#[derive(Default)]
struct Outside {
    gain: Option<SubGain>,
    dip: Option<Dip>,
}

impl Outside {
    fn is_outside(&self) -> bool {
        self.gain.is_some() || self.dip.is_some()
    }
}

/// The sub-band that lies outside by most, 3.5 errors granted.
fn outside(response: &Response, keep_db: f64) -> Outside {
    let by_db = |sub: &SubGain| {
        let margin = OUTSIDE_ERRORS * (sub.error_db * sub.error_db + sub.window_db * sub.window_db).sqrt() + keep_db;
        (-margin - sub.gain_db - sub.low_by_db).max(sub.gain_db - sub.high_by_db - margin)
    };
    let worst = response.counting.iter().max_by(|a, b| by_db(a).total_cmp(&by_db(b)));
    Outside { gain: worst.filter(|sub| by_db(sub) > 0.0).copied(), dip: None }
}

/// The same of a pair, where sub-bands are many: each is granted as much as their number
/// asks for (`chance`). Since that is more the finer they are, groups of neighbors are
/// looked at, too: a mean gain outside means that one of them is.
fn outside_in_pair(response: &Response, keep_db: f64) -> Outside {
    let alpha = chance::of_each(response.tried);
    let worst = |subs: &[SubGain], alpha: f64, bias: bool| {
        let by_db = |sub: &SubGain| outside_by_db(sub, keep_db, alpha, bias);
        subs.iter().max_by(|a, b| by_db(a).total_cmp(&by_db(b))).filter(|sub| by_db(sub) > 0.0).copied()
    };
    let single = worst(&response.counting, alpha, false);
    if single.is_some() {
        return Outside { gain: single, dip: None };
    }
    if response.counting.len() > GROUPS {
        let size = response.counting.len().div_ceil(GROUPS);
        let groups: Vec<SubGain> = response.counting.chunks(size).filter_map(mean).collect();
        let group = worst(&groups, chance::of_each(GROUPS), true);
        if group.is_some() {
            return Outside { gain: group, dip: None };
        }
    }
    // What comes out in all bounds the gain: the circle around any gain that fits into this
    // power reaches at most sqrt(k + 1) times its root.
    let window_db = response.counting.iter().map(|sub| sub.window_db).fold(0.0, f64::max);
    // Where nothing of the band is coherent, both sides may hold other stretches of a sound
    // that comes and goes (a wrong delay), whose levels differ anyway.
    let unseen_db = if response.counting.is_empty() { UNSEEN_DB } else { 0.0 };
    let dip = response.dips.iter().find(|dip| {
        let spread = chance::spread(alpha, chance::freedom(dip.independent));
        let at_most_db = dip.at_most_db + db::ratio_db(spread) + dip.low_by_db;
        at_most_db + chance::errors_of_many(alpha) * window_db < -keep_db - unseen_db
    });
    Outside { gain: None, dip: dip.copied() }
}

/// By how much a gain lies outside for certain, dB.
fn outside_by_db(sub: &SubGain, keep_db: f64, alpha: f64, bias: bool) -> f64 {
    let radius = sub.relative_error * chance::errors(alpha, sub.independent, sub.freedom);
    let window = chance::errors_of_many(alpha) * sub.window_db / DB_PER_NEPER;
    let relative = (radius * radius + window * window).sqrt();
    let lower_db = if relative < 1.0 { -2.0 * db::ratio_db(1.0 - relative) } else { f64::INFINITY };
    let higher_db = 2.0 * db::ratio_db(1.0 + relative);
    // The delay that fits best makes a gain high by half a squared error or so, the mean
    // of logarithms low by as much.
    let bias_db = if bias { sub.bias_db } else { 0.0 };
    let too_low = -keep_db - sub.gain_db - sub.low_by_db - higher_db;
    let too_high = sub.gain_db - sub.high_by_db - keep_db - lower_db;
    too_low.max(too_high) - bias_db
}

/// The mean gain of neighbors, by their bins, as one gain.
fn mean(group: &[SubGain]) -> Option<SubGain> {
    let (first, last) = (group.first()?, group.last()?);
    let bins: usize = group.iter().map(|sub| sub.bins).sum();
    let all = bins.max(1) as f64;
    let mean_of =
        |figure: &dyn Fn(&SubGain) -> f64| group.iter().map(|sub| sub.bins as f64 * figure(sub)).sum::<f64>() / all;
    let squares: f64 = group.iter().map(|sub| sub.bins as f64 * sub.relative_error).map(|error| error * error).sum();
    let relative_error = squares.sqrt() / all;
    Some(SubGain {
        from_hz: first.from_hz,
        to_hz: last.to_hz,
        bins,
        gain_db: db::rounded(mean_of(&|sub| sub.exact_db)),
        exact_db: mean_of(&|sub| sub.exact_db),
        error_db: db::rounded(DB_PER_NEPER * relative_error),
        relative_error,
        independent: group.iter().map(|sub| sub.independent).sum(),
        freedom: group.iter().map(|sub| sub.freedom).sum(),
        // Sounds shorter than a segment are the same in all of them.
        window_db: mean_of(&|sub| sub.window_db),
        low_by_db: mean_of(&|sub| sub.low_by_db),
        high_by_db: mean_of(&|sub| sub.high_by_db),
        bias_db: mean_of(&|sub| sub.bias_db),
    })
}

/// The extreme that comes closest to a limit, its error included.
fn deciding(response: &Response) -> Option<SubGain> {
    let reach = |sub: &&SubGain| sub.gain_db.abs() + INSIDE_ERRORS * sub.error_db;
    let extremes = [response.lowest()?, response.highest()?];
    extremes.into_iter().max_by(|a, b| reach(a).total_cmp(&reach(b))).copied()
}
