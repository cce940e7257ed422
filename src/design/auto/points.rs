//! The frequencies at which a cascade that is looked for is held against what is asked of it.

use super::margin;
use super::needs::Needs;
use crate::design::transform::prewarp;

/// Points in a range to keep lie this much farther from its end one after another.
const KEEP_GROWTH: f64 = 1.25;
/// The same in a range to take out.
const LINE_GROWTH: f64 = 1.4;
/// Above this many lines points are spread wider: rows are many times the same.
const MANY_LINES: usize = 60;
/// Slack beyond this counts as this much, nepers.
pub const MOST_SLACK: f64 = 3.0;
/// One neper of power, dB.
const NEPER_DB: f64 = 4.342_944_819_032_518;

/// What is asked for at a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Ask {
    /// Attenuation of at most so many dB.
    Keep(f64),
    /// Attenuation of at least so many dB.
    Reduce(f64),
}

/// A point.
#[derive(Clone, Copy, Debug)]
pub struct Point {
    /// Index of the sample rate.
    pub rate: usize,
    /// tan(pi f / rate).
    pub at: f64,
    /// What is asked for, margin included.
    pub ask: Ask,
}

impl Point {
    /// How far an attenuation is on the right side of what is asked for, nepers: for a range
    /// to keep the logarithm of what may be lost over what is lost, so that both kinds grow
    /// in step with the logarithm of a stage's ripple.
    pub fn slack(&self, attenuation_db: f64) -> f64 {
        match self.ask {
            Ask::Keep(limit_db) => {
                let part = attenuation_db / limit_db;
                if part <= 0.05 { MOST_SLACK } else { -libm::log(part) }
            }
            Ask::Reduce(need_db) => ((attenuation_db - need_db) / NEPER_DB).min(MOST_SLACK),
        }
    }
}

/// All points, rate after rate.
#[derive(Clone, Debug, Default)]
pub struct Points {
    /// The points.
    pub all: Vec<Point>,
    /// The sample rates, Hz.
    pub rates_hz: Vec<f64>,
    /// Whether a stage may reach half of a rate, and is then left out there.
    pub leaves_out: bool,
}

impl Points {
    /// The points for `needs` where lines take `part` of what they may; of the lines only
    /// those that `wanted` accepts, each asked to fall by `help_db` less.
    pub fn new(needs: &Needs, part: f64, wanted: impl Fn(usize) -> bool, help_db: f64) -> Points {
        let rates_hz: Vec<f64> = needs.rates_hz.iter().copied().map(f64::from).collect();
        let many = needs.lines.len() > MANY_LINES;
        let growth = if many { 1.6 } else { KEEP_GROWTH };
        let fineness = if many { 5.0 } else { 12.0 };
        let mut all = Vec::new();
        for (rate, &rate_hz) in rates_hz.iter().enumerate() {
            let half_hz = rate_hz / 2.0;
            let mut push = |hz: f64, ask: Ask| {
                all.push(Point { rate, at: prewarp(hz.min(0.499_999_9 * rate_hz), rate_hz), ask });
            };
            let lines: Vec<_> = needs.lines_at(half_hz).collect();
            let kept: Vec<(f64, f64)> = needs.keeps_at(half_hz).flat_map(|keep| keep.segments(part, half_hz)).collect();
            for keep in needs.keeps_at(half_hz) {
                let ask = Ask::Keep(margin::keep_limit_db(keep.keep_db));
                for (from_hz, to_hz) in keep.segments(part, half_hz) {
                    let below = lines.iter().map(|(_, line)| from_hz - line.to_hz).filter(|gap| *gap >= 0.0);
                    let above = lines.iter().map(|(_, line)| line.from_hz - to_hz).filter(|gap| *gap >= 0.0);
                    let width_hz = to_hz - from_hz;
                    let first = |gap_hz: f64| gap_hz.min(width_hz).max(1e-6 * to_hz) / fineness;
                    let firsts = [first(below.fold(width_hz, f64::min)), first(above.fold(width_hz, f64::min))];
                    graded((from_hz, to_hz), firsts, growth, |hz| push(hz, ask));
                }
            }
            for (_, line) in lines.into_iter().filter(|(owner, _)| wanted(*owner)) {
                let first_hz = first_in_line(line.from_hz, line.to_hz, &kept, many).max(1e-6 * line.to_hz);
                let ask = Ask::Reduce((line.need_db() - help_db).max(0.1 * line.need_db()));
                graded((line.from_hz, line.to_hz), [first_hz; 2], LINE_GROWTH, |hz| push(hz, ask));
            }
        }
        Points { all, rates_hz, leaves_out: needs.leaves_out }
    }

    /// The ranges of `all` that belong to one rate each.
    pub fn by_rate(&self) -> impl Iterator<Item = (f64, &[Point], usize)> {
        let mut start = 0;
        self.rates_hz.iter().enumerate().map(move |(rate, &rate_hz)| {
            let rest = self.all.get(start..).unwrap_or_default();
            let count = rest.partition_point(|point| point.rate <= rate);
            let own = (rate_hz, &rest[..count], start);
            start += count;
            own
        })
    }

    /// Adds points found later, at `hz`.
    pub fn add(&mut self, rate: usize, hz: f64, ask: Ask) {
        let Some(&rate_hz) = self.rates_hz.get(rate) else { return };
        let at = prewarp(hz.min(0.499_999_9 * rate_hz), rate_hz);
        let place = self.all.partition_point(|point| point.rate <= rate);
        self.all.insert(place, Point { rate, at, ask });
    }
}

/// How far inside a line the first point lies: the zeros of a steep stop crowd as near to its
/// edge as the transition is wide.
fn first_in_line(from_hz: f64, to_hz: f64, kept: &[(f64, f64)], many: bool) -> f64 {
    let width_hz = to_hz - from_hz;
    if many {
        return width_hz / 6.0;
    }
    let gaps = kept.iter().flat_map(|kept| [from_hz - kept.1, kept.0 - to_hz]).filter(|gap_hz| *gap_hz > 0.0);
    (width_hz / 40.0).min(gaps.fold(f64::INFINITY, f64::min) / 4.0)
}

/// Both ends of a range, its middle, and points between that are dense at the ends: the first
/// `firsts` (Hz) from them, each next one `growth` times as far.
fn graded((from_hz, to_hz): (f64, f64), firsts: [f64; 2], growth: f64, mut push: impl FnMut(f64)) {
    let half_hz = 0.5 * (to_hz - from_hz);
    push(from_hz);
    push(to_hz);
    push(from_hz + half_hz);
    let mut side = |first_hz: f64, at: &dyn Fn(f64) -> f64| {
        let mut off_hz = first_hz;
        while off_hz < half_hz {
            push(at(off_hz));
            // Near the end evenly, or the step from the end to the first point is the widest.
            off_hz += (off_hz * (growth - 1.0)).max(0.5 * first_hz);
        }
    };
    side(firsts[0], &|off_hz| from_hz + off_hz);
    side(firsts[1], &|off_hz| to_hz - off_hz);
}
