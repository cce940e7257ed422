//! One read over both recordings.
//!
//! The recording before is read ahead: of each of 24 stretches of it the liveliest chunk
//! is kept. The recording after follows as far as the next chunk needs, and its last
//! frames, twice the largest delay, are kept. The first chunk that is found in them gives
//! the lag; from then on each chunk is looked for where it is expected and kept with what
//! surrounds its place after. So memory is bounded by the largest delay and the chunks,
//! whatever the length.

use super::correlator::Correlator;
use super::line::STEEPEST;
use super::measure::{Known, measure, refused};
use super::mixer::Mixer;
use super::ring::Ring;
use super::slots::{Chunk, Slots};
use super::track::{Piece, Tracker};
use super::{AlignError, Alignment, Search, Side};
use std::collections::VecDeque;
use std::mem;

/// Stretches of the recording before.
const SLOTS: u64 = 24;

/// Frames that both must have in common: eight of the shortest chunks.
const NEEDED_FRAMES: u64 = 1024;

/// A chunk lasts an eighth of a second at least, at most twice that: a clock difference of
/// 200 parts in a million moves the lag by 1.6 frames of 48 kHz within it, and it holds
/// enough of any sound to be found in 20 s of another.
const CHUNKS_PER_SECOND: u32 = 8;

/// Chunks that are looked for at all delays before the search is given up.
const ATTEMPTS: usize = 12;

/// Chunks that are at last looked for without whitening.
const PLAIN_ATTEMPTS: usize = 3;

/// How far above its root mean square a peak must stand to be believed alone. Sounds of few
/// tones resemble others of their kind: of 59 music-like pairs 15 were refused because the
/// first peak above 7.5 was a wrong one.
pub(super) const SURE_RATIO: f64 = 30.0;

/// Frames by which lags of two chunks may differ besides what clocks allow: a filter delays
/// one sound more than another.
const AGREEING_FRAMES: f64 = 16.0;

/// How many more chunks are looked for until the best lag is taken though none agrees,
/// where what was before is not kept.
const PATIENCE: usize = 3;

/// Energy below that of the liveliest chunk so far at which one is only tried when all
/// else has failed: -30 dB.
const LIVELY: f64 = 1e-3;

/// Looks at both recordings once, block by block.
///
/// ```text
/// while let Some(side) = finder.wants() {
///     read the next block of that side; none left: planes without frames
///     finder.take(side, &planes);
/// }
/// let alignment = finder.finish()?;
/// ```
///
/// Blocks may have any length; the result does not depend on it. A side ends when as many
/// frames were taken as the [`Search`] promised, or with a block without frames if it
/// turns out to be shorter. The end of either recording need not be asked for.
#[derive(Debug)]
pub struct Finder {
    search: Search,
    refusal: Option<AlignError>,
    chunk: usize,
    max_lag: i64,
    mixers: [Mixer; 2],
    ended: [bool; 2],
    mixed: Vec<f32>,
    slots: Slots,
    /// Frames before beyond which there can be no partner.
    span: u64,
    ring: Ring,
    waiting: VecDeque<Chunk>,
    /// Chunks that were passed over.
    passed: Vec<Chunk>,
    liveliest: f64,
    attempts: usize,
    highest_ratio: f64,
    /// Lags that stand out, but not so far that one is believed alone.
    candidates: Vec<Candidate>,
    /// Chunks looked for since the first of them.
    unsure: usize,
    tracking: Option<Tracking>,
    pieces: Vec<Piece>,
}

/// A lag that may be right.
#[derive(Clone, Copy, Debug)]
struct Candidate {
    /// Middle of its chunk, frames.
    place: f64,
    lag: f64,
    ratio: f64,
    rival: Option<f64>,
}

impl Candidate {
    /// Whether one clock difference explains both.
    fn agrees(&self, other: &Candidate) -> bool {
        let apart = (self.place - other.place).abs();
        // A chunk that is looked for again at the end is no second witness.
        apart > 0.0 && (self.lag - other.lag).abs() <= AGREEING_FRAMES + STEEPEST * apart
    }
}

/// From the moment the lag is known.
#[derive(Debug)]
struct Tracking {
    tracker: Tracker,
    rival: Option<f64>,
    /// `None` until a chunk shows what to whiten.
    correlator: Option<Correlator>,
    /// Whether a chunk was found with that: until then each shows it anew.
    proven: bool,
}

impl Finder {
    /// Nothing seen yet.
    pub fn new(search: Search) -> Self {
        let rate = f64::from(search.rate_hz.max(1));
        let shorter = search.frames_before.min(search.frames_after);
        let longest = (search.rate_hz / CHUNKS_PER_SECOND).clamp(128, 1 << 20).next_power_of_two();
        let fitting = 1_u64 << (shorter / 8).max(128).ilog2();
        let chunk = fitting.min(u64::from(longest)) as usize;
        let longer = search.frames_before.max(search.frames_after);
        let given = search.given_frames;
        let reach = (search.max_delay_s * rate).max(0.0);
        let max_lag = (reach.ceil() as u64).min(longer) as i64;
        let furthest = given.map_or(max_lag, |given| -given.min(0.0) as i64);
        let span = search.frames_before.min(search.frames_after.saturating_add(furthest as u64));
        let count = (span / chunk as u64).clamp(1, SLOTS);
        let ring = if given.is_some() { 8 * chunk as u64 } else { 2 * max_lag as u64 + 8 * chunk as u64 };
        let tracking = given.map(|given| Tracking {
            tracker: Tracker::new(0.0, given, 0),
            rival: None,
            correlator: None,
            proven: false,
        });
        Self {
            refusal: refusal(&search, chunk),
            chunk,
            max_lag,
            mixers: Default::default(),
            ended: [search.frames_before == 0, search.frames_after == 0],
            mixed: Vec::new(),
            slots: Slots::new(span, chunk, count),
            span,
            ring: Ring::new(ring.min(search.frames_after.max(1)) as usize),
            waiting: VecDeque::new(),
            passed: Vec::new(),
            liveliest: 0.0,
            attempts: 0,
            highest_ratio: 0.0,
            candidates: Vec::new(),
            unsure: 0,
            tracking,
            pieces: Vec::new(),
            search,
        }
    }

    /// Which side the next block should come from, so that memory stays bounded; `None`
    /// where nothing more is needed.
    pub fn wants(&self) -> Option<Side> {
        let [before_ended, after_ended] = self.ended;
        if self.refusal.is_some() {
            return None;
        }
        if self.waiting.is_empty() && !before_ended {
            return Some(Side::Before);
        }
        // Read on in silence, so that it is known to be silence to the end.
        let silent = self.mixers[0].changes() && !self.mixers[1].changes();
        let passed = self.tracking.is_none() && !self.passed.is_empty() && !self.read_enough();
        let waits = !self.waiting.is_empty() || passed;
        (!after_ended && (waits || silent)).then_some(Side::After)
    }

    /// Takes the next frames of one side, a plane a channel; without frames that side
    /// has ended.
    pub fn take(&mut self, side: Side, planes: &[Vec<f64>]) {
        let at = side as usize;
        let promised = [self.search.frames_before, self.search.frames_after][at];
        let mut mixed = mem::take(&mut self.mixed);
        self.mixers[at].mix(planes, &mut mixed);
        match side {
            Side::Before => {
                let done = self.slots.push(&mixed);
                self.waiting.extend(done);
            }
            Side::After => self.ring.push(&mixed),
        }
        let frames = self.mixers[at].frames();
        let enough = side == Side::Before && frames >= self.span && self.mixers[0].changes();
        if (mixed.is_empty() || frames >= promised || enough) && !self.ended[at] {
            self.ended[at] = true;
            if side == Side::Before {
                self.waiting.extend(self.slots.finish());
            }
        }
        self.mixed = mixed;
        self.advance();
    }

    /// What came of it.
    ///
    /// # Errors
    /// See [`AlignError`].
    pub fn finish(mut self) -> Result<Alignment, AlignError> {
        if let Some(refusal) = self.refusal.take() {
            return Err(refusal);
        }
        self.ended = [true, true];
        self.waiting.extend(self.slots.finish());
        self.advance();
        for (side, mixer) in [(Side::Before, &self.mixers[0]), (Side::After, &self.mixers[1])] {
            let frames = mixer.frames();
            // A side that was never asked for says nothing about itself.
            if frames > 0 && !mixer.sounds() {
                return Err(AlignError::Silent { side, frames });
            }
            if frames > 0 && !mixer.changes() {
                return Err(AlignError::Constant { side, frames });
            }
        }
        let Some(tracking) = self.tracking.filter(|_| !self.pieces.is_empty()) else {
            return Err(refused(&self.search, self.highest_ratio));
        };
        self.pieces.sort_by_key(|piece| piece.start);
        let known = Known { origin: tracking.tracker.origin(), rival: tracking.rival };
        measure(&self.search, &self.pieces, self.chunk, &known)
    }

    /// Does what the frames at hand allow.
    fn advance(&mut self) {
        while let Some(chunk) = self.waiting.pop_front() {
            if self.ring.end() < self.needs(&chunk) && !self.ended[1] {
                self.waiting.push_front(chunk);
                return;
            }
            match &mut self.tracking {
                Some(tracking) => {
                    let piece = tracking.collect(chunk, &self.ring, self.chunk);
                    self.pieces.extend(piece);
                }
                None => self.consider(chunk),
            }
        }
        if self.ended[0] && self.read_enough() && self.tracking.is_none() && !self.passed.is_empty() {
            self.try_passed();
        }
    }

    /// Index after the last frame after that any chunk can need.
    fn furthest(&self) -> i64 {
        let furthest = self.span as i64 + self.max_lag + 2 * self.chunk as i64;
        furthest.min(self.search.frames_after as i64)
    }

    fn read_enough(&self) -> bool {
        self.ended[1] || self.ring.end() >= self.furthest()
    }

    /// Index after the last frame after that `chunk` waits for.
    fn needs(&self, chunk: &Chunk) -> i64 {
        match &self.tracking {
            Some(tracking) => tracking.tracker.needs(chunk),
            None if self.put_off(chunk) => 0,
            None => chunk.start as i64 + self.max_lag + 2 * self.chunk as i64,
        }
    }

    /// Whether a chunk is better left for the end: too faint, or so early that its partner
    /// may lie before the recording after, where a later one does as well.
    fn put_off(&self, chunk: &Chunk) -> bool {
        let early = (chunk.start as i64) < self.max_lag && self.span < (SLOTS * self.max_lag as u64);
        early || chunk.energy < LIVELY * self.liveliest
    }

    fn consider(&mut self, chunk: Chunk) {
        let put_off = self.put_off(&chunk) || self.attempts >= ATTEMPTS;
        self.liveliest = self.liveliest.max(chunk.energy);
        if put_off || !self.attempt(&chunk) {
            self.passed.push(chunk);
            return;
        }
        self.resume(chunk);
    }

    /// All chunks that were passed over, the liveliest first; in the end as they are, for
    /// a steady tone is what whitening takes away.
    fn try_passed(&mut self) {
        let mut passed = mem::take(&mut self.passed);
        passed.sort_by(|a, b| b.energy.total_cmp(&a.energy));
        // As far back as frames are kept for certain, whatever the blocks.
        let floor = self.furthest() - self.ring.kept() as i64;
        for (whiten, count) in [(true, ATTEMPTS), (false, PLAIN_ATTEMPTS)] {
            for index in 0..passed.len().min(count) {
                if self.attempt_from(&passed[index], floor, whiten) {
                    let chunk = passed.remove(index);
                    self.passed = passed;
                    self.resume(chunk);
                    return self.advance();
                }
            }
            if self.take_best(floor) {
                let chunk = passed.remove(0);
                self.passed = passed;
                self.resume(chunk);
                return self.advance();
            }
        }
    }

    /// Collects what was passed over, now that the lag is known, nearest first.
    fn resume(&mut self, chunk: Chunk) {
        let start = chunk.start;
        let mut all = mem::take(&mut self.passed);
        all.push(chunk);
        all.sort_by_key(|chunk| std::cmp::Reverse(chunk.start.abs_diff(start)));
        for chunk in all {
            self.waiting.push_front(chunk);
        }
    }

    /// Looks for a chunk at all delays.
    fn attempt(&mut self, chunk: &Chunk) -> bool {
        self.attempts += 1;
        let floor = chunk.start as i64 - self.max_lag - self.chunk as i64;
        self.unsure += usize::from(!self.candidates.is_empty());
        let waited = self.unsure >= PATIENCE && (self.ring.kept() as u64) < self.search.frames_after;
        self.attempt_from(chunk, floor, true) || (waited && self.take_best(floor))
    }

    /// Follows the lag that stands out most.
    fn take_best(&mut self, floor: i64) -> bool {
        let best = self.candidates.iter().copied().max_by(|a, b| a.ratio.total_cmp(&b.ratio));
        if let Some(best) = best {
            self.follow(&best, floor, None);
        }
        best.is_some()
    }

    fn follow(&mut self, found: &Candidate, floor: i64, correlator: Option<Correlator>) {
        let tracker = Tracker::new(found.place, found.lag, floor);
        let proven = correlator.is_some();
        self.tracking = Some(Tracking { tracker, rival: found.rival, correlator, proven });
    }

    /// The same, in frames after from `floor` on.
    fn attempt_from(&mut self, chunk: &Chunk, floor: i64, whiten: bool) -> bool {
        let start = chunk.start as i64;
        let first = (-self.max_lag).max(floor - start);
        let last = self.max_lag.min(self.search.frames_after as i64 - start - self.chunk as i64);
        if first > last {
            return false;
        }
        let lags = first..=last;
        let mut correlator = if whiten { Correlator::new(chunk, &self.ring, &lags) } else { Correlator::plain(chunk) };
        let Some(found) = correlator.search(chunk, &self.ring, lags) else { return false };
        self.highest_ratio = self.highest_ratio.max(if whiten { found.ratio } else { 0.0 });
        if !found.stands_out {
            return false;
        }
        let place = chunk.start as f64 + 0.5 * self.chunk as f64;
        let mut candidate = Candidate { place, lag: found.lag, ratio: found.ratio, rival: found.rival };
        let witness = self.candidates.iter().find(|other| other.agrees(&candidate));
        if let Some(other) = witness {
            // Another lag that only one of both allows is none.
            let near = |a: f64| other.rival.is_some_and(|b| (a - b).abs() <= AGREEING_FRAMES);
            candidate.rival = candidate.rival.filter(|rival| near(*rival));
        }
        let sure = !whiten || found.ratio >= SURE_RATIO || witness.is_some();
        if sure {
            self.follow(&candidate, floor, Some(correlator));
        } else {
            self.candidates.push(candidate);
        }
        sure
    }
}

impl Tracking {
    fn collect(&mut self, chunk: Chunk, ring: &Ring, length: usize) -> Option<Piece> {
        let (_, lag) = self.tracker.origin();
        let around = lag.round() as i64 - length as i64..=lag.round() as i64 + length as i64;
        let correlator = self.correlator.get_or_insert_with(|| Correlator::new(&chunk, ring, &around));
        let piece = self.tracker.collect(chunk, ring, correlator);
        self.proven |= piece.as_ref().is_some_and(|piece| piece.lag.is_some());
        // What the first chunk shows of a sweep would make all that follows unrecognizable.
        if !self.proven {
            self.correlator = None;
        }
        piece
    }
}

/// What makes a search pointless from the start.
fn refusal(search: &Search, chunk: usize) -> Option<AlignError> {
    for (side, frames) in [(Side::Before, search.frames_before), (Side::After, search.frames_after)] {
        if frames < NEEDED_FRAMES {
            return Some(AlignError::TooShort { side, frames, needed: NEEDED_FRAMES });
        }
    }
    let delay = search.given_frames?;
    let needed = NEEDED_FRAMES.max(chunk as u64);
    let (before, after) = (search.frames_before as f64, search.frames_after as f64);
    let common = (before.min(after - delay) - (-delay).max(0.0)).max(0.0) as u64;
    let (side, frames) =
        if delay >= 0.0 { (Side::After, search.frames_after) } else { (Side::Before, search.frames_before) };
    (common < needed || !delay.is_finite()).then_some(AlignError::NoOverlap { side, delay, frames, common, needed })
}
