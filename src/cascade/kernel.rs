//! The inner loop: up to 16 sections side by side in vector lanes.
//!
//! It is written once, in operations on four lanes, and those twice: [`portable`] and
//! [`avx2`]. `multiversion` picks one at run time, in the one unsafe call of the
//! program, which the macro writes. All round each operation once, in the same order,
//! so both give the same bits.

#[cfg(target_arch = "x86_64")]
mod avx2;
mod portable;

use crate::section::Section;
use multiversion::{multiversion, target::match_target};

/// The most sections one group has.
pub(super) const MAX_LANES: usize = 16;

/// Lanes come in multiples of this; those without a section compute zeros that
/// nothing reads.
pub(super) const LANE_STEP: usize = 4;

/// Frames by which each lane is behind the lane before it. With one, each step would
/// wait for outputs to move to the next lanes and pass through b0 there (12 lanes
/// 3.6 ns a sample in place of 2.8); with two that has a step to spare, and what is
/// left to wait for is the recurrence within each lane. Only at 16 lanes one would be
/// faster (4.0 against 4.3), as the registers hold the outputs of one step, not two.
pub(super) const LANE_LAG: usize = 2;

/// The vector instructions to use, where the processor has them; samples are the
/// same bits at any width.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Width {
    /// What every processor of the architecture has: two f64 at a time on x86-64.
    Portable,
    /// Four f64 at a time (AVX2) on x86-64.
    Widest,
}

/// The coefficients of a group, one section a lane.
#[derive(Clone, Debug)]
pub(super) struct Taps {
    b0: [f64; MAX_LANES],
    b1: [f64; MAX_LANES],
    b2: [f64; MAX_LANES],
    a1: [f64; MAX_LANES],
    a2: [f64; MAX_LANES],
}

impl Taps {
    /// The first 16 of `sections`.
    pub(super) fn new(sections: &[Section]) -> Self {
        let zero = [0.0; MAX_LANES];
        let mut taps = Taps { b0: zero, b1: zero, b2: zero, a1: zero, a2: zero };
        for (lane, section) in sections.iter().enumerate().take(MAX_LANES) {
            [taps.b0[lane], taps.b1[lane], taps.b2[lane]] = section.b;
            [_, taps.a1[lane], taps.a2[lane]] = section.a;
        }
        taps
    }
}

/// What one channel leaves in a group between two sweeps.
#[derive(Clone, Debug)]
pub(super) struct State {
    /// The last output but one of each lane, the next input of the lane after it.
    pub(super) waiting: [f64; MAX_LANES],
    /// The last output of each lane.
    pub(super) y: [f64; MAX_LANES],
    /// First state of each section.
    pub(super) s1: [f64; MAX_LANES],
    /// Second state of each section.
    pub(super) s2: [f64; MAX_LANES],
}

impl State {
    /// All lanes at rest.
    pub(super) const REST: State =
        State { waiting: [0.0; MAX_LANES], y: [0.0; MAX_LANES], s1: [0.0; MAX_LANES], s2: [0.0; MAX_LANES] };
}

/// What to run over the samples.
#[derive(Clone, Copy, Debug)]
pub(super) struct Sweep<'a> {
    /// The group's coefficients.
    pub(super) taps: &'a Taps,
    /// The lanes to compute: 4, 8, 12 or 16.
    pub(super) lanes: usize,
    /// The lane of the last section, which lies within the last four lanes.
    pub(super) tail: usize,
}

/// Feeds `input`, one frame a step, and writes what leaves the tail lane at each
/// step to `output`, which has the same length.
pub(super) fn run(width: Width, sweep: Sweep<'_>, state: &mut State, input: &[f64], output: &mut [f64]) {
    match width {
        Width::Portable => portable::run(sweep, state, input, output),
        Width::Widest => run_widest(sweep, state, input, output),
    }
}

#[multiversion(targets("x86_64+avx2"))]
fn run_widest(sweep: Sweep<'_>, state: &mut State, input: &[f64], output: &mut [f64]) {
    match_target! {
        "x86_64+avx2" => avx2::run(sweep, state, input, output),
        _ => portable::run(sweep, state, input, output),
    }
}

/// The loop over the operations on four lanes in scope. A macro, as a function for
/// certain instructions can only call others for them by their names.
macro_rules! sweeps {
    ($(#[$instructions:meta])*) => {
        $(#[$instructions])*
        pub(super) fn run(sweep: Sweep<'_>, state: &mut State, input: &[f64], output: &mut [f64]) {
            match sweep.lanes / LANE_STEP {
                ..=1 => steps::<1>(sweep, state, input, output),
                2 => steps::<2>(sweep, state, input, output),
                3 => steps::<3>(sweep, state, input, output),
                _ => steps::<4>(sweep, state, input, output),
            }
        }

        /// Runs `V` times four lanes. What changes lives in local arrays, which the
        /// compiler keeps in registers as long as it knows every index into them.
        $(#[$instructions])*
        fn steps<const V: usize>(sweep: Sweep<'_>, state: &mut State, input: &[f64], output: &mut [f64]) {
            let taps = sweep.taps;
            let [b0, b1, b2]: [[Lanes; V]; 3] = [first(&taps.b0), first(&taps.b1), first(&taps.b2)];
            let [a1, a2]: [[Lanes; V]; 2] = [first(&taps.a1), first(&taps.a2)];
            let [mut waiting, mut y]: [[Lanes; V]; 2] = [first(&state.waiting), first(&state.y)];
            let [mut s1, mut s2]: [[Lanes; V]; 2] = [first(&state.s1), first(&state.s2)];
            let tail = place(sweep.tail % LANE_STEP);
            for (input, output) in input.iter().zip(output) {
                let mut before = all(*input);
                for v in 0..V {
                    let x = shift(before, waiting[v]);
                    before = waiting[v];
                    waiting[v] = y[v];
                    y[v] = add(mul(b0[v], x), s1[v]);
                    s1[v] = sub(add(mul(b1[v], x), s2[v]), mul(a1[v], y[v]));
                    s2[v] = sub(mul(b2[v], x), mul(a2[v], y[v]));
                }
                *output = pick(y[V - 1], tail);
            }
            let kept = [(&mut state.waiting, waiting), (&mut state.y, y), (&mut state.s1, s1), (&mut state.s2, s2)];
            for (lanes, kept) in kept {
                for (lanes, kept) in lanes.as_chunks_mut().0.iter_mut().zip(kept) {
                    *lanes = array(kept);
                }
            }
        }

        $(#[$instructions])*
        #[inline]
        fn first<const V: usize>(lanes: &[f64; MAX_LANES]) -> [Lanes; V] {
            let mut first = [all(0.0); V];
            for (first, lanes) in first.iter_mut().zip(lanes.as_chunks().0) {
                *first = four(*lanes);
            }
            first
        }
    };
}
use sweeps;
