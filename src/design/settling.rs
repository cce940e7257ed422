//! How long a cascade rings and how long a steady line takes to go.
//!
//! A tone of amplitude 1 and frequency w that begins suddenly, e^(jwn) from n = 0 on,
//! leaves the cascade as
//!
//! ```text
//! y[n] = e^(jwn) (H(w) - T_n(w))      T_n(w) = sum of h[m] e^(-jwm) over m > n
//! ```
//!
//! so the transient that frame n still carries is exactly the transform of the tail of
//! the impulse response. The tail has fallen by D dB when max over w of |T_n(w)| is
//! at or below 10^(-D/20): then no tone, wherever it lies, leaves more of a transient
//! than that. (`h[n]` itself is no measure: a narrow notch has `h[0]` near 1 and a ring of
//! the height of width over rate, and yet a line in it comes through at full
//! amplitude at first.)
//!
//! # Both ways
//! Run forward and backward, the cascade has the autocorrelation r of h as its response,
//! which reaches as far back as ahead. What is told of an end of the recording is the same
//! for both: the tail T_n(w) is the sum of r\[m\] e^(-jwm) over m > n, on one side. It has the
//! poles of one pass.

use super::ring::{Ring, WIDTH};
use super::{response, roots};
use crate::section::Section;
use core::f64::consts::{PI, TAU};

/// Frames simulated at most; beyond, the tail is taken to fall as its slowest pole.
const MAX_FRAMES: u64 = 1 << 26;

/// The tail is followed until it is this much below what was asked for, in case
/// poles that beat let it rise again.
const AGAIN: f64 = 0.25;

/// Height of one pass' tail from which on it is left out of both passes' response: what is
/// lost there is its square.
const LEFT_OUT: f64 = 1e-8;

/// Parts into which the frames between two looks are cut, over and over.
const PARTS: u64 = 64;

/// Frames followed one by one at the end.
const FOLLOWED_FRAMES: u64 = 64;

/// A line whose steady remainder is this near the limit never gets below it: the
/// comparison is lost in rounding.
const NEVER_WITHIN: f64 = 1e-9;

/// Frames after which the tail of the impulse response has fallen by `fall_db`: the
/// first n from which on max over w of |T_n(w)| (see the module) is at least
/// `fall_db` below 1. Frame n is the first clean one; 0 for no sections.
///
/// The height falls with small rises in between. Those within 64 frames of the result
/// are seen, and later ones that last a 256th of the slowest pole's time constant, as
/// lines that beat with each other make; others may leave the result early by what they
/// add, tenths of a dB.
///
/// The cascade's poles lie inside the unit circle. Within 2^26 frames the result is
/// that of the response itself; beyond, the envelope of the slowest pole goes on.
pub fn settling_frames(sections: &[Section], fall_db: f64) -> u64 {
    let limit = from_db(-fall_db);
    Tail::new(sections).below(limit)
}

/// [`settling_frames`] of the cascade run forward and backward: frames that are not clean at
/// either end.
pub fn settling_frames_both_ways(sections: &[Section], fall_db: f64) -> u64 {
    let limit = from_db(-fall_db);
    Tail::both_ways(sections).0.below(limit)
}

/// Frames until a line at `frequency_hz` that sounds evenly from the start has fallen by
/// `reduce_db` for good; `None` if it never does.
///
/// Before the first sample the input is taken to have had that sample's value for
/// ever, as the filter's start state has it. A line of amplitude 1 and any starting
/// phase p is Re e^(jp) e^(jwn), so with the complex line in place of it the output
///
/// ```text
/// y[n] = e^(jwn) (H(w) - T_n(w)) + T_n(0)
/// ```
///
/// is in magnitude the most that any starting phase makes of frame n. The result is
/// the first frame from which on this stays at or below 10^(-reduce_db/20).
pub fn startup_frames(sections: &[Section], frequency_hz: f64, rate_hz: f64, reduce_db: f64) -> Option<u64> {
    startups(sections, rate_hz, &[(frequency_hz, reduce_db)]).pop().flatten()
}

/// [`startup_frames`] of many lines (Hz, dB) in one pass over the impulse response.
pub fn startups(sections: &[Section], rate_hz: f64, lines: &[(f64, f64)]) -> Vec<Option<u64>> {
    let mut tail = Tail::new(sections);
    let run = |&(frequency_hz, reduce_db): &(f64, f64)| {
        let limit = from_db(-reduce_db);
        let room = limit - from_db(response::gain_db(sections, frequency_hz, rate_hz));
        // At frame n at most |T_n(w)| + |T_n(0)| comes on top of the steady remainder.
        let mut until = || tail.surely_below(0.5 * room);
        let cycles_a_frame = frequency_hz / rate_hz;
        (room > NEVER_WITHIN * limit).then(|| Run::new(cycles_a_frame, limit, until(), Sum::Passed((0.0, 0.0))))
    };
    let runs = lines.iter().map(run).collect();
    let mut ring = Ring::strike(sections);
    follow(runs, response::at(sections, 0.0, rate_hz).re, || ring.advance())
}

/// [`startups`] of the cascade run forward and backward, at either end.
///
/// Before the first sample x\[0\] the input is taken to be 2 x\[0\] - x\[-n\], as the two passes
/// have it, for as long as the filter rings. That is the line going on backward, but for
/// 2 cos(p) (1 - cos wn), and the output is the real part of e^(jp) times
///
/// ```text
/// |H(w)|^2 e^(jwn) + 2 (T_n(0) - Re(e^(jwn) T_n(w)))
/// ```
///
/// whose magnitude is again the most that any starting phase makes of frame n, and of
/// frame N - 1 - n, where time runs the other way.
pub fn startups_both_ways(sections: &[Section], rate_hz: f64, lines: &[(f64, f64)]) -> Vec<Option<u64>> {
    let (mut tail, center) = Tail::both_ways(sections);
    let Some((ring, _)) = tail.looks.first() else { return vec![None; lines.len()] };
    let mut ring = ring.clone();
    let rest = center + ring.transform(0.0).0;
    let run = |&(frequency_hz, reduce_db): &(f64, f64)| {
        let limit = from_db(-reduce_db);
        let gain = from_db(2.0 * response::gain_db(sections, frequency_hz, rate_hz));
        let room = limit - gain;
        let mut until = || tail.surely_below(0.25 * room);
        let cycles_a_frame = frequency_hz / rate_hz;
        (room > NEVER_WITHIN * limit).then(|| {
            let (re, im) = ring.transform(TAU * cycles_a_frame);
            let (cos, sin) = (libm::cos(TAU * cycles_a_frame), libm::sin(TAU * cycles_a_frame));
            let left = (center + re * cos + im * sin, im * cos - re * sin);
            Run::new(cycles_a_frame, limit, until(), Sum::Left { left, gain })
        })
    };
    let runs = lines.iter().map(run).collect();
    let mut center = Some(center);
    follow(runs, rest, || center.take().unwrap_or_else(|| ring.advance()))
}

/// Sends the runs through the impulse response, whose next frame `advance` gives and whose
/// sum is `rest`.
fn follow(mut runs: Vec<Option<Run>>, mut rest: f64, mut advance: impl FnMut() -> f64) -> Vec<Option<u64>> {
    let frames = runs.iter().flatten().map(|run| run.until).max().unwrap_or(0).min(MAX_FRAMES);
    let mut block = Vec::with_capacity(BLOCK_FRAMES);
    let mut first = 0;
    while first < frames {
        block.clear();
        block.extend((0..BLOCK_FRAMES).map(|_| {
            let h = advance();
            rest -= h;
            (h, rest)
        }));
        for run in runs.iter_mut().flatten().filter(|run| run.until > first) {
            run.take(first, &block);
        }
        first += BLOCK_FRAMES as u64;
    }
    // Past the frames simulated there is only the bound.
    runs.into_iter().map(|run| run.map(|run| if run.until > frames { run.until } else { run.clean_from })).collect()
}

const BLOCK_FRAMES: usize = 512;

/// One line on its way through the impulse response.
struct Run {
    cycles_a_frame: f64,
    limit_squared: f64,
    /// From this frame on the line is surely down.
    until: u64,
    sum: Sum,
    /// First frame after the last one that was above the limit.
    clean_from: u64,
}

/// What has come of the impulse response up to frame n, or what is left of it.
enum Sum {
    /// One pass: H(w) - T_n(w), the transform of `h[0]` to `h[n]`.
    Passed((f64, f64)),
    /// Both: T_n(w), and |H(w)|^2.
    Left { left: (f64, f64), gain: f64 },
}

impl Run {
    fn new(cycles_a_frame: f64, limit: f64, until: u64, sum: Sum) -> Self {
        Run { cycles_a_frame, limit_squared: limit * limit, until, sum, clean_from: 0 }
    }

    /// Takes `h[n]` and T_n(0) of the frames from `first` on.
    fn take(&mut self, first: u64, block: &[(f64, f64)]) {
        // The phase starts afresh with every block, lest the recursion drift.
        let cycles = self.cycles_a_frame * first as f64;
        let angle = -TAU * (cycles - libm::floor(cycles));
        let (mut re, mut im) = (libm::cos(angle), libm::sin(angle));
        let step = -TAU * self.cycles_a_frame;
        let (step_re, step_im) = (libm::cos(step), libm::sin(step));
        for (n, &(h, rest)) in (first..).zip(block) {
            // y[n], turned by e^(-jwn), or its conjugate.
            let (y_re, y_im) = match &mut self.sum {
                Sum::Passed(sum) => {
                    sum.0 += h * re;
                    sum.1 += h * im;
                    (sum.0 + rest * re, sum.1 + rest * im)
                }
                Sum::Left { left, gain } => {
                    left.0 -= h * re;
                    left.1 -= h * im;
                    (*gain * re + 2.0 * (rest - (left.0 * re + left.1 * im)), *gain * im)
                }
            };
            if y_re * y_re + y_im * y_im > self.limit_squared {
                self.clean_from = n + 1;
            }
            (re, im) = (re * step_re - im * step_im, re * step_im + im * step_re);
        }
    }
}

fn from_db(db: f64) -> f64 {
    libm::exp10(db / 20.0)
}

/// When a tail falls below a limit.
enum Fall {
    /// It is never above it.
    Never,
    /// After the look of this number and before the next.
    After(usize),
    /// Past what can be simulated, at about this frame.
    Beyond(u64),
}

/// The height of the tail, max over w of |T_n(w)|, as n goes on.
struct Tail {
    /// Where the maximum can lie, radians a frame, rising.
    angles: Vec<f64>,
    /// Frames in which the slowest pole falls by 1 neper.
    time_constant: f64,
    /// Frames from look to look: a quarter of a time constant, if that many can be simulated.
    step: u64,
    /// The ring at rising frames, with the tail's height.
    looks: Vec<(Ring, f64)>,
}

impl Tail {
    fn new(sections: &[Section]) -> Tail {
        let mut ring = Ring::strike(sections);
        // T_0 is what comes after h[0].
        ring.advance();
        Tail::of(sections, ring)
    }

    /// The tail of r, on one side, and r\[0\].
    fn both_ways(sections: &[Section]) -> (Tail, f64) {
        let frames = Tail::new(sections).surely_below(LEFT_OUT).min(MAX_FRAMES);
        let (ring, center) = Ring::both_ways(sections, frames);
        (Tail::of(sections, ring), center)
    }

    fn of(sections: &[Section], ring: Ring) -> Tail {
        let mut angles = vec![0.0, PI];
        let mut time_constant: f64 = 1.0;
        for pole in roots::poles(sections) {
            let depth = pole.depth.max(f64::EPSILON);
            time_constant = time_constant.max(-1.0 / libm::log1p(-depth.min(0.9)));
            // |T_n(w)| is a sum of resonance curves, no narrower than these poles'.
            for offset in [-1.0, 0.0, 1.0] {
                let angle = pole.angle + offset * depth;
                if (0.0..=PI).contains(&angle) {
                    angles.push(angle);
                }
            }
        }
        angles.sort_by(f64::total_cmp);
        angles.dedup();
        let step = (libm::ceil(time_constant / 4.0) as u64).clamp(1, MAX_FRAMES / 4);
        let mut tail = Tail { angles, time_constant, step, looks: Vec::new() };
        if !sections.is_empty() {
            let height = tail.height(&ring);
            tail.looks.push((ring, height));
        }
        tail
    }

    /// max over w of |T_n(w)|, the ring's next frame being n + 1.
    fn height(&self, ring: &Ring) -> f64 {
        let mut heights = Vec::with_capacity(self.angles.len() + WIDTH);
        for angles in self.angles.chunks(WIDTH) {
            let filled = core::array::from_fn(|k| angles.get(k).copied().unwrap_or(PI));
            heights.extend(ring.tails(filled));
        }
        heights.truncate(self.angles.len());
        let Some((best, &height)) = heights.iter().enumerate().max_by(|a, b| a.1.total_cmp(b.1)) else { return 0.0 };
        let low = self.angles[best.saturating_sub(1)];
        let high = self.angles[(best + 1).min(self.angles.len() - 1)];
        super::golden::maximum(low, high, 1e-6 * height, |angle| ring.tail(angle)).1.max(height)
    }

    /// Looks until the height is safely below `limit`; the number of the last look
    /// that was above it, or, past what can be simulated, the frame it will be down.
    fn last_above(&mut self, limit: f64) -> Fall {
        loop {
            let Some((ring, height)) = self.looks.last() else { return Fall::Never };
            if *height <= AGAIN * limit {
                break;
            }
            // A response that overflowed never comes down.
            if !height.is_finite() {
                return Fall::Beyond(MAX_FRAMES);
            }
            if ring.frame() > MAX_FRAMES {
                let nepers = libm::log(height / limit).max(0.0);
                return Fall::Beyond(ring.frame() - 1 + libm::ceil(nepers * self.time_constant) as u64);
            }
            let mut ring = ring.clone();
            ring.skip(self.step);
            let height = self.height(&ring);
            self.looks.push((ring, height));
        }
        self.looks.iter().rposition(|&(_, height)| height > limit).map_or(Fall::Never, Fall::After)
    }

    /// A frame, not much too late, from which on the height stays at or below `limit`.
    fn surely_below(&mut self, limit: f64) -> u64 {
        match self.last_above(limit) {
            Fall::Never => 0,
            Fall::Beyond(frame) => frame,
            Fall::After(look) => self.looks.get(look + 1).map_or(0, |(ring, _)| ring.frame()),
        }
    }

    /// First n from which on the height stays at or below `limit`.
    fn below(&mut self, limit: f64) -> u64 {
        let (mut low, mut clean_from, mut width) = match self.last_above(limit) {
            Fall::Beyond(frame) => return frame,
            Fall::After(look) => (self.looks[look].0.clone(), self.looks[look].0.frame(), self.step),
            Fall::Never => match self.looks.first() {
                Some((ring, _)) => (ring.clone(), 0, 1),
                None => return 0,
            },
        };
        // Below from the next look on. Look closer and closer for the last frame above.
        while width > 1 {
            let part = width.div_ceil(PARTS);
            let mut ring = low.clone();
            for _ in 1..width.div_ceil(part) {
                ring.skip(part);
                if self.height(&ring) > limit {
                    // The ring's next frame is n + 1 where T_n is still above.
                    clean_from = ring.frame();
                    low = ring.clone();
                }
            }
            width = part;
        }
        // Fast poles make the height wiggle from frame to frame.
        let mut quiet = 0;
        while quiet < FOLLOWED_FRAMES {
            low.skip(1);
            quiet += 1;
            if self.height(&low) > limit {
                clean_from = low.frame();
                quiet = 0;
            }
        }
        clean_from
    }
}
