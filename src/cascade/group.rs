//! Groups of up to 16 sections in a chain, and channels on their way through it.

use super::kernel::{self, LANE_LAG, LANE_STEP, MAX_LANES, State, Sweep, Taps, Width};
use super::start::steady;
use super::{CLEAR_BELOW, CLEAR_PERIOD};
use crate::section::Section;

/// Up to 16 sections that advance together.
#[derive(Debug)]
pub(super) struct Group {
    sections: Vec<Section>,
    taps: Taps,
}

impl Group {
    /// A group of 1 to 16 sections.
    pub(super) fn new(sections: &[Section]) -> Self {
        Group { sections: sections.to_vec(), taps: Taps::new(sections) }
    }

    /// Steps from a frame's entry into the first lane to its exit from the last.
    pub(super) fn latency_frames(&self) -> usize {
        self.tail() * LANE_LAG
    }

    fn tail(&self) -> usize {
        self.sections.len().saturating_sub(1)
    }

    fn lanes(&self) -> usize {
        self.sections.len().next_multiple_of(LANE_STEP)
    }
}

/// A channel in one group.
#[derive(Debug)]
struct Stage {
    /// Frames fed so far, those of the drain included: lane k is at frame `step - LANE_LAG * k`.
    step: u64,
    state: State,
}

impl Stage {
    const NEW: Self = Stage { step: 0, state: State::REST };

    /// Puts the sections into the steady state of the constant `constant` and returns
    /// the constant that leaves the group.
    fn start(&mut self, group: &Group, constant: f64) -> f64 {
        group.sections.iter().enumerate().fold(constant, |constant, (lane, section)| {
            let start = steady(section, constant);
            (self.state.s1[lane], self.state.s2[lane]) = (start.s1, start.s2);
            start.output
        })
    }

    /// Feeds `input` and appends what leaves the group.
    fn feed(&mut self, width: Width, group: &Group, mut input: &[f64], out: &mut Vec<f64>) {
        let sweep = Sweep { taps: &group.taps, lanes: group.lanes(), tail: group.tail() };
        while !input.is_empty() {
            // Every `LANE_LAG` steps another lane has its turn, where it is at a multiple
            // of `CLEAR_PERIOD` frames; after the last the rest of the period is one sweep.
            let phase = (self.step % CLEAR_PERIOD) as usize;
            let lane = phase / LANE_LAG;
            let in_turn = lane <= sweep.tail;
            let ahead = if in_turn { LANE_LAG - phase % LANE_LAG } else { CLEAR_PERIOD as usize - phase };
            let (now, later) = input.split_at(ahead.min(input.len()));
            input = later;
            if in_turn && phase.is_multiple_of(LANE_LAG) {
                clear_small(&mut self.state.s1[lane]);
                clear_small(&mut self.state.s2[lane]);
            }
            let ready = out.len();
            out.resize(ready + now.len(), 0.0);
            if in_turn && self.step < CLEAR_PERIOD {
                // At the very start no frame has been beyond `lane`: those lanes take
                // back what the sweep made of nothing.
                let before = self.state.clone();
                kernel::run(width, sweep, &mut self.state, now, &mut out[ready..]);
                let idle = lane + 1;
                self.state.s1[idle..].copy_from_slice(&before.s1[idle..]);
                self.state.s2[idle..].copy_from_slice(&before.s2[idle..]);
                if lane < sweep.tail {
                    out.truncate(ready);
                }
            } else {
                kernel::run(width, sweep, &mut self.state, now, &mut out[ready..]);
            }
            self.step += now.len() as u64;
        }
    }
}

fn clear_small(state: &mut f64) {
    if state.abs() < CLEAR_BELOW {
        *state = 0.0;
    }
}

/// A channel in a chain of groups.
#[derive(Debug)]
pub(super) struct Strand {
    width: Width,
    started: bool,
    stages: Vec<Stage>,
    /// What passes between two groups.
    between: [Vec<f64>; 2],
}

/// Frames that pass through all groups before the next ones enter the first: few
/// enough that what passes between groups stays in the processor's nearest cache.
const CHUNK_FRAMES: usize = 1024;

impl Strand {
    /// A strand through `groups` groups.
    pub(super) fn new(groups: usize, width: Width) -> Self {
        Strand {
            width,
            started: false,
            stages: (0..groups).map(|_| Stage::NEW).collect(),
            between: [Vec::new(), Vec::new()],
        }
    }

    /// Feeds `input` and appends what leaves the last group.
    pub(super) fn process(&mut self, groups: &[Group], input: &[f64], out: &mut Vec<f64>) {
        let Some(&constant) = input.first() else { return };
        if !self.started {
            self.started = true;
            let stages = self.stages.iter_mut().zip(groups);
            stages.fold(constant, |constant, (stage, group)| stage.start(group, constant));
        }
        for chunk in input.chunks(CHUNK_FRAMES) {
            self.pass(groups, 0, chunk, out);
        }
    }

    /// Pushes out what is still in the groups and returns to the beginning.
    pub(super) fn finish(&mut self, groups: &[Group], out: &mut Vec<f64>) {
        if self.started {
            // Zeros push the last frame through each group in turn; what they
            // themselves become stays in the lanes and is dropped.
            for (first, group) in groups.iter().enumerate() {
                let zeros = [0.0; LANE_LAG * MAX_LANES];
                self.pass(groups, first, &zeros[..group.latency_frames()], out);
            }
        }
        *self = Strand::new(groups.len(), self.width);
    }

    /// Feeds `input` to the group `first` and what leaves it to those after it.
    fn pass(&mut self, groups: &[Group], first: usize, input: &[f64], out: &mut Vec<f64>) {
        let stages = self.stages.iter_mut().zip(groups).skip(first);
        let last = groups.len().saturating_sub(first + 1);
        if groups.is_empty() {
            out.extend_from_slice(input);
        }
        let [from, to] = &mut self.between;
        for (index, (stage, group)) in stages.enumerate() {
            to.clear();
            let source = if index == 0 { input } else { from.as_slice() };
            stage.feed(self.width, group, source, if index == last { &mut *out } else { &mut *to });
            std::mem::swap(from, to);
        }
    }
}
